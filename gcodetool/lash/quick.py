"""A short way for the commonest block: a straight feed in G90 that turns no axis.

It takes a block only where ``straight.feed`` would do no more than shift its targets, and then does just that; every other
block goes the ordinary way.  A property test holds both ways to the same output and state.

Whether an axis turns is seen from floats: reading a decimal of up to 15 digits as a float keeps order and equality.  What is
written is made from exact integers, as everywhere.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from typing import NamedTuple

from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.lash.running import Running
from gcodetool.motion.modal import g_words, step
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import INCH_DIGIT, MM_DIGIT, QUANTA_PER_MM, decimals_of, digits, to_quanta
from gcodetool.program.words import WORD

_LETTERS = frozenset("NGFXYZABC")
_FEED_WORDS = frozenset({"1", "01", "1.", "001"})
_LONGEST = 15
_POWER = tuple(10**k for k in range(32))
_MOTIONS = frozenset({"G0", "G1", "G2", "G3"})
_QUANTA_PER_INCH = 254 * 10**9


class _Track:
    """One axis as the short way sees it: side, farthest place in program units, last word, digits of its shift."""

    __slots__ = ("axis", "far", "last", "places", "side", "step")

    def __init__(self, axis: AxisKnowledge) -> None:
        self.axis = axis
        self.last = ""
        self.far = 0.0
        self.side = self.step = self.places = 0

    def read(self, inch: bool, decimals: int) -> None:
        """Take over what is known of the axis."""
        axis = self.axis
        in_inches = inch and not axis.rotary
        # side 2 lets every target pass; side 0, where a turn cannot be judged, lets none
        self.side = (axis.side if axis.framed else 0) if axis.mm_lash else 2
        self.far = axis.extreme / (_QUANTA_PER_INCH if in_inches else QUANTA_PER_MM)
        self.places = decimals + in_inches
        self.step = axis.shifts[in_inches][axis.side] // (INCH_DIGIT if in_inches else MM_DIGIT)[self.places]

    def tell(self, inch: bool) -> None:
        """Hand over the last word that went the short way."""
        axis = self.axis
        in_inches = inch and not axis.rotary
        axis.position = axis.extreme = to_quanta(self.last, INCH_DIGIT if in_inches else MM_DIGIT)
        axis.decimals = max(axis.decimals, decimals_of(self.last))
        axis.shift = axis.shifts[in_inches][axis.side]
        axis.framed = True
        self.last = ""


class _Plan(NamedTuple):
    """Where the words of a block with certain letters stand; 0 where there is none."""

    g: int
    f: int
    axes: tuple[tuple[_Track, int], ...]
    letters: tuple[str, ...]


class Quick:
    """The short way of one rewriting; ``ordinary`` takes a block that it leaves, ``is_open`` says whether it may be used."""

    def __init__(self, run: Running, ordinary: Callable[[Block], None], is_open: Callable[[], bool]) -> None:
        """Nothing is known of any block yet."""
        self._run = run
        self._ordinary = ordinary
        self._is_open = is_open
        self._plans: dict[str, _Plan | None] = {}
        self._tracks: dict[str, _Track] = {}
        self._inch = False

    def stream(self, blocks: Iterable[Block]) -> None:
        """Take all blocks, each the shortest way it can go."""
        run, plans, split, join = self._run, self._plans, WORD.split, "".join
        out, take = run.out, self._take
        ready = self._begin()
        for block in blocks:
            if ready:
                pieces = split(block.text)
                letters = join(pieces[1::3])
                plan = plans[letters] if letters in plans else self._new_plan(letters)
                if plan is not None and (not (gaps := join(pieces[::3])) or gaps.isspace()) and take(pieces, plan):
                    text = join(pieces) + block.ending
                    if out.slot is None:
                        out.write(text)
                    else:
                        out.put(text, plan.letters)
                    continue
            self._end()
            self._ordinary(block)
            ready = self._begin()
        self._end()

    def _begin(self) -> bool:
        """Take over what is known; True where the modes and all that is known allow the short way."""
        run, state = self._run, self._run.state
        modes = state.distance == "G90" and state.units is not None and state.feed_mode == "G94"
        if not modes or state.motion not in _MOTIONS or run.maybe_adrift or not self._is_open():
            return False
        self._inch = state.units == "G20"
        for track in self._tracks.values():
            track.read(self._inch, run.machine.decimals)
        return True

    def _end(self) -> None:
        """Hand over what the short way has done."""
        for track in self._tracks.values():
            if track.last:
                track.tell(self._inch)

    def _new_plan(self, letters: str) -> _Plan | None:
        plan = None
        upper = letters.upper()
        if len(set(upper)) == len(upper) and set(upper) <= _LETTERS and set(upper) & set("XYZABC"):
            at = {letter: 3 * k + 2 for k, letter in enumerate(upper)}
            axes = tuple((self._track(letter), at[letter]) for letter in "XYZABC" if letter in at)
            plan = _Plan(at.get("G", 0), at.get("F", 0), axes, tuple(track.axis.letter for track, _ in axes))
        if len(self._plans) > 4096:
            self._plans.clear()
        self._plans[letters] = plan
        return plan

    def _track(self, letter: str) -> _Track:
        track = self._tracks.get(letter)
        if track is None:
            track = self._tracks[letter] = _Track(self._run.axes[letter])
            track.read(self._inch, self._run.machine.decimals)
        return track

    def _take(self, pieces: list[str], plan: _Plan) -> bool:
        """Shift the words and say True, or leave everything as it is and say False."""
        run = self._run
        state = run.state
        g, f, axes, _ = plan
        if pieces[g] not in _FEED_WORDS if g else state.motion != "G1":
            return False
        if not f and run.feed_written != run.feed and run.feed_written is not None:
            return False
        found = []
        for track, index in axes:
            text = pieces[index]
            if len(text) > _LONGEST:
                return False
            at, side = float(text), track.side
            if side != 2 and (at < track.far if side > 0 else not side or at > track.far):
                return False
            found.append((track, index, text, at))
        if f:
            run.feed = run.feed_written = pieces[f].lstrip()
        if g and state.motion != "G1":
            run.state = step(state, g_words((pieces[g],)))
        changed = False
        for track, index, text, at in found:
            track.far, track.last = at, text
            if track.step:
                pieces[index] = _shifted(text, track.step, track.places)
                changed = True
        run.tally.changed += changed
        return True


def _shifted(text: str, step: int, places: int) -> str:
    """A number text with ``step`` last digits of ``places`` decimals more, in its own style and with all its decimals."""
    head, _, tail = text.partition(".")
    decimals = len(tail)
    if decimals <= places:
        value = int(head + tail) * _POWER[places - decimals] + step
    else:
        value = int(head + tail) + step * _POWER[decimals - places]
        places = decimals
    if value >= 0 and text[0].isdigit() and len(shown := str(value)) > places:
        return f"{shown[:-places]}.{shown[-places:]}"
    return text[: len(text) - len(text.lstrip(" \t"))] + digits(value, places, text)
