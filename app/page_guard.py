"""What every callback of the page runs under: an error becomes a sentence on it."""

from __future__ import annotations

import logging
from contextlib import AbstractContextManager
from types import TracebackType
from typing import Protocol

LOG = logging.getLogger(__name__)


class Fails(Protocol):
    """What can say that something went wrong."""

    def fail(self) -> None:
        """Say it."""


class PageGuard(AbstractContextManager[None]):
    """Turn an error in a callback into a sentence on the page.

    Parameters
    ----------
    session : Fails
        Says it.
    """

    def __init__(self, session: Fails) -> None:
        self.session = session

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> bool:
        if not isinstance(error, Exception):
            return False
        LOG.error("a callback failed", exc_info=error)
        self.session.fail()
        return True
