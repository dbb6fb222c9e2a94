"""Making a report: gather the data here, build it in a process of its own, write it whole.

The process that draws imports bokeh and never panel: with panel imported, bokeh's
own output links to a script that a file on a disk cannot load.
"""

from __future__ import annotations

import hashlib
import json
import os
import subprocess
import sys
from collections.abc import Sequence
from dataclasses import asdict
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from app.report.codec import encode
from app.report.pack import MOST_SCENARIOS, PackError, cargo, packed_scenario, table_list
from app.safe_write import disk_trouble, replace_file

if TYPE_CHECKING:
    from app.analysis.report_part import Analysis
    from app.analysis.results import Results
    from app.inputs import Inputs
    from app.scenario import Scenario

LARGEST = 5_000_000
"""A report stays under it [bytes]."""

LONGEST = {"title": 200, "author": 200, "note": 20_000}
"""Texts of a report and their largest lengths [characters]."""

ROOT = Path(__file__).resolve().parents[2]
"""Where the packages lie, for the process that draws."""

PATIENCE = 120.0
"""Longest time given to the process that draws [s]."""


class ReportError(ValueError):
    """A report that cannot be made, in one sentence."""


def make_report(
    scenarios: Sequence[tuple[Scenario, Results | None]],
    *,
    title: str = "",
    author: str = "",
    note: str = "",
    output: str | Path,
    made: datetime | None = None,
) -> Path:
    """Write a report on one scenario, or one that compares two to six.

    Parameters
    ----------
    scenarios : sequence of (Scenario, Results or None)
        Each with its results, where they are at hand; what they lack is solved.
    title, author, note : str
        Those of the scenario where empty. Plain text, escaped in the file.
    output : str or pathlib.Path
        Where to; an existing file is replaced in one step, or left as it was.
    made : datetime, optional
        The time stated in the file; now unless given.

    Returns
    -------
    pathlib.Path
        The file.

    Raises
    ------
    ReportError
        If there are none or too many scenarios, a text or a table cannot be used,
        or the file cannot be written.
    InputError
        If a scenario's section or value cannot be solved.
    """
    output = Path(output)
    if not 1 <= len(scenarios) <= MOST_SCENARIOS:
        raise ReportError(f"a report takes 1 to {MOST_SCENARIOS} scenarios; got {len(scenarios)}")
    _require_texts(title=title, author=author, note=note)
    _require_writable(output)
    try:
        content = order_content(
            scenarios, title=title, author=author, note=note, made=made or datetime.now(UTC)
        )
    except PackError as error:
        raise ReportError(str(error)) from error
    data = _drawn(content)
    if len(data) >= LARGEST:
        raise ReportError(
            f"the report would have {len(data) / 1e6:.1f} MB; at most {LARGEST / 1e6:g} MB "
            "are allowed, so give fewer scenarios"
        )
    try:
        replace_file(output.resolve(), data)
    except OSError as error:
        raise ReportError(f"{output} cannot be written: {disk_trouble(error)}") from error
    return output


def _require_texts(**texts: str) -> None:
    for name, text in texts.items():
        if len(text) > LONGEST[name]:
            raise ReportError(f"{name} must have at most {LONGEST[name]} characters")
        allowed = "\n\t" if name == "note" else ""
        if any(not (letter.isprintable() or letter in allowed) for letter in text):
            raise ReportError(f"{name} must have no control characters")


def _require_writable(output: Path) -> None:
    """Refuse what cannot end well before anything is solved."""
    if "\0" in str(output):
        raise ReportError("the output is not a usable file name")
    try:
        if output.is_dir():
            raise ReportError(f"{output} is a folder; give the name of a file")
        if not output.parent.is_dir():
            raise ReportError(f"{output} cannot be written: there is no folder {output.parent}")
    except OSError as error:
        raise ReportError(f"{output} cannot be written: {disk_trouble(error)}") from error


def order_content(
    scenarios: Sequence[tuple[Scenario, Results | None]],
    *,
    title: str,
    author: str,
    note: str,
    made: datetime,
) -> dict[str, Any]:
    """Gather everything a report shows as plain data.

    Parameters
    ----------
    scenarios : sequence of (Scenario, Results or None)
        As for :func:`make_report`.
    title, author, note : str
        As for :func:`make_report`.
    made : datetime
        With its time zone.

    Returns
    -------
    dict
        Ready for JSON.

    Raises
    ------
    PackError
        If a table of a scenario cannot ride along.
    """
    from app.analysis.report_part import Analysis
    from app.version import version

    analysis = Analysis()
    first = scenarios[0][0]
    names = [scenario.name for scenario, _ in scenarios]
    packed = [packed_scenario(scenario) for scenario, _ in scenarios]
    alone = len(scenarios) == 1
    return {
        "title": title or (first.name if alone else _listed(names) + " compared"),
        "author": author or (first.author if alone else ""),
        "note": note or (first.note if alone else ""),
        "made": made.astimezone(UTC).strftime("%Y-%m-%d %H:%M UTC"),
        "version": version(),
        "cargo": cargo(packed),
        "scenarios": [
            _scenario_content(scenario, results, analysis) for scenario, results in scenarios
        ],
    }


def _listed(names: Sequence[str]) -> str:
    text = ", ".join(names[:-1]) + f" and {names[-1]}"
    return text if len(text) <= 150 else f"{len(names)} scenarios"


def _scenario_content(
    scenario: Scenario, results: Results | None, analysis: Analysis
) -> dict[str, Any]:
    from app.analysis.report_part import plain_table, report_part
    from app.scenario_fields import FIELDS

    inputs = scenario.freeze()
    part = report_part(inputs, results, analysis=analysis)
    values = inputs.values()
    return {
        "name": scenario.name,
        "author": scenario.author,
        "note": scenario.note,
        "fields": [
            {
                "group": entry.group,
                "name": entry.name,
                "label": entry.label,
                "unit": entry.unit,
                "value": values[entry.name],
            }
            for entry in FIELDS.values()
        ],
        "oddities": [one.sentence for one in scenario.oddities()],
        "results": encode(part.results),
        "table": None if part.table is None else plain_table(part.table),
        "error": None if part.error is None else asdict(part.error),
        "drive": part.drive,
        "inputs_hash": inputs_hash(inputs),
        "tables": table_list(scenario),
    }


def inputs_hash(inputs: Inputs) -> str:
    """Hash everything an analysis depends on.

    Parameters
    ----------
    inputs : Inputs
        Frozen.

    Returns
    -------
    str
        Sha256 over the values by name and the content of the sections' tables.
    """
    sections = [
        [source.name, source.digits, source.tables.digest if source.tables else ""]
        for source in inputs.sections
    ]
    text = json.dumps([inputs.values(), sections], sort_keys=True)
    return hashlib.sha256(text.encode()).hexdigest()


def _drawn(content: dict[str, Any]) -> bytes:
    """Build the file in a process in which panel is never imported."""
    environment = {
        **os.environ,
        "PYTHONHASHSEED": "0",  # so that the same scenario gives the same bytes
        "BOKEH_SIMPLE_IDS": "yes",
        "BOKEH_RESOURCES": "inline",
        "BOKEH_MINIFIED": "yes",
        "PYTHONUTF8": "1",
        "PYTHONPATH": os.pathsep.join(filter(None, (str(ROOT), os.environ.get("PYTHONPATH")))),
    }
    try:
        done = subprocess.run(
            # -P: a folder named app where the user happens to be is not ours.
            [sys.executable, "-P", "-m", "app.report"],
            input=json.dumps(content, allow_nan=False).encode(),
            capture_output=True,
            env=environment,
            timeout=PATIENCE,
            check=False,
        )
    except subprocess.TimeoutExpired:
        raise ReportError(f"the report was not drawn within {PATIENCE:.0f} seconds") from None
    if done.returncode != 0:
        raise RuntimeError(f"the report was not drawn: {done.stderr.decode(errors='replace')}")
    return done.stdout
