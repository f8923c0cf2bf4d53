"""A concrete controller: a program and a setup to moves in machine coordinates.

It knows every position, because the setup states them; the rewriter, which must not, has its own bookkeeping.  The
proof, the statistics and the audit run on this.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping
from dataclasses import replace

from gcodetool.motion.arcs import Arc
from gcodetool.motion.command import Command, Kind, read_block
from gcodetool.motion.cycles import Sticky, cycle_steps, read_cycle
from gcodetool.motion.dialect import M_CODES, PLANE_AXES
from gcodetool.motion.frames import Frames
from gcodetool.motion.modal import ModalState, is_cycle
from gcodetool.motion.moves import ORDER, Context, Event, Move, Position, Setup
from gcodetool.motion.targets import arc_move
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import MM_DIGIT, QUANTA_PER_MM, exact, to_quanta

Happening = Move | Event
_UNITS = {"mm": "G21", "in": "G20", None: None}


class Controller:
    """One run of one program; ``run`` yields moves and events in order, and stops at the end of the program."""

    def __init__(self, setup: Setup) -> None:
        """Stand at the start of the setup, in the wake-up modes."""
        self.setup = setup
        self.state = ModalState(units=_UNITS[setup.units])
        self.frames = Frames(setup)
        self.sticky = Sticky()
        self.at = {letter: setup.start.get(letter, 0) for letter in ORDER}
        self.unplaced = set(setup.unplaced)
        self.context = Context()
        self._line = 0
        self._named = ""
        self._probes = 0
        self._started = False

    def run(self, blocks: Iterable[Block]) -> Iterator[Happening]:
        """All that the program does; raises Refusal where a block cannot be read."""
        for block in blocks:
            command = read_block(block, self.state)
            if not command.shape.at:
                if block.text.lstrip().startswith("%") and self._started:
                    return
                continue
            self._started = self._started or bool(set(command.shape.at) - {"O", "N"})
            if self.setup.skip_deletable and command.deletable:
                continue
            self._line = block.number
            yield from self._block(command)
            if "M2" in command.m or "M30" in command.m:
                return

    def _block(self, command: Command) -> Iterator[Happening]:
        if command.m or command.has("S") or command.has("T") or command.has("F"):
            self._note_context(command)
        if "M6" in command.m:
            yield from self._tool_change()
        if command.g.length:
            self.frames.change_length(command)
        if command.after.offset and command.after.offset != self.frames.active:
            self.frames.active = command.after.offset
            if not self.setup.offsets:
                self.unplaced.update(ORDER)
        self.state = command.after
        self._named = "".join([letter for letter, _ in command.shape.axes])
        if not is_cycle(command.after.motion):
            self.sticky.drop()
        mover = _MOVERS.get(command.kind)
        if mover is not None:
            yield from mover(self, command)
        for word in command.m:
            code = M_CODES.get(word)
            if code is not None and code.group == "stop":
                yield Event("stop", self._line, self._position())

    # ---- what holds beside the path -------------------------------------------------------------------------------

    def _note_context(self, command: Command) -> None:
        changes: dict[str, float | str | None] = {}
        if command.has("F"):
            digit = MM_DIGIT if command.after.feed_mode == "G93" else command.after.digit
            changes["feed"] = to_quanta(command.number("F"), digit) / QUANTA_PER_MM
        if command.has("S"):
            value, decimals = exact(command.number("S"))
            changes["speed"] = value / 10**decimals
        if command.has("T"):
            changes["tool"] = command.number("T").strip().lstrip("+0") or "0"
        for word in command.m:
            if word in ("M3", "M4", "M5"):
                changes["spindle"] = word
        self.context = self.context._replace(feed_mode=command.after.feed_mode, **changes)  # type: ignore[arg-type]

    def _tool_change(self) -> Iterator[Happening]:
        if self.setup.tool_change is not None:
            self.at.update(self.setup.tool_change)
        self.unplaced.update(ORDER)
        yield Event("tool change", self._line, self._position(), ORDER)

    def _position(self) -> Position:
        at = self.at
        return at["X"], at["Y"], at["Z"], at["A"], at["B"], at["C"]

    # ---- motion ---------------------------------------------------------------------------------------------------

    def _program(self) -> dict[str, int]:
        """Where the axes stand in program coordinates."""
        return {letter: value - self.frames.origin(letter) for letter, value in self.at.items()}

    def _targets(self, command: Command) -> dict[str, int]:
        """Machine targets of the axis words."""
        if command.after.distance == "G90":
            return {a: command.quanta(a) + self.frames.origin(a) for a, _ in command.shape.axes}
        return {a: command.quanta(a) + self.at[a] for a, _ in command.shape.axes}

    def _go(self, rapid: bool, goal: Mapping[str, int], arc: Arc | None = None, axes: tuple[int, int] = (0, 1)) -> Move:
        start = self._position()
        unplaced = "".join(a for a in goal if a in self.unplaced) if self.unplaced else ""
        self.at.update(goal)
        return Move(rapid, self._line, start, self._position(), arc, axes, self.context, unplaced, "", self._named)

    def _straight(self, command: Command) -> Iterator[Happening]:
        goal = self._targets(command)
        yield self._go(command.kind is Kind.RAPID, goal)
        if self.unplaced and command.after.distance == "G90":
            self.unplaced.difference_update(goal)

    def _arc(self, command: Command) -> Iterator[Happening]:
        program = self._program()
        goal = self._targets(command)
        end = {letter: value - self.frames.origin(letter) for letter, value in goal.items()}
        move = arc_move(command, program, end)
        first, second, _ = PLANE_AXES[command.after.plane]
        origin = self.frames.origin(first) / QUANTA_PER_MM, self.frames.origin(second) / QUANTA_PER_MM
        arc = replace(move.arc, centre=(move.arc.centre[0] + origin[0], move.arc.centre[1] + origin[1]))
        if arc.sweep or goal:
            yield self._go(False, goal, arc, (ORDER.index(first), ORDER.index(second)))

    def _machine(self, command: Command) -> Iterator[Happening]:
        digits = {a: command.quanta(a) for a, _ in command.shape.axes}
        if not self.setup.offsets:
            # nobody knows where the frame of the program lies in the machine
            self.unplaced.update(digits)
        yield self._go(command.after.motion == "G0", digits)
        self.unplaced.update(digits)
        yield Event("home", self._line, self._position(), "".join(digits))

    def _home(self, command: Command) -> Iterator[Happening]:
        via = self._targets(command)
        if via:
            yield self._go(True, via)
        home = self.setup.homes.get("G30" if "G30" in command.g.here else "G28", {})
        goal = {letter: home.get(letter, 0) for letter in (via or ORDER)}
        self.unplaced.update(goal)
        yield self._go(True, goal)
        yield Event("home", self._line, self._position(), "".join(goal))

    def _cycle(self, command: Command) -> Iterator[Happening]:
        self.sticky.take(command)
        if not command.shape.axes:
            return
        start = self._program()
        normal = PLANE_AXES[command.after.plane][2]
        cycle = read_cycle(command, self.sticky, start[normal])
        for what, targets in cycle_steps(cycle, start):
            goal = {a: value + self.frames.origin(a) for a, value in targets.items()}
            move = self._go(what in ("rapid", "back"), goal)
            yield move if what == "rapid" else move._replace(hole=what)
            if command.after.distance == "G90":
                self.unplaced.difference_update(targets)

    def _probe(self, command: Command) -> Iterator[Happening]:
        goal = self._targets(command)
        if self._probes < len(self.setup.contacts):
            stop = {letter: self.setup.contacts[self._probes][letter] for letter in goal}
        else:
            stop = {letter: (self.at[letter] + value) // 2 for letter, value in goal.items()}
        self._probes += 1
        yield self._go(False, stop)
        self.unplaced.update(goal)
        yield Event("probe", self._line, self._position(), "".join(goal))

    def _frame(self, command: Command) -> Iterator[Happening]:
        self.frames.change(command, self.at)
        return iter(())


_MOVERS = {
    Kind.RAPID: Controller._straight,
    Kind.FEED: Controller._straight,
    Kind.LINE: Controller._straight,
    Kind.ARC: Controller._arc,
    Kind.MACHINE: Controller._machine,
    Kind.HOME: Controller._home,
    Kind.CYCLE: Controller._cycle,
    Kind.PROBE: Controller._probe,
    Kind.FRAME: Controller._frame,
}
