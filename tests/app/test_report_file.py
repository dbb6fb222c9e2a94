"""The report as a file: what it holds, that it repeats itself, and that it reads back."""

from __future__ import annotations

import csv
import errno
import html
import io
import re
import subprocess
import sys
from datetime import UTC, datetime
from html.parser import HTMLParser

import numpy as np
import pytest

from app.analysis.stages import Analysis
from app.report import ReportError, ReportReadError, is_report, make_report, read_report
from app.report import make as making
from app.report.csv_text import file_name, polar_csv, station_csv
from app.report.read import LARGEST_REPORT
from scenarios import example_path
from tests.app.report_cases import HARM, IMAGE, SECTION, demo, harmful

pytestmark = pytest.mark.slow

WHEN = datetime(2025, 3, 4, 5, 6, tzinfo=UTC)


@pytest.fixture(scope="module")
def report(tmp_path_factory):
    path = tmp_path_factory.mktemp("report") / "harm.html"
    return make_report([harmful()], title=f"T {HARM}", output=path, made=WHEN)


@pytest.fixture(scope="module")
def text(report):
    return report.read_text(encoding="utf-8")


class Elements(HTMLParser):
    """Collects the elements of a page."""

    def __init__(self) -> None:
        super().__init__()
        self.found: list[tuple[str, dict[str, str | None]]] = []

    def handle_starttag(self, tag, attrs):
        self.found.append((tag, dict(attrs)))


def test_the_same_scenario_gives_the_same_bytes_apart_from_the_time(tmp_path, text, monkeypatch):
    # Wherever the user happens to be: modules that lie there are not ours.
    (tmp_path / "app").mkdir()
    (tmp_path / "app" / "__init__.py").write_text("raise SystemExit('not ours')")
    (tmp_path / "json.py").write_text("raise SystemExit('not ours')")
    monkeypatch.chdir(tmp_path)
    later = datetime(2026, 7, 8, 9, 10, tzinfo=UTC)
    again = make_report([harmful()], title=f"T {HARM}", output=tmp_path / "x.html", made=later)
    other = again.read_text(encoding="utf-8")
    assert "2025-03-04 05:06 UTC" in text
    assert other != text
    assert other.replace("2026-07-08 09:10 UTC", "2025-03-04 05:06 UTC") == text


def test_it_is_small_and_names_no_address_that_would_be_loaded(report, text):
    assert report.stat().st_size < 5_000_000
    page = Elements()
    page.feed(text)
    assert [
        tag for tag, _ in page.found if tag in ("link", "iframe", "img", "object", "base")
    ] == []
    assert all("src" not in held and "href" not in held for _, held in page.found)
    policy = next(held["content"] for _, held in page.found if held.get("http-equiv"))
    assert policy.startswith("default-src 'none'; script-src 'sha256-")
    assert "unsafe-inline" not in policy.split("script-src", 1)[1].split(";")[0]
    assert "http" not in policy


def test_every_text_a_user_typed_is_text(text):
    page = Elements()
    page.feed(text)
    kinds = {tag for tag, _ in page.found}
    assert "img" not in kinds
    assert "textarea" not in kinds
    for attribute in ("onerror", "onload", "onclick"):
        assert all(attribute not in held for _, held in page.found)
    # Six scripts: three of data, bokeh's two, our own.
    assert sum(tag == "script" for tag, _ in page.found) == 6
    for typed in (HARM, IMAGE, SECTION):
        assert typed not in text
        assert html.escape(typed) in text


def test_the_page_states_who_when_why_and_every_input_with_its_unit(text):
    said = re.sub(r"\s+", " ", html.unescape(re.sub(r"<[^>]+>", " ", text.split("<script", 1)[0])))
    for row in ("Mass 4.6 kg", "Span 2.4 m", "Battery 333 Wh", "Washout 1.5 deg"):
        assert row in said.replace("\u00a0", " ")
    for margin in harmful()[1].margins:
        assert margin.label in said
        assert margin.reason in said
    for caution in harmful()[1].cautions:
        assert caution in said
    assert "Values in between are interpolated" in said
    assert re.search(r"largest difference was 0\.\d+ %", said)
    assert "unsafe-eval" in said


def test_scenario_to_report_to_scenario_is_the_same_scenario_with_the_same_margins(report):
    scenario, results = harmful()
    again = read_report(report)
    assert again.freeze() == scenario.freeze()
    assert (again.name, again.author, again.note) == (
        scenario.name,
        scenario.author,
        scenario.note,
    )
    assert Analysis().run(again.freeze()).margins == results.margins


def test_the_process_that_draws_imports_neither_panel_nor_the_solver():
    program = (
        "import sys, app.report.__main__, app.report.order, app.report.page\n"
        "print(sorted({n.split('.')[0] for n in sys.modules} & {'panel', 'bokeh', 'solver'}))"
    )
    done = subprocess.run(
        [sys.executable, "-c", program], capture_output=True, text=True, check=True, cwd=making.ROOT
    )
    assert done.stdout.strip() == "['bokeh']"


DAMAGES = {
    "cut short": (lambda text: text[: len(text) // 4], "no scenario is inside"),
    "a value changed": (lambda text: text.replace("span_m = 2.4", "span_m = 2.5"), "damaged"),
    "hash changed": (lambda text: text.replace('1,"sha256":"', '1,"sha256":"0'), "damaged"),
    "newer": (lambda text: text.replace('{"format":1,"sha', '{"format":2,"sha'), "newer"),
    "no JSON": (lambda text: text.replace('{"format":1,"sha', '[{"format":1,"sha'), "damaged"),
    "no format": (lambda text: text.replace('{"format":1,"sha', '{"forma":1,"sha'), "damaged"),
    "no list": (lambda text: text.replace('"scenarios":[{"bundle', '"scenarios":5,"x":[{"bundle'),
                "damaged"),
}  # fmt: skip


@pytest.mark.parametrize("damage", DAMAGES)
def test_every_damaged_report_answers_with_one_sentence(tmp_path, text, damage):
    change, said = DAMAGES[damage]
    path = tmp_path / "damaged.html"
    changed = change(text)
    assert changed != text
    path.write_text(changed, encoding="utf-8")
    assert is_report(path)
    with pytest.raises(ReportReadError, match=said) as caught:
        read_report(path)
    assert str(path) in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_report_is_known_by_its_content_and_its_size_is_looked_at_first(tmp_path, report):
    renamed = tmp_path / "drone.toml"
    renamed.write_bytes(report.read_bytes())
    assert is_report(renamed)
    assert not is_report(example_path())
    assert not is_report(tmp_path)
    assert not is_report(tmp_path / "nothing.html")
    large = tmp_path / "large.html"
    with large.open("wb") as stream:
        stream.write(report.read_bytes()[:300])
        stream.truncate(LARGEST_REPORT + 1)
    with pytest.raises(ReportReadError, match="at most 8 MB"):
        read_report(large)
    with pytest.raises(ReportReadError, match="holds 1 scenario; there is no number 2"):
        read_report(report, number=2)
    broken = tmp_path / "broken.html"
    broken.write_bytes(report.read_bytes()[:300] + b"\xff\xfe")
    with pytest.raises(ReportReadError, match="not UTF-8"):
        read_report(broken)


def test_a_disk_that_refuses_answers_with_one_sentence_and_leaves_the_old_file(
    tmp_path, monkeypatch
):
    target = tmp_path / "old.html"
    target.write_text("old")
    monkeypatch.setattr(making, "_drawn", lambda content: b"new")
    monkeypatch.setattr(making, "order_content", lambda *args, **kwargs: {})
    for code, said in ((errno.ENOSPC, "disk is full"), (errno.EROFS, "read-only")):

        def refuse(*_args, code=code):
            raise OSError(code, "refused")

        monkeypatch.setattr("app.safe_write.os.fsync", refuse)
        with pytest.raises(ReportError, match=said) as caught:
            make_report([demo()], output=target)
        assert "\n" not in str(caught.value)
        assert target.read_text() == "old"
        assert [path.name for path in tmp_path.iterdir()] == ["old.html"]


@pytest.mark.parametrize(
    ("given", "said"),
    [
        ({"title": "x" * 201}, "title must have at most 200"),
        ({"note": "a\x07b"}, "note must have no control"),
        ({"author": "two\nlines"}, "author must have no control"),
        ({"count": 7}, "takes 1 to 6 scenarios; got 7"),
        ({"count": 0}, "takes 1 to 6 scenarios; got 0"),
        ({"output": "nowhere/x.html"}, "there is no folder"),
        ({"output": "."}, "is a folder"),
        ({"output": "a\0b"}, "not a usable file name"),
    ],
)
def test_what_cannot_be_used_is_refused_before_anything_is_solved(tmp_path, given, said):
    asked = {"output": "x.html", "count": 1, **given}
    scenarios = [demo()] * asked.pop("count")
    asked["output"] = str(tmp_path / asked["output"])
    with pytest.raises(ReportError, match=said):
        make_report(scenarios, **asked)


def test_tables_as_csv_hold_the_numbers_and_no_formula():
    scenario, results = harmful()
    rows = list(csv.DictReader(io.StringIO(station_csv(results))))
    span = results.landing.landing_span
    assert len(rows) == span.y_m.size + results.cruise.span.y_m.size
    # Six significant figures.
    lift = [float(row["lift_coefficient"]) for row in rows if row["condition"] == "landing"]
    assert lift == pytest.approx(span.lift, rel=1e-5)
    rows = list(csv.DictReader(io.StringIO(polar_csv(results))))
    assert {row["section"] for row in rows} == {one.name for one in results.sections}
    drag = np.array([float(row["drag_coefficient"]) for row in rows])
    curves = np.concatenate([c.drag for one in results.sections for c in one.curves])
    assert drag == pytest.approx(curves, rel=1e-5)
    assert file_name(scenario.name, "polars") == "script-window-harmed-1-script-co-polars.csv"


def test_a_name_that_a_spreadsheet_would_compute_is_quoted():
    from dataclasses import replace

    results = demo()[1]
    wicked = replace(results.sections[0], name="=1+1")
    lines = polar_csv(replace(results, sections=(wicked,))).splitlines()
    assert lines[1].split(",")[1] == "'=1+1"
