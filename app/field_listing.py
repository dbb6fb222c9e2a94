"""Every input as lines of text, for the command line and the documents."""

from __future__ import annotations

from app.scenario_fields import Field, field_list
from app.scenario_groups import GROUPS


def allowed(entry: Field) -> str:
    """Word what a field allows, briefly.

    Parameters
    ----------
    entry : Field
        One input.

    Returns
    -------
    str
        A range with its unit, the choices, or what a section may be called.
    """
    if entry.kind == "choice":
        return ", ".join(entry.choices)
    if entry.kind == "section":
        return "NACA and its digits, or a section with tables"
    return f"{entry.low:g} to {entry.high:g} {entry.unit}".rstrip()


def default(entry: Field) -> str:
    """Word the default of a field with its unit.

    Parameters
    ----------
    entry : Field
        One input.

    Returns
    -------
    str
        For example ``2.4 m``.
    """
    if isinstance(entry.default, str):
        return entry.default
    return f"{entry.default:g} {entry.unit}".rstrip()


def listing() -> str:
    """List every input by group: name, default, what is allowed, help.

    Returns
    -------
    str
        Lines of aligned text.
    """
    fields = field_list()
    wide = max(len(entry.name) for entry in fields)
    widest = max(len(default(entry)) for entry in fields)
    lines = ["Every input of a scenario, by the tables of its file.", ""]
    for group in GROUPS:
        lines.append(f"[{group}]")
        for entry in (one for one in fields if one.group == group):
            lines.append(
                f"  {entry.name:<{wide}}  {default(entry):<{widest}}  allowed: {allowed(entry)}"
            )
            lines.append(f"  {'':<{wide}}  {entry.label}. {entry.help}")
        lines.append("")
    lines.append("The second column is the default, taken where a file leaves the key out.")
    return "\n".join(lines)


def markdown_table(group: str) -> str:
    """Write the fields of one group as the table of the documents.

    Parameters
    ----------
    group : str
        A table of the scenario file.

    Returns
    -------
    str
        Markdown rows under a heading row.
    """
    lines = ["| key | what it is | allowed | default |", "|---|---|---|---|"]
    lines += [
        f"| `{entry.name}` | {entry.label}. {entry.help} | {allowed(entry)} | {default(entry)} |"
        for entry in field_list()
        if entry.group == group
    ]
    return "\n".join(lines)
