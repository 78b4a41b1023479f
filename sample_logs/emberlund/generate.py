"""Write the demo month of Emberlund: `python generate.py [OUTDIR]` makes OUTDIR/logs and OUTDIR/truth.json.

Without OUTDIR the files beside this script are rewritten, byte for byte the same each time.
"""

from __future__ import annotations

import sys
from pathlib import Path

HERE = Path(__file__).resolve().parent
sys.path[:0] = [str(HERE), str(HERE.parent)]

from logger_tools import write_truth  # noqa: E402
from waste_heat_logs import read_instruments, write_logs  # noqa: E402
from waste_heat_plant import simulate  # noqa: E402
from waste_heat_truth import truth_of  # noqa: E402


def generate(folder: Path) -> None:
    """Simulate the month and write its exports and its truth below `folder`."""
    month = simulate()
    readings = read_instruments(month)
    write_logs(folder / "logs", month, readings)
    write_truth(folder / "truth.json", truth_of(month, readings))


if __name__ == "__main__":
    generate(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
