"""The place of every hole for any true lash: is it right even when the lash value is not?

A hole is a feed straight down on Z that follows a rapid, or a hole of a cycle.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass, replace
from decimal import Decimal

from gcodetool.inspection.machines import some_setup
from gcodetool.lash.path import Follower, Vector
from gcodetool.lash.running import Settings
from gcodetool.machine import Machine
from gcodetool.motion.controller import Controller
from gcodetool.motion.moves import ORDER, Event, Move, Setup
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import QUANTA_PER_MM

Blocks = Callable[[], Iterable[Block]]
_SAME = 1e-6
_SHARES = (Decimal(0), Decimal("0.5"), Decimal(1))


@dataclass(frozen=True, slots=True)
class WorstHole:
    """The hole that is farthest from its place: distance in mm, lines in original and result, number of holes."""

    distance: float
    lines: tuple[int, int]
    count: int


def worst_hole(original: Blocks, result: Blocks, machine: Machine, stated: Settings) -> WorstHole:
    """The worst hole for true lashes of X and Y of 0, half and all of the overshoot, from both sides at the start.

    The place of a hole is a piecewise linear function of the lash with its corners at these values.
    """
    setup = some_setup(1, machine, stated)
    wanted = list(_wanted(original(), setup))
    worst = WorstHole(0.0, (0, 0), len(wanted))
    for share in _SHARES:
        true = {a: float(share) * stated.hole_overshoot / QUANTA_PER_MM for a in "XY" if machine.axis(a).lash}
        for side in (-1, 1):
            got = list(_got(result(), setup, machine, true, side))
            worst = _worse(worst, wanted, got)
    return worst


def _worse(worst: WorstHole, wanted: list[tuple[int, Vector]], got: list[tuple[int, Vector]]) -> WorstHole:
    if len(wanted) != len(got):
        return replace(worst, distance=float("inf"))
    for (line, place), (other, found) in zip(wanted, got, strict=True):
        distance = ((place[0] - found[0]) ** 2 + (place[1] - found[1]) ** 2) ** 0.5
        if distance > worst.distance:
            worst = replace(worst, distance=distance, lines=(line, other))
    return worst


class _Holes:
    """Picks the holes out of the moves: the first way down after a rapid that has moved X or Y, and those of cycles."""

    def __init__(self) -> None:
        self._after_rapid = False

    def is_hole(self, move: Move) -> bool:
        """True for a move that makes a hole where none was made since the last rapid in the plane."""
        in_plane = move.start[:2] != move.end[:2] or move.arc is not None
        if move.hole == "in":
            return True
        if move.rapid or in_plane:
            self._after_rapid = move.rapid and (in_plane or self._after_rapid)
            return False
        down = move.end[2] < move.start[2]
        found = down and self._after_rapid
        self._after_rapid = self._after_rapid and not found
        return found


def _wanted(blocks: Iterable[Block], setup: Setup) -> Iterator[tuple[int, Vector]]:
    holes = _Holes()
    for item in Controller(setup).run(blocks):
        if isinstance(item, Move) and holes.is_hole(item):
            yield item.line, tuple(value / QUANTA_PER_MM for value in item.end)


def _got(
    blocks: Iterable[Block], setup: Setup, machine: Machine, true: dict[str, float], side: int
) -> Iterator[tuple[int, Vector]]:
    holes = _Holes()
    start = [setup.start.get(letter, 0) for letter in ORDER]
    datum = {letter: axis.datum for letter, axis in machine.axes.items()}
    follower = Follower(true, datum, start, dict.fromkeys(true, side))
    for item in Controller(setup).run(blocks):
        if isinstance(item, Event):
            if item.what in ("tool change", "home"):
                follower.lose(item.at, item.letters, kept=item.what == "tool change")
            continue
        for _ in follower.drive(item):
            pass
        if holes.is_hole(item):
            yield item.line, follower.seen(item.end)
