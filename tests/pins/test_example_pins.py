"""What our own code printed for the examples: a change is noticed, nothing is checked."""

from __future__ import annotations

import pytest

from app.analysis.stages import Analysis
from app.scenario_file import read_scenario
from scenarios import example_path

pytestmark = pytest.mark.pin

PINNED = {
    "heronsgill-24": {
        "landing_over_stall": 1.3478,
        "launch_over_stall": 1.2548,
        "static_margin": 8.7434,
        "elevator_left": 63.690,
        "cruise_power": 118.16,
        "endurance": 2.2545,
        "span": 2.40,
    },
    "tarn-ridge-18": {
        "landing_over_stall": 1.2384,
        "launch_over_stall": 1.2384,
        "static_margin": 7.2936,
        "elevator_left": 61.408,
        "cruise_power": 73.037,
        "endurance": 1.6978,
        "span": 1.80,
    },
}


@pytest.mark.parametrize("name", PINNED)
def test_the_margins_of_the_examples_stay(name):
    results = Analysis().run(read_scenario(example_path(name)).freeze())
    found = {margin.key: margin.value for margin in results.margins}
    # A thousandth: wider than rounding between machines, narrower than any real change.
    assert found == pytest.approx(PINNED[name], rel=1e-3)
