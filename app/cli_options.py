"""Words and options of the ``halfspan`` command."""

from __future__ import annotations

import argparse
from collections.abc import Callable, Mapping
from contextlib import suppress
from pathlib import Path
from typing import NoReturn, TypeAlias

from app.cli_section_options import add_section_options
from app.log import LEVELS
from app.version import version

Action: TypeAlias = Callable[[argparse.Namespace], int]
Commands: TypeAlias = "argparse._SubParsersAction[argparse.ArgumentParser]"

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
  halfspan section e387.csv --reynolds 100e3 200e3 --angles -6 18 0.5 --output polar.csv
  halfspan fields                   every input with unit, range, default, help

exit status:
  0  done; with solve: no requirement fails
  1  solve: at least one requirement fails; section: not one point was found
  2  the command or a file is unusable; one sentence says why
  3  something inside went wrong; the sentence names the log file

The notebook listens on this computer only and asks nothing of the internet.
"""


def parser(actions: Mapping[str, Action]) -> argparse.ArgumentParser:
    """Make the command's parser.

    Parameters
    ----------
    actions : mapping of str to callable
        What each command does with its arguments, by its name; ``notebook`` is the
        command without a name.

    Returns
    -------
    argparse.ArgumentParser
        Its arguments carry the chosen one as ``action``.
    """
    shape = argparse.RawDescriptionHelpFormatter
    command = argparse.ArgumentParser(
        prog="halfspan", description=DESCRIPTION, epilog=EPILOG, formatter_class=shape
    )
    command.add_argument("--version", action=_Version, nargs=0, help="print the version and end")
    command.set_defaults(action=actions["notebook"])
    _add_page_options(command, port=0, no_browser=False, journal=None, log_level="info")
    commands = command.add_subparsers(title="commands", metavar="COMMAND")

    _add_open(commands, actions["open"])
    _add_solve(commands, actions["solve"])
    _add_report(commands, actions["report"])
    _add_section(commands, actions["section"])
    _add_fields(commands, actions["fields"])
    return command


def _add_open(commands: Commands, action: Action) -> None:
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
    _add_page_options(
        opening,
        port=argparse.SUPPRESS,
        no_browser=argparse.SUPPRESS,
        journal=argparse.SUPPRESS,
        log_level=argparse.SUPPRESS,
    )
    opening.set_defaults(action=action)


def _add_solve(commands: Commands, action: Action) -> None:
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
    _add_log_level(solving, argparse.SUPPRESS)
    solving.set_defaults(action=action)


def _add_fields(commands: Commands, action: Action) -> None:
    listing = commands.add_parser(
        "fields",
        help="list every input of a scenario",
        description="List every input of a scenario with its unit, range, default and meaning.",
    )
    _add_log_level(listing, argparse.SUPPRESS)
    listing.set_defaults(action=action)


def _add_report(commands: Commands, action: Action) -> None:
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
    reporting.set_defaults(action=action)


def _add_section(commands: Commands, action: Action) -> None:
    computing = commands.add_parser(
        "section",
        help="compute the polar of a section from its outline",
        description=(
            "Compute lift, drag, moment and transition of a section over angle and Reynolds "
            "number, and write them as CSV. A sizing aid: verify by test."
        ),
        epilog="Exits with 1 and writes nothing when not one point is found.",
    )
    add_section_options(computing)
    _add_log_level(computing, argparse.SUPPRESS)
    computing.set_defaults(action=action)


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
