"""Everything CI runs, in one command: ``python -m tests``.

Style, types and import rules first, since they are quick; then the tests, in
parallel and in random order.
"""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parent.parent

STEPS: tuple[tuple[str, ...], ...] = (
    ("ruff", "check", "."),
    ("ruff", "format", "--check", "."),
    ("mypy", "solver", "app"),
    ("importlinter.cli", "lint"),
    ("pytest", "-n", "2", "-q"),
)


def main() -> int:
    """Run every step; the exit status is that of the first that failed."""
    status = 0
    for step in STEPS:
        print(f"+ {' '.join(step)}", flush=True)
        if step[0] == "importlinter.cli":
            code = "import sys; from importlinter.cli import lint_imports; sys.exit(lint_imports())"
            command = [sys.executable, "-c", code]
        else:
            command = [sys.executable, "-m", *step]
        result = subprocess.run(command, cwd=ROOT, check=False)
        status = status or result.returncode
    return status


if __name__ == "__main__":
    sys.exit(main())
