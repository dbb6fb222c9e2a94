"""Halfspan's version, stated in the project file alone."""

from __future__ import annotations

from pathlib import Path


def version() -> str:
    """Halfspan's version, as installed or as the project file next door states it."""
    from importlib.metadata import PackageNotFoundError
    from importlib.metadata import version as installed

    try:
        return installed("halfspan")
    except PackageNotFoundError:
        import tomllib

        project = Path(__file__).resolve().parent.parent / "pyproject.toml"
        return str(tomllib.loads(project.read_text(encoding="utf-8"))["project"]["version"])
