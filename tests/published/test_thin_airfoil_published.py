"""Thin-airfoil theory against independently computed closed forms."""

from __future__ import annotations

import csv
import re
from pathlib import Path

import numpy as np
import pytest

from solver.section.geometry import naca_outline
from solver.section.thin_airfoil import (
    flap_effectiveness,
    naca_thin_airfoil,
    outline_thin_airfoil,
)

pytestmark = pytest.mark.published
DATA = Path(__file__).parent / "data" / "potential_and_high_re"


def _rows(name: str) -> list[dict[str, str]]:
    lines = (DATA / name).read_text().splitlines()
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


def _digits(section: str) -> str:
    match = re.search(r"\d{4,5}", section)
    assert match is not None
    return match.group()


@pytest.mark.parametrize("row", _rows("thin_airfoil.csv"), ids=lambda row: row["section"][:11])
def test_exact_camber_lines_meet_the_closed_form(row):
    found = naca_thin_airfoil(_digits(row["section"]))
    # Ten significant figures are printed: half a unit in the last is 5e-10.
    close = lambda key: pytest.approx(float(row[key]), rel=6e-10)  # noqa: E731 - used four times
    assert np.degrees(found.zero_lift_angle) == close("alphaL0_deg")
    assert found.moment_quarter_chord == close("cm_c4")
    assert np.degrees(found.ideal_angle) == close("alpha_i_deg")
    assert found.ideal_lift == close("cl_i")


@pytest.mark.parametrize("row", _rows("thin_airfoil.csv"), ids=lambda row: row["section"][:11])
@pytest.mark.parametrize("points", [61, 161])
def test_camber_lines_measured_from_outlines_come_close(row, points):
    found = outline_thin_airfoil(naca_outline(_digits(row["section"]), points=points))
    # The measured line is a cubic spline whose knots do not know where NACA's two
    # pieces meet: 0.005 degrees and 2e-4, a tenth of what thickness (which the
    # theory leaves out) does. The ideal angle hangs on the slope at the very nose,
    # and is worst (0.08 degrees) where the pieces meet early, on NACA 2212.
    assert np.degrees(found.zero_lift_angle) == pytest.approx(float(row["alphaL0_deg"]), abs=5e-3)
    assert found.moment_quarter_chord == pytest.approx(float(row["cm_c4"]), abs=2e-4)
    assert np.degrees(found.ideal_angle) == pytest.approx(float(row["alpha_i_deg"]), abs=0.1)
    assert found.ideal_lift == pytest.approx(float(row["cl_i"]), abs=1e-2)


@pytest.mark.parametrize(
    "row", _rows("glauert_flap.csv"), ids=lambda row: row["E_flap_chord_ratio"]
)
def test_plain_flaps_meet_glauerts_closed_form(row):
    found = flap_effectiveness(float(row["E_flap_chord_ratio"]))
    # Ten significant figures are printed.
    assert found.angle_shift == pytest.approx(-float(row["dalphaL0_ddelta"]), rel=6e-10)
    assert found.lift_slope == pytest.approx(float(row["dcl_ddelta_per_rad"]), rel=6e-10)
    assert found.moment_slope == pytest.approx(float(row["dcm_c4_ddelta_per_rad"]), rel=6e-10)


@pytest.mark.parametrize(
    "row",
    [row for row in _rows("inviscid_naca.csv") if row["alpha_deg"] == "0"],
    ids=lambda row: row["section"],
)
def test_a_panel_method_with_thickness_differs_by_what_thickness_does(row):
    found = naca_thin_airfoil(row["section"])
    # Thin-airfoil theory leaves out thickness: of the order of thickness times
    # the zero-lift angle, here with a factor of one half.
    thickness = int(row["section"][-2:]) / 100.0
    exact = float(row["aL0_deg_extrap"])
    allowed = 0.5 * thickness * abs(exact) + 0.01
    assert np.degrees(found.zero_lift_angle) == pytest.approx(exact, abs=allowed)
    assert found.moment_quarter_chord == pytest.approx(float(row["cm_extrap"]), abs=0.007)
