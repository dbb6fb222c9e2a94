"""A lock between processes: held by one at a time, let go when its process ends.

The system lets go of it even when the process is killed, so that no lock is
ever left behind. Where a disk knows no locks, work goes on without.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from pathlib import Path

try:
    import fcntl
except ImportError:  # Windows
    fcntl = None  # type: ignore[assignment]


class FileLock:
    """A lock that is held; see :func:`try_lock`."""

    def __init__(self, handle: int) -> None:
        self._handle = handle

    def release(self) -> None:
        """Let go of it; a second time does nothing."""
        if self._handle >= 0:
            handle, self._handle = self._handle, -1
            os.close(handle)


def try_lock(path: Path) -> FileLock | None:
    """Take a lock unless somebody holds it.

    Parameters
    ----------
    path : pathlib.Path
        An empty file that stands for the lock; made where it is missing.

    Returns
    -------
    FileLock or None
        None when it is held, by this process too.

    Raises
    ------
    OSError
        If the file can neither be opened nor made.
    """
    handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
    try:
        _lock(handle, wait=False)
    except BlockingIOError:
        os.close(handle)
        return None
    return FileLock(handle)


@contextmanager
def locked(path: Path) -> Iterator[None]:
    """Wait for a lock and hold it.

    Parameters
    ----------
    path : pathlib.Path
        As for :func:`try_lock`.

    Raises
    ------
    OSError
        If the file can neither be opened nor made.
    """
    handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
    try:
        _lock(handle, wait=True)
        yield
    finally:
        os.close(handle)


def _lock(handle: int, *, wait: bool) -> None:
    """Lock an open file; BlockingIOError when that would mean to wait."""
    if fcntl is not None:
        try:
            fcntl.flock(handle, fcntl.LOCK_EX | (0 if wait else fcntl.LOCK_NB))
        except BlockingIOError:
            raise
        except OSError:
            return  # a disk without locks
        return
    import msvcrt

    if wait:
        with suppress(OSError):
            msvcrt.locking(handle, msvcrt.LK_LOCK, 1)
        return
    try:
        msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
    except OSError as error:
        raise BlockingIOError from error
