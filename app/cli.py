"""The ``halfspan`` command.

Nothing heavy is imported before it is needed: ``--version`` and ``fields`` stay
free of the solver, ``solve`` of everything that draws.
"""

from __future__ import annotations

import argparse
import errno
import io
import logging
import os
import shutil
import sys
from collections.abc import Sequence
from contextlib import suppress
from pathlib import Path
from typing import TYPE_CHECKING, NoReturn

from app.log import LEVELS, log_file, start_log

if TYPE_CHECKING:
    from app.analysis.results import Results
    from app.inputs import Inputs
    from app.scenario import Scenario

DONE, FAILS, UNUSABLE, BROKEN = 0, 1, 2, 3
INTERRUPTED, NOBODY_READS = 130, 141
"""What a shell reports for a command ended by Ctrl-C or a closed pipe."""

DESCRIPTION = """\
Halfspan helps to choose the wing of a small fixed-wing drone: from mass, speeds
and field to drag, trim, stall and the margins that decide.

Without a command it opens the notebook in the browser, on the demo scenario.
"""

EPILOG = """\
examples:
  halfspan                          the notebook on the demo scenario
  halfspan open my-drone.toml       the notebook on your own scenario
  halfspan solve my-drone.toml      its margins, as text
  halfspan solve my-drone.toml --json | jq .margins
  halfspan report my-drone.toml --output my-drone.html
  halfspan fields                   every input with unit, range, default, help

exit status:
  0  done; with solve: no requirement fails
  1  solve: at least one requirement fails
  2  the command or the scenario file is unusable; one sentence says why
  3  something inside went wrong; the sentence names the log file

The notebook listens on this computer only and asks nothing of the internet.
"""


class UnusableError(Exception):
    """What the user gave cannot be used; the message is the whole answer."""


def main(argv: Sequence[str] | None = None) -> int:
    """Run the command.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments after the command's name; those of the process unless given.

    Returns
    -------
    int
        The exit status.
    """
    pin_threads()
    try:
        try:
            _tolerate_terminals()
            return _run(_parser().parse_args(argv))
        finally:
            sys.stdout.flush()
    except BrokenPipeError:
        _silence_stdout()
        return NOBODY_READS
    except KeyboardInterrupt:
        return INTERRUPTED


def pin_threads() -> None:
    """Keep the linear algebra on one thread: small systems only lose by more.

    Takes effect for libraries loaded afterwards; :func:`_pin_loaded` sees to
    those that ask differently.
    """
    for library in ("OPENBLAS", "OMP", "MKL", "VECLIB_MAXIMUM", "BLIS", "NUMEXPR"):
        os.environ[f"{library}_NUM_THREADS"] = "1"


def _pin_loaded() -> None:
    from threadpoolctl import threadpool_limits  # type: ignore[import-untyped]

    threadpool_limits(limits=1, user_api="blas")


def _run(arguments: argparse.Namespace) -> int:
    try:
        return int(arguments.action(arguments))
    except UnusableError as refusal:
        print(f"halfspan: {refusal}", file=sys.stderr)
        return UNUSABLE
    except (BrokenPipeError, KeyboardInterrupt):
        raise
    except Exception as error:
        print(f"halfspan: {_written_down(error, arguments.log_level)}", file=sys.stderr)
        return BROKEN


def _written_down(error: Exception, level: str) -> str:
    """Log an unexpected failure; say in one sentence where."""
    path = start_log(level)
    logging.getLogger("halfspan").error("unexpected failure", exc_info=error)
    kind = type(error).__name__
    where = f"it is written down in {path}" if path else f"{log_file()} could not be written"
    return f"something inside went wrong ({kind}), which is a fault of Halfspan; {where}"


def _parser() -> argparse.ArgumentParser:
    shape = argparse.RawDescriptionHelpFormatter
    parser = argparse.ArgumentParser(
        prog="halfspan", description=DESCRIPTION, epilog=EPILOG, formatter_class=shape
    )
    parser.add_argument("--version", action=_Version, nargs=0, help="print the version and end")
    parser.set_defaults(action=_demo)
    _add_page_options(parser, port=0, no_browser=False, journal=None, log_level="info")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND")

    unset = argparse.SUPPRESS
    opening = commands.add_parser(
        "open",
        help="open the notebook on a scenario file, or on a report",
        description=(
            "Open the notebook in the browser on a scenario file, or on the scenario that rides "
            "inside a report."
        ),
    )
    opening.add_argument("file", metavar="FILE", help="a scenario, as TOML, or a report")
    opening.add_argument(
        "--scenario",
        type=int,
        default=1,
        metavar="N",
        help="which scenario of a report that compares several, from 1",
    )
    _add_page_options(opening, port=unset, no_browser=unset, journal=unset, log_level=unset)
    opening.set_defaults(action=_open)

    solving = commands.add_parser(
        "solve",
        help="print the margins of a scenario file",
        description=(
            "Solve a scenario and print each requirement with its value, limit, margin and "
            "verdict, then the reasons, the main figures and what to be careful about."
        ),
        epilog="Exits with 1 when a requirement fails, with 2 when the file is unusable.",
    )
    solving.add_argument("file", metavar="FILE", help="a scenario, as TOML")
    solving.add_argument(
        "--json",
        action="store_true",
        help="print one JSON object instead; its keys carry their units (docs/command-line.md)",
    )
    _add_log_level(solving, unset)
    solving.set_defaults(action=_solve)

    _add_report(commands)

    listing = commands.add_parser(
        "fields",
        help="list every input of a scenario",
        description="List every input of a scenario with its unit, range, default and meaning.",
    )
    _add_log_level(listing, unset)
    listing.set_defaults(action=_fields)
    return parser


def _add_report(commands: argparse._SubParsersAction[argparse.ArgumentParser]) -> None:
    reporting = commands.add_parser(
        "report",
        help="write a report: one HTML file that opens without Halfspan or a network",
        description=(
            "Write a report on a scenario, or one that compares two to six: one HTML file that "
            "opens from a disk, without Halfspan and without a network."
        ),
    )
    reporting.add_argument("files", metavar="FILE", nargs="+", help="a scenario, as TOML")
    reporting.add_argument("--output", metavar="OUT.html", required=True, help="where to")
    reporting.add_argument("--title", default="", help="instead of the scenario's name")
    reporting.add_argument("--author", default="", help="instead of the scenario's author")
    reporting.add_argument("--note", default="", help="instead of the scenario's note")
    _add_log_level(reporting, argparse.SUPPRESS)
    reporting.set_defaults(action=_report)


def _add_page_options(
    parser: argparse.ArgumentParser,
    *,
    port: object,
    no_browser: object,
    journal: object,
    log_level: object,
) -> None:
    parser.add_argument(
        "--port",
        type=_port,
        default=port,
        metavar="N",
        help="port of the notebook on 127.0.0.1, 1 to 65535; without it, a free one",
    )
    parser.add_argument(
        "--no-browser",
        action="store_true",
        default=no_browser,
        help="print the notebook's address and leave the browser alone",
    )
    parser.add_argument(
        "--journal",
        type=_folder,
        default=journal,
        metavar="DIR",
        help="folder of the snapshots; without it, Halfspan journal among your documents",
    )
    _add_log_level(parser, log_level)


def _add_log_level(parser: argparse.ArgumentParser, default: object) -> None:
    parser.add_argument(
        "--log-level",
        choices=LEVELS,
        default=default,
        metavar="LEVEL",
        help="what the log file keeps: debug, info (as it is), warning or error",
    )


def _port(text: str) -> int:
    if not (text.isdecimal() and len(text) <= 5 and 1 <= int(text) <= 65535):
        raise argparse.ArgumentTypeError(f"must be a number from 1 to 65535; got {text[:40]!r}")
    return int(text)


def _folder(text: str) -> Path:
    path = Path(text)
    usable = False
    if text.strip() and "\0" not in text:
        with suppress(OSError):
            nearest = next(one for one in (path, *path.absolute().parents) if one.exists())
            usable = nearest.is_dir()
    if not usable:
        raise argparse.ArgumentTypeError(f"must be a folder, or a new one; got {text[:200]!r}")
    return path


class _Version(argparse.Action):
    """Print the version; a class so that it is looked up only when asked for."""

    def __call__(self, parser: argparse.ArgumentParser, *_rest: object) -> NoReturn:
        print(f"halfspan {version()}")
        parser.exit()


def version() -> str:
    """Halfspan's version, as installed or as the project file next door states it."""
    from importlib.metadata import PackageNotFoundError
    from importlib.metadata import version as installed

    try:
        return installed("halfspan")
    except PackageNotFoundError:
        import tomllib

        project = Path(__file__).resolve().parent.parent / "pyproject.toml"
        return str(tomllib.loads(project.read_text(encoding="utf-8"))["project"]["version"])


def _scenario(file: str, number: int = 1) -> Scenario:
    from app.report.read import ReportReadError, is_report, read_report
    from app.scenario_file import ScenarioError, read_scenario

    try:
        return read_report(file, number=number) if is_report(file) else read_scenario(file)
    except (ScenarioError, ReportReadError) as error:
        raise UnusableError(str(error)) from error


def _demo(arguments: argparse.Namespace) -> int:
    from scenarios import example_path

    return _serve(str(example_path()), arguments)


def _open(arguments: argparse.Namespace) -> int:
    from app.report.read import is_report

    own = None if is_report(arguments.file) else arguments.file
    return _serve(arguments.file, arguments, own=own)


def _serve(file: str, arguments: argparse.Namespace, *, own: str | None = None) -> int:
    """Show a scenario; `own` is the file that the page may save to."""
    start_log(arguments.log_level)
    scenario = _scenario(file, getattr(arguments, "scenario", 1))
    if blamed := _unusable_section(scenario.freeze(), file):
        raise blamed
    from app.notebook import serve

    _pin_loaded()

    # Where none is given, the notebook knows the place.
    chosen = {} if arguments.journal is None else {"journal": arguments.journal}

    def ready(address: str) -> None:
        print(f"Halfspan shows {scenario.name} at {address} (Ctrl-C ends it)", flush=True)

    try:
        serve(
            scenario,
            port=arguments.port,
            open_browser=not arguments.no_browser,
            ready=ready,
            file=own,
            **chosen,
        )
    except OSError as error:
        if error.errno not in (errno.EADDRINUSE, errno.EACCES):
            raise
        reason = "in use" if error.errno == errno.EADDRINUSE else "not allowed"
        raise UnusableError(
            f"--port {arguments.port} is {reason}; give another, or none for a free one"
        ) from error
    return DONE


def analyse(inputs: Inputs) -> Results:
    """Find the figures of one scenario, without what only a sheet shows.

    Parameters
    ----------
    inputs : Inputs
        The frozen scenario.

    Returns
    -------
    Results
        Margins and the figures behind them.
    """
    from app.analysis.stages import Analysis

    return Analysis().run(inputs, want=frozenset())


def _solve(arguments: argparse.Namespace) -> int:
    start_log(arguments.log_level)
    scenario = _scenario(arguments.file)
    _pin_loaded()
    results = _answer(scenario, arguments.file)
    oddities = tuple(one.sentence for one in scenario.oddities())
    if arguments.json:
        from app.answer_json import answer_json

        print(answer_json(results, version=version(), oddities=oddities))
    else:
        from app.answer_text import answer_text

        width = min(max(shutil.get_terminal_size((92, 24)).columns, 60), 100)
        print(answer_text(results, oddities=oddities, width=width))
    return FAILS if any(margin.verdict == "fail" for margin in results.margins) else DONE


def _report(arguments: argparse.Namespace) -> int:
    from app.report import ReportError, make_report

    start_log(arguments.log_level)
    scenarios = [_scenario(file) for file in arguments.files]
    for scenario, file in zip(scenarios, arguments.files, strict=True):
        if blamed := _unusable_section(scenario.freeze(), file):
            raise blamed
    _pin_loaded()
    try:
        path = make_report(
            [(scenario, None) for scenario in scenarios],
            title=arguments.title,
            author=arguments.author,
            note=arguments.note,
            output=arguments.output,
        )
    except ReportError as error:
        raise UnusableError(str(error)) from error
    print(f"{path} ({path.stat().st_size / 1e6:.1f} MB) opens in any browser, without a network")
    return DONE


def _answer(scenario: Scenario, file: str) -> Results:
    from app.scenario import FIELDS
    from app.scenario_error import input_refusal
    from solver.errors import InputError

    inputs = scenario.freeze()
    try:
        return analyse(inputs)
    except InputError as error:
        # The analysis may know limits that only show in combination.
        if error.name in FIELDS:
            raise UnusableError(str(input_refusal(error, file))) from error
        if blamed := _unusable_section(inputs, file):
            raise blamed from error
        raise


def _unusable_section(inputs: Inputs, file: str) -> UnusableError | None:
    """Find a section whose tables can be read but make no outline or no polar."""
    from app.analysis.section_stage import section_data
    from app.scenario_error import quoted
    from solver.errors import InputError

    for source in dict.fromkeys(inputs.sections):
        try:
            if source.tables is not None:
                section_data(source)
        except InputError as error:
            key = f"sections.{quoted(source.name)}"
            return UnusableError(f"{file}: {key} cannot be used: {error}")
    return None


def _fields(_arguments: argparse.Namespace) -> int:
    from app.field_listing import listing

    print(listing())
    return DONE


def _tolerate_terminals() -> None:
    """Let a terminal that lacks a letter show a stand-in instead of failing."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")


def _silence_stdout() -> None:
    """Keep the interpreter's last flush from complaining about the closed pipe."""
    with suppress(OSError, ValueError):
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


if __name__ == "__main__":
    sys.exit(main())
