"""The actual path of the axes under lash, sampled: with and without compensation, with and without a cut that drags.

One axis is followed by the play operator (see ``lash.play``), which is exact on any monotone stretch, so sampling
costs nothing in accuracy as long as the turning points are among the samples.  Where the cut drags an axis, it sits
at that end of its lash.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from gcodetool.inspection.cutting_records import Floats, Ints, Path
from gcodetool.lash.play import shift

PAIRS = {1: (0, 1), 2: (2, 0), 3: (1, 2)}


@dataclass(frozen=True, slots=True)
class AxisCase:
    """One axis in one case: true ``lash``, the lash it is ``compensated`` for (None: not at all), datum side."""

    lash: float
    compensated: float | None
    datum: int

    @property
    def low(self) -> float:
        """Least distance by which the command leads the axis."""
        return 0.0 if self.datum < 0 else -self.lash

    @property
    def high(self) -> float:
        """Largest distance by which the command leads the axis."""
        return self.lash if self.datum < 0 else 0.0


@dataclass(frozen=True, slots=True)
class AxisState:
    """Where an axis is, and its side (+1 or -1) as the compensation counts it."""

    actual: float
    side: int


def follow(wanted: Floats, case: AxisCase, state: AxisState, push: Ints | None = None) -> tuple[Floats, AxisState]:
    """Actual positions while the program goes through ``wanted``; ``push`` is +1 or -1 where the cut drags the axis."""
    if not len(wanted):
        return wanted, state
    command, side = commanded(wanted, case, state.side)
    actual = np.empty(len(wanted))
    now = state.actual
    for first, last in _runs(command, push):
        part = command[first:last]
        dragged = 0 if push is None else int(push[first])
        if dragged:
            actual[first:last] = part - (case.low if dragged > 0 else case.high)
        else:
            ends = np.minimum(np.maximum(now, part - case.high), part - case.low)
            actual[first:last] = ends
        now = float(actual[last - 1])
    return actual, AxisState(now, side)


def commanded(wanted: Floats, case: AxisCase, side: int) -> tuple[Floats, int]:
    """The commands: the wanted positions, shifted by side where the axis is compensated; and the last side."""
    step = np.sign(np.diff(wanted, prepend=wanted[0]))
    step[0] = step[0] or side
    # a sample without motion keeps the side of the one before
    place = np.maximum.accumulate(np.where(step != 0.0, np.arange(len(step)), 0))
    sides = step[place]
    if case.compensated is None:
        return wanted, int(sides[-1])
    up, down = (float(shift(s, case.compensated, case.datum)) for s in (1, -1))
    return wanted + np.where(sides > 0.0, up, down), int(sides[-1])


def _runs(command: Floats, push: Ints | None) -> list[tuple[int, int]]:
    """Stretches on which the command is monotone and the push constant."""
    way = np.sign(np.diff(command, prepend=command[0]))
    place = np.maximum.accumulate(np.where(way != 0.0, np.arange(len(way)), 0))
    way = way[place]
    change = way[1:] != way[:-1]
    if push is not None:
        change |= push[1:] != push[:-1]
    bounds = [0, *(np.flatnonzero(change) + 1).tolist(), len(command)]
    return list(pairwise(bounds))


def start_state(case: AxisCase, at: float) -> AxisState:
    """An axis at ``at`` on its datum side, where command and axis agree."""
    return AxisState(at, case.datum)


def turning_points(path: Path, axis: int) -> tuple[Ints, Floats]:
    """The ends of all monotone stretches of one axis: ``(move, position)``, moves in order, each move's end last."""
    count = np.zeros(path.count, np.int64)
    low = np.zeros(path.count, np.int64)
    for plane, pair in PAIRS.items():
        if axis not in pair:
            continue
        rows = np.flatnonzero(path.plane == plane)
        # cosine turns at whole multiples of pi, sine half a turn of pi later
        offset = 0.0 if pair[0] == axis else 0.5 * math.pi
        first, last = path.angle[rows], path.angle[rows] + path.sweep[rows]
        low[rows] = np.ceil((np.minimum(first, last) - offset) / math.pi + 1e-9)
        high = np.floor((np.maximum(first, last) - offset) / math.pi - 1e-9)
        count[rows] = np.maximum(high - low[rows] + 1, 0)
    move = np.repeat(np.arange(path.count), count + 1)
    index = np.arange(len(move)) - (np.cumsum(count + 1) - count - 1)[move]
    position = path.end[move, axis].copy()
    inner = np.flatnonzero(index < count[move])
    position[inner] = _extremes(path, axis, move[inner], index[inner], low, count)
    return move, position


def _extremes(path: Path, axis: int, move: Ints, index: Ints, low: Ints, count: Ints) -> Floats:
    forward = path.sweep[move] > 0.0
    number = low[move] + np.where(forward, index, count[move] - 1 - index)
    found = np.empty(len(move))
    for plane, pair in PAIRS.items():
        if axis not in pair:
            continue
        rows = np.flatnonzero(path.plane[move] == plane)
        which = 0 if pair[0] == axis else 1
        sign = np.where(number[rows] % 2 == 0, 1.0, -1.0)
        found[rows] = path.centre[move[rows], which] + sign * path.radius[move[rows]]
    return found


def states_before(path: Path, axis: int, case: AxisCase) -> tuple[Floats, Ints]:
    """Actual position and side of an axis before every move and after the last (n + 1 rows), without any dragging."""
    move, position = turning_points(path, axis)
    begin = float(path.start[0, axis]) if path.count else 0.0
    command, _ = commanded(np.concatenate([[begin], position]), case, case.datum)
    low, high = case.low, case.high
    actual, now = np.empty(path.count + 1), begin
    actual[0] = begin
    last = np.searchsorted(move, np.arange(path.count), "right")
    ends = np.empty(len(position))
    for k, value in enumerate(command[1:].tolist()):
        now = min(max(now, value - high), value - low)
        ends[k] = now
    actual[1:] = ends[last - 1]
    step = np.sign(np.diff(position, prepend=begin))
    place = np.maximum.accumulate(np.where(step != 0.0, np.arange(len(step)), -1))
    sides = np.where(place >= 0, step[np.maximum(place, 0)], case.datum)
    return actual, np.concatenate([[case.datum], sides[last - 1]]).astype(np.int64)
