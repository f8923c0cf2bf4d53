"""The stream: blocks in, text out, so that a controller without lash compensation cuts the intended part.

Each block is read once, in the modal state of the program as written.  A block that asks for no motion passes as it
is; one that does goes to ``straight`` or ``curved``.  Between blocks only the knowledge of the axes, the modal state
and the few lines held for the slot are kept, so memory does not grow with the program.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Iterator, Mapping

from gcodetool.errors import Refusal
from gcodetool.lash import curved, drilling, straight
from gcodetool.lash.doubt import Doubt
from gcodetool.lash.known_frames import KnownFrames
from gcodetool.lash.quick import Quick
from gcodetool.lash.running import Running, Settings
from gcodetool.lash.tally import Tally
from gcodetool.machine import Machine
from gcodetool.motion.command import Command, Kind, read_block
from gcodetool.motion.cycles import Sticky
from gcodetool.motion.dialect import M_CODES
from gcodetool.motion.modal import is_cycle
from gcodetool.program.blocks import Block
from gcodetool.program.rewrite import join_words

Mover = Callable[[Running, Command], None]
MARK = "lash taken up by gcodetool"
LABEL = "cut:"
MEASURING = "gcodetool measure: run as it is, never compensate"
_MARK_LINES = 50
_LOOKS_LIKE_MOTION = re.compile(r"[^(;]*[Gg]0*[0-3](?!\d)[^(;]*[XYZxyz]")


class Compensator:
    """One rewriting; ``feed_block`` for each block in order, then ``finish``."""

    def __init__(
        self,
        machine: Machine,
        settings: Settings,
        write: Callable[[str], object],
        header: str = "",
        again: bool = False,
    ) -> None:
        """``header`` is the comment to write near the top; ``again`` allows a program that has one already."""
        self.run = Running(machine, settings, write)
        self._doubt = Doubt(self.run)
        self._quick = Quick(self.run, self._ordinary, self._is_open)
        self._frames = KnownFrames(self.run)
        self._drilling = drilling.Drilling(Sticky())
        self._movers = _MOVERS | {
            Kind.FRAME: self._frames.frame,
            Kind.CYCLE: lambda run, command: drilling.cycle(run, self._drilling, command),
        }
        self._header = header
        self._style = "({})"
        self._styled = False
        self._again = again
        self._ended = False
        self._live = False

    @property
    def tally(self) -> Tally:
        """Totals so far."""
        return self.run.tally

    def rewrite(self, blocks: Iterable[Block], labels: Mapping[int, str] | None = None) -> Tally:
        """Take all blocks and finish; raises Refusal at the first block that cannot be rewritten.

        ``labels`` by line number are written as comments of their own, each where it changes.
        """
        self._quick.stream(self._labelled(blocks, labels) if labels else blocks)
        self.finish()
        return self.tally

    def _labelled(self, blocks: Iterable[Block], labels: Mapping[int, str]) -> Iterator[Block]:
        """The same blocks; before one with another label than the last, the label goes out as a comment."""
        last = ""
        for block in blocks:
            label = labels.get(block.number, last)
            if label != last:
                text = self._style.format(f"{LABEL} {label}")
                self.run.out.put(text + (block.ending or self.run.usual_ending))
                last = label
            yield block

    def finish(self) -> None:
        """Write out what is still held."""
        self.run.out.close()

    def feed_block(self, block: Block) -> None:
        """Take one block."""
        self._quick.stream((block,))

    def _is_open(self) -> bool:
        """True inside the program, with no mode in doubt."""
        return self._live and not self._ended and not self._doubt.fields

    def _ordinary(self, block: Block) -> None:
        """One block, whatever it is."""
        run = self.run
        if block.ending:
            run.usual_ending = block.ending
        if self._ended:
            self._pass_after_end(block)
            return
        if block.number <= _MARK_LINES and MARK in block.text and not self._again:
            reason = "this program has been rewritten for lash already"
            raise Refusal(block.number, block.text.strip()[:60], reason, "Start from the original, or use --again")
        if block.number <= _MARK_LINES and MEASURING in block.text:
            reason = "this program measures the lash, which must be there for it"
            raise Refusal(block.number, block.text.strip()[:60], reason, "Run it as it is")
        self._rewrite_block(block)

    def _pass_after_end(self, block: Block) -> None:
        """Text after the end is no part of the program, but a person may take it for one."""
        if _LOOKS_LIKE_MOTION.match(block.text):
            text = "text after the program's end passes as it is: a second program in the file is not rewritten"
            self.tally.caution(text, block.number)
        self.run.out.put(block.text + block.ending)

    def _rewrite_block(self, block: Block) -> None:
        run = self.run
        command = read_block(block, run.state)
        if not command.shape.at:
            self._without_words(command)
            return
        if not self._live and set(command.shape.at) - {"O", "N"}:
            # a program number or a lone line number is no code yet
            self._live = True
            self._write_header(block.text, block.ending)
        if command.deletable or self._doubt.fields:
            self._doubtful(command)
        else:
            self._execute(command)

    def _without_words(self, command: Command) -> None:
        text = command.block.text
        if text.lstrip().startswith("%"):
            # the first tape mark opens the program, one after live code ends it
            self._ended = self._live
        elif text.strip():
            self._write_header(text, command.block.ending)
        self.run.out.put(text + command.block.ending)

    def _write_header(self, text: str, ending: str) -> None:
        if not self._styled:
            # the program's own way of writing comments shows in its first line
            self._style = "; {}" if ";" in text and "(" not in text else "({})"
            self._styled = True
            if self._header:
                self.run.out.put(self._style.format(self._header) + (ending or self.run.usual_ending))

    # ---- one block ------------------------------------------------------------------------------------------------

    def _doubtful(self, command: Command) -> None:
        """A deletable block, or one after a deletable block that changed a mode."""
        delete = self.run.settings.block_delete
        if command.deletable and delete is True:
            self.run.out.put(command.block.text + command.block.ending)
            return
        unsure = command.deletable and delete is None
        self._doubt.check(command)
        before = self._doubt.snapshot() if unsure else None
        if unsure:
            self.run.out.close()
        self._execute(command)
        if before is not None:
            self.run.out.close()
            self._doubt.merge(before)
            if command.g.length or command.kind is Kind.FRAME:
                self._frames.forget()

    def _execute(self, command: Command) -> None:
        run = self.run
        self._before_motion(command)
        if command.after.units != command.before.units or command.after.feed_mode != command.before.feed_mode:
            run.change_feed_units(command)
        run.read_feed(command)
        run.state = command.after
        if command.before.motion != command.after.motion and not is_cycle(command.after.motion):
            self._drilling.sticky.drop()
        self._movers[command.kind](run, command)
        if "F" in command.shape.at and command.kind in _KEEPS_FEED:
            run.feed_written = run.feed
        if command.kind is not Kind.NONE:
            run.moved = True
        if command.m:
            self._after_motion(command)

    def _before_motion(self, command: Command) -> None:
        """Effects that come before the motion of a block (NISTIR 6556, table 8)."""
        if command.m and "M6" in command.m:
            self._tool_change()
        if command.g.length:
            self._frames.change_length(command)
        if command.after.offset != command.before.offset:
            self._frames.change_offset(command)

    def _after_motion(self, command: Command) -> None:
        for word in command.m:
            code = M_CODES.get(word)
            if code is None:
                self.tally.caution(
                    f"{word} is not known and passes as it is: it must not move an axis", command.block.number
                )
            elif code.group == "stop":
                self.tally.caution(f"do not jog at {word}: it spoils what is known of the sides", command.block.number)
            elif code.group == "end":
                # where a deletable end may be skipped, what follows it may run
                self.run.out.close()
                self._ended = not (command.deletable and self.run.settings.block_delete is None)
            elif code.group == "tool":
                self._tool_change()

    def _tool_change(self) -> None:
        self.run.out.close()
        for axis in self.run.axes.values():
            axis.lose_side(command_is_exact=False)


# ---- blocks that are no cutting motion ----------------------------------------------------------------------------


def _pass(run: Running, command: Command) -> None:
    """No motion: as it is."""
    run.out.put(command.block.text + command.block.ending)


def _home(run: Running, command: Command) -> None:
    """G28, G30: the via point is shifted where the side is known; then position and side are unknown."""
    pieces = list(command.pieces)
    goal = straight.targets(run, command)
    for letter, target in goal.items():
        axis = run.axes[letter]
        known = axis.side and (axis.framed or command.after.distance == "G91")
        if not axis.idle and known:
            index = command.shape.at[letter]
            pieces[index] = run.shifted_word(axis, pieces[index], command.after, axis.side_for(target))
    run.out.close()
    run.out.put(join_words(pieces) + command.block.ending)
    for letter in goal or run.axes:
        run.axes[letter].lose_side(command_is_exact=True)


def _machine(run: Running, command: Command) -> None:
    """G53: nothing is shifted; position and side are unknown after it."""
    letters = [letter for letter, _ in command.shape.axes]
    lashed = [letter for letter in letters if not run.axes[letter].idle]
    if lashed and command.after.motion != "G0":
        raise command.refusal(
            "G53", f"a feed in machine coordinates, where the side of {lashed[0]} cannot be kept", "Use G0 with G53"
        )
    run.out.close()
    run.out.put(command.block.text + command.block.ending)
    for letter in letters:
        run.axes[letter].lose_side(command_is_exact=True)


_MOVERS: dict[Kind, Mover] = {
    Kind.NONE: _pass,
    Kind.RAPID: straight.rapid,
    Kind.FEED: straight.feed,
    Kind.LINE: straight.feed,
    Kind.ARC: curved.arc,
    Kind.HOME: _home,
    Kind.MACHINE: _machine,
    Kind.PROBE: drilling.probe,
}
_KEEPS_FEED = frozenset({Kind.NONE, Kind.RAPID, Kind.HOME, Kind.MACHINE, Kind.FRAME})
