"""Ingest with derivation against one DuckDB statement that does the columns' work in SQL.

    python tests/benchmarks/ingest.py [--rows 2000000] [--runs 5]

Three whole processes take turns on the same file: ``meterlens ingest`` into a new store,
the yardstick of one_statement.sql into a new database, and a bare typed load. Printed are
medians of wall and processor time and the ratios pair by pair; before timing, the derived
columns of both are compared.
"""

from __future__ import annotations

import argparse
import resource
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import duckdb
import numpy as np

HERE = Path(__file__).resolve().parent

SITE = """\
[site]
name = "Benchmark"
timezone = "Etc/UTC"

[[service]]
id = "main"
name = "Main"
connection = "wye-4w"
nominal_voltage_v = 400
rating_a = 800
files = ["export.csv"]

[service.columns]
timestamp = "time"
clock = "utc"
stamp = "start"
pf_convention = "sign-is-lead-lag"
lagging_sign = "negative"
v_a = "v_a"
v_b = "v_b"
v_c = "v_c"
i_a = "i_a"
i_b = "i_b"
i_c = "i_c"
pf_a = "pf_a"
pf_b = "pf_b"
pf_c = "pf_c"
"""

YARDSTICK = """\
import sys, duckdb
con = duckdb.connect(sys.argv[2])
con.execute(open(sys.argv[3]).read(), {"path": sys.argv[1]})
"""

BARE = """\
import sys, duckdb
con = duckdb.connect(sys.argv[2])
con.execute(
    "create table t as select * from read_csv($path, header = true, columns = {"
    "'time': 'timestamp', 'v_a': 'double', 'v_b': 'double', 'v_c': 'double', 'i_a': 'double', "
    "'i_b': 'double', 'i_c': 'double', 'pf_a': 'double', 'pf_b': 'double', 'pf_c': 'double'})",
    {"path": sys.argv[1]},
)
"""


def write_export(path: Path, rows: int) -> None:
    """One-minute readings of an invented unbalanced load, by DuckDB's own CSV writer."""
    random = np.random.default_rng(7)
    con = duckdb.connect()
    table = {
        "n": np.arange(rows),
        **{f"v_{k}": np.round(random.normal(231, 2, rows), 2) for k in "abc"},
        **{f"i_{k}": np.round(random.uniform(5, 600, rows), 3) for k in "abc"},
        **{f"pf_{k}": np.round(-random.uniform(0.75, 0.999, rows), 4) for k in "abc"},
    }
    con.register("made", table)
    con.execute(
        "copy (select strftime(timestamp '2020-01-01' + to_minutes(n::bigint), "
        "'%Y-%m-%d %H:%M') as time, * exclude (n) from made) to '" + str(path) + "' (header)"
    )


def timed(command: list[str]) -> tuple[float, float]:
    """Wall and processor seconds of one whole process."""
    before = resource.getrusage(resource.RUSAGE_CHILDREN)
    start = time.perf_counter()
    subprocess.run(command, check=True, stdout=subprocess.DEVNULL)
    wall = time.perf_counter() - start
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    return wall, (after.ru_utime - before.ru_utime) + (after.ru_stime - before.ru_stime)


def compare(store: Path, yardstick: Path) -> float:
    """Largest relative difference of any derived column between the two."""
    con = duckdb.connect()
    con.execute(f"attach '{store}' as ours (read_only)")
    con.execute(f"attach '{yardstick}' as sql (read_only)")
    names = [
        row[0]
        for row in con.execute(
            "select column_name from duckdb_columns() where database_name = 'sql' "
            "and table_name = 'reading' and data_type in ('DOUBLE', 'FLOAT')"
        ).fetchall()
    ]
    worst = 0.0
    for name in names:
        row = con.execute(
            f"select max(abs(a.{name} - b.{name}) / greatest(abs(b.{name}), 1e-3)), "
            f"count(*) filter ((a.{name} is null) <> (b.{name} is null)), count(*) "
            "from ours.reading a join sql.reading b using (start_utc)"
        ).fetchone()
        assert row is not None
        assert row[1] == 0, f"{name}: null on one side in {row[1]} rows"
        worst = max(worst, row[0])
    return worst


def main() -> None:
    """Run the comparison and print its table."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--rows", type=int, default=2_000_000)
    parser.add_argument("--runs", type=int, default=5)
    arguments = parser.parse_args()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        export = folder / "export.csv"
        write_export(export, arguments.rows)
        (folder / "site.toml").write_text(SITE)
        store, sql, bare = folder / "store.duckdb", folder / "sql.duckdb", folder / "bare.duckdb"
        commands = {
            "meterlens ingest": (
                store,
                [sys.executable, "-m", "meterlens", "ingest", "--site", name, "--json"],
            ),
            "one DuckDB statement": (
                sql,
                [sys.executable, "-c", YARDSTICK, str(export), str(sql),
                 str(HERE / "one_statement.sql")],
            ),
            "bare typed load": (bare, [sys.executable, "-c", BARE, str(export), str(bare)]),
        }  # fmt: skip
        times: dict[str, list[tuple[float, float]]] = {label: [] for label in commands}
        for turn in range(arguments.runs + 1):
            for label, (target, command) in commands.items():
                target.unlink(missing_ok=True)
                measured = timed(command)
                if turn:  # the first round warms the file cache
                    times[label].append(measured)
        worst = compare(store, sql)
        report(
            arguments.rows, times, worst, {k: t.stat().st_size for k, (t, _) in commands.items()}
        )


def report(
    rows: int, times: dict[str, list[tuple[float, float]]], worst: float, sizes: dict[str, int]
) -> None:
    """The table: medians, and ratios pair by pair."""
    print(f"{rows:,} rows, {len(next(iter(times.values())))} runs of each in turn, medians")
    print(f"largest relative difference between the derived columns: {worst:.1e}")
    print(f"{'':<22}{'wall s':>9}{'cpu s':>9}{'file MB':>9}")
    for label, runs in times.items():
        wall, cpu = (statistics.median(x) for x in zip(*runs, strict=True))
        print(f"{label:<22}{wall:>9.2f}{cpu:>9.2f}{sizes[label] / 1e6:>9.0f}")
    ours = times["meterlens ingest"]
    for label in ("one DuckDB statement", "bare typed load"):
        pairs = list(zip(ours, times[label], strict=True))
        wall = statistics.median(a[0] / b[0] for a, b in pairs)
        cpu = statistics.median(a[1] / b[1] for a, b in pairs)
        print(f"ratio to {label}: wall {wall:.2f}, cpu {cpu:.2f}")


if __name__ == "__main__":
    main()
