"""Programs as runs of motion: feeds between rapids, and the machines that follow them.

A *run* is motion without a change between rapid and feed.  What does not move the tool is no motion: a take-up leaves
no piece.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterable, Iterator, Sequence
from typing import NamedTuple

from gcodetool.inspection.curves import is_still
from gcodetool.lash.path import Follower, Piece, Vector, intended
from gcodetool.lash.running import Settings
from gcodetool.machine import Machine
from gcodetool.motion.moves import ORDER, Event, Move, Setup
from gcodetool.program.numbers import QUANTA_PER_MM

# a rapid within the tolerance of the proof is no motion of its own, in mm
HARDLY = 0.0006
_HOLE_END = 0.01


class Run(NamedTuple):
    """Motion without a change between rapid and feed: its pieces, where the tool is after it, its last source line."""

    rapid: bool
    pieces: list[Piece]
    end: Vector
    line: int


class Sink:
    """Collects pieces into runs."""

    def __init__(self) -> None:
        self.rapid: bool | None = None
        self.pieces: list[Piece] = []
        self.line = 0

    def add(self, piece: Piece, end: Vector) -> Run | None:
        """Take one piece; the run that it ends, if it ends one.  ``end`` is where the tool stood before it."""
        if piece.hole in ("peck", "back"):
            # depths on the way are cut again; how often depends on the play, the hole does not
            return None
        if piece.hole == "out":
            piece = piece._replace(rapid=True)
        elif piece.hole:
            piece = _bottom(piece)
        if is_still(piece) or (piece.rapid and _hardly_moves(piece)):
            return None
        done = None
        if self.rapid is not None and piece.rapid != self.rapid:
            done = Run(self.rapid, self.pieces, end, self.line)
            self.pieces = []
        self.rapid = piece.rapid
        self.pieces.append(piece)
        self.line = piece.line
        return done

    def copy(self) -> Sink:
        """One that goes on from here by itself."""
        other = Sink()
        other.rapid, other.pieces, other.line = self.rapid, list(self.pieces), self.line
        return other

    def last(self, end: Vector) -> Run | None:
        """The run at the end of the program."""
        return Run(self.rapid, self.pieces, end, self.line) if self.rapid is not None else None


def _bottom(piece: Piece) -> Piece:
    """Of a feed inside a cycle the last hundredth that cuts: above it the tool is in the hole that it has made.

    The return in air may stray by the lash, so a hole may be begun that much lower; its bottom and its place are exact.
    """
    way = [b - a for a, b in zip(piece.start, piece.end, strict=True)]
    length = max(map(abs, way))
    if length == 0.0:
        return piece
    step = tuple([w / length * _HOLE_END for w in way])
    return piece._replace(start=tuple([b - s for b, s in zip(piece.end, step, strict=True)]))


def _hardly_moves(piece: Piece) -> bool:
    """A rapid within the tolerance is no motion of its own: rounding must not cut a feed in two."""
    return all(abs(a - b) <= HARDLY for a, b in zip(piece.start, piece.end, strict=True))


def intended_runs(happenings: Iterable[Move | Event]) -> Iterator[Run]:
    """The runs of a program on a machine without lash."""
    sink, end = Sink(), None
    for move in happenings:
        if isinstance(move, Move):
            piece = intended(move)
            done = sink.add(piece, end or piece.start)
            if done:
                yield done
            end = piece.end
        else:
            end = tuple(value / QUANTA_PER_MM for value in move.at)
    done = sink.last(end or (0.0,) * 6)
    if done:
        yield done


class Corner:
    """One simulated machine: a follower, the run it is in, and how many runs it has done."""

    def __init__(self, follower: Follower, sink: Sink, done: int) -> None:
        self.follower = follower
        self.sink = sink
        self.done = done

    def go(self, move: Move) -> list[tuple[int, Run]]:
        """The numbered runs that a move ends."""
        done = []
        before = self.follower.seen(move.start)
        for piece in self.follower.drive(move):
            run = self.sink.add(piece, before)
            if run:
                done.append((self.done, run))
                self.done += 1
            before = piece.end
        return done

    def follows(self, other: Corner) -> bool:
        """True where the rest of the journey can only be that of the other machine."""
        return (
            self.done == other.done
            and self.follower.state() == other.follower.state()
            and self.sink.pieces == other.sink.pieces
        )


class Fleet:
    """The machine from every corner of the unknown; those that have become alike are simulated once."""

    def __init__(self, machine: Machine, setup: Setup, stated: Settings) -> None:
        lash = {letter: float(axis.lash) for letter, axis in machine.axes.items()}
        datum = {letter: axis.datum for letter, axis in machine.axes.items()}
        lashed = [letter for letter in lash if lash[letter] > 0]
        self._at: Sequence[int] = [setup.start.get(letter, 0) for letter in ORDER]
        self._sides = [
            dict(zip(lashed, sides, strict=True)) for sides in itertools.product((-1, 1), repeat=len(lashed))
        ]
        known = {letter: said.side for letter, said in stated.start.items() if said.side}
        self._corners = [Corner(Follower(lash, datum, self._at, sides, known), Sink(), 0) for sides in self._sides]

    @property
    def base(self) -> Corner:
        """The machine that all others end up following."""
        return self._corners[0]

    def runs(self, happenings: Iterable[Move | Event]) -> Iterator[tuple[int, Run]]:
        """All runs of all machines, numbered."""
        for item in happenings:
            if isinstance(item, Move):
                for corner in self._corners:
                    yield from corner.go(item)
                self._at = item.end
                if len(self._corners) > 1:
                    base = self._corners[0]
                    self._corners = [base, *(c for c in self._corners[1:] if not c.follows(base))]
            elif item.what in ("tool change", "home"):
                self._lose(item)
        for corner in self._corners:
            run = corner.sink.last(corner.follower.seen(self._at))
            if run:
                yield corner.done, run

    def _lose(self, event: Event) -> None:
        base = self._corners[0]
        alive = [corner.follower.sides for corner in self._corners]
        self._corners += [
            Corner(base.follower.copy(sides), base.sink.copy(), base.done)
            for sides in self._sides
            if sides not in alive
        ]
        for corner in self._corners:
            corner.follower.lose(event.at, event.letters, kept=event.what == "tool change")
        self._at = event.at
