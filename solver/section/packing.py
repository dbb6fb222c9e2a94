"""Packing sections for a wing: several polars onto one grid."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from solver.errors import InputError, require_positive
from solver.section.hermite import cell_coefficients, line_coefficients
from solver.section.pack_columns import ANGLE_LIMIT, SOFT_STOP, PackedSection, pack_section
from solver.section.packed import HELD, NOMINAL, PackedPolars
from solver.section.polar import Polar

FloatArray = NDArray[np.float64]

ANGLE_STEP = np.radians(0.25)


def pack_polars(
    polars: Sequence[Polar],
    *,
    drag_factor: float = 1.0,
    largest_lift_debit: float = 0.0,
    hold_at_reynolds: float | None = None,
    angle_step: float = ANGLE_STEP,
) -> PackedPolars:
    """Pack sections for a wing.

    Parameters
    ----------
    polars : sequence of Polar
        One or more.
    drag_factor : float
        Multiplies all drag [-], > 0: finish and build quality.
    largest_lift_debit : float
        Taken off the largest lift on both sides [-], >= 0: finish.
    hold_at_reynolds : float, optional
        Every lift curve and its limits are those at this Reynolds number, taken to
        the highest tabled one: infinity asks what a high Reynolds number would do.
    angle_step : float
        Of the grid [rad]; the next that divides its range is used.

    Returns
    -------
    PackedPolars

    Raises
    ------
    InputError
        If there is no polar, or a number is out of its range.

    Notes
    -----
    Outside a section's Reynolds numbers its end curves are held, and the confidence
    half-widths grow. Between two runs whose largest lift jumps, the curves of the
    lower one hold over the whole interval and change over within its last per cent.
    """
    grid = _angle_grid(polars, angle_step, drag_factor, largest_lift_debit, hold_at_reynolds)
    packed = _packed_sections(polars, grid, drag_factor, largest_lift_debit, hold_at_reynolds)
    return _assemble(polars, packed, grid, _nodes(packed))


def pack_with_held(
    polars: Sequence[Polar], *, drag_factor: float = 1.0, largest_lift_debit: float = 0.0
) -> PackedPolars:
    """Pack sections with the counterfactual of a high Reynolds number beside the band.

    Parameters
    ----------
    polars : sequence of Polar
        One or more.
    drag_factor, largest_lift_debit : float
        As for :func:`pack_polars`.

    Returns
    -------
    PackedPolars
        Whose band index runs on to :data:`solver.section.packed.HELD`: the nominal
        curves, with lift and its limits at every Reynolds number those of the highest
        in the section's table.

    Raises
    ------
    InputError
        As for :func:`pack_polars`.
    """
    grid = _angle_grid(polars, ANGLE_STEP, drag_factor, largest_lift_debit, None)
    plain, held = (
        _packed_sections(polars, grid, drag_factor, largest_lift_debit, hold)
        for hold in (None, np.inf)
    )
    # An unknown interval asks for nodes that its held twin does not have.
    nodes = _nodes([*plain, *held])
    usual, high = (_assemble(polars, sections, grid, nodes) for sections in (plain, held))
    size = usual.cells.shape[0] // HELD

    def joined(name: str, one: slice = slice(NOMINAL, NOMINAL + 1)) -> FloatArray:
        return np.concatenate([getattr(usual, name), getattr(high, name)[one]])

    return replace(
        usual,
        cells=joined("cells", slice(NOMINAL * size, (NOMINAL + 1) * size)),
        limit_lines=joined("limit_lines"),
        largest_lift=joined("largest_lift"),
        knee_angle=joined("knee_angle"),
        peak_angle=joined("peak_angle"),
        zero_lift_angle=joined("zero_lift_angle"),
    )


def _angle_grid(
    polars: Sequence[Polar],
    angle_step: float,
    drag_factor: float,
    largest_lift_debit: float,
    hold_at_reynolds: float | None,
) -> FloatArray:
    """Check what is asked for and lay the grid of angles [rad]."""
    if not polars:
        raise InputError("polars", polars, "one section or more")
    require_positive(drag_factor=drag_factor, angle_step=angle_step)
    if not (np.isfinite(largest_lift_debit) and largest_lift_debit >= 0.0):
        raise InputError("largest_lift_debit", largest_lift_debit, "finite and >= 0")
    if hold_at_reynolds is not None and not hold_at_reynolds > 0.0:
        raise InputError("hold_at_reynolds", hold_at_reynolds, "> 0")
    end = ANGLE_LIMIT + SOFT_STOP
    return np.linspace(-end, end, 2 * int(np.ceil(end / angle_step - 1e-9)) + 1)


def _packed_sections(
    polars: Sequence[Polar],
    angle: FloatArray,
    drag_factor: float,
    largest_lift_debit: float,
    hold_at_reynolds: float | None,
) -> list[PackedSection]:
    return [
        pack_section(
            polar,
            angle,
            drag_factor=drag_factor,
            largest_lift_debit=largest_lift_debit,
            hold_at_reynolds=hold_at_reynolds,
        )
        for polar in polars
    ]


def _nodes(packed: Sequence[PackedSection]) -> FloatArray:
    """Logarithms of every Reynolds number that some section tables."""
    return np.unique(np.concatenate([section.log_reynolds for section in packed]))


def _assemble(
    polars: Sequence[Polar],
    packed: Sequence[PackedSection],
    angle: FloatArray,
    nodes: FloatArray,
) -> PackedPolars:
    step = float(angle[1] - angle[0])
    cells, lines = [], []
    for section in packed:
        value, slope, over_re, cross = section.surfaces_at(nodes)
        lines.append(line_coefficients(*section.limits_at(nodes), nodes))
        cells.append(
            cell_coefficients(value, slope, over_re, cross, angle_step=step, log_reynolds=nodes)
        )
    # Sections in front, then band: (sections, na-1, nr-1, band, quantity, v, u).
    stacked = np.stack(cells).transpose(3, 0, 1, 2, 5, 6, 4)
    line = np.stack(lines).transpose(2, 0, 1, 3, 4)
    limits = np.stack([section.limits_at(nodes)[0] for section in packed]).transpose(2, 0, 1, 3)
    return PackedPolars(
        names=tuple(polar.name for polar in polars),
        angle=angle,
        reynolds=np.exp(nodes),
        cells=np.ascontiguousarray(stacked).reshape(-1, 48),
        limit_lines=np.ascontiguousarray(line),
        largest_lift=limits[..., 0],
        knee_angle=limits[..., 1],
        peak_angle=limits[..., 2],
        **_ranges(polars, packed, nodes),
    )


def _ranges(
    polars: Sequence[Polar], packed: Sequence[PackedSection], nodes: FloatArray
) -> dict[str, Any]:
    """Fields of :class:`PackedPolars` that say how far each section's data reach."""
    reynolds = np.exp(nodes)
    middle = np.sqrt(reynolds[1:] * reynolds[:-1])
    lowest = np.array([polar.reynolds[0] for polar in polars])
    highest = np.array([polar.reynolds[-1] for polar in polars])
    cliff = np.zeros((len(polars), middle.size), dtype=np.bool_)
    for row, section in zip(cliff, packed, strict=True):
        for low, high in section.unknown:
            row |= (middle > low) & (middle < high)

    def table(name: str) -> FloatArray:
        return np.stack([section.row_at(name, nodes) for section in packed])

    near = 1e-9
    return {
        "zero_lift_angle": np.repeat(table("zero_lift_angle")[None], 3, axis=0),
        "known": (reynolds >= lowest[:, None] * (1 - near))
        & (reynolds <= highest[:, None] * (1 + near)),
        "in_cliff": cliff,
        "valid_low": table("valid_low"),
        "valid_high": table("valid_high"),
        "stall_low": table("stall_low"),
        "stall_high": table("stall_high"),
        "recovery": table("recovery"),
        "lowest_reynolds": lowest,
        "highest_reynolds": highest,
        "estimated": np.array([polar.estimated for polar in polars]),
        "unknown": tuple(section.unknown for section in packed),
    }
