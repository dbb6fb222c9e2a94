"""The report: one static file that opens from a disk, without a network, for years.

It is built by a process of its own (``python -m app.report``), which is given plain
data, imports bokeh and never panel.
"""

from app.report.make import ReportError, make_report
from app.report.read import ReportReadError, is_report, read_report

__all__ = ["ReportError", "ReportReadError", "is_report", "make_report", "read_report"]
