"""A true tool path cut into the units that are compared: feeds, holes, settles, probes, and the rapid path before each.

What may be asked of a rewritten program depends on what can be known:

- an axis is *unsure* from the start, after a tool change, and after it moved in machine coordinates (G53, the home leg of
  G28 and G30) or probed, until a rapid in work coordinates commands it, a cycle's traverse commands it, or a feed that
  moves Z alone has ended;
- the drilling axis is *soft* after a cycle (it comes back up on its other flank) until a move commands it;
- an unsure or soft axis may be off by its lash while it stands still; where it cuts, it must be right.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np

from tests.oracle.arcs import Array
from tests.oracle.controller import Event, Motion
from tests.oracle.lash import Stroke, Track

NO_MOTION = 1e-6
"""mm or degrees below which true motion counts as none (a take-up moves nothing)."""
Z = 2


@dataclass(slots=True)
class Unit:
    """One stretch of motion of one ``kind``: feed, settle, probe, hole, or end (nothing; holds the last rapids).

    ``loose`` axes are unsure or soft when the unit begins, ``unsure`` the former only; ``rapid`` is the path before it
    and ``wild`` the axes that were unsure at any time on that path.
    """

    kind: str
    start: Array
    rapid: list[Stroke]
    unsure: frozenset[int]
    loose: frozenset[int]
    wild: frozenset[int]
    strokes: list[Stroke] = field(default_factory=list)

    def points(self) -> Array:
        """Vertices of the unit, (n, 6)."""
        return path([self.start, *(s.points for s in self.strokes)])

    def rapid_points(self) -> Array:
        """Vertices of the rapids before it, or the one point where it begins."""
        return path([s.points for s in self.rapid]) if self.rapid else self.start[None]

    def line_at(self, vertex: int) -> int:
        """Line number of a vertex of ``points()``."""
        at = 1
        for stroke in self.strokes:
            at += len(stroke.points) - 1
            if vertex < at:
                return stroke.motion.line
        return self.last_line()

    def last_line(self) -> int:
        """Line number of the last move of the unit, else of the rapids before it, else 0."""
        moves = self.strokes or self.rapid
        return moves[-1].motion.line if moves else 0

    def rapid_line(self) -> int:
        """Line number of the last rapid before the unit, else of the unit."""
        return self.rapid[-1].motion.line if self.rapid else self.last_line()


def path(pieces: list[Array]) -> Array:
    """Join polylines end to end; the first point of each piece is the last of the one before."""
    return np.vstack([pieces[0][None] if pieces[0].ndim == 1 else pieces[0], *(p[1:] for p in pieces[1:])])


def moves(stroke: Stroke) -> bool:
    """True if the tool really moves."""
    return bool((np.abs(stroke.points[1:] - stroke.points[0]) > NO_MOTION).any())


class _Splitter:
    def __init__(self, here: Array, unsure: frozenset[int]) -> None:
        self.units: list[Unit] = []
        self.here = here
        self.unsure, self.soft = unsure, frozenset[int]()
        self.rapid: list[Stroke] = []
        self.wild = unsure
        self.unit: Unit | None = None
        self.hole = 0

    def close(self) -> None:
        if self.unit is not None:
            if self.unit.kind == "settle":
                self.unsure -= {Z}
            self.units.append(self.unit)
            self.unit = None
            self.wild = self.unsure

    def open(self, kind: str) -> Unit:
        """The running unit if it is of this kind, else a new one."""
        if self.unit is None or self.unit.kind != kind:
            self.close()
            loose = self.unsure | self.soft
            self.unit = Unit(kind, self.here, self.rapid, self.unsure, loose, self.wild | self.unsure)
            self.rapid = []
        return self.unit

    def forget(self, unsure: frozenset[int], soft: frozenset[int]) -> None:
        """A change of what is known ends the running unit."""
        if (unsure, soft) != (self.unsure, self.soft):
            self.close()
            self.unsure, self.soft = unsure, soft
            self.wild |= unsure

    def add(self, stroke: Stroke) -> None:
        motion, real = stroke.motion, moves(stroke)
        if motion.hole:
            self.add_hole(stroke)
        elif motion.machine_frame or motion.kind == "rapid":
            self.add_rapid(stroke, real)
        elif motion.kind == "probe":
            self.open("probe").strokes.append(stroke)
            self.close()
            self.forget(self.unsure | motion.named, self.soft - motion.named)
        else:
            if real:
                self.open(self.feed_kind(motion)).strokes.append(stroke)
            self.soft -= motion.named
        if real:
            self.here = stroke.points[-1]

    def feed_kind(self, motion: Motion) -> str:
        alone = motion.arc is None and all(
            a == b for i, (a, b) in enumerate(zip(motion.start, motion.end, strict=True)) if i != Z
        )
        return "settle" if alone and Z in self.unsure else "feed"

    def add_rapid(self, stroke: Stroke, real: bool) -> None:
        named = stroke.motion.named
        if real:
            self.close()
            self.rapid.append(stroke)
        if stroke.motion.machine_frame:
            self.forget(self.unsure | named, self.soft - named)
        else:
            self.forget(self.unsure - named, self.soft - named)

    def add_hole(self, stroke: Stroke) -> None:
        if self.unit is not None and stroke.motion.hole != self.hole:
            self.close()
        self.hole = stroke.motion.hole
        self.open("hole").strokes.append(stroke)
        drill = frozenset({stroke.motion.normal})
        self.unsure -= stroke.motion.named
        self.soft = (self.soft - stroke.motion.named) | drill


def split(track: Track, start: Iterable[float], unsure: frozenset[int]) -> list[Unit]:
    """Units in order, the last of kind end; ``start`` is the true start point, ``unsure`` the axes unsure there."""
    splitter = _Splitter(np.array(tuple(start)), unsure)
    for item in track:
        if isinstance(item, Stroke):
            splitter.add(item)
        elif isinstance(item, Event) and item.what == "tool change":
            splitter.close()
            splitter.forget(frozenset(range(6)), frozenset())
    splitter.open("end")
    splitter.close()
    return splitter.units
