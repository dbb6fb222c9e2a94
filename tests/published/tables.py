"""Read the published tables that tests compare with."""

from __future__ import annotations

import csv
from pathlib import Path

DATA = Path(__file__).parent / "data"


def rows(name: str) -> list[dict[str, str]]:
    """Rows of ``data/NAME`` as text by column, lines that begin with # left out."""
    lines = [line for line in (DATA / name).read_text().splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


def numbers(name: str) -> list[dict[str, float]]:
    """The same, every column a number; text columns are left out."""
    found = []
    for row in rows(name):
        values: dict[str, float] = {}
        for key, text in row.items():
            try:
                values[key] = float(text)
            except ValueError:
                continue
        found.append(values)
    return found
