"""The commands of ``measure`` that write programs: indicator test, vernier coupon, tongue coupon."""

from __future__ import annotations

import contextlib
from collections.abc import Iterable
from decimal import Decimal, InvalidOperation
from typing import TYPE_CHECKING, Annotated, Any

import typer

from gcodetool.cli.options import ForceOption, MachineOption, OutputOption, machine_from
from gcodetool.cli.streams import draft
from gcodetool.cli.terminal import say
from gcodetool.errors import SheetError
from gcodetool.machine import LETTERS, Axis, Machine

if TYPE_CHECKING:
    from gcodetool.inspection.measure_records import ProgramPlan, Words

ASSUMED_RAPID = Decimal(1000)


def decimal(text: str) -> Decimal:
    """An exact number of an option; raises typer.BadParameter with the way out."""
    try:
        number = Decimal(text)
    except InvalidOperation:
        number = Decimal("nan")
    if not number.is_finite() or abs(number) > 100000 or int(number.as_tuple().exponent) < -6:
        raise typer.BadParameter(f"{text} is no number; write a bare number in mm or degrees, such as 0.02")
    return number


def _number(*names: str, text: str) -> Any:
    return typer.Option(*names, parser=decimal, metavar="N", help=text)


SafeZOption = Annotated[Decimal, _number("--safe-z", text="Height in mm that clears work and clamps.")]
FeedOption = Annotated[Decimal, _number("--feed", text="Feed in mm/min.")]
PlungeOption = Annotated[Decimal, _number("--plunge", text="Feed into the work, mm/min.")]
SpindleOption = Annotated[
    Decimal | None, _number("--spindle", text="Spindle speed, 1/min; without it the program stops for you to start it.")
]
LargestOption = Annotated[Decimal, _number("--largest", text="Largest lash to be read, mm.")]
DepthOption = Annotated[Decimal, _number("--depth", text="Depth below Z 0, mm.")]
XOption = Annotated[Decimal, _number("--x", text="Lowest X of the coupon, mm.")]
YOption = Annotated[Decimal, _number("--y", text="Lowest Y of the coupon, mm.")]
CouponAxesOption = Annotated[
    list[str] | None, typer.Option("--axis", metavar="AXIS", help="x or y; repeatable; both if not said.")
]


def indicator(
    axis: Annotated[str, typer.Argument(metavar="AXIS", help="The axis to test: x y z a b c.")],
    output: OutputOption = "-",
    form: Annotated[str | None, typer.Option("--form", metavar="FILE", help="Write the readings form (CSV).")] = None,
    machine: MachineOption = None,
    cycle: Annotated[str, typer.Option("--cycle", help="standard, step or quick; see the docs.")] = "standard",
    low: Annotated[Decimal | None, _number("--from", text="Lowest program position it may go to.")] = None,
    high: Annotated[Decimal | None, _number("--to", text="Highest program position it may go to.")] = None,
    place: Annotated[Decimal | None, _number("--at", text="Quick cycle: the one place; 0 if not said.")] = None,
    targets: Annotated[
        int | None, typer.Option("--targets", help="Number of targets; by ISO 230-2 if not said.")
    ] = None,
    runs: Annotated[int | None, typer.Option("--runs", help="Approaches from each side; 5 if not said.")] = None,
    overrun: Annotated[Decimal, _number("--overrun", text="Way past a target before turning.")] = Decimal(2),
    feed: FeedOption = Decimal(300),
    dwell: Annotated[Decimal | None, _number("--dwell", text="Seconds at a reading; without it: a stop.")] = None,
    period: Annotated[Decimal, _number("--period", text="Way in which the screw's error repeats.")] = Decimal(5),
    seed: Annotated[int, typer.Option("--seed", help="Another number gives other targets.")] = 1,
    warm_up: Annotated[int, typer.Option("--warm-up", help="Runs without readings before the first.")] = 1,
    safe_z: SafeZOption = Decimal(5),
    reading_z: Annotated[Decimal | None, _number("--reading-z", text="Height of the reading, mm.")] = None,
    stand: Annotated[
        list[str] | None, typer.Option("--stand", metavar="AXIS=POS", help="Where another axis stands, as y=20.")
    ] = None,
    zero: Annotated[
        Decimal | None, _number("--zero", text="Machine position of program zero; low end of travel if not said.")
    ] = None,
    margin: Annotated[Decimal, _number("--margin", text="Clear way at both ends of the travel.")] = Decimal(1),
    instrument_digit: Annotated[Decimal, _number("--resolution", text="Last digit of the indicator, mm.")] = Decimal(
        "0.01"
    ),
    per_reading: Annotated[Decimal, _number("--seconds", text="Your seconds at a stop, for the estimate.")] = Decimal(
        10
    ),
    force: ForceOption = False,
) -> None:
    """Write a program that visits targets from both sides, as ISO 230-2 asks, and the form for the readings."""
    from gcodetool.inspection import measure_targets
    from gcodetool.inspection.measure_gcode import form_text

    letter, sheet = _axis(axis), machine_from(machine)
    centre = (place or Decimal(0)) if cycle == "quick" else None
    low, high, limits = measure_targets.program_range(
        sheet.axis(letter), low=low, high=high, centre=centre, overrun=overrun, margin=margin, zero=zero
    )
    request = measure_targets.IndicatorRequest(
        letter,
        low,
        high,
        cycle=cycle,
        count=targets,
        runs=runs,
        overrun=overrun,
        feed=feed,
        dwell=dwell,
        seed=seed,
        period=period,
        safe_z=safe_z,
        others=_stands(stand or (), letter),
        reading_z=reading_z,
        warm_up=warm_up,
        lash=sheet.axis(letter).lash,
        limits=limits,
    )
    plan, visits = measure_targets.indicator_plan(request)
    unit = "deg" if sheet.axis(letter).rotary else "mm"
    column = f"position_{unit}" if cycle == "standard" else f"indicator_{unit}"
    sheet_of_paper = form_text(visits, letter, column, {"resolution": str(instrument_digit), "accuracy": ""})
    with draft(form or "-", force=force) if form else contextlib.nullcontext() as paper:
        _write_program(plan, sheet, output, force, per_reading)
        if paper is not None:
            paper.write(sheet_of_paper.encode())
            paper.release()
    if form is None:
        say("no form was asked for; --form readings.csv writes it")


def vernier(
    output: OutputOption = "-",
    axis: CouponAxesOption = None,
    machine: MachineOption = None,
    step: Annotated[Decimal, _number("--step", text="Lash of one line, mm.")] = Decimal("0.02"),
    largest: LargestOption = Decimal("0.5"),
    pitch: Annotated[
        Decimal | None, _number("--pitch", text="Distance of main lines, mm; as small as may be if not said.")
    ] = None,
    depth: DepthOption = Decimal("0.1"),
    tip: Annotated[Decimal, _number("--tip", text="Width of the tool's tip, mm.")] = Decimal("0.1"),
    angle: Annotated[Decimal, _number("--angle", text="Full angle of the tool's tip, degrees.")] = Decimal(60),
    feed: FeedOption = Decimal(200),
    plunge: PlungeOption = Decimal(60),
    safe_z: SafeZOption = Decimal(5),
    spindle: SpindleOption = None,
    numbers: Annotated[bool, typer.Option("--numbers/--no-numbers", help="Engrave the numbers of long lines.")] = True,
    x: XOption = Decimal(0),
    y: YOption = Decimal(0),
    force: ForceOption = False,
) -> None:
    """Write a program that engraves a vernier: the line that runs straight through both scales reads the lash."""
    from gcodetool.inspection.coupon_vernier import VernierRequest, vernier_plan

    request = VernierRequest(
        _axes(axis), step, largest, pitch, depth, tip, angle, feed, plunge, safe_z, spindle, numbers, x, y
    )
    _write_program(vernier_plan(request), machine_from(machine), output, force)
    say(f"read the line that runs straight through, then: gcodetool measure read x --line K --step {step}")


def tongues(
    output: OutputOption = "-",
    axis: CouponAxesOption = None,
    machine: MachineOption = None,
    cutter: Annotated[Decimal, _number("--cutter", text="Diameter of the cutter, mm.")] = Decimal(3),
    width: Annotated[Decimal, _number("--width", text="Nominal width of the tongues, mm.")] = Decimal(8),
    length: Annotated[Decimal, _number("--length", text="Length of the tongues, mm.")] = Decimal(12),
    slot: Annotated[Decimal, _number("--slot", text="Width of the slots for the caliper's jaws, mm.")] = Decimal(6),
    depth: DepthOption = Decimal(3),
    stepdown: Annotated[Decimal, _number("--stepdown", text="Depth of one pass, mm.")] = Decimal("0.5"),
    leave: Annotated[Decimal, _number("--leave", text="Metal left for the finishing pass, mm.")] = Decimal("0.2"),
    largest: LargestOption = Decimal("0.5"),
    feed: FeedOption = Decimal(200),
    plunge: PlungeOption = Decimal(60),
    safe_z: SafeZOption = Decimal(5),
    spindle: SpindleOption = None,
    x: XOption = Decimal(0),
    y: YOption = Decimal(0),
    force: ForceOption = False,
) -> None:
    """Write a program that cuts three tongues: what a caliper reads differs by the lash, whatever the cutter."""
    from gcodetool.inspection.coupon_tongues import TonguesRequest, tongues_plan

    request = TonguesRequest(
        _axes(axis), cutter, width, length, slot, depth, stepdown, leave, largest, feed, plunge, safe_z, spindle, x, y
    )
    _write_program(tongues_plan(request), machine_from(machine), output, force)
    say("measure the tongues, then: gcodetool measure read x --wide W --same W --narrow W")


def _axis(text: str) -> str:
    if text.upper() not in LETTERS:
        raise SheetError(f"axis {text}: the axes are {' '.join(LETTERS)}.")
    return text.upper()


def _axes(given: list[str] | None) -> tuple[str, ...]:
    return tuple(_axis(each) for each in given or ("x", "y"))


def _stands(texts: Iterable[str], tested: str) -> Words:
    """Texts such as ``y=20`` as words; the axis that is tested and Z have their own options."""
    words = []
    for text in texts:
        letter, equals, value = text.partition("=")
        if not equals or _axis(letter.strip()) in (tested, "Z"):
            raise SheetError(
                f"--stand {text}: write another axis than {tested} and Z, = and its position: --stand y=20"
            )
        words.append((_axis(letter.strip()), decimal(value.strip())))
    return tuple(words)


def _write_program(
    plan: ProgramPlan, machine: Machine, output: str, force: bool, per_stop: Decimal = Decimal(10)
) -> None:
    """Check the plan against the travel, write it, and say how long it takes."""
    from gcodetool.inspection.measure_gcode import minutes, plan_bounds, plan_seconds, program_text

    bounds = plan_bounds(plan)
    for letter, (low, high) in bounds.items():
        _check_travel(machine.axis(letter), high - low)
    axes = [machine.axis(letter) for letter in bounds]
    rapid = min((axis.max_feed for axis in axes if axis.max_feed), default=ASSUMED_RAPID)
    acceleration = min((axis.acceleration for axis in axes if axis.acceleration), default=None)
    seconds = plan_seconds(
        plan,
        rapid=float(rapid),
        acceleration=None if acceleration is None else float(acceleration),
        per_stop=float(per_stop),
    )
    with draft(output, force=force) as program:
        program.write(program_text(plan, seconds).encode())
        program.release()
    say(f"takes about {minutes(seconds)}, of a stop {per_stop} s; rapids at {rapid} mm/min")


def _check_travel(axis: Axis, way: Decimal) -> None:
    if axis.travel is not None and way > axis.travel[1] - axis.travel[0]:
        length = axis.travel[1] - axis.travel[0]
        raise SheetError(f"axis {axis.letter}: the program needs {way} of its travel of {length}; make it smaller.")
