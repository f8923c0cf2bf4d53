"""The proof: original and result are read anew, driven through the play of each axis, and their tool paths compared.

It shares the reading of programs with the rewriter and nothing else.  The original runs on a machine without lash;
the result runs on the machine as measured, from every corner of what is not known: each axis on either side at the
start and after each tool change, home point or machine coordinate.  Work offsets, tool lengths, home points and the
start position are not in the program; two different sets of arbitrary values stand for them.
"""

from __future__ import annotations

import itertools
import re
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace
from typing import NamedTuple

from gcodetool.inspection.curves import Gap, gap, is_still, nearest, stray
from gcodetool.inspection.machines import some_setup
from gcodetool.lash.path import Follower, Piece, Vector, intended
from gcodetool.lash.play import shift
from gcodetool.lash.running import Settings
from gcodetool.machine import Machine
from gcodetool.motion.controller import Controller
from gcodetool.motion.frames import OFFSET_WORDS
from gcodetool.motion.moves import ORDER, Event, Move, Setup
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import QUANTA_PER_MM, decimal_to_quanta

TOLERANCE_MM = 0.0006
_RUNS_KEPT = 64
_HOLE_END = 0.01
_OFFSET = re.compile(r"G5(?:[4-8]|9(?:\.[1-3])?)(?![\d.])")
Blocks = Callable[[], Iterable[Block]]


@dataclass(frozen=True, slots=True)
class Verdict:
    """What the proof found; lengths in mm, degrees on A B C.

    ``feed`` is the widest gap on feed motion, ``stray`` the widest of the rapids, ``uncompensated`` the widest gap on
    feed motion of the original program under the same lash.  ``broken`` says where the two programs do not even have
    the same feed and rapid motions, "" where they do.  ``runs`` counts simulated machines, ``corners`` start sides
    tried.
    """

    feed: Gap = field(default_factory=Gap)
    stray: Gap = field(default_factory=Gap)
    uncompensated: Gap = field(default_factory=Gap)
    tolerance: float = TOLERANCE_MM
    stray_allowed: float = 0.0
    broken: str = ""
    runs: int = 0
    corners: int = 0
    feed_pieces: int = 0

    @property
    def holds(self) -> bool:
        """True where the result cuts the intended part."""
        return not self.broken and self.feed.distance <= self.tolerance and self.stray.distance <= self.stray_allowed

    def joined(self, other: Verdict) -> Verdict:
        """The worse of two verdicts in each respect."""
        return Verdict(
            self.feed.wider(other.feed),
            self.stray.wider(other.stray),
            self.uncompensated.wider(other.uncompensated),
            self.tolerance,
            self.stray_allowed,
            self.broken or other.broken,
            self.runs + other.runs,
            max(self.corners, other.corners),
            max(self.feed_pieces, other.feed_pieces),
        )


class Run(NamedTuple):
    """Motion without a change between rapid and feed: its pieces, where the tool is after it, its last source line."""

    rapid: bool
    pieces: list[Piece]
    end: Vector
    line: int


def verify(
    original: Blocks, result: Blocks, machine: Machine, stated: Settings | None = None, tolerance: float | None = None
) -> Verdict:
    """Compare two programs; ``original`` and ``result`` give the blocks of a program anew at every call.

    ``stated`` is what the operator has said of the start, of offsets and tool lengths; the simulated machines keep to
    it. ``tolerance`` in mm; by default 0.0006, or the largest ripple of the machine where that is more.  Raises
    Refusal where a program cannot be read.
    """
    lashed = [axis for axis in machine.axes.values() if axis.lash > 0]
    ripple = max((float(axis.ripple or 0) for axis in lashed), default=0.0)
    allowed = max((float(axis.lash) for axis in lashed), default=0.0) + float(machine.settle_margin)
    base = Verdict(
        tolerance=tolerance if tolerance is not None else max(TOLERANCE_MM, ripple + 1e-4),
        stray_allowed=allowed * len(lashed) ** 0.5 + TOLERANCE_MM,
        corners=2 ** len(lashed),
    )
    stated = stated or Settings()
    for skip in _switches(original, stated):
        for seed in (1, 2):
            setup = some_setup(seed, machine, stated, _first_offset(original), skip)
            base = base.joined(_compare(original(), result(), machine, setup, stated))
            if seed == 1:
                base = base.joined(_uncompensated(original(), machine, setup, stated))
    return base


def _switches(original: Blocks, stated: Settings) -> tuple[bool, ...]:
    """Positions of the block delete switch to try: both where the program uses it and nothing is said."""
    if stated.block_delete is not None:
        return (stated.block_delete,)
    return (False, True) if any(block.text.lstrip().startswith("/") for block in original()) else (False,)


def _first_offset(original: Blocks) -> str:
    """The work offset that a program selects first: a stated start position is meant in it."""
    for block in original():
        found = _OFFSET.search(block.text.partition(";")[0].upper().partition("(")[0])
        if found:
            return found[0]
    return OFFSET_WORDS[0]


# ---- running a program -----------------------------------------------------------------------------------------------


class _Sink:
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

    def copy(self) -> _Sink:
        """One that goes on from here by itself."""
        other = _Sink()
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
    if length <= _HOLE_END:
        return piece
    step = tuple([w / length * _HOLE_END for w in way])
    return piece._replace(start=tuple([b - s for b, s in zip(piece.end, step, strict=True)]))


def _hardly_moves(piece: Piece) -> bool:
    """A rapid within the tolerance is no motion of its own: rounding must not cut a feed in two."""
    return all(abs(a - b) <= TOLERANCE_MM for a, b in zip(piece.start, piece.end, strict=True))


def _intended_runs(happenings: Iterable[Move | Event]) -> Iterator[Run]:
    sink, end = _Sink(), None
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


class _Corner:
    """One simulated machine: a follower, the run it is in, and how many runs it has done."""

    def __init__(self, follower: Follower, sink: _Sink, done: int) -> None:
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

    def follows(self, other: _Corner) -> bool:
        """True where the rest of the journey can only be that of the other machine."""
        return (
            self.done == other.done
            and self.follower.state() == other.follower.state()
            and self.sink.pieces == other.sink.pieces
        )


class _Fleet:
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
        self._corners = [_Corner(Follower(lash, datum, self._at, sides, known), _Sink(), 0) for sides in self._sides]

    @property
    def base(self) -> _Corner:
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
            _Corner(base.follower.copy(sides), base.sink.copy(), base.done)
            for sides in self._sides
            if sides not in alive
        ]
        for corner in self._corners:
            corner.follower.lose(event.at, event.letters, kept=event.what == "tool change")
        self._at = event.at


# ---- comparing -------------------------------------------------------------------------------------------------------


def _contacts(blocks: Iterable[Block], setup: Setup) -> list[dict[str, int]]:
    """Where each probe of the original stops, machine coordinates."""
    found = []
    for item in Controller(setup).run(blocks):
        if isinstance(item, Event) and item.what == "probe":
            found.append(dict(zip(ORDER, item.at, strict=True)))
    return found


def _compare(
    original: Iterable[Block], result: Iterable[Block], machine: Machine, setup: Setup, stated: Settings
) -> Verdict:
    kept = list(original)
    contacts = _contacts(kept, setup) if any("38." in block.text for block in kept) else []
    driven = _touching(machine, setup, contacts) if contacts else setup
    got = _Fleet(machine, setup, stated).runs(Controller(driven).run(result))
    return _pairs(_intended_runs(Controller(setup).run(kept)), got)


def _touching(machine: Machine, setup: Setup, contacts: Sequence[Mapping[str, int]]) -> Setup:
    """The setup in which the drive of a probe stops one shift past the place where the tool touches."""
    lash = {letter: decimal_to_quanta(machine.axis(letter).lash) for letter in ORDER}
    moved = [{a: v + shift(-1, lash[a], machine.axis(a).datum) for a, v in place.items()} for place in contacts]
    return replace(setup, contacts=moved)


class _Wanted:
    """The runs of the original by number; what every machine has passed is dropped."""

    def __init__(self, runs: Iterator[Run]) -> None:
        self._runs = runs
        self._kept: dict[int, Run] = {}
        self._next = 0

    def __getitem__(self, number: int) -> Run | None:
        while self._next <= number:
            run = next(self._runs, None)
            if run is None:
                return None
            self._kept[self._next] = run
            self._kept.pop(self._next - _RUNS_KEPT, None)
            self._next += 1
        return self._kept.get(number)


def _pairs(wanted: Iterator[Run], got: Iterable[tuple[int, Run]]) -> Verdict:
    feed, away, pieces, last = Gap(), Gap(), 0, -1
    kept = _Wanted(wanted)
    for number, have in got:
        want = kept[number]
        if want is None or want.rapid != have.rapid:
            return Verdict(feed=feed, stray=away, broken=_broken(want, have), runs=1)
        if want.rapid:
            # a rapid that only puts an axis right after a cycle has no counterpart: it is near where the tool stood
            before = kept[number - 1] if number else None
            stood = [before.pieces[-1]._replace(start=before.end, end=before.end, arc=None)] if before else []
            away = away.wider(stray([*stood, *want.pieces], have.pieces))
        else:
            feed = feed.wider(gap(want.pieces, have.pieces))
        pieces += len(want.pieces) if not want.rapid and number > last else 0
        last = max(last, number)
    rest = kept[last + 1]
    return Verdict(feed=feed, stray=away, broken=_broken(rest, None) if rest else "", runs=1, feed_pieces=pieces)


def _broken(want: Run | None, have: Run | None) -> str:
    names = ["feed", "rapid"]
    if want is None and have is not None:
        return f"the result goes on after the original has ended (result line {have.pieces[0].line})"
    if have is None and want is not None:
        return f"the result ends before the original has (original line {want.pieces[0].line})"
    assert want is not None
    assert have is not None
    return (
        f"original line {want.pieces[0].line} is a {names[want.rapid]} where "
        f"result line {have.pieces[0].line} is a {names[have.rapid]}"
    )


def _uncompensated(blocks: Iterable[Block], machine: Machine, setup: Setup, stated: Settings) -> Verdict:
    """What the original would do on this machine: each feed move against the path it should have taken.

    The table lags behind its drive, so a point is compared with the move it belongs to and the one before; and the
    end of each move with the path that the table takes in it and in the next one.
    """
    follower = _Fleet(machine, setup, stated).base.follower
    worst = Gap()
    before: list[Piece] = []
    before_actual: list[Piece] = []
    for item in Controller(setup).run(blocks):
        if isinstance(item, Event):
            if item.what in ("tool change", "home"):
                follower.lose(item.at, item.letters, kept=item.what == "tool change")
            before, before_actual = [], []
            continue
        want, have = intended(item), list(follower.drive(item))
        if not item.rapid:
            for piece in have:
                for share in (0.5, 1.0):
                    worst = worst.wider(nearest([*before, want], piece.point(share), piece.line))
        if before and not before[0].rapid:
            worst = worst.wider(nearest([*before_actual, *have], before[0].end, before[0].line))
        before, before_actual = [want], have
    return Verdict(uncompensated=worst)
