"""A vernier that reads the lash: main lines are reached moving towards plus, vernier lines moving towards minus.

Main line k stands at k p, vernier line k at k (p - r).  Lash B holds every line reached towards plus back by B
against those reached towards minus, so the lines that meet are those with k p - B = k (p - r): k = B / r.  Every line
is cut in the same direction of the other axis, which was taken up in that direction before: nothing but the lash of
the one axis differs.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from decimal import ROUND_CEILING, Decimal

from gcodetool.errors import SheetError
from gcodetool.inspection.measure_records import Move, Note, Pause, ProgramPlan, Spindle, Step

SPARE = 2  # lines beyond either end, so that the eye has neighbours to compare
GAP = Decimal(8)


@dataclass(frozen=True, slots=True)
class VernierRequest:
    """What the operator asked for; mm, mm/min, degrees.

    ``step`` is the lash of one line, ``largest`` the largest lash to be read, ``pitch`` the distance of main lines
    (None: as small as it may be), ``tip`` the width of the tool's tip and ``angle`` its full angle (0: straight
    sides).  ``x`` and ``y`` are the corner of the coupon with the lowest coordinates.
    """

    axes: tuple[str, ...] = ("X", "Y")
    step: Decimal = Decimal("0.02")
    largest: Decimal = Decimal("0.5")
    pitch: Decimal | None = None
    depth: Decimal = Decimal("0.1")
    tip: Decimal = Decimal("0.1")
    angle: Decimal = Decimal(60)
    feed: Decimal = Decimal(200)
    plunge: Decimal = Decimal(60)
    safe_z: Decimal = Decimal(5)
    rpm: Decimal | None = None
    numbers: bool = True
    x: Decimal = Decimal(0)
    y: Decimal = Decimal(0)

    @property
    def last(self) -> int:
        """Number of the line that reads the largest lash."""
        return math.ceil(self.largest / self.step)

    @property
    def spacing(self) -> Decimal:
        """Distance of main lines: over it the vernier would read the same again, so it exceeds the whole range."""
        if self.pitch is not None:
            return self.pitch
        least = max(Decimal(1), (self.last + 2 * SPARE + 2) * self.step, 3 * self.line_width)
        return (2 * least).to_integral_value(ROUND_CEILING) / 2

    @property
    def line_width(self) -> Decimal:
        """Width of an engraved line at the surface: tip + 2 depth tan(angle / 2)."""
        return self.tip + 2 * self.depth * Decimal(math.tan(math.radians(float(self.angle) / 2))).quantize(
            Decimal("1e-6")
        )

    @property
    def overrun(self) -> Decimal:
        """Way past a line before it is approached; it crosses any lash to be read."""
        return self.largest + 1


def coinciding_line(lash: Decimal, step: Decimal) -> Decimal:
    """Number of the line that meets its partner for that lash, a fraction where two lines are nearly right."""
    return lash / step


def vernier_plan(request: VernierRequest) -> ProgramPlan:
    """The program that engraves the coupon.  Raises SheetError where the coupon could not be read."""
    _check(request)
    steps: list[Step] = [Spindle(), Move((("Z", request.safe_z),)), Move((("X", request.x), ("Y", request.y)))]
    if request.rpm is None:
        steps.append(Pause("Tool set, spindle on if the tool needs it?"))
    else:
        steps.append(Spindle(request.rpm))
    start = request.x, request.y
    for axis in request.axes:
        steps += _Scale(request, axis, *start).steps()
        # The next pattern stands beside this one, clear of its lines.
        start = request.x + _extent(request, axis)[0] + GAP, request.y
    steps += [Move((("Z", request.safe_z),)), Spindle()]
    return ProgramPlan(f"Vernier coupon for the lash of {' and '.join(request.axes)}", _head(request), tuple(steps))


def _check(request: VernierRequest) -> None:
    if (
        any(axis not in ("X", "Y") for axis in request.axes)
        or not request.axes
        or len(set(request.axes)) < len(request.axes)
    ):
        raise SheetError("a vernier coupon reads X and Y only; for another axis use an indicator.")
    for name in ("step", "largest", "depth", "tip", "feed", "plunge", "safe_z"):
        if getattr(request, name) <= 0:
            raise SheetError(f"{name.replace('_', ' ')} must be more than 0.")
    if not 0 <= request.angle < 170:
        raise SheetError(f"a tool angle of {request.angle} degrees engraves no line; give the full angle, 0 to 170.")
    if request.step < Decimal("0.005"):
        raise SheetError(f"a step of {request.step} mm cannot be told apart by eye: take 0.01 or more.")
    if request.last > 200:
        raise SheetError(f"{request.last} lines are too many to count: take a larger step or a smaller largest lash.")
    if request.spacing <= (request.last + 2 * SPARE + 1) * request.step:
        raise SheetError(
            f"a pitch of {request.spacing} mm would let two lines meet: leave it out, or take a larger one."
        )
    if 2 * request.line_width > request.spacing:
        raise SheetError(
            f"lines {request.line_width:.3f} mm wide run together: engrave less deep, or take a sharper tool."
        )


def _tick(line: int) -> Decimal:
    """Length of a line: every fifth is long, every tenth longest, to count by."""
    return Decimal(6) if line % 10 == 0 else Decimal("4.5") if line % 5 == 0 else Decimal(3)


def _extent(request: VernierRequest, axis: str) -> tuple[Decimal, Decimal]:
    """Size of one pattern along X and Y."""
    along = (request.last + 2 * SPARE) * request.spacing
    across = Decimal(12) + (_DIGIT_GAP + _DIGIT_HEIGHT if request.numbers else 0)
    return (along, across) if axis == "X" else (across, along)


def _head(request: VernierRequest) -> tuple[str, ...]:
    return (
        f"One line is {request.step} mm of lash, 0 to {request.last * request.step} mm, pitch {request.spacing} mm",
        "Count from line 0, the first longest one behind two short lines",
        "Main scale: lower or left half. Vernier: upper or right half",
        "The number of the line that runs straight through both reads the lash",
        f"Z 0 is the top of the work. Lines {request.depth} deep, about {request.line_width:.2f} wide",
        f"Clearance: Z at {request.safe_z} must clear work and clamps everywhere",
        "Clamp a flat, faced plate: lines of equal depth are easier to read",
        "Light cuts only: a heavy one drags the axis across its lash",
        "Wear eye protection. Hands off while the tool turns or an axis moves",
    )


_DIGIT_GAP, _DIGIT_WIDTH, _DIGIT_HEIGHT = Decimal(1), Decimal("1.2"), Decimal(2)
# Strokes of the digits on a grid of 2 x 3 points: column 0 or 1, row 0 to 2.
_STROKES: dict[str, tuple[tuple[tuple[int, int], ...], ...]] = {
    "0": (((0, 0), (1, 0), (1, 2), (0, 2), (0, 0)),),
    "1": (((1, 0), (1, 2)),),
    "2": (((1, 0), (0, 0), (0, 1), (1, 1), (1, 2), (0, 2)),),
    "3": (((0, 0), (1, 0), (1, 2), (0, 2)), ((0, 1), (1, 1))),
    "4": (((1, 0), (1, 2)), ((0, 2), (0, 1), (1, 1))),
    "5": (((0, 0), (1, 0), (1, 1), (0, 1), (0, 2), (1, 2)),),
    "6": (((0, 1), (1, 1), (1, 0), (0, 0), (0, 2), (1, 2)),),
    "7": (((0, 2), (1, 2), (1, 0)),),
    "8": (((0, 1), (0, 0), (1, 0), (1, 2), (0, 2), (0, 1), (1, 1)),),
    "9": (((0, 0), (1, 0), (1, 2), (0, 2), (0, 1), (1, 1)),),
}


@dataclass(frozen=True, slots=True)
class _Scale:
    """One pattern: lines across ``axis``, its corner at ``x``, ``y``."""

    request: VernierRequest
    axis: str
    x: Decimal
    y: Decimal

    @property
    def along(self) -> Decimal:
        """Position of line 0 of both scales on the axis that is measured."""
        return (self.x if self.axis == "X" else self.y) + SPARE * self.request.spacing

    @property
    def middle(self) -> Decimal:
        """Position on the other axis where the scales meet."""
        return (self.y if self.axis == "X" else self.x) + 6

    def steps(self) -> Iterator[Step]:
        request = self.request
        lines = range(-SPARE, request.last + SPARE + 1)
        yield Note(f"{self.axis}: main scale, lines reached moving towards plus")
        for line in lines:
            tick = _tick(line)
            yield from self.line(self.along + line * request.spacing, 1, self.middle - tick, self.middle)
        yield Note(f"{self.axis}: vernier, lines reached moving towards minus")
        for line in lines:
            place = self.along + line * (request.spacing - request.step)
            yield from self.line(place, -1, self.middle, self.middle + _tick(line))
        if request.numbers:
            yield Note(f"{self.axis}: numbers of the long lines")
            for line in range(0, request.last + 1, 5):
                yield from self.number(line)

    def words(self, place: Decimal, other: Decimal) -> tuple[tuple[str, Decimal], ...]:
        return (("X", place), ("Y", other)) if self.axis == "X" else (("X", other), ("Y", place))

    def line(self, place: Decimal, side: int, begin: Decimal, end: Decimal) -> Iterator[Step]:
        """One line from ``begin`` to ``end`` of the other axis, reached in the air from both overruns."""
        request, other = self.request, "Y" if self.axis == "X" else "X"
        yield Move(self.words(place - side * request.overrun, begin - request.overrun))
        yield Move(self.words(place, begin), request.feed)
        yield Move((("Z", -request.depth),), request.plunge)
        yield Move(((other, end),), request.feed)
        yield Move((("Z", request.safe_z),))

    def number(self, line: int) -> Iterator[Step]:
        """The number of a long line, beyond the vernier; both patterns are read from below."""
        text = str(line)
        place = self.along + line * (self.request.spacing - self.request.step)
        base = self.middle + 6 + _DIGIT_GAP
        width = len(text) * _DIGIT_WIDTH - _DIGIT_WIDTH / 2
        x, y = (place - width / 2, base) if self.axis == "X" else (base, place - _DIGIT_HEIGHT / 2)
        for position, digit in enumerate(text):
            for stroke in _STROKES[digit]:
                yield from self.stroke(x + position * _DIGIT_WIDTH, y, stroke)

    def stroke(self, x: Decimal, y: Decimal, points: Sequence[tuple[int, int]]) -> Iterator[Step]:
        at = [(("X", x + c * _DIGIT_WIDTH / 2), ("Y", y + r * _DIGIT_HEIGHT / 2)) for c, r in points]
        yield Move(at[0])
        yield Move((("Z", -self.request.depth),), self.request.plunge)
        for words in at[1:]:
            yield Move(words, self.request.feed)
        yield Move((("Z", self.request.safe_z),))
