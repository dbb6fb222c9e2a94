"""Example scenarios and the measured tables that ship with them."""

from __future__ import annotations

from pathlib import Path

FOLDER = Path(__file__).resolve().parent

DEMO = "heronsgill-24"
"""The scenario that the notebook opens when none is named."""


def example_names() -> tuple[str, ...]:
    """List the example scenarios.

    Returns
    -------
    tuple of str
        File names without their ending, in alphabetical order.
    """
    return tuple(sorted(path.stem for path in FOLDER.glob("*.toml")))


def example_path(name: str = DEMO) -> Path:
    """Find the file of an example scenario.

    Parameters
    ----------
    name : str
        One of `example_names`.

    Returns
    -------
    pathlib.Path
        An existing TOML file.

    Raises
    ------
    KeyError
        If there is no example of that name; the message lists what there is.
    """
    if name not in example_names():
        raise KeyError(f"no example scenario {name!r}; there are {', '.join(example_names())}")
    return FOLDER / f"{name}.toml"
