"""Three tongues that a caliper reads: their widths differ by the lash, whatever the cutter's diameter or its runout.

Every wall is cut by one light pass along the other axis, always in the same direction, at a position that was reached
in the air.  Lash B holds a wall reached towards plus back by B against one reached towards minus:

wide    left wall reached towards plus, right wall towards minus (from outside)    width + B
same    both walls reached towards plus                                            width
narrow  left wall reached towards minus, right wall towards plus (from inside)     width - B

The cutter takes the same amount off each wall, so it drops out of every difference.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from decimal import Decimal

from gcodetool.errors import SheetError
from gcodetool.inspection.measure_records import Move, Note, Pause, ProgramPlan, Spindle, Step, Words

# Name, side from which the left and the right wall are reached, and the lash in the width.
TONGUES = (("wide", 1, -1, 1), ("same", 1, 1, 0), ("narrow", -1, 1, -1))
GAP = Decimal(6)


@dataclass(frozen=True, slots=True)
class TonguesRequest:
    """What the operator asked for; mm and mm/min.

    ``width`` of the tongues, ``length`` along the other axis, ``slot`` beside each tongue for the caliper's jaws,
    ``leave`` the metal left for the finishing pass, ``largest`` the largest lash to be read.  ``x`` and ``y`` are the
    corner of the coupon with the lowest coordinates.
    """

    axes: tuple[str, ...] = ("X", "Y")
    cutter: Decimal = Decimal(3)
    width: Decimal = Decimal(8)
    length: Decimal = Decimal(12)
    slot: Decimal = Decimal(6)
    depth: Decimal = Decimal(3)
    stepdown: Decimal = Decimal("0.5")
    leave: Decimal = Decimal("0.2")
    largest: Decimal = Decimal("0.5")
    feed: Decimal = Decimal(200)
    plunge: Decimal = Decimal(60)
    safe_z: Decimal = Decimal(5)
    rpm: Decimal | None = None
    x: Decimal = Decimal(0)
    y: Decimal = Decimal(0)

    @property
    def overrun(self) -> Decimal:
        """Way past a wall before it is approached; it crosses any lash to be read."""
        return self.largest + 1


def tongue_widths(width: Decimal, lash: Decimal) -> dict[str, Decimal]:
    """Widths of the three tongues for that lash, up to the error of the cutter's diameter, which they share."""
    return {name: width + share * lash for name, _, _, share in TONGUES}


def tongues_plan(request: TonguesRequest) -> ProgramPlan:
    """The program that cuts the coupon.  Raises SheetError where it could not be cut or read."""
    _check(request)
    steps: list[Step] = [Spindle(), Move((("Z", request.safe_z),)), Move((("X", request.x), ("Y", request.y)))]
    if request.rpm is None:
        steps.append(Pause("Cutter in, work clamped, spindle on?"))
    else:
        steps.append(Spindle(request.rpm))
    x = request.x
    for axis in request.axes:
        steps += _Row(request, axis, x, request.y).steps()
        x += (_row_length(request) if axis == "X" else request.length + 2 * request.cutter) + GAP
    steps += [Move((("Z", request.safe_z),)), Spindle()]
    return ProgramPlan(f"Tongue coupon for the lash of {' and '.join(request.axes)}", _head(request), tuple(steps))


def _check(request: TonguesRequest) -> None:
    if (
        any(axis not in ("X", "Y") for axis in request.axes)
        or not request.axes
        or len(set(request.axes)) < len(request.axes)
    ):
        raise SheetError("a tongue coupon reads X and Y only; for another axis use an indicator.")
    for name in (
        "cutter",
        "width",
        "length",
        "slot",
        "depth",
        "stepdown",
        "leave",
        "largest",
        "feed",
        "plunge",
        "safe_z",
    ):
        if getattr(request, name) <= 0:
            raise SheetError(f"{name.replace('_', ' ')} must be more than 0.")
    # Wider than the cutter by what a pass may be off, else it would bite into the wall across the slot.
    least = request.cutter + request.leave + request.largest
    if request.slot < least:
        raise SheetError(f"a slot of {request.slot} mm is too narrow for that cutter: give {least} or more.")
    if request.width <= 2 * request.largest + 1:
        raise SheetError(f"a tongue of {request.width} mm may vanish with a lash of {request.largest}: make it wider.")
    if request.depth / request.stepdown > 100:
        raise SheetError("more than 100 passes for each wall: take a larger stepdown.")
    gaps = _inner(request)
    if gaps and (request.slot - request.cutter) / (gaps + 1) < request.largest + request.leave:
        raise SheetError(
            "the passes inside the slot would touch the walls: take a wider slot or a smaller largest lash."
        )


def _inner(request: TonguesRequest) -> int:
    """Clearing passes between the two walls of a slot; they overlap by a third of the cutter, or by the lash."""
    reach = request.cutter - max(request.cutter / 3, min(request.largest, request.cutter / 2))
    return max(0, math.ceil((request.slot - request.cutter) / reach) - 1)


def _row_length(request: TonguesRequest) -> Decimal:
    return len(TONGUES) * (request.width + request.slot) + request.slot


def _head(request: TonguesRequest) -> tuple[str, ...]:
    return (
        "Tongues of X from left to right, of Y from bottom to top: wide, same, narrow",
        f"Nominal width {request.width} mm, {request.depth} deep",
        "Deburr, then measure each with the caliper at the same height",
        "Lash = half of wide minus narrow; same must lie half way",
        f"Cutter {request.cutter} mm flat end; its exact size and runout do not matter",
        "Z 0 is the top of the work. The cutter plunges into the full material",
        f"Clearance: Z at {request.safe_z} must clear work and clamps everywhere",
        "Hold the work so that no screw or clamp stands in the slots",
        "Sharp cutter, light cut: a heavy one drags the axis across its lash",
        "Wear eye protection. Hands off while the tool turns or an axis moves",
    )


@dataclass(frozen=True, slots=True)
class _Row:
    """The tongues of one axis side by side, the corner of their slots at ``x``, ``y``."""

    request: TonguesRequest
    axis: str
    x: Decimal
    y: Decimal

    def walls(self) -> Iterator[tuple[str, Decimal, int, int]]:
        """Name, cutter position, direction it is reached in (+1 towards plus), and direction off the tongue."""
        start = self.x if self.axis == "X" else self.y
        half = self.request.cutter / 2
        for place, (name, left, right, _) in enumerate(TONGUES):
            edge = start + self.request.slot + place * (self.request.width + self.request.slot)
            yield f"{name}, left wall", edge - half, left, -1
            yield f"{name}, right wall", edge + self.request.width + half, right, 1

    def steps(self) -> Iterator[Step]:
        """Rough every wall from the side its finish comes from, clear the slots, then finish every wall."""
        request = self.request
        for name, place, side, off in self.walls():
            yield Note(f"{self.axis}: rough {name}, reached moving towards {_word(side)}")
            yield from self.cut(place + off * request.leave, side)
        for place in self.inner():
            yield Note(f"{self.axis}: clear the slot")
            yield from self.cut(place, 1)
        for name, place, side, _ in self.walls():
            yield Note(f"{self.axis}: finish {name}, reached moving towards {_word(side)}")
            yield from self.cut(place, side)

    def inner(self) -> Iterator[Decimal]:
        """Cutter positions that clear the slots between the walls; the outer slots are as wide as the inner ones."""
        request, count = self.request, _inner(self.request)
        start = self.x if self.axis == "X" else self.y
        for slot in range(len(TONGUES) + 1):
            low = start + slot * (request.width + request.slot) + request.cutter / 2
            free = request.slot - request.cutter
            # The outer slots have a tongue on one side only, so their far edge is cut here.
            passes = range(0 if slot == 0 else 1, count + (2 if slot == len(TONGUES) else 1))
            yield from ((low + free * each / (count + 1)).quantize(Decimal("0.001")) for each in passes)

    def cut(self, place: Decimal, side: int) -> Iterator[Step]:
        """All depths of one pass; only Z and the other axis move in between, so the side that was reached stays."""
        request, other = self.request, "Y" if self.axis == "X" else "X"
        begin = (self.y if self.axis == "X" else self.x) + request.cutter / 2
        end = begin + request.length + request.cutter
        yield Move(self.words(place - side * request.overrun, begin - request.overrun))
        yield Move(self.words(place, begin), request.feed)
        for number, depth in enumerate(self.depths()):
            if number:
                yield Move(((other, begin - request.overrun),))
                yield Move(((other, begin),))
            yield Move((("Z", -depth),), request.plunge)
            yield Move(((other, end),), request.feed)
            yield Move((("Z", request.safe_z),))

    def depths(self) -> list[Decimal]:
        count = math.ceil(self.request.depth / self.request.stepdown)
        return [min(self.request.stepdown * (each + 1), self.request.depth) for each in range(count)]

    def words(self, place: Decimal, other: Decimal) -> Words:
        return (("X", place), ("Y", other)) if self.axis == "X" else (("X", other), ("Y", place))


def _word(side: int) -> str:
    return "plus" if side > 0 else "minus"
