"""``halfspan report`` and what the other commands make of a report."""

from __future__ import annotations

import pytest

from app import cli, log
from app.report import make as making
from app.report.read import packed_in
from scenarios import example_path

pytestmark = pytest.mark.slow

FILES = [str(example_path("heronsgill-24")), str(example_path("tarn-ridge-18"))]


@pytest.fixture(autouse=True)
def log_folder(tmp_path, monkeypatch):
    monkeypatch.setattr(log.platformdirs, "user_log_dir", lambda *_a, **_k: str(tmp_path / "log"))


@pytest.fixture(scope="module")
def compared(tmp_path_factory):
    path = tmp_path_factory.mktemp("command") / "two wings.html"
    status = cli.main(["report", *FILES, "--output", str(path), "--title", "<b>Two</b>"])
    assert status == cli.DONE
    return path


def test_a_report_is_written_with_its_own_title(compared):
    text = compared.read_text(encoding="utf-8")
    assert "<h1>&lt;b&gt;Two&lt;/b&gt;</h1>" in text
    assert [one["name"] for one in packed_in(compared)] == ["Heronsgill 24", "Tarn Ridge 18"]


def test_each_scenario_of_a_report_is_opened_by_its_number(compared, monkeypatch, capsys):
    opened = []

    def serve(scenario, **_options):
        opened.append(scenario)

    monkeypatch.setattr("app.notebook.serve", serve)
    assert cli.main(["open", str(compared)]) == cli.DONE
    assert cli.main(["open", str(compared), "--scenario", "2"]) == cli.DONE
    assert [one.name for one in opened] == ["Heronsgill 24", "Tarn Ridge 18"]
    assert cli.main(["open", str(compared), "--scenario", "3"]) == cli.UNUSABLE
    assert "holds 2 scenarios; there is no number 3" in capsys.readouterr().err


def test_solve_reads_a_report_too(compared, capsys):
    assert cli.main(["solve", str(compared)]) == cli.main(["solve", FILES[0]])
    out = capsys.readouterr().out
    half = len(out) // 2
    assert out[:half] == out[half:]


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ([FILES[0], "--output", "nowhere/x.html"], "there is no folder"),
        (["missing.toml", "--output", "x.html"], "missing.toml does not exist"),
        ([*FILES * 4, "--output", "x.html"], "takes 1 to 6 scenarios; got 8"),
        ([FILES[0], "--output", "x.html", "--title", "x" * 300], "at most 200 characters"),
    ],
)
def test_what_cannot_be_done_is_one_sentence(arguments, said, capsys, monkeypatch, tmp_path):
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr(making, "_drawn", lambda content: pytest.fail("it was drawn"))
    assert cli.main(["report", *arguments]) == cli.UNUSABLE
    error = capsys.readouterr().err.strip()
    assert said in error
    assert len(error.splitlines()) == 1
    assert list(tmp_path.glob("*.html")) == []
