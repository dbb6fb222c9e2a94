"""What the accuracy table says of the section solver, held as it stands."""

from __future__ import annotations

import pytest

from tests.published.section_accuracy import TARGETS, meets, pooled, run
from tests.published.section_comparison import compare
from tests.published.section_records import RANGES

ACHIEVED = {
    "drag_mean": (0.149, 0.120, 0.089),
    "drag_median": (0.119, 0.086, 0.054),
    "drag_bias": (0.030, 0.018, 0.024),
    "lift_bias": (0.050, 0.037, 0.042),
    "lift_rms": (0.126, 0.070, 0.059),
    "largest_rms_without": (0.149, 0.054, 0.065),
    "largest_rms": (0.169, 0.115, 0.077),
    "converged": (0.999, 0.997, 0.996),
}
"""The table's figures as they stand, by name and range, each rounded to the worse side."""

SLACK = {
    "drag_mean": 0.003,
    "drag_median": 0.003,
    "drag_bias": 0.004,
    "lift_bias": 0.002,
    "lift_rms": 0.003,
    "largest_rms_without": 0.006,
    "largest_rms": 0.006,
    "converged": 0.002,
}
"""Room for machines whose last bits differ. Most points come to rest to five digits whatever
those are; near stall, and where a long bubble may burst or not, a few points end on another
branch or a step later. Fewer iterations to the same ends moved the figures by no more than
this."""

MET = {
    "drag_mean": (),
    "drag_bias": ("below 90k", "90k-170k", "above 170k"),
    "lift_bias": (),
    "largest_rms_without": (),
    "largest_rms": (),
    "converged": ("below 90k", "90k-170k", "above 170k"),
}
"""Ranges in which a figure is as good as was asked."""


@pytest.fixture(scope="session")
def reached(compiled_kernels) -> dict[str, dict[str, float]]:
    """The table's figures: all sections solved, half a minute to a minute on one core."""
    return pooled(compare(run()))


@pytest.mark.published
@pytest.mark.slow
def test_the_figures_are_as_good_as_written_down(reached):
    found = {}
    for key, limits in ACHIEVED.items():
        room = -SLACK[key] if key == "converged" else SLACK[key]
        for name, limit in zip(RANGES, limits, strict=True):
            if not meets(key, reached[name][key], limit + room):
                found[f"{key}, {name}"] = reached[name][key]
    assert not found
    assert set(ACHIEVED) >= set(TARGETS)
    # Nothing is gained by comparing less: points that ours does not reach are few.
    for name in RANGES:
        asked = reached[name]["drag_points"] + reached[name]["drag_missed"]
        assert reached[name]["drag_missed"] < 0.09 * asked
        assert reached[name]["lift_missed"] == reached[name]["largest_missed"] == 0


def test_what_is_written_down_says_where_it_is_as_good_as_asked():
    for key, targets in TARGETS.items():
        met = tuple(
            name
            for name, value, target in zip(RANGES, ACHIEVED[key], targets, strict=True)
            if meets(key, value, target)
        )
        assert met == MET[key]
