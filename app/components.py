"""The page's own parts: margins, tabs, inputs, words and choices.

Each is a small piece of plain JavaScript in ``app/static`` that builds its
elements itself and sets text only as text. State goes out as one parameter,
what the user does comes back as a message; every message is answered, so that
the browser never has more than one in flight.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any, ClassVar

import panel as pn
import param
from panel.custom import JSComponent

from app.figures.look import static_text

Message = Mapping[str, Any]


def _script(name: str) -> str:
    return static_text("dom.js") + static_text(name)


class Part(JSComponent):
    """What all parts share: the look, and messages that are always answered."""

    _stylesheets: ClassVar[list[str]] = [static_text("page.css"), static_text("session.css")]

    def __init__(
        self, on_message: Callable[[Message], object] | None = None, **params: object
    ) -> None:
        self._on_message = on_message
        super().__init__(**params)  # type: ignore[no-untyped-call]

    def _handle_msg(self, message: Message) -> None:
        # One message to the browser for all that changes, and the answer with it.
        reply: dict[str, object] = {"done": message.get("seq")}
        with pn.io.hold():
            try:
                answer = self._on_message(message) if self._on_message is not None else None
                if answer is not None:
                    reply["answer"] = answer
            finally:
                self._send_msg(reply)


class Strip(Part):
    """Name and what can be done with the whole, margins, the reason; the hash in the address."""

    data = param.Dict(default={})
    header = param.Dict(default={})
    digest = param.String(default="")

    def hand_over(self, file: Message) -> None:
        """Give the user a file that was made meanwhile."""
        self._send_msg(dict(file))

    _esm = static_text("dom.js") + static_text("header.js") + static_text("strip.js")


class Tabs(Part):
    """The sheets as tabs, and the station."""

    names = param.List(default=[], item_type=str)
    active = param.String(default="")
    station = param.Dict(default={"share": 0.5, "text": ""})
    _esm = _script("tabs.js")


class FieldColumn(Part):
    """The inputs: groups of fields with their state."""

    groups = param.List(default=[])
    state = param.Dict(default={"values": {}, "refusals": {}})
    _esm = _script("fields.js")


class Words(Part):
    """Sentences, facts and tables; behind a heading to open where `fold` names one."""

    blocks = param.List(default=[])
    fold = param.String(default="")
    _esm = _script("words.js")


class Choice(Part):
    """One choice out of a few."""

    data = param.Dict(default={"label": "", "options": [], "chosen": ""})
    _esm = _script("choice.js")


class JournalList(Part):
    """The snapshots of the journal, and what can be done with them."""

    state = param.Dict(default={})
    _esm = _script("journal.js")


class ComparisonTable(Part):
    """Two to six side by side."""

    data = param.Dict(default={"columns": [], "inputs": [], "margins": []})
    _esm = _script("comparison.js")


class Footer(Part):
    """The cautions, always in view."""

    sentences = param.List(default=[], item_type=str)
    _esm = static_text("dom.js") + static_text("footer.js")
