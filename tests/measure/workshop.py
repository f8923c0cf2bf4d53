"""A machine with known lash that runs the plain G-code of the measuring programs, for the tests only.

It knows G0 G1 G4 M0 M2 M3 M5 in mm and G90, and nothing of the product.  One axis: the drive drags the table by a
play of the lash (Krasnosel'skii & Pokrovskii 1989), [0, B] behind the command for datum -, [-B, 0] for datum +.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field

AXES = "XYZABC"


@dataclass
class Machine:
    """Positions as the controller believes them (command) and as they are (actual)."""

    lash: Mapping[str, float]
    datum: Mapping[str, int] = field(default_factory=dict)
    start: Mapping[str, float] = field(default_factory=dict)
    start_side: Mapping[str, float] = field(default_factory=dict)  # 0: minus flank, 1: plus flank, between: in the play

    def __post_init__(self) -> None:
        self.command = {axis: self.start.get(axis, 0.0) for axis in AXES}
        self.actual = {a: self.command[a] - self.low(a) - self.start_side.get(a, 0.0) * self.width(a) for a in AXES}

    def width(self, axis: str) -> float:
        return self.lash.get(axis, 0.0)

    def low(self, axis: str) -> float:
        return 0.0 if self.datum.get(axis, -1) < 0 else -self.width(axis)

    def move(self, axis: str, position: float) -> None:
        high = self.low(axis) + self.width(axis)
        self.command[axis] = position
        self.actual[axis] = min(max(self.actual[axis], position - high), position - self.low(axis))


@dataclass(frozen=True)
class Event:
    """A stroke (``rapid``, ``feed``) with true positions at its ends, or a ``stop``; with the comments before it."""

    kind: str
    before: dict[str, float]
    after: dict[str, float]
    note: str
    message: str


def run(program: str, machine: Machine) -> Iterator[Event]:
    """Run a program block by block; a word it does not know is an error."""
    note = message = ""
    for line in program.splitlines():
        for comment in re.findall(r"\(([^()]*)\)", line):
            message, note = (comment[4:], note) if comment.startswith("MSG,") else (message, comment)
        words = [(word[0], float(word[1:])) for word in re.sub(r"\([^()]*\)", "", line).split()]
        codes = [f"{letter}{value:g}" for letter, value in words if letter in "GM"]
        if codes in ([], ["G21", "G90", "G17", "G94"], ["M5"], ["M3"]):
            continue
        if codes == ["M2"]:
            return
        before = dict(machine.actual)
        if codes in (["M0"], ["G4"]):
            yield Event("stop", before, before, note, message)
            continue
        assert codes in (["G0"], ["G1"]), line
        for letter, value in words:
            if letter in AXES:
                machine.move(letter, value)
            else:
                assert letter in "GF", line
        yield Event("rapid" if codes == ["G0"] else "feed", before, dict(machine.actual), note, message)
    raise AssertionError("the program has no end")


def cuts(program: str, machine: Machine) -> list[Event]:
    """The feed strokes below Z 0 that move sideways."""
    return [
        event
        for event in run(program, machine)
        if event.kind == "feed" and event.before["Z"] < 0 and event.after["Z"] == event.before["Z"]
    ]
