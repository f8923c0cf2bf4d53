"""Holes reached from the datum side, with an overshoot, so that their place does not hang on the value of the lash.

On the datum side command and actual position agree whatever the lash is.  An axis that has come to a hole on its
other side goes on past it by the overshoot and comes back in the datum direction: after that way back it is on the
datum side for any lash between 0 and the overshoot.
"""

from __future__ import annotations

from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.lash.running import Running
from gcodetool.program.numbers import QUANTA_PER_MM
from gcodetool.program.rewrite import Word, new_line

_PLANE = ("X", "Y")


def wants_approach(run: Running, axis: AxisKnowledge, side: int) -> bool:
    """True where the option is on and an axis would stand in a hole on its other side."""
    return bool(run.settings.hole_overshoot) and axis.letter in _PLANE and not axis.idle and side == -axis.datum


def overshoot(run: Running, axis: AxisKnowledge, inch: bool) -> int:
    """How far past its target an axis goes to be settled, quanta."""
    return max(axis.lash(inch) + axis.margin, run.settings.hole_overshoot)


def approach(run: Running) -> None:
    """Before a plunge: reach the place anew from the datum side, at the height to which the last rapid has come.

    Nothing is done where X or Y has been fed since that rapid: then it is no hole.
    """
    slot = run.out.slot
    lashed = [run.axes[letter] for letter in _PLANE if not run.axes[letter].idle]
    if slot is None or not lashed or not all(run.out.takes(axis.letter) for axis in lashed):
        return
    past: list[Word] = []
    back: list[Word] = []
    for axis in lashed:
        if axis.side == -axis.datum and (axis.framed or slot.state.distance == "G91"):
            inch = run.is_inch(axis, slot.state)
            beyond = -axis.datum * max(run.settings.hole_overshoot, axis.lash(inch))
            past.append((axis.letter, run.number_at(axis, slot.state, axis.datum, "0", beyond)))
            back.append((axis.letter, run.number_at(axis, slot.state, axis.datum, "0")))
            axis.land(axis.position, axis.datum, axis.framed)
            run.tally.path_added += 2 * abs(beyond) / QUANTA_PER_MM
            run.tally.approaches += 1
    lines = [new_line([("G", "0"), *words], slot.look) for words in (past, back) if words]
    # a take-up between here and the plunge would push the hole aside if the lash were smaller than stated
    run.out.take_lines(lines, [axis.letter for axis in lashed])
