"""Reading a report back: whether it is one, and which scenarios ride in it."""

from __future__ import annotations

import stat
from pathlib import Path
from typing import TYPE_CHECKING

from app.report.pack import PackError, uncargo, unpacked_scenario

if TYPE_CHECKING:
    from app.scenario import Scenario

MARK = '<html lang="en" data-halfspan-report='
CARGO_START = '<script type="application/json" id="halfspan-scenario">'
CARGO_END = "</script>"
LARGEST_REPORT = 8_000_000
"""Largest file that is read as a report [bytes]; one is written under 5 MB."""

_MARK_WITHIN = 200


class ReportReadError(ValueError):
    """A report that cannot be read back, in one sentence that names the file."""


def is_report(path: str | Path) -> bool:
    """Say whether a file is a report, by its first letters and not by its name.

    Parameters
    ----------
    path : str or pathlib.Path
        Any path.

    Returns
    -------
    bool
        False for what cannot be read at all, too.
    """
    try:
        path = Path(path)
        if not stat.S_ISREG(path.stat().st_mode):
            return False
        with path.open("rb") as stream:
            return MARK.encode() in stream.read(_MARK_WITHIN)
    except (OSError, ValueError):
        return False


def packed_in(path: str | Path) -> list[dict[str, str]]:
    """Take the packed scenarios out of a report.

    Parameters
    ----------
    path : str or pathlib.Path
        A report.

    Returns
    -------
    list of dict
        One to six, in the order of the report.

    Raises
    ------
    ReportReadError
        If the file is too large, cut short or damaged.
    """
    file = str(path)
    try:
        size = Path(path).stat().st_size
        if size > LARGEST_REPORT:
            raise ReportReadError(
                f"{file} has {size / 1e6:.4g} MB; a report has at most {LARGEST_REPORT / 1e6:g} MB"
            )
        with Path(path).open("rb") as stream:
            data = stream.read(LARGEST_REPORT + 1)
    except OSError as error:
        raise ReportReadError(f"{file} cannot be read: {error.strerror}") from error
    try:
        text = data.decode("utf-8")
    except UnicodeDecodeError:
        raise ReportReadError(f"{file} is a damaged report: it is not UTF-8 text") from None
    start = text.find(CARGO_START)
    end = text.find(CARGO_END, start) if start >= 0 else -1
    if end < 0:
        raise ReportReadError(f"{file} is a damaged report: no scenario is inside it")
    try:
        return uncargo(text[start + len(CARGO_START) : end])
    except PackError as error:
        raise ReportReadError(f"{file} cannot be read back: {error}") from error


def read_report(path: str | Path, *, number: int = 1) -> Scenario:
    """Read a scenario back out of a report.

    Parameters
    ----------
    path : str or pathlib.Path
        A report.
    number : int
        Which of its scenarios, from 1.

    Returns
    -------
    Scenario
        Valid as a whole; it needs no folder.

    Raises
    ------
    ReportReadError
        If the report is damaged or has no scenario of that number.
    """
    from app.scenario_error import ScenarioError

    packed = packed_in(path)
    if not 1 <= number <= len(packed):
        held = "1 scenario" if len(packed) == 1 else f"{len(packed)} scenarios"
        raise ReportReadError(f"{path} holds {held}; there is no number {number}")
    try:
        return unpacked_scenario(packed[number - 1], file=str(path))
    except ScenarioError as error:
        raise ReportReadError(str(error)) from error
