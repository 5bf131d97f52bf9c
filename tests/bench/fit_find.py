"""What a calibration is worth to ``find``: the stacks it proposes, put on the invented dyno.

Run: ``python -m tests.bench.fit_find``. Searches the bundled targets with the bundled damper file,
then with the one that ``fit`` makes of the bundled runs, and computes every listed stack on the
damper that the runs were made from: its losses, its shims as cut, oil at 40 C.
"""

from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

import numpy as np

from optimiser.damper import Direction
from optimiser.files import read_oil, read_steel
from optimiser.prediction import Setup, predict
from optimiser.stack import Group, Shim, Stack
from tests.cli.calling import call
from tests.fitting.example_runs import as_cut, true_damper

DIRECTIONS: tuple[Direction, Direction] = ("compression", "rebound")


def real_error(target: dict[str, Any], stack: dict[str, Any], direction: Direction) -> float:
    """R.m.s. error, %, to the target of one listed stack on the invented dyno's damper."""
    damper = true_damper()
    setup = Setup(damper, direction, read_steel(damper.steel), read_oil(damper.oil), 40.0)
    groups = [
        Group(shim["quantity"], Shim(shim["outer_mm"], shim["thickness_mm"]))
        for shim in stack["shims"]
    ]
    built = as_cut(Stack(tuple(groups)))
    force = predict(setup, built, target["velocity_m_s"], stack["clicks"]).force_n
    off = force / np.array(target["force_n"]) - 1.0
    return float(100.0 * np.sqrt(np.average(off**2, weights=target["weight"])))


def report(damper: str, direction: Direction) -> str:
    """One line: predicted and real error of stack 1, and of the mean of all rows."""
    wanted = ("--circuit", direction, "--target", f"example-{direction}")
    document = call("find", "--damper", damper, *wanted, "--bands", "--json").document
    stacks, target = document["stacks"], document["target"]
    real = [real_error(target, stack, direction) for stack in stacks]
    said = [stack["error_percent"] for stack in stacks]
    near = np.mean([error <= document["within_percent"] for error in real])
    chance = np.mean([stack["chance_within"] for stack in stacks])
    return (
        f"{Path(damper).stem:14s} {direction:12s} stack 1: predicted {said[0]:5.2f} %, real "
        f"{real[0]:5.2f} %; {len(stacks)} stacks: predicted {np.mean(said):5.2f} %, real "
        f"{np.mean(real):5.2f} %; within 5 %: chance {100.0 * chance:.0f} %, "
        f"real {100.0 * near:.0f} %"
    )


def main() -> None:
    """Measure and print."""
    with TemporaryDirectory() as folder:
        calibrated = str(Path(folder) / "calibrated.toml")
        assert call("fit", "rear-monotube", "--out", calibrated).code == 0
        for direction in DIRECTIONS:
            for damper in ("rear-monotube", calibrated):
                print(report(damper, direction))


if __name__ == "__main__":
    main()
