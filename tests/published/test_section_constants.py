"""How constants are judged leaving a section out: the logic, on made comparisons."""

from __future__ import annotations

import numpy as np
import pytest

from solver.section.boundary_layer.constants import ClosureConstants
from tests.published.measured_sections import outline
from tests.published.section_constants import (
    GRID,
    cross_judged,
    left_out,
    lines,
    objective,
    solve_with,
)
from tests.published.section_records import CONVERGED, DRAG, LIFT, Comparison

ROUND_OFF = 1e-12
"""Sums of a few numbers of size 1."""


def made(drag: dict[str, float], *, lift: float = 0.0, found: float = 1.0) -> Comparison:
    """One reading of each kind a section above 170,000, with given errors."""
    records = []
    for section, error in drag.items():
        records.append((section, "t", DRAG, 3e5, 0.0, 0.5, 0.02, 0.02 * (1.0 + error)))
        records.append((section, "t", LIFT, 3e5, 0.0, 0.5, 0.5, 0.5 + lift))
        records.append((section, "t", CONVERGED, 3e5, 0.0, 0.5, 1.0, found))
    return Comparison.of(records)


def test_the_objective_is_one_where_all_is_as_asked():
    # Above 170,000: 7.5 % mean and 2.5 % bias of drag, 0.03 of lift, 99.5 % of points.
    one = objective(made({"a": 0.075}, lift=0.03, found=0.995))
    assert one == pytest.approx((1.0 + 3.0 + 1.0 + 1.0) / 4.0)
    mixed = made({"a": 0.075, "b": -0.075}, lift=-0.03)  # bias 0, the sign of lift is nothing
    assert objective(mixed) == pytest.approx((1.0 + 0.0 + 1.0 + 0.0) / 4.0, abs=ROUND_OFF)


def test_nothing_compared_has_no_objective():
    assert np.isnan(objective(Comparison.of([])))


def test_a_section_has_no_say_in_its_own_choice():
    # Value 1 suits a alone, and very well; value 2 suits b and c.
    trials = {
        1.0: made({"a": 0.0, "b": 0.06, "c": 0.06}),
        2.0: made({"a": 0.30, "b": 0.0, "c": 0.0}),
    }
    choices = {one.section: one for one in left_out(trials, used=1.0)}
    assert choices["a"].value == 2.0
    assert choices["a"].chosen > choices["a"].used == pytest.approx(0.0, abs=ROUND_OFF)
    # Without b, a weighs as much as c.
    assert choices["b"].value == 1.0
    assert choices["b"].chosen == choices["b"].used


def test_each_section_is_pooled_with_the_value_chosen_without_it():
    trials = {
        1.0: made({"a": 0.0, "b": 0.06, "c": 0.06}),
        2.0: made({"a": 0.30, "b": 0.0, "c": 0.0}),
    }
    choices = left_out(trials, used=1.0)
    pooled = cross_judged(trials, choices)
    drag = pooled.error[pooled.quantity == DRAG]
    expected = {"a": 0.30, "b": 0.06, "c": 0.06}
    assert pooled.section[pooled.quantity == DRAG].tolist() == list(expected)
    np.testing.assert_allclose(drag, list(expected.values()), atol=ROUND_OFF)


def test_the_table_marks_the_value_in_use_and_names_every_section():
    used = ClosureConstants().separated_growth
    trials = {used: made({"a": 0.1, "b": 0.0}), 1.0: made({"a": 0.0, "b": 0.1})}
    text = "\n".join(lines("separated_growth", trials))
    assert f"{used:g} (in use)" in text
    assert "\n  a " in text
    assert "\n  b " in text


def test_the_grid_is_of_constants_and_leaves_out_those_in_use():
    in_use = vars(ClosureConstants())
    for name, values in GRID.items():
        assert in_use[name] not in values


@pytest.mark.slow
def test_the_constants_in_use_give_the_flow_that_users_get(compiled_kernels):
    from solver.section.flow import section_flow

    angle, reynolds = np.radians([0.0, 4.0]), np.array([1e5, 3e5])
    section = outline("e387")
    mine = solve_with(ClosureConstants())(section, angle=angle, reynolds=reynolds)
    theirs = section_flow(section, angle=angle, reynolds=reynolds)
    # The same kernels in the same order: to the last bit.
    np.testing.assert_array_equal(mine.lift, theirs.lift)
    np.testing.assert_array_equal(mine.drag, theirs.drag)
    other = solve_with(ClosureConstants(separated_growth=1.0))(
        section, angle=angle, reynolds=reynolds
    )
    # A shorter bubble has less drag: the constants do reach the kernels.
    assert (other.drag[:, 0] < mine.drag[:, 0]).all()
