"""Where unexpected things are written down: one rotating file for the user."""

from __future__ import annotations

import logging
from logging.handlers import RotatingFileHandler
from pathlib import Path

import platformdirs

LEVELS = ("debug", "info", "warning", "error")
LARGEST_LOG = 1_000_000
"""Size at which a new file is begun [bytes]; three older ones are kept."""


def log_file() -> Path:
    """Say where the log is written, whether or not it exists."""
    return Path(platformdirs.user_log_dir("halfspan", appauthor=False)) / "halfspan.log"


def start_log(level: str = "info") -> Path | None:
    """Send log records and Python's warnings to the log file.

    Parameters
    ----------
    level : str
        One of `LEVELS`: the least serious kind that is written.

    Returns
    -------
    pathlib.Path or None
        The file, or None where it cannot be written; the command goes on then.
    """
    path = log_file()
    # A log that cannot be written must not litter the terminal.
    logging.raiseExceptions = False
    root = logging.getLogger()
    for handler in [one for one in root.handlers if isinstance(one, RotatingFileHandler)]:
        root.removeHandler(handler)
        handler.close()
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        handler = RotatingFileHandler(
            path, maxBytes=LARGEST_LOG, backupCount=3, encoding="utf-8", errors="replace"
        )
    except OSError:
        root.addHandler(logging.NullHandler())
        return None
    handler.setFormatter(logging.Formatter("%(asctime)s %(levelname)s %(name)s: %(message)s"))
    root.addHandler(handler)
    root.setLevel(level.upper())
    logging.captureWarnings(True)
    return path
