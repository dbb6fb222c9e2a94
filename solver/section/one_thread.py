"""Linear algebra on one thread while sections are solved on several."""

from __future__ import annotations

import threading
from collections.abc import Iterator
from contextlib import contextmanager
from typing import Any

_LOCK = threading.Lock()
_HELD: list[Any] = []
_USERS = 0


@contextmanager
def linear_algebra_on_one_thread() -> Iterator[None]:
    """Hold the libraries of linear algebra to one thread, in the whole process.

    The systems of a section are too small to be shared among threads, and what comes
    out would depend on how many there are. Several may hold them at once: the last
    one to leave gives them back. To be entered once they are loaded, that is, after
    the kernels were imported.
    """
    global _USERS
    with _LOCK:
        if _USERS == 0:
            from threadpoolctl import threadpool_limits  # type: ignore[import-untyped]

            _HELD.append(threadpool_limits(limits=1, user_api="blas"))
        _USERS += 1
    try:
        yield
    finally:
        with _LOCK:
            _USERS -= 1
            if _USERS == 0:
                _HELD.pop().restore_original_limits()
