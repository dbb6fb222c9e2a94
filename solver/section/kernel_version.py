"""Versions of the section solver that change with any of their sources.

Numba keeps compiled code on disk and looks at the file of a compiled function
only, not at the modules it calls. Code kept under this version is never stale.
"""

from __future__ import annotations

import hashlib
from functools import cache
from pathlib import Path

KERNEL_SOURCES = ("boundary_layer/**/*.py", "panelling.py", "potential_flow.py")
"""Which files of this folder the kernels are made of."""

SECTION_SOURCES = ("**/*.py",)
"""Which files of this folder a section's results may depend on."""

DIGITS = 16
"""Hexadecimal digits of a version."""


@cache
def kernel_version() -> str:
    """Name the version of the kernels in this installation.

    Returns
    -------
    str
        16 hexadecimal digits: the same for the same sources, on every machine.

    Notes
    -----
    Found once in a process. The sources are read, nothing is imported.
    """
    return version_of(Path(__file__).parent)


@cache
def section_version() -> str:
    """Name the version of all that a computed polar depends on in this installation.

    Returns
    -------
    str
        16 hexadecimal digits: what is remembered under it is what would be computed.
    """
    return version_of(Path(__file__).parent, SECTION_SOURCES)


def version_of(folder: Path, sources: tuple[str, ...] = KERNEL_SOURCES) -> str:
    """Name the version of sources that lie in a folder.

    Parameters
    ----------
    folder : pathlib.Path
        Laid out as ``solver/section``.
    sources : tuple of str, optional
        Patterns of their names.

    Returns
    -------
    str
        First 16 hexadecimal digits of the sha256 over names, lengths and contents of
        the files that `sources` finds, in the order of their names.
    """
    digest = hashlib.sha256()
    found = {path for pattern in sources for path in folder.glob(pattern)}
    for name, path in sorted((path.relative_to(folder).as_posix(), path) for path in found):
        # The same on a machine whose checkout ends lines in its own way.
        source = path.read_bytes().replace(b"\r\n", b"\n")
        digest.update(f"{name}\n{len(source)}\n".encode())
        digest.update(source)
    return digest.hexdigest()[:DIGITS]
