(function () {
  "use strict";

  var DAY = 86400000;
  var shared = JSON.parse(document.getElementById("palettes").textContent);
  var dark = window.matchMedia("(prefers-color-scheme: dark)");
  var coarse = window.matchMedia("(pointer: coarse)");
  var charts = Array.prototype.slice.call(document.querySelectorAll("[data-figure]"));
  var span = document.getElementById("span");
  var moves = Array.prototype.slice.call(document.querySelectorAll("[data-move]"));
  var linked = [];
  var whole = null; // [first, last] in milliseconds of wall clock
  var shown = null;
  var printing = false;
  var following = false; // true while this script itself moves the charts

  function palette() {
    return dark.matches && !printing ? shared.dark : shared.light;
  }

  // Colours stand in the figures as "@name"; only keys that hold colours are looked at.
  function paint(node, colours, isColour) {
    if (typeof node === "string") {
      return isColour && node.charAt(0) === "@" ? colours[node.slice(1)] : node;
    }
    if (node === null || typeof node !== "object") { return node; }
    if (node.bdata) { return node; }
    Object.keys(node).forEach(function (key) {
      var colour = isColour || /color(scale)?$/.test(key);
      node[key] = paint(node[key], colours, colour);
    });
    return node;
  }

  // Room for the rows of the legend: its columns are as wide as the longest entry.
  function legendRows(traces, width) {
    var names = traces.filter(function (t) { return t.showlegend !== false; })
      .map(function (t) { return t.name.length; });
    var columns = Math.max(1, Math.floor(width / (54 + 6.6 * Math.max.apply(null, names))));
    return Math.ceil(names.length / columns);
  }

  function fit(layout, traces, width) {
    var margin = layout.margin;
    if (layout.showlegend) {
      var more = 25 * (legendRows(traces, width - margin.l - margin.r) - 1);
      layout.height += more;
      margin.b += more;
    }
    if (layout.meta && layout.meta.aspect) {
      var tall = (width - margin.l - margin.r) * layout.meta.aspect;
      layout.height = Math.max(100, Math.min(480, tall)) + margin.t + margin.b;
    }
    if (width >= 560) { return; }
    // Small screens: less margin, smaller type, fewer dates.
    layout.margin.l = Math.min(layout.margin.l, 46);
    if (!(layout.meta && layout.meta.aspect)) { layout.margin.r = 8; }
    layout.font.size = 12;
    if (layout.xaxis.type === "date") { layout.xaxis.nticks = 4; }
    (layout.annotations || []).forEach(function (note) { note.font.size = 11; });
  }

  function stamp(ms) { return new Date(ms).toISOString().slice(0, 19).replace("T", " "); }

  function millis(value) {
    return typeof value === "number" ? value : Date.parse(String(value).replace(" ", "T") + (/Z$/.test(value) ? "" : "Z"));
  }

  function draw(el) {
    var figure = JSON.parse(document.getElementById("spec-" + el.dataset.figure).textContent);
    var layout = figure.layout;
    paint(figure.traces, palette(), false);
    paint(layout, palette(), false);
    fit(layout, figure.traces, el.clientWidth);
    if (coarse.matches) { layout.dragmode = false; }
    if (figure.linked) {
      if (!whole) { whole = layout.xaxis.range.map(millis); shown = whole.slice(); }
      layout.xaxis.range = shown.map(stamp);
    }
    el.style.minHeight = layout.height + "px";
    return window.Plotly.react(el, figure.traces, layout, shared.config).then(function () {
      if (el.dataset.drawn) { return; }
      el.dataset.drawn = "yes";
      if (figure.linked) { linked.push(el); el.on("plotly_relayout", function (change) { moved(el, change); }); }
    });
  }

  function drawAll() {
    return charts.reduce(function (before, el) {
      return before.then(function () { return draw(el); });
    }, Promise.resolve()).then(function () { document.body.dataset.charts = "drawn"; });
  }

  function isWhole() { return shown[0] === whole[0] && shown[1] === whole[1]; }

  // The words, the choice and the buttons follow what the charts show, however it came about.
  function say() {
    if (!shown) { return; }
    var out = document.getElementById("shown");
    out.textContent = stamp(shown[0]).slice(0, 16) + " to " + stamp(shown[1]).slice(0, 16);
    var days = isWhole() ? "0" : String((shown[1] - shown[0]) / DAY);
    span.value = days;
    if (span.selectedIndex < 0) { span.value = ""; }
    moves.forEach(function (button) {
      var done = Number(button.dataset.move) < 0 ? shown[0] <= whole[0] : shown[1] >= whole[1];
      button.setAttribute("aria-disabled", String(done));
    });
  }

  function show(range, except) {
    shown = range;
    say();
    following = true;
    return linked.filter(function (el) { return el !== except; }).reduce(function (before, el) {
      return before.then(function () {
        return window.Plotly.relayout(el, { "xaxis.range": range.map(stamp) });
      });
    }, Promise.resolve()).then(function () { following = false; });
  }

  function moved(el, change) {
    if (following) { return; }
    var range = change["xaxis.range"] ||
      (change["xaxis.range[0]"] !== undefined ? [change["xaxis.range[0]"], change["xaxis.range[1]"]] : null);
    if (range) { show(range.map(millis), el); }
    else if (change["xaxis.autorange"]) { show(whole.slice(), null); }
  }

  function within(first, width) {
    var start = Math.max(whole[0], Math.min(first, whole[1] - width));
    return [start, Math.min(whole[1], start + width)];
  }

  function press(event) {
    var button = event.target.closest("button");
    if (!button || !whole || button.getAttribute("aria-disabled") === "true") { return; }
    var width = shown[1] - shown[0];
    show(within(shown[0] + Number(button.dataset.move) * width, width), null);
  }

  function choose() {
    if (!whole) { return; }
    var width = Number(span.value) * DAY;
    if (!width) { show(whole.slice(), null); return; }
    // From the whole record the newest days; from a closer look, around its middle.
    show(within(isWhole() ? whole[1] - width : (shown[0] + shown[1] - width) / 2, width), null);
  }

  // A table that is wider than its place says so.
  function cue() {
    document.querySelectorAll(".sheet").forEach(function (sheet) {
      sheet.querySelector(".cue").hidden = sheet.scrollWidth <= sheet.clientWidth + 1;
    });
  }

  document.querySelector(".range").addEventListener("click", press);
  span.addEventListener("change", choose);
  window.addEventListener("resize", cue);
  cue();
  dark.addEventListener("change", drawAll);
  window.addEventListener("beforeprint", function () { printing = true; drawAll(); });
  window.addEventListener("afterprint", function () { printing = false; drawAll(); });

  var narrow = document.body.clientWidth < 640;
  window.addEventListener("resize", function () {
    var now = document.body.clientWidth < 640;
    if (now !== narrow) { narrow = now; drawAll(); }
  });
  drawAll().then(say);
}());
