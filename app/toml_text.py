"""Long texts as TOML strings that a person can read: line breaks stay line breaks."""

from __future__ import annotations

import re

_CONTROL = re.compile(r"[\x00-\x08\x0b-\x1f\x7f]")
_CLOSING = re.compile(r'"(?=""|\Z)')
_ESCAPED = re.compile(r'[\\"\x00-\x08\x0a-\x1f\x7f]')


def line_string(text: str) -> str:
    """Write a text as a TOML string on one line.

    Parameters
    ----------
    text : str

    Returns
    -------
    str
        With its quotes.
    """
    return '"' + _ESCAPED.sub(_escape, text) + '"'


def escaped_block(text: str) -> str:
    r"""Write a text as a TOML string of many lines between ``\"\"\"``.

    Parameters
    ----------
    text : str

    Returns
    -------
    str
        With its quotes; never holds three apostrophes that the text does not.
    """
    body = _CONTROL.sub(_escape, text.replace("\\", "\\\\"))
    body = _CLOSING.sub(r"\"", body)
    return f'"""\n{body}"""'


def block(text: str) -> str:
    """Write a text as a TOML string of many lines, word for word where that is possible.

    Parameters
    ----------
    text : str

    Returns
    -------
    str
        With its quotes: between three apostrophes, nothing escaped, unless the
        text has them itself or has control characters.
    """
    if "'''" in text or text.endswith("'") or _CONTROL.search(text):
        return escaped_block(text)
    return f"'''\n{text}'''"


def _escape(found: re.Match[str]) -> str:
    letter = found.group()
    return {"\\": "\\\\", '"': '\\"', "\n": "\\n"}.get(letter, f"\\u{ord(letter):04x}")
