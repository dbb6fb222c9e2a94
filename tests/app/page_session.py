"""A workspace for tests: everything it writes goes into a folder of the test."""

from __future__ import annotations

from pathlib import Path

from app.autosave import Autosave
from app.journal import Journal
from app.scenario import Scenario
from app.workspace import Workspace
from tests.app.sample_results import SampleAnalysis


def made_workspace(
    scenario: Scenario, folder: Path, *, file: Path | None = None, **autosave: object
) -> Workspace:
    """Make a workspace on sample results."""
    return Workspace(
        scenario,
        SampleAnalysis(),
        journal=Journal(folder / "journal", version="test"),
        autosave=Autosave(folder / "states", **autosave),
        file=file,
    )
