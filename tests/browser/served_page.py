"""The notebook as the browser's tests open it: run as a program, prints its address.

The demo scenario under a name that would do harm as HTML; and two masses at
which the analysis misbehaves on purpose, to see what the page makes of it.
"""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

from app.analysis.results import Results
from app.analysis.stages import Analysis
from app.inputs import Inputs
from app.notebook import serve
from app.scenario_file import read_scenario
from app.scenario_save import write_scenario

DEMO = Path(__file__).resolve().parents[2] / "scenarios" / "heronsgill-24.toml"
NAME = '<img src=x onerror="window.harmed=1"> <b>Rook</b> & co'
NOTE = "<script>window.harmed=2</script>"
FAILS_AT_KG = 6.66
SLOW_AT_KG = 7.77


class MisbehavingAnalysis(Analysis):
    """The real analysis, but for two masses."""

    def run(self, inputs: Inputs, *, want: frozenset[str] = frozenset()) -> Results:
        """Solve, fail, or take long."""
        if inputs.brief.mass_kg == FAILS_AT_KG:
            raise RuntimeError("this mass fails on purpose")
        if inputs.brief.mass_kg == SLOW_AT_KG:
            time.sleep(1.0)
        return super().run(inputs, want=want)


def main() -> None:
    """Serve until the process is ended: a folder for all it writes, and a port, may be given."""
    with tempfile.TemporaryDirectory(prefix="halfspan-test-") as made:
        folder = Path(sys.argv[1]) if len(sys.argv) > 1 else Path(made)
        port = int(sys.argv[2]) if len(sys.argv) > 2 else None
        scenario = read_scenario(DEMO)
        scenario.name, scenario.note = NAME, NOTE
        file = folder / "rook.toml"
        if file.exists():
            scenario = read_scenario(file)
        else:
            write_scenario(scenario, file)

        def ready(address: str) -> None:
            sys.stdout.write(f"{address}\n")
            sys.stdout.flush()

        serve(
            scenario,
            port=port,
            open_browser=False,
            ready=ready,
            analysis=MisbehavingAnalysis(),
            journal=folder / "journal",
            states=folder / "states",
            file=file,
        )


if __name__ == "__main__":
    main()
