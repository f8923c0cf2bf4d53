"""Reversals of a program, per axis: where each axis changes its direction, on feeds, on rapids and inside arcs.

A reversal is counted once the axis has come back from its last extreme by more than the ripple (``play.advance``);
its place is that extreme.  Positions are in mm (degrees on A B C), in the coordinates of the program.  A direction
that follows an unknown position counts as no reversal.
"""

from __future__ import annotations

import itertools
from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass, field
from statistics import median
from typing import NamedTuple

from gcodetool.lash.play import advance
from gcodetool.motion.controller import Controller, Happening
from gcodetool.motion.moves import ORDER, Event, Move, Setup
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import QUANTA_PER_MM

BINS = 12


class Reversal(NamedTuple):
    """One reversal: source line, axis, position in mm (degrees), new direction, on a rapid, inside an arc."""

    line: int
    axis: str
    position: float
    direction: int
    rapid: bool
    in_arc: bool


@dataclass(frozen=True, slots=True)
class AxisReversals:
    """Statistics of one axis.

    ``feed`` counts all reversals on feed motion, ``in_arcs`` those of them inside an arc, ``rapid`` those on rapids.
    ``median_travel`` and ``shortest_travel`` are between neighbouring reversals, None with fewer than two.
    ``suppressed`` is what the ripple has passed over, ``seconds`` what the take-ups would cost from stop to stop, 0
    where lash or feed is not known.  ``bins`` counts reversals along the axis from ``low`` to ``high``, in equal
    parts.
    """

    axis: str
    feed: int
    rapid: int
    in_arcs: int
    median_travel: float | None
    shortest_travel: float | None
    suppressed: int
    low: float
    high: float
    bins: tuple[int, ...]
    busiest: tuple[tuple[int, int], ...]
    seconds: float = 0.0

    @property
    def take_ups(self) -> int:
        """Take-ups that a machine with lash on this axis needs: one for each reversal on feed motion."""
        return self.feed


class Detector:
    """Finds the reversals in a stream of moves; ``ripple`` by axis letter in quanta."""

    def __init__(self, ripple: Mapping[str, int]) -> None:
        """Know nothing of any side."""
        self._ripple = [ripple.get(letter, 0) for letter in ORDER]
        self._side = [0] * 6
        self._extreme: list[int] = [0] * 6

    def behind(self, move: Move) -> frozenset[int]:
        """The axes that stand short of their extreme after a move: in an excursion that the ripple passes over."""
        return frozenset(k for k in range(6) if self._side[k] and self._extreme[k] != move.end[k])

    def take(self, item: Happening) -> list[Reversal]:
        """The reversals of one move; after an event the sides it loses are forgotten."""
        if isinstance(item, Event):
            if item.what != "stop":
                for letter in item.letters:
                    self._side[ORDER.index(letter)] = 0
            return []
        found: list[Reversal] = []
        begin = item.start
        for k in range(6):
            if item.unplaced and ORDER[k] in item.unplaced:
                self._side[k], self._extreme[k] = 0, item.end[k]
            elif item.arc is not None and k in item.axes:
                self._along_arc(item, k, found)
            elif begin[k] != item.end[k]:
                self._step(item, k, item.end[k], begin[k], False, found)
        return found

    def _along_arc(self, move: Move, k: int, found: list[Reversal]) -> None:
        arc = move.arc
        assert arc is not None
        which = move.axes.index(k)
        inside = False
        here = move.start[k]
        for share, axis in arc.quadrants():
            if axis == which:
                point = round(arc.point(share)[which] * QUANTA_PER_MM)
                self._step(move, k, point, here, inside, found)
                inside, here = True, point
        self._step(move, k, move.end[k], here, inside, found)

    def _step(self, move: Move, k: int, target: int, begin: int, in_arc: bool, found: list[Reversal]) -> None:
        side, extreme = self._side[k], self._extreme[k]
        if side == 0:
            extreme = begin
        self._side[k], self._extreme[k] = advance(side, extreme, target, self._ripple[k])
        if side and self._side[k] != side:
            found.append(Reversal(move.line, ORDER[k], extreme / QUANTA_PER_MM, self._side[k], move.rapid, in_arc))


@dataclass(slots=True)
class _Counts:
    feed: int = 0
    rapid: int = 0
    in_arcs: int = 0
    unfiltered: int = 0
    places: list[float] = field(default_factory=list)
    lines: Counter[int] = field(default_factory=Counter)
    seconds: float = 0.0


def reversals(blocks: Iterable[Block], setup: Setup, ripple: Mapping[str, int]) -> Iterator[Reversal]:
    """All reversals of a program in order; raises Refusal where it cannot be read."""
    detector = Detector(ripple)
    for item in Controller(setup).run(blocks):
        yield from detector.take(item)


def statistics(
    blocks: Iterable[Block],
    setup: Setup,
    ripple: Mapping[str, int],
    most: int = 5,
    cost: Callable[[str, float], float] | None = None,
) -> list[AxisReversals]:
    """Statistics of the axes that move; ``most`` is how many of the busiest blocks to name.

    ``cost`` gives the seconds of one take-up of an axis at a feed in mm/min.
    """
    filtered, plain = Detector(ripple), Detector({})
    counts = {letter: _Counts() for letter in ORDER}
    moved: set[str] = set()
    for item in Controller(setup).run(blocks):
        if isinstance(item, Move):
            moved.update(
                letter
                for k, letter in enumerate(ORDER)
                if item.start[k] != item.end[k] or (item.arc and k in item.axes)
            )
        for reversal in filtered.take(item):
            _count(counts[reversal.axis], reversal)
            if cost is not None and not reversal.rapid and isinstance(item, Move) and item.context.feed_mode == "G94":
                counts[reversal.axis].seconds += cost(reversal.axis, item.context.feed or 0.0)
        for reversal in plain.take(item):
            counts[reversal.axis].unfiltered += 1
    return [_summed(letter, counts[letter], most) for letter in ORDER if letter in moved]


def _count(counts: _Counts, reversal: Reversal) -> None:
    counts.rapid += reversal.rapid
    counts.feed += not reversal.rapid
    counts.in_arcs += reversal.in_arc and not reversal.rapid
    counts.places.append(reversal.position)
    if not reversal.rapid:
        counts.lines[reversal.line] += 1


def _summed(letter: str, counts: _Counts, most: int) -> AxisReversals:
    travels = [abs(b - a) for a, b in itertools.pairwise(counts.places)]
    low, high = (min(counts.places), max(counts.places)) if counts.places else (0.0, 0.0)
    busiest = sorted(counts.lines.items(), key=lambda item: (-item[1], item[0]))[:most]
    return AxisReversals(
        axis=letter,
        feed=counts.feed,
        rapid=counts.rapid,
        in_arcs=counts.in_arcs,
        median_travel=median(travels) if travels else None,
        shortest_travel=min(travels) if travels else None,
        suppressed=counts.unfiltered - counts.feed - counts.rapid,
        low=low,
        high=high,
        bins=_bins(counts.places, low, high),
        busiest=tuple(busiest),
        seconds=counts.seconds,
    )


def _bins(places: list[float], low: float, high: float) -> tuple[int, ...]:
    bins = [0] * BINS
    width = (high - low) or 1.0
    for place in places:
        bins[min(BINS - 1, int((place - low) / width * BINS))] += 1
    return tuple(bins)
