"""Program plans -> plain G-code, readings asked for -> a form to fill in, and how long it takes.

The G-code is the part that every controller understands: mm, absolute, XY plane, feed per minute, G0 G1 G4 M0 M2 M3 M5,
one space between words, comments in ( ), no line longer than 80 columns.
"""

from __future__ import annotations

import math
import textwrap
from collections.abc import Iterable, Iterator, Mapping
from decimal import Decimal

from gcodetool.inspection.measure_records import Move, Note, Pause, ProgramPlan, Spindle, Step, Visit
from gcodetool.lash.compensate import MEASURING

WIDTH = 80
WARNING = MEASURING


def program_text(plan: ProgramPlan, seconds: float | None = None) -> str:
    """The program, line feed at each line's end.  ``seconds`` is its estimated time, for the head."""
    head = [plan.title, WARNING, *plan.head]
    head.append(
        "Program positions: " + "; ".join(_bounds(axis, *ends) for axis, ends in sorted(plan_bounds(plan).items()))
    )
    if seconds is not None:
        head.append(f"Takes about {minutes(seconds)}")
    lines = [line for text in head for line in _comment(text)]
    lines.append("G21 G90 G17 G94")
    for step in plan.steps:
        lines += _step_lines(step)
    return "\n".join([*lines, "M2", ""])


def _bounds(axis: str, low: Decimal, high: Decimal) -> str:
    return f"{axis} {number(low)}" if low == high else f"{axis} from {number(low)} to {number(high)}"


def minutes(seconds: float) -> str:
    """A time in words, rounded to what an estimate is worth."""
    if seconds < 90:
        return f"{max(1, round(seconds))} s"
    whole = round(seconds / 60)
    return f"{whole} min" if whole < 120 else f"{whole // 60} h {whole % 60} min"


def _comment(text: str) -> list[str]:
    """The text as comment lines; parentheses would end the comment, so they become brackets."""
    plain = text.replace("(", "[").replace(")", "]").encode("ascii", "replace").decode()
    return [f"({line})" for line in textwrap.wrap(plain, WIDTH - 2)]


def _step_lines(step: Step) -> list[str]:
    if isinstance(step, Note):
        return _comment(step.text)
    if isinstance(step, Move):
        words = " ".join(letter + number(value) for letter, value in step.words)
        return [f"G0 {words}" if step.feed is None else f"G1 {words} F{step.feed.normalize():f}"]
    if isinstance(step, Spindle):
        return ["M5" if step.rpm is None else f"M3 S{step.rpm.normalize():f}"]
    return _pause_lines(step)


def _pause_lines(pause: Pause) -> list[str]:
    """The operator message of RS-274, then the stop or the dwell."""
    message = _comment("MSG," + pause.message)
    if len(message) != 1:
        raise ValueError(f"operator message longer than a line: {pause.message}")
    return [*message, "M0" if pause.seconds is None else f"G4 P{number(pause.seconds, 1)}"]


def number(value: Decimal, decimals: int = 3) -> str:
    """A plain decimal, always with a point: without one some controllers count in the last digit."""
    own = -int(value.as_tuple().exponent)
    return f"{value + 0:.{max(decimals, own)}f}" if value else f"{0:.{decimals}f}"


def form_text(visits: Iterable[Visit], axis: str, column: str, facts: Mapping[str, str]) -> str:
    """The form (CSV) for the readings, rows in the order of the program; ``column`` such as ``indicator_mm``."""
    lines = [f"# axis = {axis}", *(f"# {key} = {value}".rstrip() for key, value in facts.items())]
    lines += ["# One row per reading, in the order of the program. An empty cell is a missing reading."]
    unit = "deg" if axis in "ABC" else "mm"
    lines.append(f"run,direction,target_{unit},{column},note")
    for visit in visits:
        lines.append(f"{visit.run},{'up' if visit.direction > 0 else 'down'},{number(visit.target)},,")
    return "\n".join([*lines, ""])


def plan_seconds(
    plan: ProgramPlan, *, rapid: float, acceleration: float | None = None, per_stop: float = 10.0
) -> float:
    """Time of the program in seconds, each move from stop to stop.

    ``rapid`` in mm/min, ``acceleration`` in mm/s^2 (None: at once), ``per_stop`` the operator's seconds at an M0.  A
    move over a distance d at speed v takes d/v + v/a, or 2 sqrt(d/a) where it is too short to reach v (uniform
    acceleration). The way to the first position is unknown and left out.
    """
    place: dict[str, float] = {}
    total = 0.0
    for step in plan.steps:
        if isinstance(step, Move):
            total += _move_seconds(_distance(place, step), float(step.feed or rapid) / 60, acceleration)
            place.update((letter, float(value)) for letter, value in step.words)
        elif isinstance(step, Pause):
            total += per_stop if step.seconds is None else float(step.seconds)
    return total


def _distance(place: Mapping[str, float], move: Move) -> float:
    return math.hypot(*(float(value) - place.get(letter, float(value)) for letter, value in move.words))


def _move_seconds(distance: float, speed: float, acceleration: float | None) -> float:
    if not distance or acceleration is None:
        return distance / speed
    if distance < speed**2 / acceleration:
        return 2 * math.sqrt(distance / acceleration)
    return distance / speed + speed / acceleration


def plan_bounds(plan: ProgramPlan) -> dict[str, tuple[Decimal, Decimal]]:
    """Lowest and highest position of each axis the program moves."""
    bounds: dict[str, tuple[Decimal, Decimal]] = {}
    for letter, value in _positions(plan):
        low, high = bounds.get(letter, (value, value))
        bounds[letter] = min(low, value), max(high, value)
    return bounds


def _positions(plan: ProgramPlan) -> Iterator[tuple[str, Decimal]]:
    for step in plan.steps:
        if isinstance(step, Move):
            yield from step.words
