"""What a report shows of one scenario: all its results, and the table behind its sliders."""

from __future__ import annotations

from dataclasses import asdict, dataclass, replace
from typing import Any

import numpy as np

from app.analysis.report_check import TableError, table_error
from app.analysis.report_reading import FlightTable
from app.analysis.report_table import COLUMNS, drive_numbers, flight_table
from app.analysis.results import Results
from app.analysis.stages import EXTRAS, Analysis, drive_of
from app.inputs import Inputs

__all__ = ["EXTRAS", "Analysis", "ReportPart", "plain_table", "report_part"]


@dataclass(frozen=True, eq=False)
class ReportPart:
    """One scenario of a report.

    Fields
    ------
    results : Results
        With every curve; its `solver_ms` is zero, since a report repeats itself.
    table : FlightTable or None
        None where no stall was found.
    error : TableError or None
        Of the table against full solves.
    drive : dict of str to float
        Battery, motor and propeller.
    """

    results: Results
    table: FlightTable | None
    error: TableError | None
    drive: dict[str, float]


def report_part(
    inputs: Inputs, results: Results | None = None, *, analysis: Analysis | None = None
) -> ReportPart:
    """Complete the results of a scenario and solve the table of its report.

    Parameters
    ----------
    inputs : Inputs
    results : Results, optional
        Of these inputs; what they lack is solved.
    analysis : Analysis, optional
        Whose memory may help.

    Returns
    -------
    ReportPart

    Raises
    ------
    InputError
        If a section's digits or tables, or a value, cannot be used.
    """
    analysis = Analysis() if analysis is None else analysis
    if results is None or not _complete(results):
        results = analysis.run(inputs, want=EXTRAS)
    aircraft = analysis.airframe(inputs).aircraft
    table = flight_table(inputs, aircraft, stall_speed=results.landing.stall_speed_m_s)
    return ReportPart(
        results=replace(results, solver_ms=0.0),
        table=table,
        error=None if table is None else table_error(table, inputs, aircraft),
        drive=drive_numbers(drive_of(inputs)),
    )


def _complete(results: Results) -> bool:
    return (
        results.sweep is not None
        and results.lift_curve is not None
        and bool(results.balance.speed_m_s.size)
    )


def plain_table(table: FlightTable) -> dict[str, Any]:
    """Write a table as lists of numbers with six figures, NaN as None.

    Parameters
    ----------
    table : FlightTable

    Returns
    -------
    dict
        Ready for JSON.
    """
    axes = ("share", "log_speed", "log_weight", "altitude")
    arrays = ("knee", "lift", "limit", "stall", "y_m", "density", "viscosity")
    return {
        "reach": asdict(table.reach),
        "area": table.area,
        "body": table.body,
        **{name: asdict(getattr(table, name)) for name in axes},
        **{name: _numbers(getattr(table, name)) for name in arrays},
        "columns": dict(zip(COLUMNS, (_numbers(one) for one in table.columns), strict=True)),
        "trust": table.trust.tolist(),
    }


def _numbers(values: Any) -> Any:  # noqa: ANN401 - nested lists of any depth
    if np.ndim(values):
        return [_numbers(one) for one in values]
    value = float(values)
    return float(f"{value:.6g}") if np.isfinite(value) else None
