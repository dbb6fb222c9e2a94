"""The numbers behind the plots, as tables: for the keyboard, a reader, or a copy."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from app.analysis.results import (
    BalanceResult,
    LiftCurveResult,
    PolarCurve,
    SectionResult,
    SpanResult,
    SweepResult,
    Trust,
)
from app.figures import words
from app.sheets.sheet import table, title

Block = dict[str, object]
Column = tuple[str, ArrayLike]

TRUST_WORDS = {
    Trust.VALID: "",
    Trust.EXTRAPOLATED: "extrapolated",
    Trust.INDICATIVE: "indicative",
    Trust.NOT_CONVERGED: "no solution",
}


def columns_table(columns: Sequence[Column], trust: ArrayLike | None = None) -> Block:
    """Make a table of columns of equal length.

    Parameters
    ----------
    columns : sequence of (str, array_like)
        Heading with its unit in brackets, and values.
    trust : array_like, optional
        Codes of :class:`Trust`; said in a last column where any is not valid.

    Returns
    -------
    dict
        A block for a card of words; a value without a solution is left empty.
    """
    values = [np.asarray(column, dtype=np.float64) for _, column in columns]
    codes = None if trust is None else np.asarray(trust, dtype=np.int64)
    if codes is not None and not codes.any():
        codes = None
    rows = []
    for at in range(len(values[0])):
        row = [words.number(float(v[at])) if np.isfinite(v[at]) else "" for v in values]
        rows.append(row if codes is None else [*row, TRUST_WORDS[Trust(int(codes[at]))]])
    head = [name for name, _ in columns]
    return table(head if codes is None else [*head, "trust"], rows)


def span_numbers(span: SpanResult, condition: str) -> list[Block]:
    """Give one flight condition along the half-wing.

    Parameters
    ----------
    span : SpanResult
        Root to tip.
    condition : str
        As in "at landing".

    Returns
    -------
    list of dict
        Blocks for a card of words.
    """
    columns: list[Column] = [
        ("from the centre [m]", span.y_m),
        ("chord [mm]", 1e3 * np.asarray(span.chord_m)),
        ("Reynolds number", span.reynolds),
        ("angle [deg]", span.angle_deg),
        ("lift [-]", span.lift),
        ("limit, low [-]", span.limit_low),
        ("limit [-]", span.limit),
        ("limit, high [-]", span.limit_high),
        ("left [-]", span.room),
        ("to the knee [deg]", span.knee_room_deg),
        ("loading [-]", span.loading),
    ]
    return [title(f"Along the half-wing {condition}"), columns_table(columns, span.trust)]


def lift_curve_numbers(curve: LiftCurveResult) -> list[Block]:
    """Give the wing's lift curve.

    Parameters
    ----------
    curve : LiftCurveResult
        At landing speed.

    Returns
    -------
    list of dict
        Blocks for a card of words.
    """
    columns: list[Column] = [
        ("angle [deg]", curve.angle_deg),
        ("lift [-]", curve.lift_coefficient),
        ("stalled from [% of half-span]", 100.0 * np.asarray(curve.stalled_from)),
        ("to [% of half-span]", 100.0 * np.asarray(curve.stalled_to)),
    ]
    return [title("Wing lift at landing speed"), columns_table(columns, curve.trust)]


def section_numbers(section: SectionResult, curve: PolarCurve | None) -> list[Block]:
    """Give one curve of a section, and its largest lift.

    Parameters
    ----------
    section : SectionResult
        The one chosen.
    curve : PolarCurve or None
        The one brought forward.

    Returns
    -------
    list of dict
        Blocks for a card of words.
    """
    blocks: list[Block] = []
    if curve is not None:
        columns: list[Column] = [
            ("angle [deg]", curve.angle_deg),
            ("lift [-]", curve.lift),
            ("drag [-]", curve.drag),
            ("moment [-]", curve.moment),
        ]
        said = f"{section.name} at Reynolds number {words.reynolds(curve.reynolds)}"
        blocks += [title(said), columns_table(columns, curve.trust)]
    some = slice(None, None, max(1, len(section.limit_reynolds) // 16))
    largest: list[Column] = [
        ("Reynolds number", section.limit_reynolds[some]),
        ("largest lift, low [-]", section.largest_lift_low[some]),
        ("largest lift [-]", section.largest_lift[some]),
        ("high [-]", section.largest_lift_high[some]),
        ("knee [deg]", section.knee_angle_deg[some]),
    ]
    return [
        *blocks,
        title(f"{section.name}: largest lift over Reynolds number"),
        columns_table(largest, section.limit_trust[some]),
    ]


def balance_numbers(balance: BalanceResult) -> list[Block]:
    """Give the elevator over speed.

    Parameters
    ----------
    balance : BalanceResult
        With its curves.

    Returns
    -------
    list of dict
        Blocks for a card of words.
    """
    columns: list[Column] = [
        ("speed [m/s]", balance.speed_m_s),
        ("elevator [deg]", balance.elevator_nominal_deg),
        ("elevator, forward balance point [deg]", balance.elevator_forward_deg),
    ]
    return [title("Elevator for level flight"), columns_table(columns, balance.trust)]


def sweep_numbers(sweep: SweepResult) -> list[Block]:
    """Give level flight over speed.

    Parameters
    ----------
    sweep : SweepResult
        With all its curves.

    Returns
    -------
    list of dict
        Blocks for a card of words.
    """
    columns: list[Column] = [
        ("speed [m/s]", sweep.speed_m_s),
        ("induced [N]", sweep.induced),
        ("sections [N]", sweep.profile),
        ("body [N]", sweep.body),
        ("trim [N]", sweep.trim),
        ("all [N]", sweep.total),
        ("electric power [W]", sweep.electric_power_w),
        ("lift to drag [-]", sweep.lift_to_drag),
        ("endurance [h]", sweep.endurance_h),
        ("range [km]", sweep.range_km),
    ]
    return [title("Level flight over speed"), columns_table(columns, sweep.trust)]
