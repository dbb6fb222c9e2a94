"""``halfspan section``: what it asks the solver, what it writes, how it ends."""

from __future__ import annotations

import math
import os
import re
import signal
import subprocess
import sys
import threading
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest

from app import cli, cli_section, cli_section_options, log, safe_write
from app.section_csv import COLUMNS, status_words
from app.tables import read_drag_table, read_lift_table, read_outline_table, table_source
from app.version import version
from scenarios import FOLDER
from solver.errors import InputError
from solver.section import flow
from solver.section.flap import deflect_flap
from solver.section.flow import (
    FlowCancelledError,
    FlowSettings,
    PointStatus,
    critical_amplification,
)
from solver.section.geometry import naca_outline, outline_from_coordinates
from solver.section.kernel_version import section_version
from tests.app.sample_flow import SLOPE, SampleSolver

E387 = str(FOLDER / "measured" / "e387_outline.csv")
RUN = "import sys; from app.cli import main; sys.exit(main(sys.argv[1:]))"
USUAL = ["--reynolds", "200e3", "100e3", "--angles", "-6", "18", "0.5"]


@pytest.fixture(autouse=True)
def log_folder(tmp_path_factory, monkeypatch):
    folder = tmp_path_factory.mktemp("log")
    monkeypatch.setattr(log.platformdirs, "user_log_dir", lambda *_a, **_k: str(folder))


@pytest.fixture
def kernels(monkeypatch):
    """Keep the compiled kernels out of the way; warm unless a test says otherwise."""
    cache = SimpleNamespace(warm=True, marked=0)
    cache.mark_warm = lambda: setattr(cache, "marked", cache.marked + 1)
    monkeypatch.setattr(cli_section, "prepare_kernel_cache", lambda: cache)
    return cache


@pytest.fixture
def solver(monkeypatch, kernels):
    standing_in = SampleSolver()
    monkeypatch.setattr(flow, "section_flow", standing_in.section_flow)
    return standing_in


def rows_of(text: str) -> list[dict[str, str]]:
    headings, *rows = [line.split(",") for line in text.splitlines() if line[0] != "#"]
    return [dict(zip(headings, row, strict=True)) for row in rows]


def test_the_solver_is_asked_what_the_command_says(solver, tmp_path, capsys):
    output = tmp_path / "polar.csv"
    options = "--trip-upper 0.05 --trip-lower 0.6 --critical-factor 7 --threads 3"
    assert cli.main(["section", E387, *USUAL, "--output", str(output), *options.split()]) == 0
    (asked,) = solver.asked
    assert asked.outline.name == "E387"
    assert asked.reynolds.tolist() == [100e3, 200e3]
    assert np.degrees(asked.angle) == pytest.approx(np.linspace(-6.0, 18.0, 49), abs=1e-12)
    settings = asked.settings
    assert (settings.trip_upper, settings.trip_lower, asked.threads) == (0.05, 0.6, 3)
    assert settings.critical_amplification == 7.0
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.splitlines() == [
        "Re 100,000: 49 of 49 points, largest lift 1.21 at 12.0 deg",
        "Re 200,000: 49 of 49 points, largest lift 1.21 at 12.0 deg",
    ]


def test_what_is_not_said_is_as_it_is(solver, monkeypatch):
    monkeypatch.setattr(cli_section, "usable_cores", lambda: 5)
    assert cli.main(["section", "2412", *USUAL]) == cli.DONE
    (asked,) = solver.asked
    assert asked.settings == FlowSettings()
    assert asked.threads == 5


def test_turbulence_is_translated_by_the_relation_of_the_solver(solver, capsys):
    assert cli.main(["section", "2412", *USUAL, "--turbulence", "0.3"]) == cli.DONE
    (asked,) = solver.asked
    assert asked.settings.critical_amplification == critical_amplification(0.003)
    factor = f"{asked.settings.critical_amplification:.4g}"
    assert f"factor {factor}, which goes with a turbulence level of 0.3 percent" in (
        capsys.readouterr().out
    )


@pytest.mark.parametrize(
    "options",
    [
        ["--turbulence", "0.02"],
        ["--turbulence", "1.96"],
        ["--critical-factor", "1"],
        ["--critical-factor", "20"],
        ["--trip-upper", "0", "--trip-lower", "1"],
        ["--flap", "0.5", "40"],
        ["--flap", "0.95", "-40"],
    ],
    ids=" ".join,
)
def test_the_ends_of_the_ranges_are_taken_by_the_solver(options, solver):
    assert cli.main(["section", "0012", *USUAL, *options]) == cli.DONE


def test_ranges_lie_within_those_of_the_solver():
    assert cli_section_options.REYNOLDS[0] >= flow.LEAST_REYNOLDS
    assert cli_section_options.REYNOLDS[1] <= flow.MOST_REYNOLDS
    assert flow.MOST_THREADS == cli_section_options.MOST_THREADS


@pytest.mark.parametrize("name", ["2412", "NACA 2412", "naca2412"])
def test_digits_name_a_section(name, solver, capsys):
    assert cli.main(["section", name, *USUAL]) == cli.DONE
    (asked,) = solver.asked
    assert np.array_equal(asked.outline.y, naca_outline("2412").y)
    assert "# outline: NACA 2412, from its digits; sha256 of " in capsys.readouterr().out


def test_a_file_called_like_digits_is_the_file(solver, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    Path("2412").write_bytes(Path(E387).read_bytes())
    assert cli.main(["section", "2412", *USUAL]) == cli.DONE
    assert solver.asked[0].outline.name == "E387"


def test_the_head_says_what_made_it(solver, capsys):
    assert cli.main(["section", E387, *USUAL, "--trip-lower", "0.1"]) == cli.DONE
    head = [line for line in capsys.readouterr().out.splitlines() if line.startswith("#")]
    assert head[0] == f"# Halfspan {version()}, section solver {section_version()}"
    assert "# computed, not measured: a sizing aid, verify by test" in head
    assert head[2].startswith("# outline: E387, 61 points of e387_outline.csv; sha256 of ")
    assert "# transition: upper surface natural, lower surface forced at 0.1 chord" in head
    assert "# flap: none" in head
    assert "# points: 74 converged, 0 approximate, 0 missing, 24 beyond stall" in head


def test_the_digest_is_of_the_shape_alone(solver, tmp_path, capsys):
    lines = Path(E387).read_text(encoding="utf-8").splitlines()
    first = lines.index("x,y") + 1
    points = [[250.0 * float(v) for v in line.split(",")] for line in lines[first:]]
    other = tmp_path / "other.txt"
    other.write_text(
        "A section, 250 mm\n" + "".join(f"{x:.7f} {y:.7f}\n" for x, y in reversed(points)),
        encoding="utf-8",
    )
    digests = []
    for file in (E387, str(other), "2412"):
        assert cli.main(["section", file, *USUAL]) == cli.DONE
        digests.append(capsys.readouterr().out.split("coordinates ")[1].split()[0])
    assert digests[0] == digests[1] != digests[2]


def test_rows_ascend_and_carry_sensible_digits(solver, capsys):
    assert cli.main(["section", "2412", *USUAL]) == cli.DONE
    rows = rows_of(capsys.readouterr().out)
    assert len(rows) == 98
    keys = [(float(row["reynolds"]), float(row["angle_deg"])) for row in rows]
    assert keys == sorted(keys)
    assert rows[0] == {
        "reynolds": "100000",
        "angle_deg": "-6",
        "cl": "-0.6074",
        "cd": "0.01022",
        "cm": "0.0000",  # -1e-6: no sign on zero
        "transition_upper": "0.7047",
        "transition_lower": "",
        "status": "converged",
    }
    assert rows[12]["angle_deg"] == "0"
    assert rows[48]["status"] == "beyond stall"


def test_missing_points_are_empty_cells_and_are_said(solver, tmp_path, capsys):
    solver.missing = lambda reynolds, degrees: (
        reynolds < 150e3 and (degrees > 15.9 or abs(degrees - 3.0) < 0.1)
    )
    output = tmp_path / "polar.csv"
    assert cli.main(["section", "2412", *USUAL, "--output", str(output)]) == cli.DONE
    assert (
        "Re 100,000: 43 of 49 points (none at 3, 16 to 18 deg), largest" in capsys.readouterr().err
    )
    text = output.read_text(encoding="utf-8")
    assert "nan" not in text
    gone = [row for row in rows_of(text) if row["status"] == "missing"]
    assert len(gone) == 6
    assert {row[name] for row in gone for name in ("cl", "cd", "cm", "transition_upper")} == {""}
    assert "# points: 73 converged, 0 approximate, 6 missing, 19 beyond stall\n" in text


def test_the_reader_of_measured_tables_takes_it(solver, tmp_path):
    solver.missing = lambda reynolds, degrees: reynolds < 150e3 and degrees > 15.9
    output = tmp_path / "polar.csv"
    assert cli.main(["section", "2412", *USUAL, "--output", str(output)]) == cli.DONE
    asked = solver.asked[0]
    for read in (read_lift_table, read_drag_table):
        low, high = read(output)
        assert (low.reynolds, high.reynolds) == (100e3, 200e3)
        assert low.angle == pytest.approx(asked.angle[:44], abs=1e-9)
        assert high.angle == pytest.approx(asked.angle, abs=1e-9)
        # Half of the last digit written.
        assert high.lift[24] == pytest.approx(SLOPE * asked.angle[24], abs=0.5e-4)
        assert high.drag[24] == pytest.approx(0.01 + 0.02 * asked.angle[24] ** 2, abs=0.5e-5)
        assert high.moment is not None
    assert "computed, not measured" in table_source(output)


def test_a_largest_lift_that_is_not_bracketed_is_said(solver, capsys):
    arguments = ["section", "2412", "--reynolds", "1e5", "--angles", "0", "5", "1"]
    assert cli.main(arguments) == cli.DONE
    assert capsys.readouterr().err == "Re 100,000: 6 of 6 points, largest lift not bracketed\n"


def test_where_every_point_fails_nothing_is_written(solver, kernels, tmp_path, capsys):
    solver.missing = lambda reynolds, degrees: True
    output = tmp_path / "polar.csv"
    assert cli.main(["section", "2412", *USUAL, "--output", str(output)]) == cli.FAILS
    assert list(tmp_path.iterdir()) == []
    assert capsys.readouterr().err.splitlines()[-1] == (
        "halfspan: not one point was found; nothing was written"
    )
    assert kernels.marked == 0


def test_a_cold_start_is_announced_and_noted(solver, kernels, capsys):
    kernels.warm = False
    solver.meanwhile = lambda _cancelled: capsys.readouterr().err.startswith("Preparing") or 1 / 0
    assert cli.main(["section", "2412", *USUAL]) == cli.DONE
    assert kernels.marked == 1


@pytest.mark.skipif(os.name != "posix", reason="signals as a terminal sends them")
def test_ctrl_c_stops_the_threads_and_leaves_the_old_file(solver, tmp_path, capsys):
    ended = threading.Event()

    def interrupted(cancelled):
        def work():
            while not cancelled():
                pass
            ended.set()

        threading.Thread(target=work).start()
        os.kill(os.getpid(), signal.SIGINT)
        threading.Event().wait(30.0)  # ends with the signal

    solver.meanwhile = interrupted
    before = signal.getsignal(signal.SIGINT)
    output = tmp_path / "polar.csv"
    output.write_text("the old one", encoding="utf-8")
    assert cli.main(["section", "2412", *USUAL, "--output", str(output)]) == cli.INTERRUPTED
    assert ended.wait(30.0)
    assert signal.getsignal(signal.SIGINT) is before
    assert capsys.readouterr().err == "halfspan: stopped; nothing was written\n"
    assert [path.read_text(encoding="utf-8") for path in tmp_path.iterdir()] == ["the old one"]


def test_a_flow_that_was_cancelled_counts_as_stopped(solver, capsys):
    def cancel(_cancelled):
        raise FlowCancelledError

    solver.meanwhile = cancel
    assert cli.main(["section", "2412", *USUAL]) == cli.INTERRUPTED
    assert capsys.readouterr().err == "halfspan: stopped; nothing was written\n"


def test_an_existing_file_is_replaced_in_one_step(solver, tmp_path, monkeypatch, capsys):
    output = tmp_path / "polar.csv"
    output.write_text("the old one", encoding="utf-8")

    def full(*_arguments):
        raise OSError(28, "No space left on device")

    with monkeypatch.context() as patched:
        patched.setattr(safe_write.os, "fsync", full)
        arguments = ["section", "2412", *USUAL, "--output", str(output)]
        assert cli.main(arguments) == cli.UNUSABLE
    assert f"halfspan: {output} cannot be written: the disk is full" in capsys.readouterr().err
    assert [path.read_text(encoding="utf-8") for path in tmp_path.iterdir()] == ["the old one"]
    assert cli.main(arguments) == cli.DONE
    assert output.read_text(encoding="utf-8").startswith("# Halfspan")


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["missing.csv", *USUAL], "missing.csv does not exist; give a file of coordinates, or"),
        (["2512x", *USUAL], "2512x does not exist"),
        (["2012", *USUAL], "must be the digits of a NACA section"),
        ([".", *USUAL], "is not a regular file"),
        (["2412", *USUAL, "--output", "no/where.csv"], "there is no folder no"),
        (["2412", *USUAL, "--output", "."], ". is a folder; give the name of a file"),
        (["2412", *USUAL, "--output", ""], "--output is not a usable file name"),
        (["own.csv", *USUAL, "--output", "./own.csv"], "is the outline itself"),
        (["2412", *USUAL, "--flap", "0.4", "5"], "0.5 to 0.95 of chord and a deflection from -40"),
        (["2412", *USUAL, "--flap", "0.7", "41"], "to 40 degrees; got 0.7 41"),
        (["2412", *USUAL[:3], "--angles", "5", "4", "1"], "ascending by a step > 0; got 5 4 1"),
        (["2412", *USUAL[:3], "--angles", "0", "4", "0"], "ascending by a step > 0; got 0 4 0"),
        (["2412", *USUAL[:3], "--angles", "-20", "20", "0.1"], "makes 401 angles; at most 400"),
    ],
)
def test_what_cannot_be_used_is_one_sentence(
    arguments, said, solver, capsys, monkeypatch, tmp_path
):
    monkeypatch.chdir(tmp_path)
    Path("own.csv").write_bytes(Path(E387).read_bytes())
    assert cli.main(["section", *arguments]) == cli.UNUSABLE
    (sentence,) = capsys.readouterr().err.splitlines()
    assert sentence.startswith("halfspan: ")
    assert said in sentence
    assert solver.asked == []
    assert [path.name for path in tmp_path.iterdir()] == ["own.csv"]


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        ("2412 --reynolds 9e3 --angles 0 4 1", "must be a number from 10000 to 10000000"),
        ("2412 --reynolds nan --angles 0 4 1", "got 'nan'"),
        ("2412 --reynolds 1e5 --angles 0 31 1", "must be a number from -30 to 30; got '31'"),
        ("2412 --reynolds 1e5 --angles 0 4", "expected 3 arguments"),
        ("2412 --angles 0 4 1", "the following arguments are required: --reynolds"),
        (
            "2412 --reynolds 1e5 --angles 0 4 1 --turbulence 1 --critical-factor 5",
            "not allowed with argument",
        ),
        ("2412 --reynolds 1e5 --angles 0 4 1 --turbulence 3", "from 0.02 to 1.96"),
        ("2412 --reynolds 1e5 --angles 0 4 1 --trip-upper 1.1", "from 0 to 1"),
        ("2412 --reynolds 1e5 --angles 0 4 1 --threads 0", "from 1 to 64"),
    ],
)
def test_options_out_of_range_are_said(arguments, said, solver, capsys):
    with pytest.raises(SystemExit) as ended:
        cli.main(["section", *arguments.split()])
    assert ended.value.code == cli.UNUSABLE
    assert said in capsys.readouterr().err
    assert solver.asked == []


def test_an_outline_is_refused_with_the_reason_and_the_line(solver, tmp_path, capsys):
    lines = Path(E387).read_text(encoding="utf-8").splitlines()
    lines[20], lines[21] = lines[21], lines[20]
    path = tmp_path / "swapped.csv"
    path.write_text("\n".join(lines), encoding="utf-8")
    assert cli.main(["section", str(path), *USUAL]) == cli.UNUSABLE
    (sentence,) = capsys.readouterr().err.splitlines()
    assert "running the other way" in sentence
    head = lines.index("x,y") + 1
    # Lines 21 and 22 of the file, counted from 1, were swapped.
    assert f"(point {21 - head} is in line 21, point {22 - head} is in line 22)" in sentence
    assert solver.asked == []


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("trip_upper", "halfspan: --trip-upper: trip_upper must be ahead of it; got 0.9"),
        ("coordinates", "halfspan: 2412 cannot be used: coordinates must be ahead of it; got 0.9"),
    ],
)
def test_a_refusal_of_the_solver_names_the_option(name, said, solver, capsys):
    def refuse(_cancelled):
        raise InputError(name, 0.9, "ahead of it")

    solver.meanwhile = refuse
    assert cli.main(["section", "2412", *USUAL, "--trip-upper", "0.9"]) == cli.UNUSABLE
    assert capsys.readouterr().err == f"{said}\n"


def test_a_flap_is_deflected_in_radians_and_said(solver, capsys):
    assert cli.main(["section", "2412", *USUAL, "--flap", "0.75", "-10"]) == cli.DONE
    expected = deflect_flap(naca_outline("2412"), hinge=0.75, deflection=math.radians(-10.0))
    assert np.array_equal(solver.asked[0].outline.y, expected.y)
    text = capsys.readouterr().out
    assert "# flap: hinge at 0.75 chord, -10 deg, down positive\n" in text
    assert "# outline: NACA 2412," in text


def test_statuses_have_a_word_each(solver):
    assert status_words() == {
        PointStatus.CONVERGED: "converged",
        PointStatus.APPROXIMATE: "approximate",
        PointStatus.MISSING: "missing",
        PointStatus.BEYOND_STALL: "beyond stall",
    }


def test_the_manual_names_every_option_column_and_status(solver, capsys):
    manual = (FOLDER.parent / "docs" / "command-line.md").read_text(encoding="utf-8")
    with pytest.raises(SystemExit):
        cli.main(["section", "--help"])
    options = set(re.findall(r"--[a-z-]+", capsys.readouterr().out)) - {"--help"}
    assert len(options) == 10
    for name in (*options, *COLUMNS, *status_words().values()):
        assert f"`{name}" in manual, name


@pytest.mark.slow
@pytest.mark.usefixtures("compiled_kernels")
def test_the_real_solver_answers_in_a_process_of_its_own(tmp_path):
    output = tmp_path / "polar.csv"
    angles = ["--angles", "0", "4", "1"]
    options = ["--trip-upper", "0.3", "--flap", "0.75", "3", "--threads", "2"]
    command = subprocess.run(
        [
            *[sys.executable, "-c", RUN, "section", E387, *USUAL[:3], *angles, *options],
            *["--output", str(output)],
        ],
        capture_output=True,
        text=True,
        check=False,
        cwd=FOLDER.parent,
        env={**os.environ, "XDG_STATE_HOME": str(tmp_path)},
        timeout=120,
    )
    assert command.returncode == cli.DONE, command.stderr
    said = sorted(line.split(" points")[0] for line in command.stderr.splitlines())
    assert said == ["Re 100,000: 5 of 5", "Re 200,000: 5 of 5"]
    rows = rows_of(output.read_text(encoding="utf-8"))
    assert {row["status"] for row in rows} == {"converged"}
    expected = flow.section_flow(
        deflect_flap(
            outline_from_coordinates(*read_outline_table(E387)),
            hinge=0.75,
            deflection=math.radians(3.0),
        ),
        angle=np.radians(np.arange(5.0)),
        reynolds=[100e3, 200e3],
        settings=FlowSettings(trip_upper=0.3),
    )
    # Half of the last digit written.
    for name, values, play in (
        ("cl", expected.lift, 0.5e-4),
        ("cd", expected.drag, 0.5e-5),
        ("cm", expected.moment, 0.5e-4),
        ("transition_upper", expected.transition_upper, 0.5e-4),
    ):
        written = [float(row[name]) for row in rows]
        assert written == pytest.approx(values.T.ravel(), abs=1.001 * play), name
