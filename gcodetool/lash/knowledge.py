"""What the rewriter knows of each axis while the program runs: position, side, shift in force.

An axis is *framed* while its position in the present program frame is known.  An axis that is not framed still counts
increments, from an origin of its own.  Everything is in quanta (1e-10 mm or degree).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from decimal import Decimal

from gcodetool.lash.play import advance, shift
from gcodetool.machine import LETTERS, Axis, Machine
from gcodetool.program.numbers import INCH_DIGIT, MM_DIGIT, decimal_to_quanta, round_to_grid


@dataclass(frozen=True, slots=True)
class Start:
    """What the operator states of an axis before the first block.

    The position is that which the controller shows (mm, degrees); None, or side 0, where unknown.  Off the datum side
    the axis is not where the controller shows it.
    """

    position: Decimal | None = None
    side: int = 0


class AxisKnowledge:
    """One axis; mutable, because it is the running state of the stream.

    ``adrift`` is true where the shift in force does not belong to the side (after a drilling cycle has come back in
    air). ``shift`` is the command minus the wanted position as last written, None where it is not known.  ``extreme``
    is the farthest position on the present side (see ``play.advance``).  ``decimals`` are those of the position.
    """

    __slots__ = (
        "adrift", "datum", "decimals", "extreme", "framed", "inch_lash", "letter", "margin", "mm_lash", "position",
        "ripple", "rotary", "shift", "shifts", "side",
    )  # fmt: skip

    def __init__(self, axis: Axis, machine: Machine, start: Start) -> None:
        """Take lash, datum and ripple from the sheet, rounded to the output grid, and the start as stated."""
        self.letter = axis.letter
        self.rotary = axis.rotary
        self.datum = axis.datum
        lash = decimal_to_quanta(axis.lash)
        self.mm_lash = round_to_grid(lash, MM_DIGIT, machine.decimals)
        self.inch_lash = self.mm_lash if axis.rotary else round_to_grid(lash, INCH_DIGIT, machine.decimals + 1)
        # below the output resolution a reversal is rounding, not motion
        self.ripple = max(decimal_to_quanta(axis.ripple or Decimal(0)), MM_DIGIT[machine.decimals])
        # by inch or mm, then by side: shifts[False][-1] is the shift in mm on the side -
        self.shifts = tuple(
            (0, shift(1, lash, self.datum), shift(-1, lash, self.datum)) for lash in (self.mm_lash, self.inch_lash)
        )
        self.margin = decimal_to_quanta(machine.settle_margin)
        self.position = self.extreme = decimal_to_quanta(start.position or Decimal(0))
        self.framed = start.position is not None
        self.side = start.side
        self.decimals = 0
        self.shift: int | None = 0
        self.adrift = bool(start.side) and self.shift_on(start.side, False) != 0

    @property
    def idle(self) -> bool:
        """True for an axis without lash, which changes nothing."""
        return self.mm_lash == 0

    def lash(self, inch: bool) -> int:
        """The lash on the output grid of the units in force."""
        return self.inch_lash if inch else self.mm_lash

    def shift_on(self, side: int, inch: bool) -> int:
        """The shift that belongs to a side."""
        return self.shifts[inch][side]

    def side_for(self, target: int) -> int:
        """The side that a monotone move to ``target`` asks for; the present one where it is no reversal."""
        return advance(self.side, self.extreme, target, self.ripple)[0]

    def go(self, target: int) -> None:
        """Take a move to ``target`` into account, with the side that ``side_for`` gave."""
        self.side, self.extreme = advance(self.side, self.extreme, target, self.ripple)
        self.position = target
        self.adrift = False

    def land(self, target: int, side: int, framed: bool) -> None:
        """Take note that the axis now stands at ``target``, seated on ``side``."""
        self.position = self.extreme = target
        self.side = side
        self.framed = framed
        self.adrift = False

    def unframe(self) -> None:
        """The frame has changed: the side and the shift stay known, the position does not."""
        self.framed = False

    def rebase(self, by: int) -> None:
        """The origin has moved by a known amount: the axis stands where it was, under another number."""
        self.position += by
        self.extreme += by

    def lose_side(self, command_is_exact: bool) -> None:
        """Position and side are unknown from here on.

        ``command_is_exact`` says that the command now stands where the original program's would (a home point, a
        machine coordinate), so that no shift is in force; otherwise that is not known either, unless there was none.
        """
        self.framed = False
        self.side = 0
        self.adrift = False
        if command_is_exact or self.shift == 0:
            self.shift = 0
        else:
            self.shift = None


def knowledge(machine: Machine, start: Mapping[str, Start]) -> dict[str, AxisKnowledge]:
    """The state of all axes before the first block."""
    return {a: AxisKnowledge(machine.axes.get(a, Axis(a)), machine, start.get(a, Start())) for a in LETTERS}
