"""A short way for the commonest blocks: rapids, and feeds and arcs in G90 that turn no axis.

It takes a block only where ``straight`` and ``curved`` would do no more than shift its targets, and then does just
that; every other block goes the ordinary way.  A property test holds both ways to the same output and state.

Whether an axis turns is seen from floats: reading a decimal of up to 15 digits as a float keeps order and equality.
What is written is made from exact integers, as everywhere.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable
from typing import NamedTuple

from gcodetool.lash.running import Running
from gcodetool.lash.track import ANY_SIDE, Track, in_one_quadrant, shifted_text
from gcodetool.motion.dialect import CENTRE_LETTER, PLANE_AXES
from gcodetool.motion.modal import ModalState, g_words, step
from gcodetool.motion.targets import LOOSEST_MISMATCH_MM
from gcodetool.program.blocks import Block
from gcodetool.program.rewrite import Word, look_of, new_line
from gcodetool.program.words import WORD

_LETTERS = frozenset("NGFXYZABCIJK")
_MOTIONS = {"0": "G0", "00": "G0", "1": "G1", "01": "G1", "2": "G2", "02": "G2", "3": "G3", "03": "G3"}
_LONGEST = 15
_Found = list[tuple[Track, int, str, float]]


class _Plan(NamedTuple):
    """Where the words of a block with certain letters stand; 0 where there is none.  ``centre`` are I, J and K."""

    g: int
    f: int
    axes: tuple[tuple[Track, int], ...]
    centre: dict[str, int]
    letters: tuple[str, ...]


class Quick:
    """The short way; ``ordinary`` takes a block that it leaves, ``is_open`` says whether it may be used."""

    def __init__(self, run: Running, ordinary: Callable[[Block], None], is_open: Callable[[], bool]) -> None:
        """Nothing is known of any block yet."""
        self._run = run
        self._ordinary = ordinary
        self._is_open = is_open
        self._plans: dict[str, _Plan | None] = {}
        self._tracks: dict[str, Track] = {}
        self._inch = False

    def stream(self, blocks: Iterable[Block]) -> None:
        """Take all blocks, each the shortest way it can go."""
        run, plans, split, join = self._run, self._plans, WORD.split, "".join
        out, take = run.out, self._take
        ready = self._begin()
        block = None
        for block in blocks:
            if ready:
                pieces = split(block.text)
                letters = join(pieces[1::3])
                plan = plans[letters] if letters in plans else self._new_plan(letters)
                gaps = join(pieces[::3])
                before = None
                if plan is not None and (not gaps or gaps.isspace()):
                    before = take(block, pieces, plan)
                if plan is not None and before is not None:
                    text = before + join(pieces) + block.ending
                    if out.slot is None:
                        out.write(text)
                    else:
                        # an arc moves both axes of its plane, whichever it has words of
                        out.put(text, plan.letters + (PLANE_AXES[run.state.plane][:2] if plan.centre else ()))
                    if run.state.motion == "G0":
                        run.open_slot(run.state, pieces, block.ending)
                    continue
            self._end()
            self._ordinary(block)
            ready = self._begin()
        self._end()
        if block is not None:
            run.tally.blocks = block.number

    def _begin(self) -> bool:
        """Take over what is known; True where the modes and all that is known allow the short way."""
        run, state = self._run, self._run.state
        if run.settings.hole_overshoot or run.settings.clear_z is not None:
            return False
        modes = state.distance == "G90" and state.units is not None and state.feed_mode == "G94"
        if not modes or run.maybe_adrift or state.motion not in ("G0", "G1", "G2", "G3") or not self._is_open():
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
            centre = {letter: at[letter] for letter in "IJK" if letter in at}
            plan = _Plan(at.get("G", 0), at.get("F", 0), axes, centre, tuple(track.axis.letter for track, _ in axes))
        if len(self._plans) > 4096:
            self._plans.clear()
        self._plans[letters] = plan
        return plan

    def _track(self, letter: str) -> Track:
        track = self._tracks.get(letter)
        if track is None:
            track = self._tracks[letter] = Track(self._run.axes[letter])
            track.read(self._inch, self._run.machine.decimals)
        return track

    def _take(self, block: Block, pieces: list[str], plan: _Plan) -> str | None:
        """Shift the words and give the line to write before them ("" for none), or None, with nothing changed."""
        run = self._run
        state = run.state
        g, f, axes, centre, _ = plan
        motion = _MOTIONS.get(pieces[g]) if g else state.motion
        if motion is None or (centre and motion < "G2") or (motion >= "G2" and not centre):
            return None
        if not f and run.feed_written != run.feed and run.feed_written is not None and motion != "G0":
            return None
        targets = _targets(pieces, axes)
        if targets is None:
            return None
        found, turning = targets
        if centre and not self._is_plain_arc(pieces, centre, found, state, motion):
            return None
        before = ""
        if turning and motion != "G0":
            here = [track for track in turning if not run.out.takes(track.axis.letter)]
            if run.machine.take_up_feed is not None or (here and not g and motion != "G1"):
                return None
            if f:
                run.feed = pieces[f].lstrip()
            before = self._take_up(block, pieces, turning, here)
        if f:
            run.feed = run.feed_written = pieces[f].lstrip()
        if motion != state.motion:
            run.state = step(state, g_words((pieces[g],)))
        self._shift(pieces, axes, found)
        return before

    def _take_up(self, block: Block, pieces: list[str], turning: list[Track], here: list[Track]) -> str:
        """Turn these axes: in the slot those that it takes, the others (``here``) by the line that is returned."""
        run = self._run
        words: list[Word] = [("G", "1")]
        for track in turning:
            axis = track.axis
            track.tell(self._inch)
            like = pieces[track.index_in(pieces)]
            if track in here:
                words.append((axis.letter, run.number_at(axis, run.state, -track.side, like)))
            else:
                run.take_up_in_slot(block.number, axis, -track.side, like)
        if not here:
            return ""
        if run.feed is not None and run.feed != run.feed_written:
            words.append(("F", run.feed))
        run.count(block.number, run.state, [track.axis for track in here], True, run.feed)
        look = look_of(pieces, "".join(pieces[1::3]).islower(), run.usual_blank)
        return new_line(words, look) + (block.ending or run.usual_ending)

    def _is_plain_arc(
        self, pieces: list[str], centre: dict[str, int], found: _Found, state: ModalState, motion: str
    ) -> bool:
        """True for an arc inside one quadrant on which every lashed plane axis goes on the way it went."""
        first, second, normal = PLANE_AXES[state.plane]
        offsets = []
        for letter in (first, second, normal):
            index = centre.get(CENTRE_LETTER[letter], 0)
            if index and len(pieces[index]) > _LONGEST:
                return False
            offsets.append(float(pieces[index]) if index else 0.0)
        if state.centre != "G91.1" or offsets[2]:
            return False
        tracks = self._track(first), self._track(second)
        ends = {track: at for track, _, _, at in found}
        v = [ends.get(track, track.at) - track.at - offset for track, offset in zip(tracks, offsets, strict=False)]
        u = -offsets[0], -offsets[1]
        scale = 25.4 if self._inch else 1.0
        if abs(math.hypot(*u) - math.hypot(*v)) * scale > LOOSEST_MISMATCH_MM:
            return False
        least = 0.25 * min((t.ripple for t in tracks if t.side != ANY_SIDE), default=0.0)
        ways = in_one_quadrant(u, (v[0], v[1]), motion == "G3", least)
        sides = {track: side for track, side, _, _ in found}
        return ways is not None and all(
            t.placed and sides.get(t, t.side) in (ANY_SIDE, way) for t, way in zip(tracks, ways, strict=True)
        )

    def _shift(self, pieces: list[str], axes: tuple[tuple[Track, int], ...], found: _Found) -> None:
        """Move the axes to their targets and shift the words."""
        changed = False
        for (track, index), (_, side, text, at) in zip(axes, found, strict=True):
            track.far = track.at = at
            track.last, track.placed = text, True
            if side != track.side:
                track.turn(side)
            if track.step:
                pieces[index] = shifted_text(text, track.step, track.places)
                changed = True
        self._run.tally.changed += changed


def _targets(pieces: list[str], axes: tuple[tuple[Track, int], ...]) -> tuple[_Found, list[Track]] | None:
    """Track, side, text and value of each target word, and the tracks that turn; None where that cannot be judged."""
    found: _Found = []
    turning: list[Track] = []
    for track, index in axes:
        text = pieces[index]
        if len(text) > _LONGEST:
            return None
        at, side = float(text), track.side
        if side != ANY_SIDE and (at < track.far if side > 0 else not side or at > track.far):
            if not side or abs(at - track.far) <= track.ripple:
                return None
            side = -side
            turning.append(track)
        found.append((track, side, text, at))
    return found, turning
