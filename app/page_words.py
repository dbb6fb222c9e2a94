"""Times, names of files and files themselves as the page hands them out."""

from __future__ import annotations

import base64
import re
from datetime import datetime


def clock(moment: datetime, now: datetime | None = None) -> str:
    """Write a time as this computer's clock shows it, with the day where it is another.

    Parameters
    ----------
    moment : datetime.datetime
        With its time zone.
    now : datetime.datetime, optional
        The present time, with its time zone.

    Returns
    -------
    str
        For example ``"14:32"`` or ``"3 Mar 2026, 14:32"``.
    """
    local = moment.astimezone()
    today = (now or datetime.now().astimezone()).astimezone()
    time = f"{local:%H:%M}"
    return time if local.date() == today.date() else f"{local.day} {local:%b %Y}, {time}"


def file_stem(name: str) -> str:
    """Make a name for a file out of a name: letters, digits and dashes."""
    return re.sub(r"[^A-Za-z0-9]+", "-", name).strip("-")[:60].strip("-") or "scenario"


def download(name: str, data: bytes) -> dict[str, object]:
    """Make the answer that hands the user a file."""
    return {"download": {"name": name, "data": base64.b64encode(data).decode()}}
