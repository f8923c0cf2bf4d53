"""Where and in which order the indicator is read: targets, cycles and the program that visits them (ISO 230-2).

Cycles: ``standard`` goes over all targets upwards, overruns, and comes back, run after run; it needs a scale that reads
the whole travel.  ``step`` does all runs at one target before it goes on, so that a dial indicator can be set anew at
each.  ``quick`` is one target only.
"""

from __future__ import annotations

import math
import random
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from decimal import Decimal
from itertools import pairwise

from gcodetool.errors import SheetError
from gcodetool.inspection.measure_records import Move, Note, Pause, ProgramPlan, Spindle, Step, Visit, Words
from gcodetool.machine import Axis

CYCLES = ("standard", "step", "quick")
GRID = Decimal("0.001")


@dataclass(frozen=True, slots=True)
class IndicatorRequest:
    """What the operator asked for; positions are those of the program, in mm or degrees.

    ``low`` and ``high`` bound every position the axis is sent to, overrun included.  ``others`` says where the other
    axes stand, ``reading_z`` is the height of the reading (None: at ``safe_z``), ``dwell`` the seconds at a reading
    (None: stop until the start button), ``period`` the length over which the error of the screw repeats, ``warm_up``
    the runs without readings, ``limits`` a line about the travel for the head.
    """

    axis: str
    low: Decimal
    high: Decimal
    cycle: str = "standard"
    count: int | None = None
    runs: int | None = None
    overrun: Decimal = Decimal(2)
    feed: Decimal = Decimal(300)
    dwell: Decimal | None = None
    seed: int = 1
    period: Decimal = Decimal(5)
    safe_z: Decimal = Decimal(5)
    others: Words = ()
    reading_z: Decimal | None = None
    warm_up: int = 1
    lash: Decimal = Decimal(0)
    limits: str = ""


def default_count(length: Decimal) -> int:
    """Targets that ISO 230-2 asks for: five per metre and never below five; over 2000 mm about one each 250 mm."""
    if length > 2000:
        return math.ceil(length / 250) + 1
    return max(5, math.ceil(length / 200))


def default_runs(length: Decimal) -> int:
    """Approaches from each side that ISO 230-2 asks for: five, and one over 2000 mm."""
    return 1 if length > 2000 else 5


def choose_targets(low: Decimal, high: Decimal, count: int, period: Decimal, seed: int) -> tuple[Decimal, ...]:
    """``count`` targets from ``low`` to ``high`` in ascending order, no two steps alike, on a grid of 0.001.

    P_i = (i - 1) p + r: each has its own random part r, up to one period of the screw's error or 0.8 p, so that the
    error that repeats with the screw is met at all its phases.  The same seed gives the same targets.
    """
    if count < 2:
        return (((low + high) / 2).quantize(GRID),)
    width = float(high - low)
    part = min(float(period), 0.8 * width / count)
    step = (width - part) / (count - 1)
    for attempt in range(100):
        # Only random(), whose series is the same in every version of Python.
        source = random.Random(seed + 1000 * attempt)
        places = [float(low) + i * step + part * source.random() for i in range(count)]
        targets = tuple(min(max(Decimal(place).quantize(GRID), low), high) for place in places)
        steps = [b - a for a, b in pairwise(targets)]
        if len(set(steps)) == len(steps) and min(steps) > 0:
            return targets
    raise SheetError(f"no {count} targets at unequal steps fit from {low} to {high}: ask for fewer, or give more room.")


def program_range(
    axis: Axis,
    *,
    low: Decimal | None = None,
    high: Decimal | None = None,
    centre: Decimal | None = None,
    overrun: Decimal = Decimal(2),
    margin: Decimal = Decimal(1),
    zero: Decimal | None = None,
) -> tuple[Decimal, Decimal, str]:
    """Lowest and highest position the axis may be sent to, in program coordinates, and a line about the travel.

    ``centre``: one overrun to either side of it.  Else ``low`` and ``high``; else the sheet's travel less the
    ``margin`` at both ends.  ``zero`` is the machine position of program zero, by default the low end of the travel.
    Raises SheetError where nothing is known of the travel, or the range does not fit into it.
    """
    if centre is not None:
        low, high = centre - overrun, centre + overrun
    elif low is None and high is None and axis.travel is not None:
        zero = axis.travel[0] if zero is None else zero
        low, high = axis.travel[0] - zero + margin, axis.travel[1] - zero - margin
    if low is None or high is None:
        raise SheetError(f"axis {axis.letter}: give --from and --to, or a sheet that states its travel.")
    return low, high, _check_travel(axis, low, high, zero)


def _check_travel(axis: Axis, low: Decimal, high: Decimal, zero: Decimal | None) -> str:
    """What the operator must know about the limits; raises SheetError where the range cannot fit."""
    if axis.travel is None:
        return "The sheet states no travel: see that the way below fits the machine"
    ends = f"Machine travel {axis.travel[0]} to {axis.travel[1]}"
    if high - low > axis.travel[1] - axis.travel[0]:
        raise SheetError(
            f"axis {axis.letter}: from {low} to {high} is more than its travel {axis.travel[1] - axis.travel[0]}."
        )
    if zero is None:
        return f"{ends}; set zero so that the way below fits"
    if low + zero < axis.travel[0] or high + zero > axis.travel[1]:
        place = f"{low + zero} to {high + zero} in machine coordinates"
        raise SheetError(f"axis {axis.letter}: {place} leaves the travel {axis.travel[0]} to {axis.travel[1]}.")
    return f"{ends}; set {axis.letter} zero at machine {zero}"


def indicator_plan(request: IndicatorRequest) -> tuple[ProgramPlan, tuple[Visit, ...]]:
    """The program and its readings in the order they are taken.  Raises SheetError where the request cannot be met."""
    _check(request)
    targets = _targets(request)
    length = request.high - request.low
    runs = request.runs or default_runs(length)
    visits = tuple(_visits(request, targets, runs))
    steps: list[Step] = [*_start(request, targets)]
    body = _standard if request.cycle == "standard" else _stepwise
    steps += body(request, targets, visits)
    steps.append(
        Move((("Z", request.safe_z),)) if request.axis != "Z" else Move((("Z", max(request.safe_z, request.high)),))
    )
    return ProgramPlan(_title(request), _head(request, targets, runs), tuple(_moving(steps))), visits


def _moving(steps: Iterable[Step]) -> Iterator[Step]:
    """The steps without moves to where the machine already stands."""
    place: dict[str, Decimal] = {}
    for step in steps:
        if isinstance(step, Move):
            if all(place.get(letter) == value for letter, value in step.words):
                continue
            place.update(step.words)
        yield step


def _check(request: IndicatorRequest) -> None:
    axis = request.axis
    if request.cycle not in CYCLES:
        raise SheetError(f"cycle {request.cycle!r}: the cycles are {', '.join(CYCLES)}.")
    if request.overrun <= 2 * request.lash or request.overrun <= 0:
        raise SheetError(f"axis {axis}: an overrun of {request.overrun} does not cross the lash safely: give more.")
    if request.high - request.low < 2 * request.overrun:
        raise SheetError(f"axis {axis}: from {request.low} to {request.high} is no room for the overrun at both ends.")
    if request.feed <= 0 or (request.dwell is not None and request.dwell <= 0):
        raise SheetError("the feed and the dwell must be more than 0.")
    if not (1 <= _or_one(request.count) <= 1000 and 1 <= _or_one(request.runs) <= 1000 and 0 <= request.warm_up <= 100):
        raise SheetError("the numbers of targets and runs must be 1 to 1000, warm-up runs 0 to 100.")
    if request.reading_z is not None and request.reading_z > request.safe_z:
        raise SheetError(f"the reading height {request.reading_z} is above the clearance height {request.safe_z}.")


def _or_one(number: int | None) -> int:
    return 1 if number is None else number


def _targets(request: IndicatorRequest) -> tuple[Decimal, ...]:
    low, high = request.low + request.overrun, request.high - request.overrun
    count = 1 if request.cycle == "quick" else request.count or default_count(request.high - request.low)
    return choose_targets(low, high, count, request.period, request.seed)


def _visits(request: IndicatorRequest, targets: tuple[Decimal, ...], runs: int) -> Iterator[Visit]:
    numbered = list(enumerate(targets, 1))
    if request.cycle != "standard":
        for index, target in numbered:
            for run in range(1, runs + 1):
                yield Visit(index, target, run, 1)
                yield Visit(index, target, run, -1)
        return
    for run in range(1, runs + 1):
        yield from (Visit(index, target, run, 1) for index, target in numbered)
        yield from (Visit(index, target, run, -1) for index, target in reversed(numbered))


def _start(request: IndicatorRequest, targets: tuple[Decimal, ...]) -> Iterator[Step]:
    """Spindle off, a stop before anything moves, Z up, then the other axes and the start of the axis by rapids."""
    begin, end = targets[0] - request.overrun, targets[-1] + request.overrun
    others = dict(request.others)
    yield Spindle()
    yield Pause(f"{request.axis} goes from {begin} to {end}, Z first to {request.safe_z}: way clear?")
    yield Move((("Z", max(request.safe_z, request.high) if request.axis == "Z" else request.safe_z),))
    words = {"X": Decimal(0), "Y": Decimal(0), **others}
    if request.axis != "Z":
        words[request.axis] = begin
    yield Move(tuple(sorted(words.items(), key=lambda word: "XYZABC".index(word[0]))))
    if request.axis != "Z" and request.reading_z is not None:
        yield Pause(f"Way clear? Z goes down to {request.reading_z}")
        yield Move((("Z", request.reading_z),), request.feed)
    if request.axis == "Z":
        yield Pause(f"Way clear? Z goes down to {begin}")
        yield Move((("Z", begin),), request.feed)


def _standard(request: IndicatorRequest, targets: tuple[Decimal, ...], visits: tuple[Visit, ...]) -> Iterator[Step]:
    axis, below, above = request.axis, targets[0] - request.overrun, targets[-1] + request.overrun
    yield Pause(f"Set up the scale or laser along {axis}, set zero")
    for _ in range(request.warm_up):
        yield _go(request, above)
        yield _go(request, below)
    previous = 1
    for number, visit in enumerate(visits, 1):
        if visit.direction != previous:
            yield _go(request, above if visit.direction < 0 else below)
        previous = visit.direction
        yield _go(request, visit.target)
        yield _read(request, visit, number, len(visits))
    yield _go(request, below)


def _stepwise(request: IndicatorRequest, targets: tuple[Decimal, ...], visits: tuple[Visit, ...]) -> Iterator[Step]:
    """All readings at one target, each from an overrun away; the indicator is set anew at each target."""
    place: Decimal | None = None
    for number, visit in enumerate(visits, 1):
        if visit.target != place:
            yield from _new_target(request, visit, len(targets), first=place is None)
            place = visit.target
        yield _go(request, visit.target - visit.direction * request.overrun)
        yield _go(request, visit.target)
        yield _read(request, visit, number, len(visits))


def _new_target(request: IndicatorRequest, visit: Visit, count: int, *, first: bool) -> Iterator[Step]:
    if not first:
        yield Pause("Take the indicator away, the axis goes on")
    yield Note(f"target {visit.index} of {count}: {request.axis} {visit.target}")
    yield _go(request, visit.target - request.overrun)
    yield _go(request, visit.target)
    yield Pause(f"Set indicator: {request.axis} {visit.target}, tip half pressed in")
    for _ in range(request.warm_up):
        yield _go(request, visit.target + request.overrun)
        yield _go(request, visit.target - request.overrun)


def _go(request: IndicatorRequest, position: Decimal) -> Move:
    return Move(((request.axis, position),), request.feed)


def _read(request: IndicatorRequest, visit: Visit, number: int, total: int) -> Pause:
    side = "up" if visit.direction > 0 else "down"
    return Pause(f"Read {request.axis} {visit.target} {side}, run {visit.run}, {number} of {total}", request.dwell)


def _title(request: IndicatorRequest) -> str:
    return f"Lash test of axis {request.axis} with an indicator, {request.cycle} cycle"


def _head(request: IndicatorRequest, targets: tuple[Decimal, ...], runs: int) -> tuple[str, ...]:
    """What the operator must know before the start button, one line each."""
    unit = "degrees" if request.axis in "ABC" else "mm"
    lines = [
        "Run it as it is: a compensated copy would hide what is to be measured",
        f"Targets: {len(targets)}, runs from each side: {runs}, overrun {request.overrun} {unit}, feed {request.feed}",
        request.limits,
        f"Clearance: Z at {request.safe_z} must clear work and clamps everywhere",
        _reach(request, unit),
        "Spindle off and power off to its motor. Hands off while an axis moves",
        "The start button moves the axis again after each stop",
        "Read without leaning on the machine. Run the machine warm first",
    ]
    if request.dwell is not None:
        lines.append(f"Each reading waits {request.dwell} seconds: G4 P in seconds; where P is ms, change it")
    return tuple(line for line in lines if line)


def _reach(request: IndicatorRequest, unit: str) -> str:
    if request.cycle == "standard":
        return "This cycle needs a scale or laser over the whole way, no dial indicator"
    reach = 2 * request.overrun + request.lash
    return f"The indicator must yield {reach} {unit} in all, its tip pressed in half way"
