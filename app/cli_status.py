"""How the ``halfspan`` command ends."""

from __future__ import annotations

DONE, FAILS, UNUSABLE, BROKEN = 0, 1, 2, 3
INTERRUPTED, NOBODY_READS = 130, 141
"""What a shell reports for a command ended by Ctrl-C or a closed pipe."""


class UnusableError(Exception):
    """What the user gave cannot be used; the message is the whole answer."""
