"""Results into JSON and back: every bit, every mask, and a refusal for what is damaged."""

from __future__ import annotations

import copy
import dataclasses
import json
import math

import numpy as np
import pytest

from app.analysis.results import Results, Trust, Verdict
from app.report.codec import CodecError, decode, encode
from tests.app.sample_results import make_results

ALL = frozenset({"sweep", "lift_curve", "trim_curve"})


def same(first: object, second: object) -> bool:
    """Equal in type and in every bit, NaN included; numpy's float is a float."""
    if isinstance(first, float) and isinstance(second, float):
        return float(first).hex() == float(second).hex()
    if type(first) is not type(second):
        return False
    if dataclasses.is_dataclass(first):
        names = [entry.name for entry in dataclasses.fields(first)]
        return all(same(getattr(first, name), getattr(second, name)) for name in names)
    if isinstance(first, np.ndarray):
        return first.dtype == second.dtype and first.tobytes() == second.tobytes()
    if isinstance(first, tuple):
        return len(first) == len(second) and all(map(same, first, second))
    if isinstance(first, dict):
        return first.keys() == second.keys() and all(same(first[k], second[k]) for k in first)
    return first == second


def there_and_back(results: Results) -> Results:
    return decode(json.loads(json.dumps(encode(results), allow_nan=False)))


@pytest.mark.parametrize("want", [frozenset(), ALL])
def test_results_come_back_in_every_bit(want):
    results = make_results(want=want)
    again = there_and_back(results)
    assert same(again, results)
    assert again.margins[0].verdict is Verdict(results.margins[0].verdict)
    assert isinstance(again.cruise.trust, Trust)
    assert not again.cruise.span.lift.flags.writeable


def test_what_json_has_no_number_for_comes_back_too():
    results = make_results(want=ALL)
    lift = np.array([np.nan, np.inf, -np.inf, -0.0, 5e-324, 0.1])
    span = dataclasses.replace(results.cruise.span, lift=lift)
    cruise = dataclasses.replace(results.cruise, span=span, lift_to_drag=math.nan)
    landing = dataclasses.replace(results.landing, gust_m_s=-math.inf)
    odd = dataclasses.replace(results, cruise=cruise, landing=landing)
    assert same(there_and_back(odd), odd)
    # The comparison itself can tell: one bit more is another result.
    other = dataclasses.replace(span, lift=np.nextafter(lift, 1.0))
    assert not same(other, span)


@pytest.mark.parametrize(
    ("path", "value", "said"),
    [
        (("name",), None, "results.name"),
        (("margins", 0, "verdict"), "maybe", "unknown value"),
        (("cruise", "span", "lift"), ["x"], "not a number"),
        (("cruise", "span", "lift"), 3.0, "not a list"),
        (("cruise", "trust"), 99, "unknown value"),
        (("air",), [], "not a table"),
        (("solver_ms",), True, "solver_ms"),
    ],
)
def test_what_is_not_what_its_field_says_is_named(path, value, said):
    content = copy.deepcopy(encode(make_results()))
    place = content
    for step in path[:-1]:
        place = place[step]
    place[path[-1]] = value
    with pytest.raises(CodecError, match=said):
        decode(content)


def test_a_missing_entry_is_named():
    content = encode(make_results())
    del content["planform"]["area_m2"]
    with pytest.raises(CodecError, match=r"planform\.area_m2 is missing"):
        decode(content)
