"""Where the section solver's compiled kernels are kept between runs.

Compiling takes half a minute or more, reading what was compiled a fraction of one.
Numba's own cache would go beside the sources, perhaps unwritable, and does not see
an edit in a module that a kernel calls: here every version of the sources has a
folder of its own. Numba reads where to keep things when it is imported, so
`prepare_kernel_cache` comes first; it imports neither numba nor the solver's kernels.
"""

from __future__ import annotations

import atexit
import logging
import os
import re
import shutil
import sys
import tempfile
import time
from collections.abc import Iterator
from contextlib import suppress
from dataclasses import dataclass
from importlib.metadata import PackageNotFoundError
from importlib.metadata import version as package_version
from pathlib import Path

import platformdirs

from solver.section.kernel_version import DIGITS, kernel_version

VARIABLE = "NUMBA_CACHE_DIR"
"""Numba's own environment variable; where a user has set it, kernels are kept below it."""

LONGEST_UNUSED = 30 * 86_400.0
"""Age from which kernels of another version are removed, counted from their last use [s]."""

LARGEST_CACHE = 200_000_000
"""What kernels of other versions may take beside those in use [bytes]."""

_VERSION = re.compile(rf"[0-9a-f]{{{DIGITS}}}")
_MARK = "compiled"


@dataclass(frozen=True)
class KernelCache:
    """The folder of one version's compiled kernels.

    Parameters
    ----------
    folder : pathlib.Path
        Exists and can be written.
    version : str
        Of the kernels, see `solver.section.kernel_version`.
    warm : bool
        Whether all of them were compiled before, by the numba and Python of this process.
    """

    folder: Path
    version: str
    warm: bool

    def mark_warm(self) -> None:
        """Take note that all kernels have been compiled; a full disk is no failure."""
        with suppress(OSError):
            (self.folder / _MARK).write_text(_compiler(), encoding="utf-8")


def default_folder() -> Path:
    """Say where every version's kernels are kept, whether or not it exists.

    Returns
    -------
    pathlib.Path
        Below the folder that `VARIABLE` names, or else the user's cache folder.
    """
    own = os.environ.get(VARIABLE, "").strip()
    if not own:
        return Path(platformdirs.user_cache_dir("halfspan", appauthor=False)) / "kernels"
    given = Path(own).absolute()
    # Set by `prepare_kernel_cache`, in this process or in the one that started it.
    return given.parent if _VERSION.fullmatch(given.name) else given / "halfspan"


def prepare_kernel_cache(root: Path | None = None) -> KernelCache:
    """Tell numba to keep compiled kernels in the folder of their version.

    To be called before a module with kernels is imported. Processes started
    afterwards use the same folder.

    Parameters
    ----------
    root : pathlib.Path, optional
        Holds a folder for each version; `default_folder` unless given.

    Returns
    -------
    KernelCache
        Where nothing can be written there, of a folder that lasts as long as this
        process.
    """
    version = kernel_version()
    folder = (root or default_folder()) / version
    try:
        _make_usable(folder)
    except OSError as error:
        logging.getLogger(__name__).warning(
            "compiled kernels cannot be kept in %s (%s): compiled anew in every run",
            folder,
            error.strerror or type(error).__name__,
        )
        folder = _passing_folder(version)
    else:
        _remove_unused(folder)
    os.environ[VARIABLE] = str(folder)
    if (numba := sys.modules.get("numba")) is not None:
        numba.config.CACHE_DIR = str(folder)
    return KernelCache(folder, version, warm=_is_warm(folder))


def clear_kernel_cache(root: Path | None = None) -> int:
    """Remove the compiled kernels of every version.

    Parameters
    ----------
    root : pathlib.Path, optional
        As for `prepare_kernel_cache`.

    Returns
    -------
    int
        How many versions there were; anything else in that folder is left alone.
    """
    versions = list(_versions(root or default_folder()))
    for folder in versions:
        shutil.rmtree(folder, ignore_errors=True)
    return len(versions)


def _make_usable(folder: Path) -> None:
    """Make a folder, prove that files can be made in it, note that it is in use."""
    # Numba runs what it finds here: nobody else may write.
    folder.mkdir(mode=0o700, parents=True, exist_ok=True)
    with tempfile.TemporaryFile(dir=folder):
        pass
    os.utime(folder)


def _passing_folder(version: str) -> Path:
    """Make a folder, of a name that nobody can foresee, that goes with this process."""
    root = Path(tempfile.mkdtemp(prefix="halfspan-"))
    atexit.register(shutil.rmtree, root, ignore_errors=True)
    folder = root / version
    folder.mkdir()
    return folder


def _versions(root: Path) -> Iterator[Path]:
    with suppress(OSError):
        for path in sorted(root.iterdir()):
            if _VERSION.fullmatch(path.name) and path.is_dir() and not path.is_symlink():
                yield path


def _remove_unused(used: Path) -> None:
    """Remove other versions not used for long, and the oldest where they take too much."""
    others: list[tuple[float, Path]] = []
    for path in _versions(used.parent):
        with suppress(OSError):  # another process may have removed it
            if path != used:
                others.append((path.stat().st_mtime, path))
    oldest, room = time.time() - LONGEST_UNUSED, LARGEST_CACHE
    for last_used, path in sorted(others, reverse=True):
        room -= _size(path)
        if last_used < oldest or room < 0:
            shutil.rmtree(path, ignore_errors=True)


def _size(folder: Path) -> int:
    total = 0
    with suppress(OSError):  # another process may be removing it
        for path in folder.rglob("*"):
            if path.is_file():
                total += path.lstat().st_size
    return total


def _compiler() -> str:
    """What compiled code depends on beside its source."""
    try:
        compiler = package_version("numba")
    except PackageNotFoundError:
        compiler = "none"
    return f"numba {compiler}, Python {sys.version.split()[0]}"


def _is_warm(folder: Path) -> bool:
    try:
        return (folder / _MARK).read_text(encoding="utf-8") == _compiler()
    except (OSError, UnicodeDecodeError):
        return False
