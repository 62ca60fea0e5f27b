"""The views that people's own SQL leans on, as a fresh store has them."""

from __future__ import annotations

from collections.abc import Iterator

import pytest

from meterlens.settings import load_site, write_new_site
from meterlens.store.database import Store, open_store
from meterlens.store.questions import VIEWS

KEY = "service start_utc start_local interval_min"
GRADES = "angle_grade current_angle_grade flags"
PHASES = "a b c"


def of_phases(pattern: str) -> str:
    return " ".join(pattern.format(phase) for phase in PHASES.split())


PROMISED = {
    "interval": [KEY, of_phases("v_{}"), "v_ab v_bc v_ca", of_phases("i_{}"), "i_n_metered_a",
                 of_phases("pf_exported_{}")],
    "interval_power": [KEY, of_phases("p_{}_kw"), of_phases("q_{}_kvar"), of_phases("s_{}_kva"),
                       of_phases("pf_{}"), "p_kw q_kvar s_vector_kva s_arithmetic_kva",
                       "s_effective_kva pf_vector pf_arithmetic pf_effective", GRADES],
    "interval_impedance": [KEY, of_phases("r_wye_{}_ohm"), of_phases("x_wye_{}_ohm"),
                           "r_delta_ab_ohm x_delta_ab_ohm r_delta_bc_ohm x_delta_bc_ohm",
                           "r_delta_ca_ohm x_delta_ca_ohm r_delta_ohm x_delta_ohm", GRADES],
    "interval_balance": [KEY, "vuf lvur pvur iuf2 iuf0 current_unbalance i_n_a i_n_metered_a",
                         GRADES],
    "demand": ["service start_utc start_local window_min complete p_kw q_kvar"],
    "month": ["service month completeness energy_kwh energy_export_kwh reactive_lagging_kvarh",
              "reactive_leading_kvarh apparent_kvah peak_current_a peak_current_phase",
              "peak_current_utilisation low_pf_hours leading_hours kvarh_above_target vuf_p95",
              "lvur_p95 current_unbalance_p95 neutral_current_max_a voltage_min_pu",
              "voltage_max_pu hours_outside_voltage_band"],
    "period": ["service kind phase start_utc start_local end_utc hours intervals worst mean unit",
               "energy_kwh kvarh_above_target"],
    "reject": ["file service line column reason text"],
    "file": ["service path sha256 rows_read rows_stored rows_replaced rows_duplicate",
             "rows_rejected values_rejected"],
    "history": [KEY, of_phases("v_{}"), of_phases("i_{}"), of_phases("pf_exported_{}"),
                "replaced_by_file_id replaced_by_line"],
}  # fmt: skip


@pytest.fixture(scope="module")
def fresh(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Store]:
    folder = tmp_path_factory.mktemp("site")
    write_new_site(folder)
    with open_store(load_site(folder), write=True) as store:
        yield store


@pytest.mark.parametrize("view", PROMISED)
def test_view_has_its_columns(fresh: Store, view: str) -> None:
    relation = fresh.con.view(view)
    assert set(" ".join(PROMISED[view]).split()) <= set(relation.columns)
    assert relation.fetchall() == []


def test_these_are_all_the_views(fresh: Store) -> None:
    rows = fresh.con.execute(
        "select view_name from duckdb_views() where not internal order by view_name"
    ).fetchall()
    # One view is the program's own: it names the places of a list column for the others.
    public = [row[0] for row in rows if row[0] != "reading_version"]
    assert public == sorted(PROMISED) == sorted(VIEWS)


def test_readings_are_doubles_and_so_is_what_is_summed(fresh: Store) -> None:
    for view in ("interval", "interval_power"):
        relation = fresh.con.view(view)
        kinds = dict(zip(relation.columns, map(str, relation.types), strict=True))
        for name in kinds:
            if name.startswith(("v_", "i_", "p_", "q_", "s_")) or name.endswith(("_kw", "_kvar")):
                assert kinds[name] == "DOUBLE", name
