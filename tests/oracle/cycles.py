"""Drilling and boring cycles as single moves, after NISTIR 6556 section 3.5.16.

A call is resolved to machine coordinates before it comes here; this module only spells the moves of one hole.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

Point = tuple[float, ...]
Step = tuple[str, Point]

CODES = frozenset({730, 810, 820, 830, 840, 850, 860, 870, 880, 890})
FEED_OUT = frozenset({840, 850, 890})


@dataclass(frozen=True, slots=True)
class Hole:
    """One repetition: ``code`` is the G code times ten, ``normal`` the index of the drilling axis.

    ``bottom``, ``retract`` (R) and ``clear`` are positions on the normal axis, ``peck`` is Q or None, ``back`` the K
    position and ``offset`` the I, J step of the back-boring cycle, ``clearance`` the peck back-off.
    """

    code: int
    normal: int
    place: dict[int, float]
    bottom: float
    retract: float
    clear: float
    peck: float | None = None
    back: float = 0.0
    offset: tuple[tuple[int, float], ...] = ()
    clearance: float = 0.254


def _with(point: Point, changes: dict[int, float]) -> Point:
    return tuple(changes.get(i, value) for i, value in enumerate(point))


def hole_steps(hole: Hole, start: Point) -> Iterator[Step]:
    """Yield ("rapid" | "feed", end point): traverse over the hole, to R, the cycle's own moves, retract."""
    over = _with(start, hole.place)
    yield "rapid", over
    if hole.code == 870:
        yield from _back_bore(hole, over)
        return
    yield "rapid", _with(over, {hole.normal: hole.retract})
    if hole.code in (730, 830):
        yield from _pecks(hole, over)
    else:
        yield "feed", _with(over, {hole.normal: hole.bottom})
    yield "feed" if hole.code in FEED_OUT else "rapid", _with(over, {hole.normal: hole.clear})


def _pecks(hole: Hole, over: Point) -> Iterator[Step]:
    """Feed down by Q at a time; G83 goes out to R between pecks, G73 only backs off by the clearance."""
    assert hole.peck is not None
    depth = hole.retract
    while True:
        depth = max(depth - hole.peck, hole.bottom)
        yield "feed", _with(over, {hole.normal: depth})
        if depth <= hole.bottom + 1e-9:
            return
        back = depth + hole.clearance
        if hole.code == 830:
            yield "rapid", _with(over, {hole.normal: hole.retract})
        yield "rapid", _with(over, {hole.normal: back})


def _back_bore(hole: Hole, over: Point) -> Iterator[Step]:
    """Down beside the hole, over to it, feed up to K and back, beside it again, out."""
    aside = _with(over, {axis: over[axis] + step for axis, step in hole.offset})
    yield "rapid", aside
    yield "rapid", _with(aside, {hole.normal: hole.bottom})
    yield "rapid", _with(over, {hole.normal: hole.bottom})
    yield "feed", _with(over, {hole.normal: hole.back})
    yield "feed", _with(over, {hole.normal: hole.bottom})
    yield "rapid", _with(aside, {hole.normal: hole.bottom})
    yield "rapid", _with(aside, {hole.normal: hole.clear})
    yield "rapid", over if hole.clear == over[hole.normal] else _with(over, {hole.normal: hole.clear})
