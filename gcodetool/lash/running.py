"""The running state of one rewriting, shared by the straight moves, the arcs and the stream that drives them."""

from __future__ import annotations

from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass, field, replace
from decimal import Decimal

from gcodetool.lash.cost import stop_to_stop
from gcodetool.lash.knowledge import AxisKnowledge, Start, knowledge
from gcodetool.lash.outflow import Outflow, Slot
from gcodetool.lash.tally import TakeUp, Tally
from gcodetool.machine import Machine
from gcodetool.motion.command import Command
from gcodetool.motion.modal import ModalState
from gcodetool.program.numbers import (
    INCH_DIGIT,
    MM_DIGIT,
    QUANTA_PER_MM,
    decimals_of,
    digits,
    divide_half_even,
    exact,
    shifted,
)
from gcodetool.program.rewrite import (
    Look,
    Word,
    lines,
    look_of,
    new_line,
    with_check_sum,
    with_leading_word,
    with_word,
)

DEEPEST_DECIMALS = 9
MM_PER_INCH = Decimal("25.4")


@dataclass(frozen=True, slots=True)
class Settings:
    """How to rewrite, beside the machine: what holds at the start, how far to look ahead, how to take deletable blocks.

    ``offsets`` and ``lengths`` are what the operator states of work offsets and tool lengths, ``clear_z`` the height
    above which there is no work (None: not stated), ``hole_overshoot`` how far to go past a hole so as to reach it
    from the datum side (0: not at all); all in quanta.  ``block_delete`` is None where the switch is not known, True
    where deletable blocks are skipped, False where they run.
    """

    start: Mapping[str, Start] = field(default_factory=dict)
    offsets: Mapping[str, Mapping[str, int]] = field(default_factory=dict)
    lengths: Mapping[int, int] = field(default_factory=dict)
    look_ahead: int = 32
    block_delete: bool | None = None
    hole_overshoot: int = 0
    clear_z: int | None = None


class Running:
    """Axes, modal state, feed words, outgoing lines and tally of one rewriting."""

    def __init__(self, machine: Machine, settings: Settings, write: Callable[[str], object]) -> None:
        """Begin with nothing known but what the settings state."""
        units = {"mm": "G21", "in": "G20", None: None}[machine.units]
        self.machine = machine
        self.settings = settings
        self.state = ModalState(units=units)
        self.maybe_adrift = any(said.side for said in settings.start.values())
        self.axes = knowledge(machine, settings.start)
        self.lashed = [axis.letter for axis in self.axes.values() if not axis.idle]
        self.out = Outflow(write, settings.look_ahead)
        self.tally = Tally()
        self.feed: str | None = None
        self.feed_written: str | None = None
        self.feed_lost = False
        self.motion_written = ""
        self.usual_ending = "\n"
        self.usual_blank = " "
        self.moved = False

    def is_inch(self, axis: AxisKnowledge, state: ModalState) -> bool:
        """True where a word of this axis is in inches."""
        return state.units == "G20" and not axis.rotary

    def least(self, inch: bool) -> int:
        """Decimals that a changed word has at least."""
        return self.machine.decimals + inch

    def look(self, command: Command) -> Look:
        """How a new line beside this block is written."""
        return look_of(command.pieces, command.shape.lower, self.usual_blank)

    def put(self, command: Command, texts: Sequence[str], touched: Collection[str] = ()) -> None:
        """Send the lines that stand for a block; ``touched`` are axes that it moves without having a word of them."""
        block = command.block
        touched = [*touched, *(letter for letter, _ in command.shape.axes)]
        if len(texts) > 1 or texts[0] != block.text:
            self.tally.changed += block.text not in texts
            if "*" in command.pieces[-1]:
                texts = [with_check_sum(text) for text in texts]
        self.out.put(lines(texts, block.ending, self.usual_ending), touched)

    def shifted_word(self, axis: AxisKnowledge, text: str, state: ModalState, side: int, beyond: int = 0) -> str:
        """The number of a target word on a side, ``beyond`` quanta past it; notes the shift then in force."""
        inch = self.is_inch(axis, state)
        want = axis.shift_on(side, inch) + beyond
        absolute = state.distance == "G90"
        assert absolute or axis.shift is not None
        add = want if absolute else want - (axis.shift or 0)
        if not add:
            axis.shift = want
            return text
        new, added = shifted(text, add, INCH_DIGIT if inch else MM_DIGIT, self.least(inch))
        axis.shift = added if absolute else (axis.shift or 0) + added
        return new if added else text

    def plus(self, axis: AxisKnowledge, text: str, state: ModalState, add: int) -> str:
        """A number with ``add`` quanta more; as it is where that is nothing."""
        if not add:
            return text
        inch = self.is_inch(axis, state)
        new, added = shifted(text, add, INCH_DIGIT if inch else MM_DIGIT, self.least(inch))
        return new if added else text

    def number_at(self, axis: AxisKnowledge, state: ModalState, side: int, like: str, beyond: int = 0) -> str:
        """The number that takes the command from where it stands to the present position on a side.

        Used for take-ups and for coming back from an overshoot: the table itself has no way to go, or ``beyond`` less.
        """
        inch = self.is_inch(axis, state)
        digit = INCH_DIGIT if inch else MM_DIGIT
        want = axis.shift_on(side, inch) + beyond
        if state.distance == "G91":
            assert axis.shift is not None
            places, value = self.least(inch), want - axis.shift
            base = axis.shift
        else:
            places = min(max(self.least(inch), axis.decimals), DEEPEST_DECIMALS)
            value, base = axis.position + want, -axis.position
        count = divide_half_even(value, digit[places])
        axis.shift = base + count * digit[places]
        return digits(count, places, like)

    def note_decimals(self, command: Command) -> None:
        """At the end of a motion: keep the decimals of each position, so that a take-up repeats it exactly.

        In G91 they are the most that were seen.
        """
        absolute = command.after.distance == "G90"
        for letter, index in command.shape.axes:
            axis = self.axes[letter]
            decimals = decimals_of(command.pieces[index])
            axis.decimals = decimals if absolute else max(axis.decimals, decimals)

    # ---- take-ups -------------------------------------------------------------------------------------------------

    def take_up(self, command: Command, sides: Mapping[str, int], state: ModalState, in_air: bool) -> list[str]:
        """The lines, none or one, that cross the lash of the axes in ``sides`` (letter to new side) before a motion.

        ``state`` holds before the line.  What can go into the slot after the last rapid goes there.
        """
        here = {}
        for letter, side in sides.items():
            axis = self.axes[letter]
            if in_air and self.out.takes(letter) and self._slot_can_say(axis) and not command.deletable:
                self.take_up_in_slot(command.block.number, axis, side, self._like(command, axis))
            else:
                here[letter] = side
        if not here:
            return []
        return [self._take_up_here(command, here, state)]

    def reseat(self, command: Command) -> list[str]:
        """The line, if one is needed, that brings axes left adrift by a cycle to where they should be."""
        if not self.maybe_adrift:
            return []
        self.maybe_adrift = False
        adrift = {letter: self.axes[letter].side for letter in self.lashed if self.axes[letter].adrift}
        if not adrift:
            return []
        # after a cycle the tool is in air; at the start nobody knows, so there it is a feed
        made = [self._take_up_here(command, adrift, command.before, in_air=self.moved)]
        for letter in adrift:
            self.axes[letter].adrift = False
        return made

    def _slot_can_say(self, axis: AxisKnowledge) -> bool:
        return self.out.slot is not None and (axis.framed or self.out.slot.state.distance == "G91")

    def take_up_in_slot(self, line: int, axis: AxisKnowledge, side: int, like: str) -> None:
        """Cross the lash of an axis in the slot, for a source line that needs it later."""
        slot = self.out.slot
        assert slot is not None
        self.out.take((axis.letter, self.number_at(axis, slot.state, side, like)))
        self.count(line, slot.state, [axis], False, None)

    def _take_up_here(
        self, command: Command, sides: Mapping[str, int], state: ModalState, in_air: bool = False
    ) -> str:
        words: list[Word] = []
        if state.distance == "G90" and not all(self.axes[letter].framed for letter in sides):
            # the block itself turns to G91; only then can the step be said at all
            words.append(("G", "91"))
            state = command.after
        if state.units is None and command.after.units:
            words.append(("G", command.after.units[1:]))
            state = replace(state, units=command.after.units)
        by_rapid = in_air or command.after.feed_mode != "G94" or command.before.feed_mode != "G94"
        if command.after.motion:
            words.append(("G", "0" if by_rapid else "1"))
            self.motion_written = "G0" if by_rapid else "G1"
        axes = [axis for axis in self.axes.values() if axis.letter in sides]
        words += [(a.letter, self.number_at(a, state, sides[a.letter], self._like(command, a))) for a in axes]
        feed = None if by_rapid else self._take_up_feed(command, state)
        if feed is not None:
            words.append(("F", feed))
            self.feed_written = feed
        self.count(command.block.number, command.after, axes, not in_air, feed or self.feed)
        return new_line(words, self.look(command))

    def _like(self, command: Command, axis: AxisKnowledge) -> str:
        return command.number(axis.letter) if command.has(axis.letter) else "0"

    def _take_up_feed(self, command: Command, state: ModalState) -> str | None:
        """The F word a take-up needs: its own feed, or the block's new one; None where the feed in force serves."""
        own = self.machine.take_up_feed
        if own is None and state.units != command.after.units:
            # the F of the block is meant in its own units
            return None
        if own is None:
            new = command.number("F").strip() if command.has("F") else self.feed
            return None if new is None or new == self.feed_written else new
        if self.feed is None and self.feed_lost and not command.has("F"):
            reason = "the feed in force was stated in other units or another feed mode, so it cannot be said again"
            raise command.refusal(command.block.text.strip()[:40], reason, "State F after the change of units")
        value = own / MM_PER_INCH if state.units == "G20" else own
        text = f"{value:.3f}".rstrip("0").rstrip(".")
        return None if text == self.feed_written else text

    def count(
        self, line: int, state: ModalState, axes: Sequence[AxisKnowledge], in_cut: bool, feed: str | None
    ) -> None:
        """Count one take-up block, made for a source line, of these axes at a feed."""
        crossed = max(axis.mm_lash for axis in axes) / QUANTA_PER_MM
        per_minute = _feed_mm(feed, state) if in_cut else self._rapid_feed(axes)
        seconds = stop_to_stop(crossed, per_minute / 60.0, self._acceleration(axes)) if per_minute else 0.0
        letters = "".join([axis.letter for axis in axes])
        length = sum([a.mm_lash for a in axes if not a.rotary]) / QUANTA_PER_MM
        self.tally.take_up(TakeUp(seconds, line, letters, in_cut), length)

    def _acceleration(self, axes: Sequence[AxisKnowledge]) -> float:
        """The smallest acceleration that the sheet gives for these axes, 0 where it gives none."""
        stated = [self.machine.axis(axis.letter).acceleration for axis in axes]
        return min((float(value) for value in stated if value), default=0.0)

    def _rapid_feed(self, axes: Sequence[AxisKnowledge]) -> float:
        stated = [self.machine.axis(axis.letter).max_feed for axis in axes]
        return min((float(value) for value in stated if value), default=0.0)

    # ---- feed words -----------------------------------------------------------------------------------------------

    def read_feed(self, command: Command) -> None:
        """Note the F word of a block before its motion."""
        if "F" in command.shape.at:
            self.feed = command.number("F").strip()
            self.feed_lost = False

    def change_feed_units(self, command: Command) -> None:
        """Units or feed mode change: F counts otherwise from here on, so the program's own must be in force before."""
        if self.feed is not None and self.feed_written not in (None, self.feed):
            look = self.look(command)
            self.out.put(new_line([("F", self.feed)], look) + (command.block.ending or self.usual_ending))
        self.feed_lost = self.feed_lost or self.feed is not None
        self.feed = self.feed_written = None

    def with_feed(self, command: Command, pieces: Sequence[str]) -> list[str]:
        """The pieces of a feed block, with the program's F where a take-up has changed it and the block has none."""
        if "F" in command.shape.at:
            self.feed_written = self.feed
            return list(pieces)
        if self.feed is None or self.feed_written in (None, self.feed) or command.after.feed_mode != "G94":
            return list(pieces)
        self.feed_written = self.feed
        return with_word(pieces, ("F", self.feed), self.look(command))

    def with_motion(self, command: Command, pieces: Sequence[str]) -> list[str]:
        """The pieces of a block without a motion word, with the one that is in force for it."""
        return with_leading_word(pieces, ("G", command.after.motion[1:]), self.look(command))

    # ---- the slot -------------------------------------------------------------------------------------------------

    def open_clear_slot(self, command: Command) -> None:
        """After a feed that ends above the height stated for the work, take-ups cost nothing either."""
        z, clear = self.axes["Z"], self.settings.clear_z
        if clear is None or not z.framed or z.position < clear or command.deletable:
            return
        if command.after.motion == "G1" and command.after.feed_mode == "G94":
            self.open_slot(command.after, command.pieces, command.block.ending)

    def open_slot(self, state: ModalState, pieces: list[str], ending: str) -> None:
        """After a rapid: the tool is in air here, so this is where take-ups cost nothing."""
        known = [letter for letter in self.lashed if self.axes[letter].side]
        self.out.open(Slot(state, pieces, self.usual_blank, ending or self.usual_ending), known)


def _feed_mm(feed: str | None, state: ModalState) -> float:
    if not feed:
        return 0.0
    value, decimals = exact(feed)
    return float(value / 10**decimals) * (25.4 if state.units == "G20" else 1.0)
