"""Bench sheets made of plain numbers, without the model: usual, crowded and hostile ones."""

from dataclasses import replace

import numpy as np

from optimiser.report.curve_line import CurveLine
from optimiser.report.sheet import (
    Errors,
    Exchange,
    Fact,
    ForceRow,
    Opening,
    Piston,
    Sheet,
    Source,
    Step,
    Worked,
)
from optimiser.report.sheet_table import KitLine, TuneCell, TuneColumn, TunePage, TuneRow
from optimiser.stack import Shim

HOSTILE = '<script>alert("1")</script>--><b x=\'&quot;'
PISTON = Piston(12.0, 27.0, 38.0, 39.0, 1.0, 0.0, 1.8, 6.0)
VELOCITY = np.array([0.05, 0.1, 0.2, 0.35, 0.5, 0.75, 1.0])
FORCE = 200.0 + 1000.0 * VELOCITY


def usual() -> Sheet:
    """Two stages, bins, target, click range, a measured run."""
    steps = (
        Step(2, Shim(40, 0.2), "face", ("A 1",), 7, (), (Worked(500, 0.7), Worked(480, 0.65))),
        Step(1, Shim(34, 0.15), "shim", ("A 2",), 3, (0.152,), (Worked(300, 0.4),)),
        Step(1, Shim(22, 0.1), "crossover", ("B 1",), 0, (), (Worked(100, 0.1),), 0.1),
        Step(1, Shim(36, 0.2), "shim", ("A 3", "A 4"), 5, (), (Worked(900, 1.2),)),
        Step(2, Shim(20, 0.3), "clamp", ("C 9",), 4),
    )
    rows = tuple(
        ForceRow(float(v), float(f), float(f) * 1.02, 0.9 * float(f), 1.1 * float(f))
        for v, f in zip(VELOCITY, FORCE, strict=True)
    )
    lines = (
        CurveLine("wanted", VELOCITY, 1.02 * FORCE, "target"),
        CurveLine("predicted", VELOCITY, FORCE, "predicted", 0.9 * FORCE, 1.1 * FORCE),
        CurveLine("measured: run.csv", VELOCITY, 1.04 * FORCE, "measured"),
    )
    return Sheet(
        title="rear-monotube",
        subtitle="wanted: example \u00b7 stack 1 of 8",
        direction="compression",
        clicks=9,
        clicks_range=22,
        facts=(Fact("oil", "light, 40 \u00b0C"), Fact("gas, shaft out", "1.4 MPa")),
        piston=PISTON,
        steps=steps,
        height_mm=1.45,
        rows=rows,
        lines=lines,
        opening=Opening(VELOCITY, 0.4 * VELOCITY, 0.05 / VELOCITY),
        source=Source("shimwright", "shimwright find", 3, (Fact("damper rear", "0123456789ab"),)),
        stock_name="workshop",
        errors=Errors(2.0, -2.0, 0.1, 2.0, 1.9, None, 0.14, 0.37),
        exchange=Exchange(("1 x 36 x 0.20",), ("1 x 34 x 0.15",)),
        warnings=("fatigue: at least one shim is worked beyond its endurance limit",),
        spread_n=(0.95 * FORCE, 1.05 * FORCE),
    )


def plain() -> Sheet:
    """No adjuster, no stock, no target, a dished seat."""
    sheet = usual()
    return replace(
        sheet,
        clicks=0,
        clicks_range=0,
        piston=replace(PISTON, seat_height_mm=0.15),
        steps=tuple(replace(step, bins=(), left=None, measured_mm=()) for step in sheet.steps),
        rows=tuple(ForceRow(row.velocity_m_s, row.predicted_n) for row in sheet.rows),
        lines=(CurveLine("predicted", VELOCITY, FORCE),),
        source=Source("shimwright"),
        stock_name=None,
        errors=None,
        exchange=None,
        warnings=(),
        spread_n=None,
    )


def crowded() -> Sheet:
    """As much of everything as a sheet must hold: names, groups, warnings, points."""
    sheet = usual()
    name = "a name as long as a damper file allows, which nobody would give to a real one, 80 c"[
        :80
    ]
    sizes = [42, 42, 40, 40, 38, 38, 36, 22, 40, 38, 36, 34, 32, 30, 28, 26]
    steps = tuple(
        Step(
            3 if place % 3 == 0 else 1,
            Shim(float(outer), 0.15 + 0.05 * (place % 2)),
            "face" if place == 0 else "crossover" if outer == 22 else "shim",
            ("tall cabinet, third drawer, tray 12", "the tin beside it"),
            100,
            (0.152,),
            (Worked(1234, 1.34),) * (3 if place % 3 == 0 else 1),
            0.1 if outer == 22 else None,
        )
        for place, outer in enumerate(sizes)
    )
    many = np.geomspace(0.02, 4.0, 60)
    rows = tuple(ForceRow(float(v), 9000.0 * v, 9100.0 * v, 8000.0 * v, 9999.0 * v) for v in many)
    facts = tuple(Fact(f"fact {n}", "some words about a frame or a spring") for n in range(10))
    inputs = tuple(Fact(f"kind a-file-name-of-some-length-{n}", "0123456789ab") for n in range(7))
    return replace(
        sheet,
        title=name,
        subtitle=f"wanted: {name} \u00b7 stack 1 of 100",
        facts=facts,
        steps=(*steps, Step(4, Shim(18, 0.3), "clamp", ("C 9",), 4)),
        rows=rows,
        exchange=Exchange(("1 x 36 x 0.20",) * 8, ("1 x 34 x 0.15",) * 8),
        warnings=("a long sentence that says what is wrong with this stack, and why; " * 3,) * 9,
        source=Source("shimwright 0.1.0", "shimwright find --target a-file.csv " * 4, 7, inputs),
    )


def overfull() -> Sheet:
    """Twice as many groups as the crowded one."""
    sheet = crowded()
    *most, clamp = sheet.steps
    return replace(sheet, steps=(*most, *most, clamp))


def hostile() -> Sheet:
    """Texts that would be code if they were not escaped."""
    sheet = usual()
    return replace(
        sheet,
        title=HOSTILE,
        subtitle=HOSTILE,
        facts=(Fact(HOSTILE, HOSTILE),),
        steps=tuple(replace(step, bins=(HOSTILE,)) for step in sheet.steps),
        lines=tuple(replace(line, label=HOSTILE) for line in sheet.lines),
        source=Source(HOSTILE, HOSTILE, 0, (Fact(HOSTILE, HOSTILE),)),
        stock_name=HOSTILE,
        exchange=Exchange((HOSTILE,), (HOSTILE,)),
        warnings=(HOSTILE,),
    )


def tune_page(masses: int = 8, feels: int = 3, groups: int = 8) -> TunePage:
    """A tune table for both circuits."""
    columns = tuple(
        TuneColumn(circuit, f"feel {n}")
        for circuit in ("compression", "rebound")
        for n in range(feels)
    )
    stack = tuple(f"2 x {40 - 2 * n} x 0.20" for n in range(groups))
    marks = ("outside the model",)
    change = ("take out 1 x 40 x 0.15", "put in 1 x 34 x 0.20")
    rows = tuple(
        TuneRow(
            f"{58 + 8 * row} kg",
            "coil 82.4 N/mm",
            tuple(
                None
                if (row, place) == (1, 1)
                else TuneCell(stack, 9, 2.3, 0.8, change if row else (), marks if row == 2 else ())
                for place in range(len(columns))
            ),
        )
        for row in range(masses)
    )
    kit = tuple(KitLine(f"{18 + n} x 0.20", 3, f"tall cabinet {n}-1", 5, n % 2) for n in range(24))
    facts = (("frame", "forest motorcycle"), ("damper", "rear-monotube"), ("seed", "0"))
    return TunePage(
        "opening table", facts, columns, rows, kit, "72 shims build any cell", ("note",)
    )
