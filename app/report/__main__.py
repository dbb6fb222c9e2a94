"""``python -m app.report``: an order as JSON in, the report as HTML out."""

from __future__ import annotations

import json
import sys


def main() -> None:
    """Read the order from standard input, write the report to standard output."""
    from app.report.order import order_from
    from app.report.page import page

    order = order_from(json.loads(sys.stdin.buffer.read()))
    sys.stdout.buffer.write(page(order).encode("utf-8"))


if __name__ == "__main__":
    main()
