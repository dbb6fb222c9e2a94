"""The scenario that rides inside a report: its text with its tables, and back.

A report carries each scenario as one text (:mod:`app.scenario_bundle`), with a hash
over all of it, so that one letter changed by a mail program does not go unnoticed.
"""

from __future__ import annotations

import hashlib
import json
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from app.scenario import Scenario

FORMAT = 1
"""Of what rides inside; rises when a reader of today could not read it."""

MOST_SCENARIOS = 6
LARGEST_CARGO = 2_500_000
"""All scenarios of a report together, so that it stays under 5 MB [characters]."""

DAMAGED = "the scenario inside it is damaged; use an undamaged copy"


class PackError(ValueError):
    """A scenario that cannot ride in a report, or does not come out of it."""


def packed_scenario(scenario: Scenario) -> dict[str, str]:
    """Take a scenario with its tables, and see that it reads back the same.

    Parameters
    ----------
    scenario : Scenario
        Valid as a whole.

    Returns
    -------
    dict
        Its ``name`` and its ``bundle``.

    Raises
    ------
    PackError
        If it is not valid or does not read back equal.
    """
    from app.scenario_bundle import bundle_text
    from app.scenario_error import ScenarioError

    try:
        packed = {"name": scenario.name, "bundle": bundle_text(scenario, file=scenario.name)}
        again = unpacked_scenario(packed, file=scenario.name)
    except ScenarioError as error:
        raise PackError(str(error)) from error
    if again.freeze() != scenario.freeze():
        raise PackError(f"{scenario.name} does not read back the same; save it and open it again")
    return packed


def table_list(scenario: Scenario) -> list[tuple[str, int, str]]:
    """List the tables of a scenario's sections: path, size in bytes and sha256."""
    listed = {}
    for files in scenario.sections.values():
        for table in (files.outline, files.lift, files.drag):
            listed[table.path] = (table.path, len(table.text.encode()), table.digest)
    return sorted(listed.values())


def cargo(packed: list[dict[str, str]]) -> str:
    """Write packed scenarios as the text that rides in a report.

    Parameters
    ----------
    packed : list of dict
        As :func:`packed_scenario` made them.

    Returns
    -------
    str
        JSON with a hash of itself, in which no letter could end a script.

    Raises
    ------
    PackError
        If they are too large together.
    """
    body = _canonical(packed)
    if len(body) > LARGEST_CARGO:
        raise PackError(
            f"the scenarios with their tables have {len(body) / 1e6:.1f} MB; a report carries at "
            f"most {LARGEST_CARGO / 1e6:g} MB, so take out sections that no wing uses"
        )
    digest = hashlib.sha256(body.encode()).hexdigest()
    return f'{{"format":{FORMAT},"sha256":"{digest}","scenarios":{body}}}'


def _canonical(content: object) -> str:
    # Escaped by JSON's own means: no "<" can end the script that carries it.
    text = json.dumps(content, sort_keys=True, separators=(",", ":"), allow_nan=False)
    return text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")


def uncargo(text: str) -> list[dict[str, str]]:
    """Read the text that rides in a report.

    Parameters
    ----------
    text : str
        As :func:`cargo` wrote it.

    Returns
    -------
    list of dict
        Each with ``name`` and ``bundle``.

    Raises
    ------
    PackError
        If it is damaged, or of a newer Halfspan.
    """
    try:
        content = json.loads(text)
        known = content["format"]
        if type(known) is int and known > FORMAT:
            raise PackError("a newer Halfspan has written it; update this one")
        scenarios = content["scenarios"]
        digest = hashlib.sha256(_canonical(scenarios).encode()).hexdigest()
        whole = known == FORMAT and digest == content["sha256"]
    except PackError:
        raise
    except (ValueError, RecursionError, LookupError, TypeError):
        raise PackError(DAMAGED) from None
    if not whole or not isinstance(scenarios, list) or not 1 <= len(scenarios) <= MOST_SCENARIOS:
        raise PackError(DAMAGED)
    if not all(map(_well_formed, scenarios)):
        raise PackError(DAMAGED)
    return scenarios


def _well_formed(one: Any) -> bool:  # noqa: ANN401 - whatever JSON can hold
    return isinstance(one, dict) and all(
        isinstance(one.get(key), str) for key in ("name", "bundle")
    )


def unpacked_scenario(packed: dict[str, str], *, file: str) -> Scenario:
    """Read a packed scenario.

    Parameters
    ----------
    packed : dict
        As :func:`packed_scenario` made it.
    file : str
        What errors call the scenario.

    Returns
    -------
    Scenario
        Valid as a whole; it needs no folder.

    Raises
    ------
    ScenarioError
        If it cannot be used.
    """
    from app.scenario_bundle import scenario_from_bundle

    return scenario_from_bundle(packed["bundle"], file=file)
