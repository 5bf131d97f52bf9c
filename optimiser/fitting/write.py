"""The text of a calibrated damper file: new numbers, their errors, and the runs they come from."""

from collections.abc import Sequence

from optimiser.damper import Damper, Direction
from optimiser.fitting.calibrate import Calibration
from optimiser.fitting.damper_text import Change, Place, edited
from optimiser.fitting.parameters import FRICTION, GAS, Parameter, shaft_area_m2, value_of


def calibrated_text(
    text: str, result: Calibration, names: Sequence[str], moved: Sequence[Change] = ()
) -> str:
    """A damper file's ``text`` with the fitted numbers in place, comments kept.

    ``names``: one line of words for every file used, written on top; ``moved``: further changes,
    such as paths that must lead to the same file from a new folder. Raises BadInput.
    """
    return edited(text, [*changes_of(result), *moved], _heading(result, names))


def changes_of(result: Calibration) -> list[Change]:
    """Every fitted number as a change of the damper file. ``gas_offset_n`` is one only where the
    damper's curve shows the gas force: it becomes the charge pressure."""
    found = result.found
    changes = []
    for item, value, error, limit in zip(
        found.parameters, found.values, found.errors, found.at_limit, strict=True
    ):
        spread = "at its limit" if limit else f"standard error {error:.2g}"
        was = value_of(result.original, item.key, item.direction)
        if item.key != GAS:
            place = _place(result.original, item)
            changes.append(Change(place, _plain(value), f"fit: {spread}, was {was:.4g}"))
        elif result.original.gas_in_force:
            area = shaft_area_m2(result.original.body)
            remark = f"fit: standard error {1e-6 * error / area:.2g}, was {1e-6 * was / area:.4g}"
            changes.append(Change(("gas", "pressure_mpa"), _plain(1e-6 * value / area), remark))
    return changes


def _plain(value: float) -> str:
    """Five significant digits as a TOML float."""
    text = f"{value:.5g}"
    return text if "." in text or "e" in text else f"{text}.0"


def _place(damper: Damper, item: Parameter) -> Place:
    if item.key == FRICTION or item.direction is None:
        return (item.key,)
    return (item.direction, "valves", _searched(damper, item.direction), *item.key.split("."))


def _searched(damper: Damper, direction: Direction) -> int:
    valves = damper.circuit(direction).valves
    return next(number for number, valve in enumerate(valves) if valve.searched)


def _heading(result: Calibration, names: Sequence[str]) -> list[str]:
    lines = ["Calibrated to dyno runs; each fitted number has its standard error beside it."]
    for run, measured in zip(result.runs, result.measured, strict=True):
        stack = ", ".join(measured.stack.lines())
        lines.append(
            f"  {run.label}: {run.direction}, {run.clicks} clicks, oil {run.oil_temp_c:g} C, "
            f"{run.points} points, r.m.s. error {run.fitted_percent:.1f} %"
        )
        lines.append(f"    {stack}")
    left, new = result.left_out_percent, result.new_stack_percent
    if left is not None:
        lines.append(f"  A run left out of the fit was predicted within {left:.1f} % (r.m.s.).")
    if new is not None:
        lines.append(f"  A stack that no other run has was predicted within {new:.1f} % (r.m.s.).")
    if not result.original.gas_in_force:
        lines.append(f"  Gas force in the runs, not part of this file: {result.steady_n:.1f} N.")
    lines += [f"  {doubt.sentence}." for doubt in (*result.held, *result.doubts)]
    lines += [f"  {name}" for name in names]
    return [*lines, ""]
