"""A true tool path cut into the units that are compared: feeds, holes, settles, probes, and the rapid path before each.

What may be asked of a rewritten program depends on what can be known:

- an axis is *unsure* from the start, after a tool change, and after it moved in machine coordinates (G53, the home leg
  of G28 and G30) or probed, until a rapid in work coordinates commands it, a cycle's traverse commands it, or a feed
  that moves Z alone has ended;
- the drilling axis is *soft* after a cycle (it comes back up on its other flank) until a move commands it;
- an unsure or soft axis may be off by its lash while it stands still; where it cuts, it must be right;
- an axis is *lost* after a change of frame or a deletable block until a rapid commands it: it must be right all the
  same, but it may be settled.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field

import numpy as np

from tests.oracle.arcs import Array
from tests.oracle.lash import Stroke, Track
from tests.oracle.machine import Motion

NO_MOTION = 1e-6
"""mm or degrees below which true motion counts as none (a take-up moves nothing)."""
HARDLY = 3e-4
"""mm or degrees that a take-up written as a rapid may move: lash is held in whole last digits (0.00001 in)."""
Z = 2
Axes = frozenset[int]
NONE: Axes = frozenset()
ALL: Axes = frozenset(range(6))


@dataclass(frozen=True, slots=True)
class Doubt:
    """What cannot be known at one moment."""

    unsure: Axes = NONE
    soft: Axes = NONE
    lost: Axes = NONE

    @property
    def loose(self) -> Axes:
        """Axes that may be off by their lash."""
        return self.unsure | self.soft

    def without(self, axes: Axes) -> Doubt:
        """The same after a rapid in work coordinates has commanded ``axes``."""
        return Doubt(self.unsure - axes, self.soft - axes, self.lost - axes)

    def unknown(self, axes: Axes) -> Doubt:
        """The same after ``axes`` moved outside the work frame."""
        return Doubt(self.unsure | axes, self.soft - axes, self.lost | axes)

    def union(self, other: Doubt) -> Doubt:
        """Either's doubts."""
        return Doubt(self.unsure | other.unsure, self.soft | other.soft, self.lost | other.lost)


@dataclass(slots=True)
class Unit:
    """One stretch of motion of one ``kind``: feed, settle, probe, hole, or end (nothing; holds the last rapids).

    ``rapid`` is the path before it, each stroke with the axes that may be off by their lash when it has ended;
    ``doubt`` holds when the unit begins, ``before`` is all doubt there was at any time on the rapid path.
    """

    kind: str
    start: Array
    rapid: list[tuple[Stroke, Axes]]
    doubt: Doubt
    before: Doubt
    strokes: list[Stroke] = field(default_factory=list)

    def points(self) -> Array:
        """Vertices of the unit, (n, 6)."""
        return _join([self.start[None], *(s.points for s in self.strokes)])

    def rapid_points(self) -> Array:
        """Vertices of the rapids before it, or the one point where it begins."""
        return _join([s.points for s, _ in self.rapid]) if self.rapid else self.start[None]

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
        moves = self.strokes or [stroke for stroke, _ in self.rapid]
        return moves[-1].motion.line if moves else 0

    def rapid_line(self) -> int:
        """Line number of the last rapid before the unit, else of the unit."""
        return self.rapid[-1][0].motion.line if self.rapid else self.last_line()


def _join(pieces: list[Array]) -> Array:
    """Polylines end to end; the first point of each piece is the last of the one before."""
    return np.vstack([pieces[0], *(piece[1:] for piece in pieces[1:])])


def _moves(stroke: Stroke, least: float = NO_MOTION) -> bool:
    """True if the tool really moves."""
    return bool((np.abs(stroke.points[1:] - stroke.points[0]) > least).any())


class _Splitter:
    """Takes strokes and events in order; closes a unit when its kind or what is known changes."""

    def __init__(self, here: Array, unsure: Axes) -> None:
        self.units: list[Unit] = []
        self.here = here
        self.doubt = self.before = Doubt(unsure=unsure, lost=unsure)
        self.rapid: list[tuple[Stroke, Axes]] = []
        self.unit: Unit | None = None
        self.hole = 0

    def close(self) -> None:
        if self.unit is not None:
            if self.unit.kind == "settle":
                self.doubt = self.doubt.without(frozenset({Z}))
            self.units.append(self.unit)
            self.unit = None
            self.before = self.doubt

    def open(self, kind: str) -> Unit:
        """The running unit if it is of this kind, else a new one."""
        if self.unit is None or self.unit.kind != kind:
            self.close()
            self.unit = Unit(kind, self.here, self.rapid, self.doubt, self.before)
            self.rapid = []
        return self.unit

    def learn(self, doubt: Doubt) -> None:
        """A change of what is known ends the running unit."""
        if doubt != self.doubt:
            self.close()
            self.doubt = doubt
            self.before = self.before.union(doubt)

    def add(self, stroke: Stroke) -> None:
        motion, real = stroke.motion, _moves(stroke)
        if motion.hole:
            self.add_hole(stroke)
        elif motion.machine_frame or motion.kind == "rapid":
            self.add_rapid(stroke, real)
        elif motion.kind == "probe":
            self.close()
            self.open("probe").strokes.append(stroke)
            self.close()
            self.learn(self.doubt.unknown(motion.named))
        else:
            if real and not self.within_feed(stroke):
                self.open(self.feed_kind(motion)).strokes.append(stroke)
            self.doubt = Doubt(self.doubt.unsure, self.doubt.soft - motion.named, self.doubt.lost)
        if real:
            self.here = stroke.points[-1]

    def within_feed(self, stroke: Stroke) -> bool:
        """Take a stroke that hardly moves into the running feed: a take-up there settles nothing and parts nothing."""
        if self.unit is None or self.unit.kind != "feed" or _moves(stroke, HARDLY):
            return False
        self.unit.strokes.append(stroke)
        return True

    def feed_kind(self, motion: Motion) -> str:
        alone = motion.arc is None and all(
            a == b for i, (a, b) in enumerate(zip(motion.start, motion.end, strict=True)) if i != Z
        )
        return "settle" if alone and Z in self.doubt.unsure | self.doubt.lost else "feed"

    def add_rapid(self, stroke: Stroke, real: bool) -> None:
        named = stroke.motion.named
        if self.within_feed(stroke):
            return
        if real:
            self.close()
        self.learn(self.doubt.unknown(named) if stroke.motion.machine_frame else self.doubt.without(named))
        if real:
            self.rapid.append((stroke, self.doubt.loose))

    def add_hole(self, stroke: Stroke) -> None:
        """The traverses to a hole are rapids like others; the hole begins with its first feed."""
        motion = stroke.motion
        if motion.hole != self.hole:
            self.close()
            self.hole = motion.hole
        begun = self.unit is not None and self.unit.kind == "hole"
        if motion.kind == "rapid" and not begun and _moves(stroke):
            self.close()
        known = self.doubt.without(motion.named)
        self.doubt = Doubt(known.unsure, known.soft | {motion.normal}, known.lost)
        if motion.kind == "feed" or begun:
            self.open("hole").strokes.append(stroke)
        elif _moves(stroke):
            self.rapid.append((stroke, self.doubt.loose))


def split(track: Track, start: Iterable[float], unsure: Axes) -> list[Unit]:
    """Units in order, the last of kind end; ``start`` is the true start point, ``unsure`` the axes unsure there."""
    splitter = _Splitter(np.array(tuple(start)), unsure)
    for item in track:
        if isinstance(item, Stroke):
            splitter.add(item)
        elif item.what == "tool change":
            splitter.close()
            splitter.learn(splitter.doubt.unknown(ALL))
        elif item.what == "frame":
            splitter.learn(splitter.doubt.union(Doubt(lost=ALL)))
    splitter.open("end")
    splitter.close()
    return splitter.units
