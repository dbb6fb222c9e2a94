"""Remember what each stage found, so that a slider redoes only what it touches."""

from __future__ import annotations

import threading
from collections import OrderedDict
from collections.abc import Callable, Hashable
from typing import TypeVar

Found = TypeVar("Found")

KEPT = 32
"""Results kept for each stage: a few sliders back and forth."""


class StageMemo:
    """The last results of named stages, each under the inputs it depends on.

    Results are frozen, so handing the same one out twice is safe. Several
    sessions may share one memo.
    """

    def __init__(self) -> None:
        self._found: dict[str, OrderedDict[Hashable, object]] = {}
        self._lock = threading.Lock()

    def get(self, stage: str, key: Hashable, make: Callable[[], Found]) -> Found:
        """Return what `stage` found for `key`, making it on first asking.

        Parameters
        ----------
        stage : str
            Name of the stage.
        key : hashable
            Everything the stage depends on.
        make : callable
            Computes the result; what it raises is not remembered.
        """
        with self._lock:
            known = self._found.setdefault(stage, OrderedDict())
            if key in known:
                known.move_to_end(key)
                return known[key]  # type: ignore[return-value]
        result = make()
        with self._lock:
            known[key] = result
            while len(known) > KEPT:
                known.popitem(last=False)
        return result
