"""Arcs that start or end within a few last digits of a quadrant point: never a piece that closes on itself.

A controller reads an arc whose end is its start as a full circle, so a sliver that rounds away is a crash.
"""

from __future__ import annotations

import math
import random
from decimal import Decimal
from itertools import product
from typing import NamedTuple

import pytest

from tests.lash.rewriting import assert_right, compensate
from tests.oracle.controller import run
from tests.oracle.machine import Machine, Motion

LASH = {"x": "0.12", "y": "0.09", "z": "0.05"}
DIGITS = (0, 1, -1, 2, -2, 10, -10)
PLANES = {"G17": ("XY", "IJ"), "G18": ("ZX", "KI"), "G19": ("YZ", "JK")}
INCH = 25.4


class Sliver(NamedTuple):
    """An arc from near one quadrant point (0 to 3) to near another, ``begin`` and ``end`` last digits beside it."""

    first: int
    last: int
    begin: int
    end: int
    clockwise: bool


def near(quadrant: int, digits: int, radius: Decimal, digit: Decimal) -> tuple[Decimal, Decimal]:
    """The point of the circle some last digits beside a quadrant point, rounded to a last digit."""
    aside = digits * digit
    along = Decimal(math.sqrt(float(radius**2 - aside**2))).quantize(digit)
    return [(along, aside), (-aside, along), (-along, -aside), (aside, -along)][quadrant]


def sweep_of(sliver: Sliver, radius: Decimal, digit: Decimal) -> float:
    """Degrees from the begin to the end in the direction of travel, above 0 and up to 360."""
    begin, end = (math.atan2(float(q), float(p)) for p, q in ends_of(sliver, radius, digit))
    turn = math.degrees(begin - end if sliver.clockwise else end - begin) % 360.0
    return turn or 360.0


def ends_of(sliver: Sliver, radius: Decimal, digit: Decimal) -> tuple[tuple[Decimal, Decimal], tuple[Decimal, Decimal]]:
    begin = near(sliver.first, sliver.begin, radius, digit)
    return begin, near(sliver.last, sliver.end, radius, digit)


def block(sliver: Sliver, plane: str, by_radius: bool, radius: Decimal, digit: Decimal, centre: Decimal) -> str:
    """A rapid to the begin and the arc, about (centre, centre)."""
    (one, two), words = PLANES[plane]
    begin, end = ends_of(sliver, radius, digit)
    place = f"{one}{begin[0] + centre} {two}{begin[1] + centre}"
    target = f"{one}{end[0] + centre} {two}{end[1] + centre}"
    if by_radius:
        how = f"R{radius if sweep_of(sliver, radius, digit) <= 180.0 else -radius}"
    else:
        how = f"{words[0]}{-begin[0]} {words[1]}{-begin[1]}"
    return f"G0 {place}\n{'G2' if sliver.clockwise else 'G3'} {target} {how}\n"


def program(slivers: list[Sliver], plane: str, by_radius: bool, inch: bool) -> str:
    """All the arcs in one program, each about a centre of its own so that no two look alike."""
    digit = Decimal("0.0001") if inch else Decimal("0.001")
    radius = Decimal("0.5") if inch else Decimal("10")
    head = f"{'G20' if inch else 'G21'} G90 {plane}\nG0 X0 Y0 Z0\nF10\n"
    return head + "".join(block(s, plane, by_radius, radius, digit, digit * k) for k, s in enumerate(slivers))


def arcs(text: str) -> list[Motion]:
    """The arcs that the oracle's controller runs."""
    return [item for item in run(text.encode(), Machine()) if isinstance(item, Motion) and item.arc]


def closes(motion: Motion) -> bool:
    """True where the written end of an arc is its written start."""
    assert motion.arc is not None
    return all(abs(motion.start[k] - motion.end[k]) < 1e-7 for k in motion.arc.axes)


def hold_slivers(slivers: list[Sliver], plane: str, by_radius: bool, inch: bool, lash: dict[str, str] = LASH) -> None:
    """No piece closes on itself unless its original did, no piece turns farther than it, and the path holds."""
    original = program(slivers, plane, by_radius, inch)
    result = compensate(original, lash)
    wanted = sum(closes(arc) for arc in arcs(original))
    found = arcs(result)
    assert sum(closes(arc) for arc in found) <= wanted
    turned = sum(abs(arc.arc.sweep) for arc in found if arc.arc)
    asked = sum(abs(arc.arc.sweep) for arc in arcs(original) if arc.arc)
    assert turned == pytest.approx(asked, abs=0.02 * len(slivers) ** 0.5)
    assert_right(original, result, lash, seeds=range(1))


def usable(sliver: Sliver, by_radius: bool) -> bool:
    """An arc by radius cannot be a full circle, and an arc of nothing is none."""
    same = (sliver.first, sliver.begin) == (sliver.last, sliver.end)
    if by_radius:
        return not same and sliver.first != sliver.last
    return True


GRID = list(product(PLANES, (False, True), (False, True)))
FORMS = pytest.mark.parametrize(
    ("plane", "by_radius", "inch"),
    GRID,
    ids=[f"{plane}-{'R' if by_radius else 'IJK'}-{'inch' if inch else 'mm'}" for plane, by_radius, inch in GRID],
)


@FORMS
@pytest.mark.parametrize("where", ["start", "end", "both"])
def test_slivers(plane: str, by_radius: bool, inch: bool, where: str) -> None:
    """Quarter, half and three-quarter turns both ways, 0, 1, 2 and 10 digits beside the quadrant points."""
    slivers = [
        Sliver(
            first, (first + quarters) % 4, digits if where != "end" else 0, digits if where != "start" else 0, clockwise
        )
        for first, quarters, digits, clockwise in product(
            (0, 1), (1, 2, 3), DIGITS if where != "both" else (1, -2, 10), (False, True)
        )
    ]
    hold_slivers([s for s in slivers if usable(s, by_radius)], plane, by_radius, inch)


@pytest.mark.parametrize("inch", [False, True])
@pytest.mark.parametrize("plane", PLANES)
def test_nearly_closed_and_nearly_nothing(plane: str, inch: bool) -> None:
    """From one side of a quadrant point to the other, or almost all the way round, a few digits from where it began."""
    slivers = [
        Sliver(quadrant, quadrant, begin, end, clockwise)
        for quadrant, begin, end, clockwise in product((0, 1, 2, 3), (0, 1, -2, 10), DIGITS, (False, True))
    ]
    hold_slivers(slivers, plane, by_radius=False, inch=inch)


@pytest.mark.long
@FORMS
def test_all_slivers(plane: str, by_radius: bool, inch: bool) -> None:
    every = [
        Sliver(first, last, begin, end, clockwise)
        for first, last, begin, end, clockwise in product(range(4), range(4), DIGITS, DIGITS, (False, True))
    ]
    slivers = [s for s in every if usable(s, by_radius)]
    for low in range(0, len(slivers), 200):
        hold_slivers(slivers[low : low + 200], plane, by_radius, inch)


@pytest.mark.parametrize("seed", range(6))
def test_slivers_under_other_lash(seed: int) -> None:
    """Lash of one axis only, very small and very large ones, mixed planes and units."""
    rng = random.Random(seed)
    lash = {axis: rng.choice(["0", "0.0003", "0.02", "0.9"]) for axis in "xyz"}
    plane, inch = rng.choice(list(PLANES)), rng.random() < 0.5
    slivers = [
        Sliver(rng.randrange(4), rng.randrange(4), rng.choice(DIGITS), rng.choice(DIGITS), rng.random() < 0.5)
        for _ in range(60)
    ]
    hold_slivers(slivers, plane, by_radius=False, inch=inch, lash=lash)


def test_a_full_circle_stays_one_where_nothing_turns() -> None:
    """Only Z has lash, and a circle in XY does not move it: the block is left as it is, closed on itself."""
    text = "G21 G90\nG0 X10 Y0 Z5\nG1 Z-1 F100\nG3 X10 Y0 I-10\nG3 I-10\n"
    result = compensate(text, {"z": "0.1"})
    assert result.splitlines()[-2:] == ["G3 X10 Y0 I-10", "G3 I-10"]


@pytest.mark.parametrize("radius", ["0.0005", "0.001", "0.0015", "0.005", "0.05"])
def test_circles_smaller_than_the_lash(radius: str) -> None:
    """A circle of a few last digits: rounding, not motion, or taken up; never a larger circle."""
    text = f"G21 G90\nG0 X5 Y5 Z0\nF100\nG2 X5 Y5 I{radius}\nG3 X5 Y5 J-{radius}\nG1 X6\n"
    result = compensate(text, LASH)
    assert all(abs(a.arc.start_radius) <= float(radius) + 0.002 for a in arcs(result) if a.arc)
    assert_right(text, result, LASH)
