"""The path the tool really takes: commanded moves driven through the play of each axis.

Lines become one or more lines, with a corner where an axis gets into contact.  Arcs become arcs with a shifted centre
while all their axes are in contact, and straight flats while one of them stands still.  Lengths in mm, angles in
degrees.
"""

from __future__ import annotations

import copy
import itertools
import math
from collections.abc import Iterator, Mapping, Sequence
from typing import NamedTuple

from gcodetool.lash.play import play, shift
from gcodetool.motion.arcs import Arc
from gcodetool.motion.moves import ORDER, Move
from gcodetool.program.numbers import QUANTA_PER_MM

# axes nearer to contact than this are in contact; a millionth of the finest written digit
CONTACT = 1e-9
# a curve that is neither line nor arc (a helix while a plane axis stands still) is cut into chords of this angle
CHORD = math.radians(0.25)
Vector = tuple[float, ...]


class Piece(NamedTuple):
    """A part of a path: a straight line, or an arc in the plane of ``axes`` with all other axes linear in its angle.

    ``start`` and ``end`` have six numbers, X Y Z A B C.  ``loose`` is true where an axis that moves started on a side
    that nothing in the program had made known; ``hole`` is that of the move.
    """

    rapid: bool
    line: int
    start: Vector
    end: Vector
    arc: Arc | None
    axes: tuple[int, int]
    loose: bool = False
    hole: str = ""

    def point(self, share: float) -> Vector:
        """The point at a share (0 to 1) of the piece."""
        spot = [a + (b - a) * share for a, b in zip(self.start, self.end, strict=True)]
        if self.arc is not None and 0.0 < share < 1.0:
            spot[self.axes[0]], spot[self.axes[1]] = self.arc.point(share)
        return tuple(spot)


def intended(move: Move) -> Piece:
    """The path of a move on a machine without lash."""
    return Piece(move.rapid, move.line, _mm(move.start), _mm(move.end), move.arc, move.axes, hole=move.hole)


def _mm(position: Sequence[int]) -> Vector:
    return tuple([value / QUANTA_PER_MM for value in position])


class Follower:
    """The table (or tool) behind the drives; ``drive`` yields the pieces of its path for each commanded move.

    ``lash`` and ``datum`` by axis letter; ``side`` is the side of every axis at the start and after each event that
    loses it; ``known`` are the axes whose side at the start is known, and which it is.
    """

    def __init__(
        self,
        lash: Mapping[str, float],
        datum: Mapping[str, int],
        at: Sequence[int],
        side: Mapping[str, int],
        known: Mapping[str, int] | None = None,
    ) -> None:
        """Stand at the commanded position ``at``, each axis on its side."""
        self._lash = [float(lash.get(letter, 0.0)) for letter in ORDER]
        self._datum = [datum.get(letter, -1) for letter in ORDER]
        self.sides = dict(side)
        self._lashed = [k for k in range(6) if self._lash[k] > 0.0]
        self.actual = list(_mm(at))
        self.loose: set[int] = set()
        self._command = list(_mm(at))
        self._off = [0.0] * 6
        self.lose(at, ORDER)
        for letter, stands in (known or {}).items():
            k = ORDER.index(letter)
            self.actual[k] = at[k] / QUANTA_PER_MM - self._shift(k, stands)
            self.loose.discard(k)

    def copy(self, sides: Mapping[str, int]) -> Follower:
        """Another machine in the same state that will find itself on other sides when it loses them."""
        other = copy.copy(self)
        other.actual, other.loose, other.sides = list(self.actual), set(self.loose), dict(sides)
        other._command, other._off = list(self._command), list(self._off)
        return other

    def lose(self, at: Sequence[int], letters: str, kept: bool = False) -> None:
        """Put these axes on their unknown side again, the command standing at ``at``.

        Until it moves, such an axis counts as where its command is; with ``kept`` as where it was, unless it has been
        moved.
        """
        self._note_offsets(at, letters, kept)
        for k in range(6):
            if ORDER[k] in letters and k not in self._lashed:
                self.actual[k] = at[k] / QUANTA_PER_MM
            elif ORDER[k] in letters:
                self.actual[k] = at[k] / QUANTA_PER_MM - self._shift(k, self.sides.get(ORDER[k], -1))
                self.loose.add(k)

    def _note_offsets(self, at: Sequence[int], letters: str, kept: bool) -> None:
        for k in self._lashed:
            if ORDER[k] in letters:
                stood = abs(at[k] / QUANTA_PER_MM - self._command[k]) <= CONTACT
                if not stood or not kept:
                    self._off[k] = 0.0
                elif k not in self.loose:
                    self._off[k] = self.actual[k] - self._command[k]
                self._command[k] = at[k] / QUANTA_PER_MM

    def _shift(self, k: int, side: int) -> float:
        return float(shift(side, self._lash[k], self._datum[k]))

    def state(self) -> tuple[Vector, frozenset[int]]:
        """What the further path depends on beside the commands."""
        return tuple(self.actual), frozenset(self.loose)

    def seen(self, at: Sequence[int]) -> Vector:
        """Where the table is; an axis that has not moved since its side was lost counts as where it was taken to be."""
        return self._show(self.actual, _mm(at))

    def drive(self, move: Move) -> Iterator[Piece]:
        """The pieces of the actual path; a move that only crosses lash gives one piece of no length."""
        before = None
        if self.loose:
            # a rapid that names an axis is meant to leave it in its place, even where it has no way to go
            named = move.named if move.rapid else ""
            moving = {
                k
                for k in self.loose
                if move.start[k] != move.end[k] or (move.arc and k in move.axes) or ORDER[k] in named
            }
            before = self.seen(move.start) if moving else None
            self.loose -= moving
        self._command = list(_mm(move.end))
        pieces = self._line(move) if move.arc is None else self._arc(move, move.arc)
        if before is None:
            yield from pieces
            return
        for piece in pieces:
            # the path is taken to begin where the command stood: where the axis really was, nobody can say
            yield piece._replace(start=before or piece.start, loose=True)
            before = None

    def _show(self, actual: Sequence[float], command: Vector) -> Vector:
        if not self.loose:
            return tuple(actual)
        return tuple([command[k] + self._off[k] if k in self.loose else actual[k] for k in range(6)])

    # ---- lines ----------------------------------------------------------------------------------------------------

    def _line(self, move: Move) -> Iterator[Piece]:
        begin, end = _mm(move.start), _mm(move.end)
        starts: list[tuple[int, float]] = []
        cuts: set[float] = set()
        for k in self._lashed:
            way = end[k] - begin[k]
            if way:
                share = (self.actual[k] + self._shift(k, 1 if way > 0 else -1) - begin[k]) / way
                starts.append((k, share))
                if share * abs(way) > CONTACT and share < 1.0:
                    cuts.add(share)
        bounds = [0.0, *sorted(cuts), 1.0]
        now = self._line_point(begin, end, starts, 0.0)
        for low, high in itertools.pairwise(bounds):
            then = self._line_point(begin, end, starts, high)
            yield Piece(
                move.rapid, move.line,
                self._show(now, _between(begin, end, low)), self._show(then, _between(begin, end, high)),
                None, (0, 1), hole=move.hole,
            )  # fmt: skip
            now = then
        self.actual = now

    def _line_point(self, begin: Vector, end: Vector, starts: list[tuple[int, float]], share: float) -> list[float]:
        point = list(_between(begin, end, share))
        for k in self._lashed:
            point[k] = self.actual[k]
        for k, _ in starts:
            command = begin[k] + (end[k] - begin[k]) * share
            point[k] = play(self.actual[k], command, self._lash[k], self._datum[k])
        return point

    # ---- arcs -----------------------------------------------------------------------------------------------------

    def _arc(self, move: Move, arc: Arc) -> Iterator[Piece]:
        command = Piece(move.rapid, move.line, _mm(move.start), _mm(move.end), arc, move.axes)
        shares = [0.0, *(u for u, axis in arc.quadrants() if move.axes[axis] in self._lashed), 1.0]
        for low, high in itertools.pairwise(shares):
            yield from self._stretch(command, arc, low, high)

    def _stretch(self, command: Piece, arc: Arc, low: float, high: float) -> Iterator[Piece]:
        """A part of an arc on which no lashed axis reverses."""
        begin, end = command.point(low), command.point(high)
        contact, offset = {}, [0.0] * 6
        for k in self._lashed:
            way = end[k] - begin[k]
            if way:
                side = 1 if way > 0 else -1
                offset[k] = self._shift(k, side)
                contact[k] = self._contact(command, k, low, high, self.actual[k] + offset[k], side)
        bounds = sorted({low, high, *(u for u in contact.values() if low < u < high)})
        for first, last in itertools.pairwise(bounds):
            still = {k for k in self._lashed if contact.get(k, math.inf) > first}
            yield from self._part(command, arc, (first, last), still, offset)

    def _contact(self, command: Piece, k: int, low: float, high: float, wanted: float, way: int) -> float:
        """The share at which an axis gets into contact; ``low`` where it is, ``high`` or more where it never does."""
        if (wanted - command.point(low)[k]) * way <= CONTACT:
            return low
        if (wanted - command.point(high)[k]) * way >= 0.0:
            return math.inf
        for _ in range(60):
            middle = 0.5 * (low + high)
            if (wanted - command.point(middle)[k]) * way > 0.0:
                low = middle
            else:
                high = middle
        return high

    def _part(
        self, command: Piece, arc: Arc, bounds: tuple[float, float], still: set[int], offset: Sequence[float]
    ) -> Iterator[Piece]:
        """A part on which each axis either stands still or moves in contact all the way."""
        low, high = bounds
        plane_still = [k for k in command.axes if k in still]
        steps = 1
        if len(plane_still) == 1 and any(command.start[k] != command.end[k] for k in range(6) if k not in command.axes):
            steps = max(1, math.ceil(abs(arc.sweep) * (high - low) / CHORD))
        now = self.actual
        for index in range(steps):
            first = low + (high - low) * index / steps
            last = high if index == steps - 1 else low + (high - low) * (index + 1) / steps
            end = command.point(last)
            then = [now[k] if k in still else end[k] - offset[k] for k in range(6)]
            shifted = None if plane_still else _shifted(command, arc, first, last, offset)
            yield Piece(
                command.rapid, command.line, self._show(now, command.point(first)), self._show(then, end),
                shifted, command.axes,
            )  # fmt: skip
            now = then
        self.actual = list(now)


def _shifted(command: Piece, arc: Arc, low: float, high: float, offset: Sequence[float]) -> Arc:
    """The part of an arc between two shares, its centre moved against the offsets of the plane axes."""
    first, second = (offset[k] for k in command.axes)
    return Arc(
        centre=(arc.centre[0] - first, arc.centre[1] - second),
        start_radius=arc.radius(low),
        end_radius=arc.radius(high),
        start_angle=arc.start_angle + arc.sweep * low,
        sweep=arc.sweep * (high - low),
    )


def _between(begin: Vector, end: Vector, share: float) -> Vector:
    if share == 0.0:
        return begin
    if share == 1.0:
        return end
    return tuple([a + (b - a) * share for a, b in zip(begin, end, strict=True)])
