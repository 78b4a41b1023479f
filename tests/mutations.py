"""Do the tests notice? Ten faults that an audit could have, seeded one at a time into a copy of the code.

``python tests/mutations.py`` first runs the tests that are meant to notice on the code as it is, then on a
copy with each fault, and prints ``caught`` or ``SURVIVED`` for each. Exit 0 only when all are caught.
"""

from __future__ import annotations

import argparse
import os
import shutil
import subprocess
import sys
import tempfile
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[1]
COPIED = ("auditor", "tests", "report_templates", "sample_logs", "pyproject.toml")
SCENARIOS = "tests/test_whole_scenarios.py"
INVARIANTS = "tests/test_whole_invariants.py"


@dataclass(frozen=True)
class Mutation:
    """One seeded fault: a piece of code in a file, what it becomes, and the tests meant to notice."""

    name: str
    file: str
    old: str
    new: str
    tests: tuple[str, ...]


MUTATIONS = (
    Mutation(
        "zero of the Celsius scale at 273 K",
        "auditor/cleaning/view.py",
        "[[tag.offset] for tag in tags]",
        "[[round(tag.offset)] for tag in tags]",
        (
            f"{SCENARIOS}::test_finite_source_in_kelvin",
            f"{INVARIANTS}::test_unit_of_the_log_does_not_change_figures",
        ),
    ),
    Mutation(
        "coverage must exceed the rule instead of reaching it",
        "auditor/balancing/coverage.py",
        "if share >= rules.firm_coverage",
        "if share > rules.firm_coverage",
        ("tests/test_balancing_coverage.py",),
    ),
    Mutation(
        "hold ignored: old values stay valid for ever",
        "auditor/cleaning/sums.py",
        "near = np.diff(chain.instants_us) <= self.hold_us",
        "near = np.diff(chain.instants_us) >= 0",
        ("tests/test_cleaning_rules.py", "tests/test_cleaning_ledgers.py"),
    ),
    Mutation(
        "reset of a counter taken for a negative amount",
        "auditor/cleaning/counters.py",
        "np.where((rise >= 0.0) & (rise <= most), rise, np.nan)",
        "np.where(rise <= most, rise, np.nan)",
        (f"{SCENARIOS}::test_counters",),
    ),
    Mutation(
        "uncertainty of the efficiency in place of that of the margin",
        "auditor/judging/verdicts.py",
        'U("margin", shape)',
        'U("gross", shape)',
        (f"{SCENARIOS}::test_a_thermometer_of_both_efficiency_and_ceiling_counts_once_in_the_margin",),
    ),
    Mutation(
        "calibration parts averaged out, random parts added up",
        "auditor/influences.py",
        'if source.kind == "random":',
        'if source.kind != "random":',
        (f"{INVARIANTS}::test_random_parts_average_out_and_calibration_does_not",),
    ),
    Mutation(
        "passes of the repeated hour exchanged",
        "auditor/log_reading/clocks.py",
        "second[rows[falls[0] + 1 :]] = True",
        "second[rows[: falls[0] + 1]] = True",
        ("tests/test_log_reading_time.py", f"{SCENARIOS}::test_days_of_a_clock_change"),
    ),
    Mutation(
        "implausible before impossible",
        "auditor/judging/verdicts.py",
        "(evidence.impossible, Verdict.IMPOSSIBLE),\n"
        "        (evidence.unproven, Verdict.OVER_CEILING_UNPROVEN),\n"
        "        (evidence.implausible, Verdict.IMPLAUSIBLE),",
        "(evidence.implausible, Verdict.IMPLAUSIBLE),\n"
        "        (evidence.impossible, Verdict.IMPOSSIBLE),\n"
        "        (evidence.unproven, Verdict.OVER_CEILING_UNPROVEN),",
        ("tests/test_judging_verdicts.py",),
    ),
    Mutation(
        "what meters show at standstill counted in",
        "auditor/balancing/masks.py",
        "live = counted & ~stopped",
        "live = counted",
        ("tests/test_balancing_figures.py", "tests/test_balancing_coverage.py"),
    ),
    Mutation(
        "gauge pressure taken for absolute",
        "auditor/metering/gas_volume.py",
        "return absolute_pressure_Pa(pressure_Pa, _air_pressure_Pa(read))",
        "return pressure_Pa + 0.0 * np.asarray(absolute_pressure_Pa(pressure_Pa, _air_pressure_Pa(read)))",
        (f"{SCENARIOS}::test_gas_pressure_and_reference_state",),
    ),
)


def passes(folder: Path, tests: Sequence[str]) -> tuple[bool, str]:
    """Whether tests pass on the code of a folder, and the end of what they printed."""
    command = [sys.executable, "-m", "pytest", "-x", "-q", "--no-header", *tests]
    environment = {**os.environ, "PYTHONDONTWRITEBYTECODE": "1", "PYTHONPATH": str(folder)}
    done = subprocess.run(
        command, cwd=folder, env=environment, capture_output=True, text=True, check=False, timeout=300
    )
    if done.returncode not in (0, 1):  # 1: tests failed; all others: they could not be run
        raise RuntimeError(f"the tests cannot be run:\n{done.stdout}\n{done.stderr}")
    return done.returncode == 0, done.stdout[-2000:]


def seeded(folder: Path, mutation: Mutation) -> str:
    """Put a fault into the copy; return the file's text as it was."""
    path = folder / mutation.file
    text = path.read_text(encoding="utf-8")
    if text.count(mutation.old) != 1:
        times = text.count(mutation.old)
        raise RuntimeError(
            f"{mutation.file} holds {mutation.old!r} {times} times: the mutation needs an update"
        )
    path.write_text(text.replace(mutation.old, mutation.new), encoding="utf-8")
    return text


def main() -> int:
    """Seed every fault whose name holds the given word, one after the other."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("word", nargs="?", default="", help="only mutations whose name holds this word")
    word = parser.parse_args().word
    chosen = [mutation for mutation in MUTATIONS if word in mutation.name]
    survivors = 0
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        for part in COPIED:
            if (ROOT / part).is_dir():
                shutil.copytree(ROOT / part, folder / part, ignore=shutil.ignore_patterns("__pycache__"))
            else:
                shutil.copy(ROOT / part, folder / part)
        sound, printed = passes(folder, sorted({test for mutation in chosen for test in mutation.tests}))
        if not sound:
            print(f"The tests fail on the code as it is; nothing can be said.\n{printed}")
            return 2
        for mutation in chosen:
            before = seeded(folder, mutation)
            survived, _ = passes(folder, mutation.tests)
            (folder / mutation.file).write_text(before, encoding="utf-8")
            survivors += survived
            print(f"{'SURVIVED' if survived else 'caught':<8}  {mutation.name}", flush=True)
    print(f"{len(chosen) - survivors} of {len(chosen)} caught")
    return 1 if survivors else 0


if __name__ == "__main__":
    sys.exit(main())
