"""The outgoing lines, and the slot in which a take-up can be made in air.

A take-up commutes with every block that has no word of its axis.  After a rapid the tool is in air, so a take-up that
is first needed after a plunge is written right after the rapid instead, where it leaves no mark.  For that the blocks
since the rapid are held back, at most ``look_ahead`` of them, and only while some axis could still use the slot.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from typing import NamedTuple

from gcodetool.motion.modal import ModalState
from gcodetool.program.rewrite import Look, Word, look_of, new_line


class Slot(NamedTuple):
    """The place after a rapid: the modal state that holds there, and the rapid, whose look a line there copies."""

    state: ModalState
    pieces: list[str]
    blank: str
    ending: str

    @property
    def look(self) -> Look:
        """How a line in the slot is written."""
        return look_of(self.pieces, "".join(self.pieces[1::3]).islower(), self.blank)


class Outflow:
    """Lines on their way out; ``write`` takes finished text."""

    def __init__(self, write: Callable[[str], object], look_ahead: int) -> None:
        """Hold at most ``look_ahead`` blocks; 0 turns the slot off."""
        self.write = write
        self._look_ahead = look_ahead
        self._held: list[str] = []
        self._open_axes: set[str] = set()
        self._words: list[Word] = []
        self._lines: list[str] = []
        self.slot: Slot | None = None

    def put(self, text: str, touched: Collection[str] = ()) -> None:
        """Send text, or hold it while the slot is open; ``touched`` are the axes it has words of."""
        if self.slot is None:
            self.write(text)
            return
        self._held.append(text)
        self._open_axes.difference_update(touched)
        if not self._open_axes or len(self._held) >= self._look_ahead:
            self.close()

    def open(self, slot: Slot, axes: Collection[str]) -> None:
        """Close the slot there is and open one here for these axes."""
        self.close()
        if axes and self._look_ahead:
            self.slot = slot
            self._open_axes = set(axes)

    def takes(self, letter: str) -> bool:
        """True where a take-up of this axis can still go into the slot."""
        return self.slot is not None and letter in self._open_axes

    def take(self, word: Word) -> None:
        """Put one axis word of a take-up into the slot."""
        self._words.append(word)
        self._open_axes.discard(word[0])

    def take_lines(self, texts: Sequence[str], axes: Collection[str]) -> None:
        """Put whole lines into the slot; it takes nothing more for these axes."""
        self._lines += texts
        self._open_axes.difference_update(axes)

    def close(self) -> None:
        """Write the lines and the take-up of the slot, if any, and all that was held behind it."""
        slot, self.slot = self.slot, None
        if slot is None:
            return
        for text in self._lines:
            self.write(text + slot.ending)
        self._lines.clear()
        if self._words:
            # the motion word in force, so that the blocks behind are read as before
            self.write(new_line([("G", slot.state.motion[1:]), *self._words], slot.look) + slot.ending)
            self._words.clear()
        for text in self._held:
            self.write(text)
        self._held.clear()
