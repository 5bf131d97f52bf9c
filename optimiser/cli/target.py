"""``shimwright target``: what is wanted, however it was said, and whether the damper can do it."""

from pathlib import Path
from typing import TYPE_CHECKING

from optimiser.cli.notes import note, note_when_preparing, print_document
from optimiser.cli.options import (
    DEFAULT_DAMPER,
    ChartOption,
    DamperOption,
    JsonOption,
    OilOption,
    OilTempOption,
    QuietOption,
    SteelOption,
    VelocitiesOption,
)
from optimiser.cli.wish_options import (
    CopyOption,
    CopyStaticOption,
    FeelOption,
    FittedClicksOption,
    FittedOption,
    FrameOption,
    HighOption,
    KneeOption,
    LowOption,
    MidOption,
    OutFileOption,
    ResampleOption,
    RiderKgOption,
    RiderOption,
    SagOption,
    TargetOption,
    WantedCircuitOption,
    wanted_from,
)
from optimiser.faults import BadInput

if TYPE_CHECKING:
    from optimiser.cli.inputs import Given
    from optimiser.prediction import Setup
    from optimiser.report.target import Seen
    from optimiser.wish import Wished


def target(
    damper: DamperOption = DEFAULT_DAMPER,
    circuit: WantedCircuitOption = None,
    target: TargetOption = None,
    copy: CopyOption = None,
    copy_static_n: CopyStaticOption = None,
    fitted: FittedOption = None,
    low: LowOption = None,
    mid: MidOption = None,
    high: HighOption = None,
    knee: KneeOption = None,
    clicks: FittedClicksOption = None,
    velocities: VelocitiesOption = None,
    rider_kg: RiderKgOption = None,
    rider: RiderOption = None,
    frame: FrameOption = None,
    feel: FeelOption = None,
    sag: SagOption = None,
    resample: ResampleOption = None,
    oil_temp_c: OilTempOption = None,
    steel: SteelOption = None,
    oil: OilOption = None,
    out: OutFileOption = None,
    chart: ChartOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """What is wanted, as a curve, and whether the damper can do it.

    Say it one way: points (--target), a measured damper to copy (--copy), a change of what is
    fitted (--low, --mid, --high, --knee), or --rider-kg, --frame and --feel. With none of these
    it is the bundled example, or what is fitted in another damper.
    """
    from optimiser.cli.inputs import parse_velocities, read_given
    from optimiser.report.chart import chart_format
    from optimiser.wanted.said import Said

    if chart is not None:
        chart_format(chart)
    if out is not None and out.suffix.lower() != ".csv":
        raise BadInput(f"--out: '{out}' ends in '{out.suffix or 'nothing'}'; allowed: .csv")
    said = Said(
        targets=tuple(target or ()),
        copies=tuple(copy or ()),
        copy_static_n=copy_static_n,
        fitted=tuple(fitted or ()),
        low_percent=low,
        mid_percent=mid,
        high_percent=high,
        knee_percent=knee,
        clicks=clicks,
        velocity_m_s=None if velocities is None else tuple(parse_velocities(velocities)),
        rider_kg=rider_kg,
        rider=rider,
        frame=frame,
        feel=feel,
        sag_percent=sag,
        resample=resample,
    )
    given = read_given(damper, steel, oil, oil_temp_c)
    note_when_preparing(quiet)
    setups, wished = wanted_from(said, given, circuit)
    seen = _held_against_limits(setups, wished)
    if out is not None:
        _save(out, seen, quiet)
    if chart is not None:
        _write_chart(chart, seen)
        note(f"chart written to {chart}", quiet)
    if json:
        _print_json(given, seen, wished, quiet)
    else:
        from optimiser.report.look import look_of
        from optimiser.report.target import show_target

        show_target(seen, wished, look_of(), quiet)


def _held_against_limits(setups: "list[Setup]", wished: "Wished") -> "list[Seen]":
    """Every target with the damper's limits. Raises BadInput for points that make no sense."""
    from optimiser.envelope import damper_limits
    from optimiser.report.target import Seen
    from optimiser.wanted.feasible import feasibility

    seen = []
    for setup, wanted, now in zip(setups, wished.targets, wished.now, strict=True):
        limits = damper_limits(setup, wanted.velocity_m_s)
        seen.append(Seen(setup, wanted, limits, feasibility(wanted, limits), now))
    faults = [
        f"{one.target.origin}, {one.setup.direction}: {one.feasible.far_outside}"
        for one in seen
        if one.feasible.far_outside is not None and wished.way in ("example", "points", "copy")
    ]
    if faults:
        raise BadInput(faults)
    return seen


def _save(path: Path, seen: "list[Seen]", quiet: bool) -> None:
    from optimiser.wanted_files import write_target

    for one in seen:
        file = path
        if len(seen) > 1:
            file = path.with_name(f"{path.stem}-{one.setup.direction}{path.suffix}")
        write_target(file, one.target)
        note(f"{one.setup.direction} target written to {file}", quiet)


def _write_chart(path: Path, seen: "list[Seen]") -> None:
    from optimiser.files import atomic_write_bytes
    from optimiser.report.chart import chart_bytes, chart_format
    from optimiser.report.target import panels_of

    atomic_write_bytes(path, chart_bytes(panels_of(seen), chart_format(path)))


def _print_json(given: "Given", seen: "list[Seen]", wished: "Wished", quiet: bool) -> None:
    from optimiser.report.target import target_document

    document = target_document(seen, wished)
    document["inputs"] = [vars(file) for file in given.files]
    print_document(document)
    for one in seen:
        for remark in one.target.notes:
            note(f"note: {one.setup.direction}: {remark}", quiet)
    for remark in wished.notes:
        note(f"note: {remark}", quiet)
