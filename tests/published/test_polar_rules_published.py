"""The rules for measured tables, on wind-tunnel runs that show why they are needed.

Numbers that a rule should find were read off the tables by eye.
"""

from __future__ import annotations

import csv
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from app.tables import read_drag_table, read_lift_table
from solver.section.confidence import drag_half_width, largest_lift_half_width
from solver.section.packed import HIGH, LOW, NOMINAL
from solver.section.packing import pack_polars
from solver.section.polar import CellOrigin, Polar, polar_from_sweeps
from solver.section.sweeps import Sweep, first_attached_peak, hysteresis
from solver.section.thin_airfoil import ThinAirfoil

pytestmark = pytest.mark.published

DATA = Path(__file__).parent / "data" / "sections"
CAMBERED = ThinAirfoil(-0.06, -0.08, 0.02, 0.4)
"""Stands for thin-airfoil theory where only the filling of moments matters."""

SYMMETRIC = ThinAirfoil(0.0, 0.0, 0.0, 0.0)

SETS = {
    "S1223": (["s1223/uiuc_v1_lift.csv", "s1223/uiuc_v2_lift.csv"], "s1223/uiuc_v1_drag.csv"),
    "FX 63-137": (["fx63-137/uiuc_v1_modelB_lift.csv"], "fx63-137/uiuc_v1_modelB_drag.csv"),
    "E387 C": (["e387/uiuc_v3_modelC_lift.csv"], "e387/uiuc_v3_modelC_drag.csv"),
    "E387 E": (
        ["e387/nrel_sr500_34515_modelE_lift.csv"],
        "e387/nrel_sr500_34515_modelE_drag.csv",
    ),
    "NACA 0009": (["naca0009/uiuc_v1_lift.csv"], "naca0009/soartech8_drag.csv"),
    "NACA 6409": (["naca6409/uiuc_v1_lift.csv"], "naca6409/uiuc_v1_drag.csv"),
}


@cache
def lift_runs(name: str) -> tuple[Sweep, ...]:
    return tuple(run for file in SETS[name][0] for run in read_lift_table(DATA / file))


@cache
def polar(name: str) -> Polar:
    thin = SYMMETRIC if name == "NACA 0009" else CAMBERED
    return polar_from_sweeps(
        name, lift_runs(name), read_drag_table(DATA / SETS[name][1]), thin=thin
    )


def run(name: str, reynolds: float, *, rising: bool = True) -> Sweep:
    (found,) = (
        sweep
        for sweep in lift_runs(name)
        if abs(sweep.reynolds - reynolds) < 600.0 and sweep.rising is rising
    )
    return found.ordered()


def limit(name: str, reynolds: float):
    sweep = run(name, reynolds)
    return first_attached_peak(sweep.angle, sweep.lift)


def test_s1223_at_61k_is_limited_by_its_first_peak_and_not_by_what_creeps_up_after_it():
    found = limit("S1223", 61_000)
    # The readings themselves: 1.123 at 2.85 degrees, 1.391 at 19.97 (print precision).
    assert found.largest_lift == pytest.approx(1.123, abs=5e-4)
    assert np.degrees(found.peak_angle) == pytest.approx(2.85, abs=5e-3)
    assert found.later_rise == pytest.approx(1.391, abs=5e-4)
    assert found.bracketed


def test_s1223_at_102k_peaks_where_lift_falls_away():
    found = limit("S1223", 101_600)
    assert found.largest_lift == pytest.approx(1.544, abs=5e-4)
    assert np.degrees(found.peak_angle) == pytest.approx(6.7, abs=0.05)
    assert found.plateau is None


def test_lift_of_s1223_is_unknown_up_to_147k():
    low_ends = [round(low, -3) for low, _ in polar("S1223").unknown]
    high_ends = [round(high, -3) for _, high in polar("S1223").unknown]
    assert 123_000 in low_ends
    # Repeats at 147,400 and 149,500 make one column between them.
    assert 147_000 <= high_ends[low_ends.index(123_000)] <= 150_000
    assert max(high_ends) <= 150_000, "171,000 and above agree within a few per cent"


def test_between_two_runs_that_jump_the_lower_one_is_taken():
    packed = pack_polars([polar("S1223")])
    below = packed.limits(145e3).largest_lift
    # 1.668 at 122,600; the change to 2.18 is kept to the last per cent below 148,400.
    assert below == pytest.approx(1.668, abs=1e-3)
    assert packed.limits(150e3).largest_lift > 2.1
    assert packed.in_unknown(145e3)
    assert not packed.in_unknown(160e3)
    assert packed.trust(0.0, 145e3) == 1
    assert packed.trust(0.0, 160e3) == 0


def test_s1223_at_147k_stays_on_the_lower_branch_until_about_six_degrees():
    up, down = run("S1223", 147_400), run("S1223", 147_400, rising=False)
    found = hysteresis(up, down, limit=first_attached_peak(up.angle, up.lift))
    assert found is not None
    # The readings: 1.106 at 6.6 degrees, 1.549 at 5.8.
    assert 5.7 < np.degrees(found.recovery_angle) < 6.6
    assert found.recovery_lift == pytest.approx(1.106, abs=5e-4)
    assert 1.0 < found.lower_lift < 1.1
    column = int(np.argmin(np.abs(polar("S1223").reynolds - 148e3)))
    assert 5.0 < np.degrees(polar("S1223").recovery[column]) < 6.6


@pytest.mark.parametrize("name", ["E387 C", "E387 E"])
def test_e387_shows_no_hysteresis_loop(name):
    assert not np.isfinite(polar(name).recovery).any()


def test_fx_63_137_between_62k_and_80k_is_unknown_and_the_only_such_interval():
    ((low, high),) = polar("FX 63-137").unknown
    assert (low, high) == pytest.approx((61_500, 80_400))
    packed = pack_polars([polar("FX 63-137")])
    # 1.216 is the end of the run at 61,500, 1.667 the peak at 80,400.
    assert packed.limits(70e3).largest_lift == pytest.approx(1.216, abs=1e-3)
    assert packed.limits(80.4e3).largest_lift == pytest.approx(1.667, abs=1e-3)


def test_a_run_that_ends_while_lift_still_rises_gives_a_lower_bound():
    assert not polar("FX 63-137").bracketed[0]
    assert polar("FX 63-137").bracketed[1:].all()


@pytest.mark.parametrize("reynolds", [100_064, 200_083, 300_096, 460_154, 499_909])
def test_e387_model_e_has_a_plateau_and_a_knee_before_it(reynolds):
    found = limit("E387 E", reynolds)
    assert found.plateau is not None
    start, end = np.degrees(found.plateau)
    # Flat from about 9.5 to 14 degrees; readings stand a degree apart, and at 300,000
    # a hump of 0.05 at 14 degrees ends it one reading earlier.
    assert start == pytest.approx(9.5, abs=0.5)
    assert end == pytest.approx(14.0, abs=1.0)
    assert np.degrees(found.knee_angle) == pytest.approx(9.5, abs=0.5)


def test_the_knee_of_e387_varies_less_than_the_angle_of_its_maximum():
    knees = polar("E387 E").knee_angle
    runs = [sweep for sweep in lift_runs("E387 E") if sweep.rising]
    tops = np.array([sweep.angle[np.argmax(sweep.lift)] for sweep in runs])
    assert np.degrees(np.ptp(knees)) < 1.0
    assert np.degrees(np.ptp(tops)) > 2.0


@pytest.mark.parametrize("name", ["E387 C", "E387 E"])
def test_e387_has_no_jump_between_100k_and_500k(name):
    assert polar(name).unknown == ()


def test_largest_lift_of_e387_agrees_between_tunnels_within_the_half_width():
    # NASA TM-4062: 1.207 at 100,000 and 1.284 at 460,000 in the Langley tunnel.
    packed = pack_polars([polar("E387 E")])
    for reynolds, langley in ((100_064, 1.207), (460_000, 1.284)):
        low, high = (float(packed.limits(reynolds, band=b).largest_lift) for b in (LOW, HIGH))
        assert low < langley < high


def test_a_dip_before_reattachment_counts_as_the_first_peak():
    # NACA 6409 at 61,300: 0.865 at 4.9 degrees, 0.813 at 6.5, then 1.426 at 11.2.
    found = limit("NACA 6409", 61_300)
    assert found.largest_lift == pytest.approx(0.865, abs=5e-4)
    assert found.later_rise == pytest.approx(1.426, abs=5e-4)


@pytest.mark.parametrize("name", SETS)
def test_the_curve_stays_within_the_scatter_of_the_readings(name):
    table = polar(name)
    packed = pack_polars([table])
    for j, reynolds in enumerate(table.reynolds):
        repeats = [s for s in lift_runs(name) if s.rising and abs(s.reynolds / reynolds - 1) < 0.03]
        if len(repeats) != 1 or not (table.origin_lift[:, j] == CellOrigin.MEASURED).any():
            continue
        sweep = repeats[0].ordered()
        attached = sweep.angle <= table.peak_angle[j] - np.radians(0.2)
        fitted = packed.evaluate(sweep.angle[attached], sweep.reynolds).lift
        # 0.015 of smoothing; 0.004 for readings between nodes a quarter degree apart.
        assert np.max(np.abs(fitted - sweep.lift[attached])) < 0.015 + 0.004


@pytest.mark.parametrize("name", SETS)
@pytest.mark.parametrize("band", [LOW, NOMINAL, HIGH])
def test_each_end_of_the_band_has_its_own_largest_lift(name, band):
    table = polar(name)
    packed = pack_polars([table])
    for j, reynolds in enumerate(table.reynolds):
        limits = packed.limits(reynolds, band=band)
        shift = (band - NOMINAL) * table.largest_lift_uncertainty[j]
        assert limits.largest_lift == pytest.approx(table.largest_lift[j] + shift, abs=1e-9)
        angle = np.linspace(limits.knee_angle - 0.2, limits.peak_angle, 600)
        largest = packed.evaluate(angle, reynolds, band=band).lift.max()
        # The curve between grid nodes, and between the readings about the peak.
        assert largest == pytest.approx(float(limits.largest_lift), abs=1e-3)


@pytest.mark.parametrize("name", ["E387 C", "E387 E"])
def test_the_linear_range_is_the_same_at_every_end_of_the_band(name):
    packed = pack_polars([polar(name)])
    angle = np.radians(np.linspace(0.0, 4.0, 9))
    nominal = packed.evaluate(angle, 200e3).lift
    for band in (LOW, HIGH):
        # Exact: the shift's weight is zero there.
        assert packed.evaluate(angle, 200e3, band=band).lift == pytest.approx(nominal, abs=1e-12)


def test_drag_is_carried_over_at_equal_lift():
    table, packed = polar("E387 E"), pack_polars([polar("E387 E")])
    runs = read_drag_table(DATA / SETS["E387 E"][1])
    for sweep in runs:
        rising = (sweep.lift > 0.0) & (sweep.lift < 0.9)
        j = int(np.argmin(np.abs(table.reynolds - sweep.reynolds)))
        angle = np.interp(sweep.lift[rising], table.lift[: np.argmax(table.lift[:, j]), j],
                          table.angle[: np.argmax(table.lift[:, j])])  # fmt: skip
        found = packed.evaluate(angle, table.reynolds[j]).drag
        # Smoothed within the spanwise scatter of one run: 5 % from 200,000, 7 % at 100,000.
        allowed = 0.075 if sweep.reynolds < 150e3 else 0.05
        assert found == pytest.approx(sweep.drag[rising], rel=allowed)


def test_every_drag_run_of_e387_model_e_has_a_column():
    assert polar("E387 E").reynolds == pytest.approx(
        [100_064, 200_083, 300_096, 349_865, 460_154, 499_909]
    )
    # At 349,865 there was no lift run.
    filled = polar("E387 E").origin_lift[:, 3] == CellOrigin.FILLED
    assert filled.all()
    assert (polar("E387 E").origin_drag[:, 3] == CellOrigin.MEASURED).any()


def test_moments_are_kept_where_measured_and_filled_from_theory_where_not():
    assert (polar("E387 E").origin_moment[:, 0] == CellOrigin.MEASURED).any()
    table = polar("S1223")
    assert (table.origin_moment == CellOrigin.FILLED).all()
    at_zero = int(np.argmin(np.abs(table.angle)))
    assert table.moment[at_zero] == pytest.approx(CAMBERED.moment_quarter_chord, abs=1e-12)


def test_cambered_sections_lift_at_zero_angle_and_pitch_down():
    packed = pack_polars([polar("E387 E")])
    values = packed.evaluate(0.0, np.array([100e3, 200e3, 500e3]))
    assert np.all(values.lift > 0.3)
    assert np.all(values.moment < -0.05)


def test_a_symmetric_section_is_completed_by_its_mirror_image():
    packed = pack_polars([polar("NACA 0009")])
    # The run reaches down to -6 degrees only.
    angle = np.radians(np.linspace(7.0, 12.0, 11))
    up, down = (packed.evaluate(sign * angle, 100.7e3) for sign in (1.0, -1.0))
    # The run's zero lift lies at -0.24 degrees, twice which is 0.045 in lift, and
    # readings are smoothed within 0.015.
    assert -down.lift == pytest.approx(up.lift, abs=0.06)
    assert packed.trust(np.radians(-9.0), 100.7e3) == 0
    assert packed.trust(np.radians(-14.0), 100.7e3) == 2


def test_drag_falls_and_lift_to_drag_rises_with_reynolds_number():
    packed = pack_polars([polar("E387 E")])
    values = packed.evaluate(np.radians(5.0), np.array([100e3, 200e3, 300e3, 500e3]))
    assert np.all(np.diff(values.drag) < 0.0)
    assert np.all(np.diff(values.lift / values.drag) > 0.0)


def scatter_rows(quantity: str) -> list[tuple[str, float]]:
    lines = (DATA.parent / "measurement_scatter.csv").read_text().splitlines()
    rows = csv.DictReader(line for line in lines if not line.startswith("#"))
    return [(row["Re"], float(row["value"])) for row in rows if row["quantity"] == quantity]


def test_the_half_width_of_drag_is_the_difference_between_two_tunnels():
    rows = [(re, v) for re, v in scatter_rows("mean |dcd|/cd two tunnels") if re != "all"]
    assert len(rows) == 5
    for reynolds, value in rows:
        assert drag_half_width(float(reynolds)) == pytest.approx(value, abs=5e-4)


def test_the_half_width_of_largest_lift_lies_between_two_published_differences():
    ((_, mean),) = [row for row in scatter_rows("mean |dcl| two tunnels") if row[0] == "all"]
    ((_, largest),) = scatter_rows("clmax LTPT 1.20 vs Stuttgart 1.12")
    width = largest_lift_half_width(np.geomspace(40e3, 1e6, 30))
    # 0.048 over all points, rounded to 0.05; 0.07 at 100,000.
    assert np.min(width) == pytest.approx(mean, abs=0.0025)
    assert np.max(width) == pytest.approx(largest, abs=1e-12)
    assert np.all(np.diff(width) <= 0.0)
