"""The proof: original and result are read anew, driven through the play of each axis, and their tool paths compared.

It shares the reading of programs with the rewriter and nothing else.  The original runs on a machine without lash;
the result runs on the machine as measured, from every corner of what is not known: each axis on either side at the
start and after each tool change, home point or machine coordinate.  Work offsets, tool lengths, home points and the
start position are not in the program; two different sets of arbitrary values stand for them.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field, replace

from gcodetool.inspection.curves import Ease, Gap, gap, nearest, stray
from gcodetool.inspection.machines import some_setup
from gcodetool.inspection.runs import Fleet, Run, intended_runs
from gcodetool.lash.path import Piece, intended
from gcodetool.lash.play import shift
from gcodetool.lash.reversals import Detector
from gcodetool.lash.running import Settings
from gcodetool.machine import Machine
from gcodetool.motion.controller import Controller
from gcodetool.motion.frames import OFFSET_WORDS
from gcodetool.motion.moves import ORDER, Event, Move, Setup
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import MM_DIGIT, QUANTA_PER_MM, decimal_to_quanta

TOLERANCE_MM = 0.0006
_RUNS_KEPT = 64
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


def verify(
    original: Blocks, result: Blocks, machine: Machine, stated: Settings | None = None, tolerance: float | None = None
) -> Verdict:
    """Compare two programs; ``original`` and ``result`` give the blocks of a program anew at every call.

    ``stated`` is what the operator has said of the start, of offsets and tool lengths; the simulated machines keep to
    it. ``tolerance`` in mm, by default 0.0006.  Where the ripple of an axis has passed over a reversal, and only
    there, the axis may be off by its ripple as well.  Raises Refusal where a program cannot be read.
    """
    stated = stated or Settings()
    lashed = [axis for axis in machine.axes.values() if axis.lash > 0]
    past = max((float(axis.lash) for axis in lashed), default=0.0) + float(machine.settle_margin)
    past = max(past, stated.hole_overshoot / QUANTA_PER_MM)
    base = Verdict(
        tolerance=TOLERANCE_MM if tolerance is None else tolerance,
        stray_allowed=past * len(lashed) ** 0.5 + TOLERANCE_MM,
        corners=2 ** len(lashed),
    )
    for skip in _switches(original, stated):
        for seed in (1, 2):
            setup = some_setup(seed, machine, stated, _first_offset(original), skip)
            ease = _ripple_places(original(), machine, setup)
            base = base.joined(_compare(original(), result(), machine, setup, stated, ease))
            if seed == 1:
                base = base.joined(_uncompensated(original(), machine, setup, stated))
    return base


def _ripple_places(blocks: Iterable[Block], machine: Machine, setup: Setup) -> Ease | None:
    """Where the ripple of the sheet has passed over a reversal: lines of the original and axes; None without a ripple.

    There an axis stands short of its extreme, or has come back to it inside the move.  The move after that is one of
    these places too, because it begins where they end.
    """
    stated = {a: axis.ripple for a, axis in machine.axes.items() if axis.lash and axis.ripple}
    if not stated:
        return None
    amount = {ORDER.index(a): decimal_to_quanta(value) for a, value in stated.items()}
    plain = Detector(dict.fromkeys(stated, MM_DIGIT[machine.decimals]))
    passing = Detector({ORDER[k]: value for k, value in amount.items()})
    lines: dict[int, frozenset[int]] = {}
    before: frozenset[int] = frozenset()
    anchor: dict[int, int] = {}
    for item in Controller(setup).run(blocks):
        every, counted = plain.take(item), passing.take(item)
        here: frozenset[int] = frozenset()
        if isinstance(item, Move):
            passed = frozenset(ORDER.index(r.axis) for r in every if r not in counted)
            here = passing.behind(item) | passed | _near_rapid(item, anchor, amount) | _near_quadrant(item, amount)
            if here or before:
                lines[item.line] = lines.get(item.line, frozenset()) | here | before
        before = here
    return Ease(tuple(float(stated.get(letter, 0)) for letter in ORDER), lines)


def _near_quadrant(move: Move, amount: Mapping[int, int]) -> frozenset[int]:
    """Plane axes that an arc turns within their ripple of its start: the take-up may be made at the start instead."""
    if move.arc is None:
        return frozenset()
    turns = [(move.axes[which], move.arc.point(share)[which] * QUANTA_PER_MM) for share, which in move.arc.quadrants()]
    return frozenset(k for k, place in turns if k in amount and abs(place - move.start[k]) <= amount[k])


def _near_rapid(move: Move, anchor: dict[int, int], amount: Mapping[int, int]) -> frozenset[int]:
    """Axes still within their ripple of where the last rapid left them, on a side that only the rewriter knows."""
    if move.rapid:
        anchor.update({k: move.end[k] for k in amount})
        return frozenset()
    for k in [k for k in anchor if abs(move.end[k] - anchor[k]) > amount[k]]:
        del anchor[k]
    return frozenset(k for k in anchor if move.end[k] != anchor[k])


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


# ---- comparing -------------------------------------------------------------------------------------------------------


def _contacts(blocks: Iterable[Block], setup: Setup) -> list[dict[str, tuple[int, int]]]:
    """Where each probe of the original stops, machine coordinates, and on which side it arrives there."""
    found = []
    start: Sequence[int] = ()
    for item in Controller(setup).run(blocks):
        if isinstance(item, Move):
            start = item.start
        elif item.what == "probe":
            ways = [(end > begin) - (end < begin) for begin, end in zip(start, item.at, strict=True)]
            found.append({a: (at, way) for a, at, way in zip(ORDER, item.at, ways, strict=True)})
    return found


def _compare(
    original: Iterable[Block],
    result: Iterable[Block],
    machine: Machine,
    setup: Setup,
    stated: Settings,
    ease: Ease | None,
) -> Verdict:
    kept = list(original)
    contacts = _contacts(kept, setup) if any("38." in block.text for block in kept) else []
    driven = _touching(machine, setup, contacts) if contacts else setup
    got = Fleet(machine, setup, stated).runs(Controller(driven).run(result))
    return _pairs(intended_runs(Controller(setup).run(kept)), got, ease)


def _touching(machine: Machine, setup: Setup, contacts: Sequence[Mapping[str, tuple[int, int]]]) -> Setup:
    """The setup in which the drive of a probe stops one shift past the place where the tool touches."""
    lash = {letter: decimal_to_quanta(machine.axis(letter).lash) for letter in ORDER}
    moved = [
        {a: at + (shift(way, lash[a], machine.axis(a).datum) if way else 0) for a, (at, way) in place.items()}
        for place in contacts
    ]
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


def _pairs(wanted: Iterator[Run], got: Iterable[tuple[int, Run]], ease: Ease | None) -> Verdict:
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
            feed = feed.wider(gap(want.pieces, have.pieces, ease))
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
    follower = Fleet(machine, setup, stated).base.follower
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
                for share in (0.5, 1.0) if piece.arc or want.arc else (1.0,):
                    worst = worst.wider(nearest([*before, want], piece.point(share), piece.line))
        if before and not before[0].rapid:
            worst = worst.wider(nearest([*before_actual, *have], before[0].end, before[0].line))
        before, before_actual = [want], have
    return Verdict(uncompensated=worst)
