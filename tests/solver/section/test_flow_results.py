import math

import pytest

from solver.errors import InputError
from solver.section.flow import FlowSettings, critical_amplification, turbulence_level


def test_macks_relation_gives_nine_at_seven_hundredths_of_a_percent():
    # The pair is given with two digits.
    assert critical_amplification(0.0007) == pytest.approx(9.0, abs=0.05)


def test_a_factor_of_e_in_turbulence_is_worth_2_4():
    quiet, rough = critical_amplification(0.001), critical_amplification(0.001 * math.e)
    assert quiet - rough == pytest.approx(2.4, abs=1e-12)  # rounding


def test_a_factor_of_one_is_left_in_the_roughest_air():
    assert critical_amplification(0.0196) == pytest.approx(1.0, abs=0.01)  # the range in two digits


@pytest.mark.parametrize("turbulence", [0.0002, 0.0007, 0.0196])
def test_the_relation_turned_round_gives_the_turbulence_back(turbulence):
    back = turbulence_level(critical_amplification(turbulence))
    assert back == pytest.approx(turbulence, rel=1e-12)  # rounding


@pytest.mark.parametrize("critical", [0.9, 20.5, math.nan])
def test_a_factor_out_of_range_has_no_turbulence(critical):
    with pytest.raises(InputError, match="critical"):
        turbulence_level(critical)


@pytest.mark.parametrize("turbulence", [0.0, -0.001, 0.0001, 0.03, math.nan, math.inf])
def test_turbulence_outside_the_relation_is_refused(turbulence):
    with pytest.raises(InputError, match=r"between 0\.0002 and 0\.0196") as caught:
        critical_amplification(turbulence)
    assert caught.value.name == "turbulence"


@pytest.mark.parametrize(
    ("field", "value"),
    [
        ("critical_amplification", 0.9),
        ("critical_amplification", math.nan),
        ("critical_amplification", 20.5),
        ("trip_upper", -0.01),
        ("trip_upper", 1.01),
        ("trip_lower", math.nan),
        ("nodes", 140),
        ("nodes", 99),
        ("nodes", 203),
    ],
)
def test_settings_out_of_range_are_named(field, value):
    with pytest.raises(InputError) as caught:
        FlowSettings(**{field: value})
    assert caught.value.name == field
