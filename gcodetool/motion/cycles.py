"""Drilling and boring cycles: their sticky words, and the moves each stands for (NISTIR 6556, 3.5.16).

The normal axis of the plane is called Z here and the plane axes X and Y, whatever the plane.  Lengths in quanta.
Moves are given in the program frame; a move names only the axes that it is about.  A step is ``rapid``, ``in`` (a
feed that cuts), ``out`` (a feed that comes back), ``peck`` (a feed to a depth on the way) or ``back`` (a rapid
between pecks).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from gcodetool.motion.command import Command
from gcodetool.motion.dialect import PLANE_AXES
from gcodetool.program.numbers import QUANTA_PER_MM, exact, to_quanta

# how far a peck comes back above the last depth; the text gives no number (0.010 in in its source, from memory)
PECK_CLEARANCE = 254 * QUANTA_PER_MM // 1000
MOST_REPEATS = 100_000
MOST_PECKS = 100_000
Step = tuple[str, dict[str, int]]


class Sticky:
    """The words that a cycle keeps from block to block, as number text with the units they were written in."""

    def __init__(self) -> None:
        """No cycle has been read."""
        self.motion = ""
        self.words: dict[str, tuple[str, tuple[int, ...]]] = {}

    def take(self, command: Command) -> None:
        """Note the words of a cycle block: R stays for all cycles, the others while the same cycle goes on."""
        if command.after.motion != self.motion:
            self.motion = command.after.motion
            self.words = {letter: word for letter, word in self.words.items() if letter == "R"}
        normal = PLANE_AXES[command.after.plane][2]
        letters = [normal, "R", "Q", "P", "I", "J"] + (["K"] if self.motion == "G87" else [])
        for letter in letters:
            if command.has(letter):
                self.words[letter] = (command.number(letter), command.after.digit)

    def drop(self) -> None:
        """The cycle has been cancelled; R stays."""
        self.motion = ""

    def quanta(self, letter: str) -> int | None:
        """The value of a sticky word, None where it was never given."""
        word = self.words.get(letter)
        return None if word is None else to_quanta(*word)


@dataclass(frozen=True, slots=True)
class Cycle:
    """One cycle block with everything it needs: where, how deep, how often.

    ``steps`` are the plane axis words as written: targets, or increments where ``absolute`` is False.  ``bottom``,
    ``level`` (R) and ``top`` (K of G87) are targets of the normal axis; ``clear`` is the level it returns to.
    """

    word: str
    plane: tuple[str, str, str]
    absolute: bool
    steps: dict[str, int]
    bottom: int
    level: int
    top: int
    clear: int
    peck: int
    aside: dict[str, int]
    repeats: int


def read_cycle(command: Command, sticky: Sticky, height: int) -> Cycle:
    """The cycle a block asks for, its words already in ``sticky``; ``height`` is where the normal axis stands.

    Raises Refusal for the errors of NISTIR 6556, 3.5.16.
    """
    if command.after.feed_mode == "G93":
        raise command.refusal(command.after.motion, "a cycle in inverse time", "State G94 before the cycle")
    plane = PLANE_AXES[command.after.plane]
    absolute = command.after.distance == "G90"
    level, depth = sticky.quanta("R"), sticky.quanta(plane[2])
    if level is None or depth is None:
        missing = "R" if level is None else plane[2]
        raise command.refusal(
            command.after.motion, f"the cycle has no {missing}", "State it in the first block of the cycle"
        )
    level = level if absolute else height + level
    bottom = depth if absolute else level + depth
    if level < bottom:
        raise command.refusal(
            command.block.text.strip()[:40], "R lies below the bottom of the hole", "Mend R or the depth"
        )
    top = _top(command, sticky, bottom, absolute)
    return Cycle(
        word=command.after.motion,
        plane=plane,
        absolute=absolute,
        steps={a: command.quanta(a) for a in plane[:2] if command.has(a)},
        bottom=bottom,
        level=level,
        top=top,
        clear=max(height, level) if command.after.retract == "G98" else level,
        peck=_peck(command, sticky),
        aside={plane[k]: sticky.quanta("IJ"[k]) or 0 for k in (0, 1)} if command.after.motion == "G87" else {},
        repeats=_repeats(command),
    )


def _top(command: Command, sticky: Sticky, bottom: int, absolute: bool) -> int:
    if command.after.motion != "G87":
        return bottom
    top = sticky.quanta("K")
    if top is None:
        raise command.refusal("G87", "back boring without K", "State K, the level it bores up to")
    top = top if absolute else bottom + top
    if top < bottom:
        raise command.refusal("G87", "K lies below the level it starts from", "Mend K or the depth")
    return top


def _peck(command: Command, sticky: Sticky) -> int:
    if command.after.motion not in ("G73", "G83"):
        return 0
    peck = sticky.quanta("Q")
    if peck is None or peck <= 0:
        raise command.refusal(
            command.after.motion, "a pecking cycle needs Q above zero", "State Q, the depth of one peck"
        )
    return peck


def _repeats(command: Command) -> int:
    letter = "L" if command.has("L") else "K" if command.has("K") and command.after.motion != "G87" else ""
    if not letter:
        return 1
    value, decimals = exact(command.number(letter))
    if value % 10**decimals or not 1 <= value // 10**decimals <= MOST_REPEATS:
        word = letter + command.number(letter).strip()
        raise command.refusal(word, "repeats are whole numbers from 1", "Mend the number of repeats")
    return int(value // 10**decimals)


def cycle_steps(cycle: Cycle, start: Mapping[str, int]) -> Iterator[Step]:
    """The moves of a cycle block from ``start``, in order."""
    first, second, normal = cycle.plane
    place = {first: start[first], second: start[second]}
    if start[normal] < cycle.level:
        yield "rapid", {normal: cycle.level}
    for _ in range(cycle.repeats):
        for letter, step in cycle.steps.items():
            place[letter] = step if cycle.absolute else place[letter] + step
        if cycle.word == "G87":
            yield from _back_bore(cycle, place)
            continue
        yield "rapid", dict(place)
        yield "rapid", {normal: cycle.level}
        yield from _hole(cycle, normal)


def _hole(cycle: Cycle, normal: str) -> Iterator[Step]:
    if cycle.peck:
        yield from _pecks(cycle, normal)
    yield "in", {normal: cycle.bottom}
    yield ("out" if cycle.word in ("G84", "G85", "G89") else "rapid"), {normal: cycle.clear}


def _pecks(cycle: Cycle, normal: str) -> Iterator[Step]:
    """All pecks but the last: down, back, down again to just above the last depth."""
    depth = cycle.level - cycle.peck
    for _ in range(MOST_PECKS):
        if depth <= cycle.bottom:
            return
        yield "peck", {normal: depth}
        if cycle.word == "G83":
            yield "back", {normal: cycle.clear}
        yield "back", {normal: min(depth + PECK_CLEARANCE, cycle.level)}
        depth -= cycle.peck


def _back_bore(cycle: Cycle, place: Mapping[str, int]) -> Iterator[Step]:
    aside = {letter: place[letter] + cycle.aside[letter] for letter in cycle.plane[:2]}
    normal = cycle.plane[2]
    yield "rapid", dict(aside)
    yield "rapid", {normal: cycle.bottom}
    yield "rapid", dict(place)
    yield "in", {normal: cycle.top}
    yield "in", {normal: cycle.bottom}
    yield "rapid", dict(aside)
    yield "rapid", {normal: cycle.clear}
    yield "rapid", dict(place)
