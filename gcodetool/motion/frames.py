"""Work offsets, set positions, local shifts and tool lengths of a controller: from program to machine coordinates.

Program position = machine position - origin; the origin of an axis is the sum of the active work offset, the G92
offset, the G52 shift and, for Z, the tool length (NISTIR 6556, 3.5.5, 3.5.10, 3.5.14, 3.5.17).  All in quanta.
"""

from __future__ import annotations

from collections.abc import Mapping

from gcodetool.motion.command import Command
from gcodetool.motion.moves import Setup
from gcodetool.program.numbers import exact

OFFSET_WORDS = ("G54", "G55", "G56", "G57", "G58", "G59", "G59.1", "G59.2", "G59.3")


class Frames:
    """The offsets in force; mutable, as they are in a controller."""

    def __init__(self, setup: Setup) -> None:
        """Wake up in the first work offset with no tool length, no set position, no local shift."""
        self.active = "G54"
        self.offsets = {word: dict(setup.offsets.get(word, {})) for word in OFFSET_WORDS}
        self.lengths = dict(setup.lengths)
        self.length = 0
        self.set: dict[str, int] = {}
        self.saved: dict[str, int] = {}
        self.local: dict[str, int] = {}

    def origin(self, letter: str) -> int:
        """Machine position of program zero of an axis."""
        length = self.length if letter == "Z" else 0
        return self.offsets[self.active].get(letter, 0) + self.set.get(letter, 0) + self.local.get(letter, 0) + length

    def change(self, command: Command, machine: Mapping[str, int]) -> None:
        """G92, G10, G52; ``machine`` is where the axes stand."""
        here = command.g.here
        if "G92" in here:
            for letter, _ in command.shape.axes:
                self.set[letter] = (
                    self.set.get(letter, 0) + machine[letter] - self.origin(letter) - command.quanta(letter)
                )
            self.saved = dict(self.set)
        elif "G92.1" in here or "G92.2" in here:
            self.saved = {} if "G92.1" in here else self.saved
            self.set = {}
        elif "G92.3" in here:
            self.set = dict(self.saved)
        elif "G52" in here:
            self.local.update({letter: command.quanta(letter) for letter, _ in command.shape.axes})
        elif "G10" in here:
            self._g10(command, machine)

    def _g10(self, command: Command, machine: Mapping[str, int]) -> None:
        kind = whole(command, "L")
        number = whole(command, "P")
        if kind == 1:
            self.lengths[number] = command.quanta("Z") if command.has("Z") else self.lengths.get(number, 0)
            return
        system = self.active if number == 0 else offset_word(command, number)
        for letter, _ in command.shape.axes:
            value = command.quanta(letter)
            if kind == 20:
                rest = self.origin(letter) - self.offsets[self.active].get(letter, 0)
                value = machine[letter] - rest - value
            self.offsets[system][letter] = value

    def change_length(self, command: Command) -> None:
        """G43, G43.1, G49."""
        if command.g.length == "G49":
            self.length = 0
        elif command.g.length == "G43.1":
            self.length = command.quanta("Z") if command.has("Z") else self.length
        else:
            self.length = self.lengths.get(whole(command, "H") if command.has("H") else 0, 0)


def whole(command: Command, letter: str) -> int:
    """The whole number of a word; 0 where the block has none.  Raises Refusal for a broken number."""
    if not command.has(letter):
        return 0
    value, decimals = exact(command.number(letter))
    if value % 10**decimals or value < 0:
        word = letter + command.number(letter).strip()
        raise command.refusal(word, "this must be a whole number", "Mend the word")
    return int(value // 10**decimals)


def offset_word(command: Command, number: int) -> str:
    """The work offset that a P number means."""
    if not 1 <= number <= len(OFFSET_WORDS):
        raise command.refusal(f"P{number}", "there is no such work offset", "Use P1 to P9")
    return OFFSET_WORDS[number - 1]
