"""From bokeh figures and HTML to one file that asks nothing of any network.

The file is put together here rather than by bokeh's own template, so that its
names are the same every time and that a policy can list each script by its hash:
a script that somebody managed to smuggle in would not run.
"""

from __future__ import annotations

import base64
import hashlib
import json
from collections.abc import Sequence
from functools import cache
from pathlib import Path

from bokeh.document import Document
from bokeh.models import ColumnDataSource
from bokeh.plotting import figure
from bokeh.resources import Resources

from app.figures.look import static_text, theme
from app.report.markup import Html, tag
from app.report.read import CARGO_END, CARGO_START, MARK

FORMAT = 1
DOCUMENT = "halfspan-document"

_HERE = Path(__file__).resolve().parent

POLICY = (
    "default-src 'none'; script-src {scripts} 'unsafe-eval'; style-src 'unsafe-inline'; "
    "img-src data: blob:; font-src data:; base-uri 'none'; form-action 'none'"
)
"""What the browser is told to allow. Bokeh turns the small scripts of its figures into
functions, which needs 'unsafe-eval', and writes styles as it draws."""


def whole_file(
    body: Html,
    *,
    title: str,
    figures: Sequence[figure],
    sources: Sequence[ColumnDataSource],
    data: dict[str, object],
    cargo: str,
) -> str:
    """Put the file together.

    Parameters
    ----------
    body : Html
        Everything between head and scripts.
    title : str
        Of the window.
    figures : sequence of figure
        Each is drawn into the element whose id is ``plot-`` and its name.
    sources : sequence of ColumnDataSource
        Roots without a place: what the report's own script feeds.
    data : dict
        For the report's own script.
    cargo : str
        The scenarios as :func:`app.report.pack.cargo` wrote them.

    Returns
    -------
    str
        HTML.
    """
    document = Document(theme=theme())
    # All at once: each root by itself would walk through everything again.
    with document.models.freeze():
        for model in (*figures, *sources):
            document.add_root(model)
    places = {model.id: f"plot-{model.name}" for model in figures}
    content = {
        "docs": {DOCUMENT: document.to_json(deferred=False)},
        "items": [{"docid": DOCUMENT, "roots": places, "root_ids": list(places)}],
    }
    scripts = [*_library(), (_HERE / "report.js").read_text(encoding="utf-8")]
    allowed = " ".join(f"'sha256-{_digest(script)}'" for script in scripts)
    head = [
        Html('<meta charset="utf-8">'),
        tag(
            "meta",
            http_equiv="Content-Security-Policy",
            content=POLICY.format(scripts=allowed),
        ),
        Html('<meta name="viewport" content="width=device-width, initial-scale=1">'),
        Html('<meta name="referrer" content="no-referrer">'),
        tag("title", title),
        Html(f"<style>{_styles()}</style>"),
    ]
    return "\n".join(
        [
            "<!DOCTYPE html>",
            f'{MARK}"{FORMAT}">',
            "<head>",
            *head,
            "</head>",
            "<body>",
            str(body),
            f'<script type="application/json" id="halfspan-figures">{_json(content)}</script>',
            f'<script type="application/json" id="halfspan-data">{_json(data)}</script>',
            f"{CARGO_START}{cargo}{CARGO_END}",
            *(f"<script>{script}</script>" for script in scripts),
            "</body>",
            "</html>",
            "",
        ]
    )


def _json(content: object) -> str:
    text = json.dumps(content, separators=(",", ":"), allow_nan=False)
    return text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")


@cache
def _library() -> tuple[str, ...]:
    """Bokeh's own script, from the installed package."""
    raw = Resources(mode="inline", minified=True, components=["bokeh"]).js_raw
    for script in raw:
        if "</script" in script.lower() or "<!--" in script:
            raise ValueError("bokeh's script holds an end of script and cannot stand inline")
    return tuple(raw)


def _styles() -> str:
    return static_text("tokens.css") + (_HERE / "report.css").read_text(encoding="utf-8")


def _digest(script: str) -> str:
    # A browser reads a file's line ends as plain ones before it hashes.
    text = script.replace("\r\n", "\n").replace("\r", "\n")
    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()
