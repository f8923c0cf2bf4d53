"""Rapids, settles and straight feeds: one block in, one to three lines out.

settle    a short approach from a known side that makes an unknown side known: past the target by the lash and a margin,
          then to it in the datum direction; Z always comes from above and never goes lower than its target
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from gcodetool.lash import holes
from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.lash.running import Running
from gcodetool.motion.command import Command
from gcodetool.motion.dialect import ACTS_LAST
from gcodetool.motion.modal import code_word
from gcodetool.program.numbers import QUANTA_PER_MM
from gcodetool.program.rewrite import Word, join_words, new_line, without_words

_SAY_START = "Bring the axis there with a rapid (G0) first, or state --start {0}=POSITION+ or {0}=POSITION-"


@dataclass(frozen=True, slots=True)
class Plan:
    """What a rapid does to each lashed axis: the side it ends on, and whether it must be settled to get there."""

    sides: dict[str, int]
    settle: tuple[str, ...]


def targets(run: Running, command: Command) -> dict[str, int]:
    """Target of each axis word, quanta, in the frame of the axis."""
    absolute = command.after.distance == "G90"
    found = {}
    for letter, _ in command.shape.axes:
        value = command.quanta(letter)
        found[letter] = value if absolute else run.axes[letter].position + value
    return found


def rapid(run: Running, command: Command) -> None:
    """Fold the shifts into the targets of a rapid; settle the axes whose side it does not make known."""
    goal = targets(run, command)
    plan = _plan(run, command, goal)
    if not plan.settle:
        pieces = _shift_words(run, command, plan.sides)
        _arrive(run, command, goal, plan.sides)
        run.put(command, ["".join(pieces)])
    else:
        run.out.close()
        run.put(command, _settled(run, command, goal, plan, command.pieces))
    if command.after.motion == "G0" and not command.deletable:
        run.open_slot(command.after, command.pieces, command.block.ending)
    else:
        run.out.close()


def _plan(run: Running, command: Command, goal: Mapping[str, int]) -> Plan:
    sides: dict[str, int] = {}
    settle = []
    for letter, target in goal.items():
        axis = run.axes[letter]
        if axis.idle:
            continue
        side = arrival_side(run, command, axis, target)
        if side:
            sides[letter] = side
        else:
            sides[letter] = settling_side(axis)
            settle.append(letter)
    return Plan(sides, tuple(settle))


def settling_side(axis: AxisKnowledge) -> int:
    """The side a settle ends on: the datum side, and for Z the lower one, because Z comes from above."""
    return -1 if axis.letter == "Z" else axis.datum


def arrival_side(run: Running, command: Command, axis: AxisKnowledge, target: int) -> int:
    """The side on which a rapid to ``target`` surely arrives; 0 where the axis must be settled."""
    absolute = command.after.distance == "G90"
    if absolute and not axis.framed:
        return 0
    if axis.side and not axis.adrift:
        return axis.side_for(target)
    if axis.shift is None:
        if absolute:
            return 0
        raise _unsaid(command, axis)
    inch = run.is_inch(axis, command.after)
    if axis.adrift and target == axis.position:
        return axis.side
    side = (target > axis.position) - (target < axis.position)
    if axis.adrift and side == axis.side:
        return side
    travel = target + axis.shift_on(side, inch) - axis.position - axis.shift if side else 0
    return side if travel * side >= axis.lash(inch) and side else 0


def _unsaid(command: Command, axis: AxisKnowledge) -> Exception:
    word = axis.letter + command.number(axis.letter).strip()
    reason = "an incremental move after a tool change, where it is not known how far the axis is off"
    return command.refusal(word, reason, "Move the axis in G90 once after the tool change")


def _shift_words(run: Running, command: Command, sides: Mapping[str, int]) -> list[str]:
    pieces = list(command.pieces)
    for letter, side in sides.items():
        index = command.shape.at[letter]
        pieces[index] = run.shifted_word(run.axes[letter], pieces[index], command.after, side)
    return pieces


def _arrive(run: Running, command: Command, goal: Mapping[str, int], sides: Mapping[str, int]) -> None:
    absolute = command.after.distance == "G90"
    run.note_decimals(command)
    for letter, target in goal.items():
        axis = run.axes[letter]
        if axis.side and (axis.framed or not absolute):
            axis.go(target)
        else:
            axis.land(target, sides.get(letter, 0), axis.framed or absolute)


def _settled(
    run: Running, command: Command, goal: Mapping[str, int], plan: Plan, pieces: list[str], motion: str = "G0"
) -> list[str]:
    """The two lines of a settle: the block with an overshoot, then the way back to its target."""
    pieces = list(pieces)
    for letter, side in plan.sides.items():
        axis, index = run.axes[letter], command.shape.at[letter]
        beyond = -side * (axis.lash(run.is_inch(axis, command.after)) + axis.margin) if letter in plan.settle else 0
        pieces[index] = run.shifted_word(axis, pieces[index], command.after, side, beyond)
    _arrive(run, command, goal, plan.sides)
    pieces, last = split_last_words(command, pieces)
    words: list[Word] = [("G", motion[1:])] if command.after.motion else []
    for letter in plan.settle:
        axis = run.axes[letter]
        axis.land(goal[letter], plan.sides[letter], axis.framed)
        number = run.number_at(axis, command.after, plan.sides[letter], command.number(letter).strip())
        words.append((letter, number))
        run.tally.path_added += 2 * (axis.mm_lash + axis.margin) / QUANTA_PER_MM
    run.tally.settles += len(plan.settle)
    return [join_words(pieces), new_line([*words, *last], run.look(command))]


def split_last_words(command: Command, pieces: list[str]) -> tuple[list[str], list[Word]]:
    """Take out the M words that act after the motion (stops, program end), so that they can end the last line."""
    if not command.shape.m:
        return pieces, []
    # looked for in the edited pieces: a word may have been put in or taken out before them
    numbers = [i + 1 for i in range(1, len(pieces), 3) if pieces[i] in ("M", "m")]
    indexes = [i for i in numbers if code_word("M", pieces[i]) in ACTS_LAST]
    return without_words(pieces, indexes), [("M", pieces[i].strip()) for i in indexes]


def feed(run: Running, command: Command) -> None:
    """Take up where a straight feed reverses an axis, then shift its targets."""
    goal = targets(run, command)
    unknown = [letter for letter in goal if not run.axes[letter].idle and not _feed_known(run, command, letter)]
    if unknown:
        _feed_from_unknown(run, command, goal, unknown)
        return
    if run.maybe_adrift:
        _absorb(run, command, goal)
    if run.settings.hole_overshoot and _plunges(command, run, goal):
        holes.approach(run)
    texts = run.reseat(command)
    sides = {letter: run.axes[letter].side_for(goal[letter]) for letter in goal if not run.axes[letter].idle}
    turning = {letter: side for letter, side in sides.items() if side != run.axes[letter].side}
    if turning:
        texts += run.take_up(command, turning, command.before, in_air=not texts)
    pieces = _shift_words(run, command, sides) if sides else list(command.pieces)
    _arrive(run, command, goal, sides)
    finish_feed(run, command, texts, pieces)


def _absorb(run: Running, command: Command, goal: Mapping[str, int]) -> None:
    """An axis that a cycle has left adrift and that now moves alone needs no line to be put right.

    Alone it goes along one line whether it is seated or not: it is enough that its target lies beyond where it is.
    """
    if not run.moved:
        # off the datum side at the start: the first cut must begin where the program says
        return
    moved = [letter for letter in goal if not _stands(command, run.axes[letter], goal[letter])]
    axis = run.axes[moved[0]] if len(moved) == 1 else None
    if axis is None or not axis.adrift or axis.shift is None:
        return
    really = axis.position + axis.shift - axis.shift_on(axis.side, run.is_inch(axis, command.after))
    way = goal[axis.letter] - really
    if way * axis.side > 0 and (goal[axis.letter] - axis.position) * axis.side >= 0:
        axis.adrift = False
    elif way * axis.side < 0:
        axis.adrift = False
        axis.land(axis.position, -axis.side, axis.framed)


def _plunges(command: Command, run: Running, goal: Mapping[str, int]) -> bool:
    """True for a feed that moves Z alone, and down."""
    if "Z" not in goal or goal["Z"] >= run.axes["Z"].position:
        return False
    return all(letter == "Z" or _stands(command, run.axes[letter], goal[letter]) for letter in goal)


def finish_feed(run: Running, command: Command, texts: list[str], pieces: list[str]) -> None:
    """Send a feed block with the lines before it; say again what those have changed."""
    pieces = run.with_feed(command, pieces)
    if texts and not command.g.motion and run.motion_written != command.after.motion and command.after.motion:
        pieces = run.with_motion(command, pieces)
    run.put(command, [*texts, join_words(pieces)])
    run.open_clear_slot(command)


def _feed_known(run: Running, command: Command, letter: str) -> bool:
    axis = run.axes[letter]
    return bool(axis.side) and (axis.framed or command.after.distance == "G91")


def _feed_from_unknown(run: Running, command: Command, goal: Mapping[str, int], unknown: list[str]) -> None:
    """A feed that starts from an unknown side: Z alone is settled, all else is refused."""
    axes = [run.axes[letter] for letter in goal]
    alone = unknown == ["Z"] and all(a.letter == "Z" or _stands(command, a, goal[a.letter]) for a in axes)
    z_unsaid = command.after.distance == "G91" and any(run.axes[letter].shift is None for letter in unknown)
    if alone and not z_unsaid:
        sides = {**_plan(run, command, goal).sides, **{a: settling_side(run.axes[a]) for a in unknown}}
        plan = Plan(sides, tuple(unknown))
        pieces = run.with_feed(command, command.pieces)
        run.out.close()
        run.put(command, _settled(run, command, goal, plan, pieces, "G1"))
        return
    letter = unknown[0]
    word = letter + command.number(letter).strip()
    reason = f"a feed motion of {letter} from " + (
        "an unknown side" if run.axes[letter].framed else "an unknown position"
    )
    raise command.refusal(word, reason, _SAY_START.format(letter.lower()))


def _stands(command: Command, axis: AxisKnowledge, target: int) -> bool:
    """True where an axis word asks for no motion."""
    return target == axis.position and (axis.framed or command.after.distance == "G91")
