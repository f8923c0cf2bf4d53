"""What the program itself tells of offsets.

Where both the old and the new value are known, positions follow the change.  All in quanta.  A value that the program
(or an option) has not given is unknown, and so is the position after it came into or went out of force.
"""

from __future__ import annotations

from gcodetool.lash.running import Running
from gcodetool.motion.command import Command
from gcodetool.motion.frames import offset_word, whole

_WAY_OUT = "Move {0} with a rapid (G0) in G90 before it"


class KnownFrames:
    """Offsets, lengths and set positions as far as they are known."""

    def __init__(self, run: Running) -> None:
        """Start from the table in the settings; no length is known to be in force, no set position."""
        self._run = run
        self._offsets = {word: dict(table) for word, table in run.settings.offsets.items()}
        self._lengths: dict[int, int] = dict(run.settings.lengths)
        self._length: int | None = None
        self._length_word: str | None = None
        self._set: dict[str, int] = {}
        self._local: dict[str, int] = {}
        self._forgotten = False

    def forget(self) -> None:
        """Nothing is known any more of lengths, offsets and set positions: a deletable block may have changed them."""
        self._length = self._length_word = None
        self._offsets.clear()
        self._set.clear()
        self._local.clear()
        self._lengths.clear()
        self._forgotten = True

    # ---- changes that are no word values ---------------------------------------------------------------------------

    def change_offset(self, command: Command) -> None:
        """Another work offset has been selected."""
        old, new = command.before.offset, command.after.offset
        if old is None and not self._run.moved:
            # what the operator states of the start is meant in the frame that the program selects first
            return
        for letter in self._run.axes:
            self._move(letter, self._offset(old, letter), self._offset(new, letter))

    def change_length(self, command: Command) -> None:
        """G43, G43.1, G49: Z keeps its side, and its position too where the change of length is known."""
        word, length = self._stated_length(command)
        first = self._length_word is None and not self._run.moved
        if not first and (word is None or word != self._length_word):
            self._move("Z", self._length, length)
        self._length, self._length_word = length, word

    def _stated_length(self, command: Command) -> tuple[str | None, int | None]:
        if command.g.length == "G49":
            return "G49", 0
        if command.g.length == "G43.1":
            value = command.quanta("Z") if command.has("Z") else None
            return (f"G43.1 {value}" if value is not None else None), value
        if not command.has("H"):
            return None, None
        number = whole(command, "H")
        return f"G43 H{number}", self._lengths.get(number)

    def _offset(self, word: str | None, letter: str) -> int | None:
        return self._offsets.get(word, {}).get(letter) if word else None

    def _move(self, letter: str, old: int | None, new: int | None) -> None:
        """The origin of an axis goes from ``old`` to ``new``."""
        axis = self._run.axes[letter]
        self._run.out.close()
        if old is None or new is None:
            axis.unframe()
        else:
            axis.rebase(old - new)

    # ---- G92, G10, G52 ---------------------------------------------------------------------------------------------

    def frame(self, run: Running, command: Command) -> None:
        """One block that changes the frame; values that set a position get the shift of their axis."""
        run.out.close()
        here = command.g.here
        pieces = list(command.pieces)
        if "G92" in here:
            for letter, _ in command.shape.axes:
                self._set_position(command, pieces, letter)
        elif here & {"G92.1", "G92.2", "G92.3"}:
            self._cancel(command)
        elif "G52" in here:
            for letter, _ in command.shape.axes:
                value = command.quanta(letter)
                self._move(letter, self._local.get(letter, None if self._forgotten else 0), value)
                self._local[letter] = value
        else:
            self._g10(command, pieces)
        run.put(command, ["".join(pieces)])

    def _set_position(self, command: Command, pieces: list[str], letter: str) -> None:
        """G92: the present position is called ``value``."""
        axis, value = self._run.axes[letter], command.quanta(letter)
        if axis.framed and letter in self._set:
            self._set[letter] += axis.position - value
        else:
            self._set.pop(letter, None)
        self._call_position(command, pieces, letter, value)

    def _call_position(self, command: Command, pieces: list[str], letter: str, value: int) -> None:
        axis, index = self._run.axes[letter], command.shape.at[letter]
        if not axis.idle:
            if axis.shift is None:
                word = letter + command.number(letter).strip()
                reason = f"zero is set where it is not known how far {letter} is off"
                raise command.refusal(word, reason, _WAY_OUT.format(letter))
            pieces[index] = self._run.plus(axis, pieces[index], command.after, axis.shift)
        axis.rebase(value - axis.position)
        axis.framed = True

    def _cancel(self, command: Command) -> None:
        """G92.1 to G92.3: known only where everything that led there is in the program."""
        restore = "G92.3" in command.g.here
        for letter in self._run.axes:
            self._move(letter, None if restore else self._set.get(letter), None if restore else 0)
            if not restore:
                self._set[letter] = 0
            else:
                self._set.pop(letter, None)

    def _g10(self, command: Command, pieces: list[str]) -> None:
        kind, number = whole(command, "L"), whole(command, "P")
        if kind == 1:
            if command.has("Z"):
                self._lengths[number] = command.quanta("Z")
            return
        if kind not in (2, 20):
            raise command.refusal(f"G10 L{kind}", "this form of G10 is not followed", "Use L2, L20 or L1")
        if command.has("R"):
            raise command.refusal("R" + command.number("R").strip(), "a rotated work offset mixes the axes", "Remove R")
        active = command.after.offset
        system = active if number == 0 else offset_word(command, number)
        for letter, _ in command.shape.axes:
            if kind == 2:
                self._set_offset(command, system, letter)
            else:
                self._set_zero(command, pieces, system, letter)

    def _set_offset(self, command: Command, system: str | None, letter: str) -> None:
        value = command.quanta(letter)
        if system == command.after.offset or command.after.offset is None or system is None:
            self._move(letter, self._offset(system, letter), value if system == command.after.offset else None)
        if system is not None:
            self._offsets.setdefault(system, {})[letter] = value

    def _set_zero(self, command: Command, pieces: list[str], system: str | None, letter: str) -> None:
        """L20: the present position gets a value in a work offset."""
        axis, index = self._run.axes[letter], command.shape.at[letter]
        if (system == command.after.offset and system is not None) or system is None:
            self._call_position(command, pieces, letter, command.quanta(letter))
        else:
            if not axis.idle:
                if axis.shift is None:
                    reason = f"zero is set where it is not known how far {letter} is off"
                    raise command.refusal("G10 L20", reason, _WAY_OUT.format(letter))
                pieces[index] = self._run.plus(axis, pieces[index], command.after, axis.shift)
            if command.after.offset is None:
                axis.unframe()
        if system is not None:
            self._offsets.get(system, {}).pop(letter, None)
