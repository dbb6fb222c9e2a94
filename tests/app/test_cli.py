"""The command: what it prints, how it ends, and what it leaves alone."""

from __future__ import annotations

import errno
import json
import logging
import os
import re
import shutil
import signal
import subprocess
import sys
from pathlib import Path

import pytest

from app import cli, log
from app.scenario import field_list
from scenarios import FOLDER, example_names, example_path
from solver.errors import InputError
from tests.app.sample_results import make_results, with_nothing_found

TARN_RIDGE = str(example_path("tarn-ridge-18"))
ROOT = FOLDER.parent


@pytest.fixture(autouse=True)
def log_folder(tmp_path, monkeypatch):
    """Keep the log and the process's state out of the way of others."""
    folder = tmp_path / "log"
    monkeypatch.setattr(log.platformdirs, "user_log_dir", lambda *_a, **_k: str(folder))
    monkeypatch.setattr(log.logging, "raiseExceptions", logging.raiseExceptions)
    level = logging.getLogger().level
    yield folder
    logging.captureWarnings(False)
    root = logging.getLogger()
    root.setLevel(level)
    for handler in list(root.handlers):
        if isinstance(handler, (log.RotatingFileHandler, logging.NullHandler)):
            root.removeHandler(handler)
            handler.close()


@pytest.fixture
def analysed(monkeypatch):
    """Answer with made-up results; list the inputs that were asked about."""
    asked = []

    def analyse(inputs):
        asked.append(inputs)
        return make_results(name=inputs.name)

    monkeypatch.setattr(cli, "analyse", analyse)
    return asked


def in_fresh_interpreter(code: str, *arguments: str) -> subprocess.CompletedProcess[str]:
    """Run code where nothing has been imported yet."""
    return subprocess.run(
        [sys.executable, "-c", code, *arguments],
        capture_output=True,
        text=True,
        check=False,
        cwd=ROOT,
        timeout=60,
    )


def test_version_is_that_of_the_project(capsys):
    with pytest.raises(SystemExit) as ended:
        cli.main(["--version"])
    assert ended.value.code == 0
    project = (ROOT / "pyproject.toml").read_text(encoding="utf-8")
    assert f'version = "{capsys.readouterr().out.split()[1]}"' in project


@pytest.mark.parametrize("arguments", [["--help"], ["open", "--help"], ["solve", "--help"]])
def test_help_names_what_there_is(arguments, capsys):
    with pytest.raises(SystemExit) as ended:
        cli.main(arguments)
    assert ended.value.code == 0
    text = capsys.readouterr().out
    assert "--log-level" in text
    assert ("exit status" in text) == (arguments == ["--help"])


def test_fields_lists_every_input_with_range_default_and_help(capsys):
    assert cli.main(["fields"]) == cli.DONE
    text = capsys.readouterr().out
    for entry in field_list():
        assert entry.name in text
        assert entry.help in text
    assert "  span_m " in text
    assert "2.4 m " in text
    assert "0.4 to 8 m\n" in text


@pytest.mark.parametrize(
    "arguments",
    [
        "solve",
        "open",
        "fly",
        "--port 0",
        "--port 70000",
        "--port x",
        "open x.toml --port -1",
        "--log-level loud",
        "solve a b",
    ],
)
def test_a_command_that_cannot_be_used_ends_with_2(arguments, capsys):
    with pytest.raises(SystemExit) as ended:
        cli.main(arguments.split())
    assert ended.value.code == cli.UNUSABLE
    assert "halfspan" in capsys.readouterr().err


def test_solve_asks_about_the_file_and_reports_its_verdict(analysed, capsys):
    status = cli.main(["solve", TARN_RIDGE])
    (inputs,) = analysed
    assert (inputs.name, inputs.wing.root_section) == ("Tarn Ridge 18", "NACA 2409")
    text = capsys.readouterr().out
    assert text.startswith("Tarn Ridge 18: ")
    failing = [one for one in make_results().margins if one.verdict == "fail"]
    assert status == (cli.FAILS if failing else cli.DONE)


def test_a_requirement_that_fails_ends_with_1(monkeypatch, capsys):
    monkeypatch.setattr(cli, "analyse", lambda inputs: with_nothing_found(make_results()))
    assert cli.main(["solve", TARN_RIDGE]) == cli.FAILS
    assert "not found" in capsys.readouterr().out


def test_json_is_one_object_on_standard_output(analysed, capsys):
    cli.main(["solve", TARN_RIDGE, "--json"])
    printed = json.loads(capsys.readouterr().out)
    assert printed["name"] == "Tarn Ridge 18"
    assert len(analysed) == 1


@pytest.mark.parametrize("command", ["solve", "open"])
def test_a_bad_file_gives_one_sentence_and_no_traceback(command, tmp_path, capsys, analysed):
    path = tmp_path / "bad.toml"
    path.write_text("schema = 1\n[wing]\nspan_m = 12\n", encoding="utf-8")
    assert cli.main([command, str(path)]) == cli.UNUSABLE
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err == (
        f"halfspan: {path}: wing.span_m must be a number between 0.4 and 8 m; got 12\n"
    )
    assert analysed == []


def test_a_field_that_the_analysis_refuses_is_a_fault_of_the_file(monkeypatch, capsys):
    def refuse(_inputs):
        raise InputError("sweep_deg", 30.0, "at most 25 deg with so little span")

    monkeypatch.setattr(cli, "analyse", refuse)
    assert cli.main(["solve", TARN_RIDGE]) == cli.UNUSABLE
    assert "wing.sweep_deg must be at most 25 deg" in capsys.readouterr().err


@pytest.mark.parametrize(
    "failure", [ZeroDivisionError("division by zero"), InputError("inner", 0.0, "finite")]
)
def test_a_failure_inside_is_said_in_one_sentence_and_logged(
    failure, monkeypatch, capsys, log_folder
):
    def fail(_inputs):
        raise failure

    monkeypatch.setattr(cli, "analyse", fail)
    assert cli.main(["solve", TARN_RIDGE]) == cli.BROKEN
    captured = capsys.readouterr()
    assert captured.err.count("\n") == 1
    assert str(log_folder / "halfspan.log") in captured.err
    written = (log_folder / "halfspan.log").read_text(encoding="utf-8")
    assert "Traceback" in written
    assert type(failure).__name__ in written


def test_a_log_that_cannot_be_written_is_said_and_stops_nothing(
    monkeypatch, capsys, log_folder, analysed
):
    log_folder.write_text("a file where the folder should be", encoding="utf-8")
    assert cli.main(["solve", TARN_RIDGE]) in (cli.DONE, cli.FAILS)
    monkeypatch.setattr(cli, "analyse", lambda _inputs: 1 / 0)
    capsys.readouterr()
    assert cli.main(["solve", TARN_RIDGE]) == cli.BROKEN
    assert "could not be written" in capsys.readouterr().err


def test_the_log_keeps_the_level_asked_for_and_rotates(log_folder, analysed, monkeypatch):
    monkeypatch.setattr(log, "LARGEST_LOG", 2000)
    cli.main(["solve", TARN_RIDGE, "--log-level", "warning"])
    for number in range(100):
        logging.getLogger("halfspan").info("unheard %d", number)
        logging.getLogger("halfspan").warning("kept %d %s", number, "x" * 40)
    files = sorted(path.name for path in log_folder.iterdir())
    assert files == ["halfspan.log", *(f"halfspan.log.{age}" for age in (1, 2, 3))]
    text = "".join(path.read_text(encoding="utf-8") for path in log_folder.iterdir())
    assert "kept 99" in text
    assert "unheard" not in text


@pytest.mark.parametrize("command", ["solve", "open"])
@pytest.mark.parametrize(
    ("table", "keep", "words"),
    [
        ("e387_outline.csv", lambda lines: lines[:-1], "coordinates must be"),
        ("e387_model_e_lift.csv", lambda lines: lines[:6], "lift_sweeps must be"),
    ],
    ids=["outline without its last point", "two readings of lift"],
)
def test_tables_that_make_no_section_are_a_fault_of_the_file(
    command, table, keep, words, tmp_path, capsys, served
):
    shutil.copytree(FOLDER / "measured", tmp_path / "measured")
    text = example_path().read_text(encoding="utf-8").replace("schema = 2", "schema = 1")
    text = re.sub(r"^\w+_sha256 = .*\n", "", text, flags=re.MULTILINE)
    (tmp_path / "a.toml").write_text(text, encoding="utf-8")
    path = tmp_path / "measured" / table
    path.chmod(0o644)
    lines = path.read_text(encoding="utf-8").splitlines()
    path.write_text("\n".join(keep(lines)) + "\n", encoding="utf-8")
    assert cli.main([command, str(tmp_path / "a.toml")]) == cli.UNUSABLE
    (sentence,) = capsys.readouterr().err.splitlines()
    assert "a.toml: sections.E387 cannot be used: " in sentence
    assert words in sentence
    assert served.asked == []


class Served:
    """Stands in for the notebook: remembers what it was asked to serve."""

    def __init__(self) -> None:
        self.asked: list[tuple[str, object, object]] = []
        self.error: BaseException | None = None

    def serve(self, scenario, *, port, open_browser, ready, file, journal=None):
        self.journal, self.file = journal, file
        self.asked.append((scenario.name, port, open_browser))
        if self.error is not None:
            raise self.error
        ready("http://127.0.0.1:5006/")


@pytest.fixture
def served(monkeypatch):
    notebook = Served()
    monkeypatch.setitem(sys.modules, "app.notebook", notebook)
    return notebook


def test_open_serves_the_file_and_prints_the_address(served, capsys):
    assert cli.main(["open", TARN_RIDGE, "--port", "5006", "--no-browser"]) == cli.DONE
    assert served.asked == [("Tarn Ridge 18", 5006, False)]
    assert served.file == TARN_RIDGE
    assert "Tarn Ridge 18 at http://127.0.0.1:5006/" in capsys.readouterr().out


def test_options_before_the_command_count_too(served):
    cli.main(["--port", "5006", "--no-browser", "open", TARN_RIDGE])
    cli.main(["open", TARN_RIDGE])
    assert served.asked == [("Tarn Ridge 18", 5006, False), ("Tarn Ridge 18", 0, True)]


def test_without_a_command_the_demo_is_served(served):
    assert cli.main([]) == cli.DONE
    assert served.asked == [("Heronsgill 24", 0, True)]
    assert served.file is None  # the example is nobody's to overwrite


def test_the_journal_is_where_it_is_said_to_be(served, tmp_path):
    for arguments in (["--journal", str(tmp_path)], ["open", TARN_RIDGE, "--journal", "new/one"]):
        assert cli.main(arguments) == cli.DONE
        assert served.journal == Path(arguments[-1])
    assert cli.main(["--journal", str(tmp_path), "open", TARN_RIDGE]) == cli.DONE
    assert served.journal == tmp_path
    assert cli.main([]) == cli.DONE
    assert served.journal is None


@pytest.mark.parametrize("folder", [TARN_RIDGE, "", " ", f"{TARN_RIDGE}/journal", "x" * 5000])
def test_a_journal_that_is_no_folder_is_said(folder, served, capsys):
    with pytest.raises(SystemExit) as caught:
        cli.main(["open", TARN_RIDGE, "--journal", folder])
    assert caught.value.code == cli.UNUSABLE
    assert "--journal: must be a folder, or a new one; got" in capsys.readouterr().err
    assert served.asked == []


@pytest.mark.parametrize(
    ("number", "words"), [(errno.EADDRINUSE, "in use"), (errno.EACCES, "not allowed")]
)
def test_a_port_that_cannot_be_had_is_said(served, capsys, number, words):
    served.error = OSError(number, "refused")
    assert cli.main(["open", TARN_RIDGE, "--port", "5006"]) == cli.UNUSABLE
    assert f"--port 5006 is {words}" in capsys.readouterr().err


def test_ctrl_c_ends_quietly(served, capsys):
    served.error = KeyboardInterrupt()
    assert cli.main(["open", TARN_RIDGE]) == cli.INTERRUPTED
    assert capsys.readouterr().err == ""


RUN = "import sys; from app.cli import main; sys.exit(main(sys.argv[1:]))"


def test_a_reader_that_stops_early_ends_it_quietly():
    reading, writing = os.pipe()
    os.close(reading)
    command = subprocess.run(
        [sys.executable, "-c", RUN, "fields"],
        stdout=writing,
        stderr=subprocess.PIPE,
        cwd=ROOT,
        check=False,
        timeout=60,
    )
    os.close(writing)
    assert command.stderr == b""
    assert command.returncode == cli.NOBODY_READS


@pytest.mark.skipif(os.name != "posix", reason="signals as a terminal sends them")
def test_an_interrupt_from_the_terminal_ends_it_quietly(tmp_path):
    code = (
        "import sys, time; from app import cli\n"
        "def wait(_inputs):\n"
        "    print('waiting', flush=True); time.sleep(60)\n"
        "cli.analyse = wait\n"
        "sys.exit(cli.main(sys.argv[1:]))"
    )
    with subprocess.Popen(
        [sys.executable, "-c", code, "solve", TARN_RIDGE],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        cwd=ROOT,
        env={**os.environ, "XDG_STATE_HOME": str(tmp_path)},
    ) as command:
        assert command.stdout is not None
        first = command.stdout.readline()
        command.send_signal(signal.SIGINT)
        _, complaints = command.communicate(timeout=30)
    assert (first, complaints) == (b"waiting\n", b"")
    assert command.returncode == cli.INTERRUPTED


def test_a_terminal_without_the_letters_shows_stand_ins():
    command = subprocess.run(
        [sys.executable, "-c", RUN, "fields"],
        capture_output=True,
        env={**os.environ, "PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"},
        cwd=ROOT,
        check=False,
        timeout=60,
    )
    assert (command.returncode, command.stderr) == (cli.DONE, b"")
    assert b"m?" in command.stdout


def test_version_and_fields_load_nothing_heavy():
    for argument in ("--version", "fields"):
        code = (
            "import sys, app.cli\n"
            "try: app.cli.main(sys.argv[1:])\n"
            "except SystemExit: pass\n"
            "heavy = {'numpy', 'scipy', 'panel', 'bokeh'} & set(sys.modules)\n"
            "sys.exit(f'loaded: {heavy}' if heavy - {'numpy'} else 0)"
        )
        command = in_fresh_interpreter(code, argument)
        assert command.stderr == ""
        assert command.returncode == 0


def test_linear_algebra_is_pinned_before_numpy_is_loaded():
    code = (
        "import os, sys, app.cli\n"
        "assert 'numpy' not in sys.modules, 'numpy is loaded too early'\n"
        "os.environ['OPENBLAS_NUM_THREADS'] = '7'\n"
        "app.cli.main(['fields'])\n"
        "import numpy, scipy.linalg, threadpoolctl\n"
        "numpy.linalg.solve(numpy.eye(3), numpy.ones(3))\n"
        "pools = threadpoolctl.threadpool_info()\n"
        "assert pools, 'no library to ask'\n"
        "assert all(pool['num_threads'] == 1 for pool in pools), pools\n"
    )
    command = in_fresh_interpreter(code)
    assert command.stderr == ""
    assert command.returncode == 0


def test_the_examples_are_found_by_name():
    assert example_names() == ("heronsgill-24", "tarn-ridge-18")
    assert example_path() == FOLDER / "heronsgill-24.toml"
    with pytest.raises(KeyError, match="there are heronsgill-24, tarn-ridge-18"):
        example_path("heron")
    assert all(isinstance(example_path(name), Path) for name in example_names())
