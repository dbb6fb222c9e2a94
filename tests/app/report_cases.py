"""Scenarios for tests of reports: the demo, one full of markup, and a third one."""

from __future__ import annotations

from functools import cache

from app.analysis.report_part import EXTRAS
from app.analysis.results import Results
from app.analysis.stages import Analysis
from app.scenario import Scenario
from app.scenario_file import read_scenario
from scenarios import example_path

HARM = "<script>window.harmed=1</script>"
IMAGE = '<img src=x onerror="window.harmed=2">'
SECTION = "</script><img src=x onerror=window.harmed=3>"
NOTE = f'{IMAGE}\n</textarea></script>\u2028{{{{harm}}}} ${{harm}} $$harm$$ & "it\'s"'


@cache
def demo() -> tuple[Scenario, Results]:
    """The demo with its results."""
    scenario = read_scenario(example_path())
    return scenario, Analysis().run(scenario.freeze(), want=EXTRAS)


@cache
def harmful() -> tuple[Scenario, Results]:
    """The demo with markup in everything that a user types."""
    scenario = demo()[0].copy()
    scenario.name, scenario.author = f"{HARM} & co", f"'\">{IMAGE}"
    scenario.note = NOTE.replace("\u2028", "")
    scenario.sections = {SECTION: scenario.sections["E387"], **scenario.sections}
    scenario.set_values({"root_section": SECTION, "tip_section": SECTION})
    return scenario, Analysis().run(scenario.freeze(), want=EXTRAS)


@cache
def other() -> tuple[Scenario, Results]:
    """The demo with another wing."""
    scenario = demo()[0].copy()
    scenario.name = "Longer"
    scenario.set_values({"span_m": 2.45, "tip_chord_mm": 180})
    return scenario, Analysis().run(scenario.freeze(), want=EXTRAS)
