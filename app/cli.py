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
from typing import TYPE_CHECKING

from app.cli_options import parser
from app.cli_status import BROKEN, DONE, FAILS, INTERRUPTED, NOBODY_READS, UNUSABLE, UnusableError
from app.cli_threads import pin_loaded, pin_threads
from app.log import log_file, start_log
from app.version import version

if TYPE_CHECKING:
    from app.analysis.results import Results
    from app.inputs import Inputs
    from app.scenario import Scenario


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


def _parser() -> argparse.ArgumentParser:
    return parser(
        {
            "notebook": _demo,
            "open": _open,
            "solve": _solve,
            "report": _report,
            "section": _section,
            "fields": _fields,
        }
    )


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

    pin_loaded()

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
    pin_loaded()
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
    pin_loaded()
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


def _section(arguments: argparse.Namespace) -> int:
    from app.cli_section import compute_polar

    start_log(arguments.log_level)
    pin_loaded()
    return compute_polar(arguments)


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
