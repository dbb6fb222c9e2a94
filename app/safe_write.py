"""Files put in place whole or not at all, and what to say when the disk refuses.

A reader sees the old file or the new one, never half of it, and what was
reported as written is on the disk: the content before the name, and the name
before the report.
"""

from __future__ import annotations

import errno
import os
import re
import secrets
import time
from contextlib import suppress
from pathlib import Path

LEFTOVER = re.compile(r"\..{0,60}\.[0-9a-f]{16}\.part", re.DOTALL)
"""Names of files that were being written; one that stays belongs to a process that died."""

LEFTOVER_AGE = 86_400.0
"""Age from which such a file is swept away: nobody writes for a day [s]."""

_TROUBLES = {
    errno.ENOSPC: "the disk is full; free some space and try again",
    errno.EDQUOT: "your share of the disk is used up; free some space and try again",
    errno.EROFS: "the folder is read-only; choose another one",
    errno.EACCES: "writing is not allowed there; choose another folder or change its permissions",
    errno.EPERM: "writing is not allowed there; choose another folder or change its permissions",
    errno.ENOENT: "its folder does not exist; make the folder first",
    errno.EEXIST: "what should be its folder is a file; choose another folder",
    errno.ENOTDIR: "what should be its folder is a file; choose another folder",
    errno.ENAMETOOLONG: "its name is too long; choose a shorter one",
    errno.EIO: "the disk reports a fault; choose another disk",
}

_CANNOT_SYNC = (errno.EINVAL, errno.ENOTSUP, errno.EOPNOTSUPP, errno.EACCES, errno.EPERM)
"""How systems say that a folder cannot be forced to the disk by itself."""


def disk_trouble(error: OSError) -> str:
    """Say why the disk refused and what to do, to follow "cannot be written: ".

    Parameters
    ----------
    error : OSError
        Of opening, writing, renaming or making a folder.

    Returns
    -------
    str
        Part of a sentence, one line.
    """
    known = _TROUBLES.get(error.errno or 0)
    return known or (error.strerror or type(error).__name__).splitlines()[0]


def replace_file(target: Path, data: bytes) -> None:
    """Put a file in place in one step, on the disk before it has its name.

    Parameters
    ----------
    target : pathlib.Path
        Where to, in a folder that exists; a file that is there is replaced, its
        permissions stay.
    data : bytes
        Its content.

    Raises
    ------
    OSError
        If it cannot be written; what was there before is as it was, and nothing
        is left beside it.
    """
    temporary = target.with_name(f".{target.name[:60]}.{secrets.token_hex(8)}.part")
    # Not tempfile, which would leave the saved file readable by its owner only.
    handle = os.open(temporary, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666)
    try:
        with os.fdopen(handle, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        if target.exists():
            temporary.chmod(target.stat().st_mode & 0o777)
        os.replace(temporary, target)  # noqa: PTH105 - beside os.open and os.fsync
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise
    sync_folder(target.parent)


def sync_folder(folder: Path) -> None:
    """Force the names in a folder to the disk, where the system can.

    Parameters
    ----------
    folder : pathlib.Path

    Raises
    ------
    OSError
        If the disk fails; not if the system has no such thing.
    """
    if os.name != "posix":
        return
    try:
        handle = os.open(folder, os.O_RDONLY)
    except OSError as error:
        if error.errno in _CANNOT_SYNC:
            return
        raise
    try:
        os.fsync(handle)
    except OSError as error:
        if error.errno not in _CANNOT_SYNC:
            raise
    finally:
        os.close(handle)


def sweep(folder: Path) -> None:
    """Remove what processes that died have left half written, a day later.

    Parameters
    ----------
    folder : pathlib.Path
    """
    with suppress(OSError):
        for path in folder.glob(".*.part"):
            if LEFTOVER.fullmatch(path.name) and time.time() - path.stat().st_mtime > LEFTOVER_AGE:
                path.unlink(missing_ok=True)
