"""Drilling and boring cycles, kept as cycles; and probing.

X and Y of a hole are folded like those of a rapid.  Depth and R are shifted by the shift of the lower side, so the
bottom is exact; the return in air may stray by the lash.  After the cycle the normal axis is on its upper side with
the command where the cycle put it, which is why it is *adrift*: the next motion puts that right.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from gcodetool.lash import holes
from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.lash.running import Running
from gcodetool.lash.straight import arrival_side, settling_side
from gcodetool.motion.command import Command
from gcodetool.motion.cycles import Cycle, Sticky, read_cycle
from gcodetool.motion.dialect import PLANE_AXES
from gcodetool.motion.modal import ModalState, is_cycle
from gcodetool.program.numbers import QUANTA_PER_MM
from gcodetool.program.rewrite import Word, join_words, new_line, with_word

_BRING = "Bring {0} to the hole with a rapid (G0) before the cycle"


@dataclass(slots=True)
class Drilling:
    """The sticky words of the program as written, R as it went out last (in G91 it depends on the shift).

    ``entry`` is where the normal axis stood before the series of cycles, None where that is not known.
    """

    sticky: Sticky
    level_written: int | None = None
    entry: int | None = None


def cycle(run: Running, drilling: Drilling, command: Command) -> None:
    """Rewrite one block in a cycle mode."""
    drilling.sticky.take(command)
    run.out.close()
    if not is_cycle(command.before.motion):
        normal = run.axes[PLANE_AXES[command.after.plane][2]]
        drilling.entry = normal.position if normal.framed else None
    if not command.shape.axes:
        _words_only(run, command)
        return
    plane = PLANE_AXES[command.after.plane]
    _check_rotary(command, plane)
    height = run.axes[plane[2]].position
    asked = read_cycle(command, drilling.sticky, height)
    before, sides = _approach(run, command, asked)
    pieces = _plane_words(run, command, sides)
    pieces = _depth_words(run, command, asked, pieces, drilling)
    if before:
        pieces = _respelled(run, command, asked, pieces, drilling)
    pieces = run.with_feed(command, pieces)
    run.note_decimals(command)
    _leave(run, command, asked, sides)
    if command.after.retract == "G98" and drilling.entry is not None:
        _doubt_level(run, asked, height, drilling.entry)
    run.put(command, [*before, join_words(pieces)])


def _check_rotary(command: Command, plane: tuple[str, str, str]) -> None:
    for letter, _ in command.shape.axes:
        if letter not in plane:
            word = letter + command.number(letter).strip()
            raise command.refusal(word, "a rotary motion inside a cycle", "Turn the axis on a line before the cycle")


def _words_only(run: Running, command: Command) -> None:
    """R, Q, P and the like without a hole: they are kept for the next one."""
    pieces = list(command.pieces)
    axis = run.axes[PLANE_AXES[command.after.plane][2]]
    if command.has("R") and command.after.distance == "G90" and not axis.idle:
        index = command.shape.at["R"]
        pieces[index] = run.plus(axis, pieces[index], command.after, _low(run, command, axis))
    run.put(command, [join_words(pieces)])


def _low(run: Running, command: Command, axis: AxisKnowledge) -> int:
    return axis.shift_on(-1, run.is_inch(axis, command.after))


# ---- where the holes are
# -----------------------------------------------------------------------------------------------


def _approach(run: Running, command: Command, asked: Cycle) -> tuple[list[str], dict[str, int]]:
    """Lines to write before the block, and the side on which each lashed plane axis stands in the hole."""
    sides: dict[str, int] = {}
    settle: dict[str, int] = {}
    for letter in asked.plane[:2]:
        axis = run.axes[letter]
        if axis.idle or (letter not in asked.steps and not asked.aside.get(letter)):
            continue
        side = _hole_side(run, command, asked, axis)
        sides[letter] = side or settling_side(axis)
        if letter in asked.steps and holes.wants_approach(run, axis, side) and not asked.aside:
            side, sides[letter] = 0, axis.datum
        if not side:
            settle[letter] = asked.steps[letter]
    if settle:
        return _settle(run, command, asked, settle, sides), sides
    return _step_first(run, command, asked, sides), sides


def _hole_side(run: Running, command: Command, asked: Cycle, axis: AxisKnowledge) -> int:
    """The side on which an axis reaches the hole; 0 where it has to be settled."""
    aside = asked.aside.get(axis.letter, 0)
    if aside:
        return -1 if aside > 0 else 1
    step = asked.steps[axis.letter]
    return arrival_side(run, command, axis, step if asked.absolute else axis.position + step)


def _settle(
    run: Running, command: Command, asked: Cycle, settle: Mapping[str, int], sides: Mapping[str, int]
) -> list[str]:
    """Settle over the hole before the cycle, at the height at which the cycle itself would go there."""
    normal = run.axes[asked.plane[2]]
    letter = next(iter(settle))
    if (
        not asked.absolute
        or not normal.framed
        or normal.position < asked.level
        or command.after != _same_frame(command)
    ):
        word = letter + command.number(letter).strip()
        reason = f"a cycle that starts from an unknown position or side of {letter}"
        raise command.refusal(word, reason, _BRING.format(letter))
    words, back = [], []
    for name, step in asked.steps.items():
        axis, side = run.axes[name], sides.get(name, 0)
        like = command.number(name).strip()
        if name not in settle:
            # it goes along, so that the way there is the one that the cycle would take
            axis.land(step, side, True)
            words.append((name, like if axis.idle else run.number_at(axis, command.after, side, like)))
            continue
        axis.land(step, side, True)
        beyond = holes.overshoot(run, axis, run.is_inch(axis, command.after)) * -side
        words.append((name, run.number_at(axis, command.after, side, like, beyond)))
        back.append((name, run.number_at(axis, command.after, side, like)))
        run.tally.path_added += 2 * abs(beyond) / QUANTA_PER_MM
    run.tally.settles += len(settle)
    look = run.look(command)
    return [new_line([("G", "0"), *words], look), new_line([("G", "0"), *back], look)]


def _same_frame(command: Command) -> ModalState:
    """The modal state after the block if it changes only its motion: lines before it are written in the same frame."""
    return replace(command.before, motion=command.after.motion, retract=command.after.retract)


def _step_first(run: Running, command: Command, asked: Cycle, sides: Mapping[str, int]) -> list[str]:
    """In G91 with repeats a changed step would be repeated too: the lash is crossed on a line of its own."""
    if asked.absolute or asked.repeats == 1:
        return []
    turning = {a: s for a, s in sides.items() if run.axes[a].side != s and not asked.aside.get(a)}
    if not turning:
        return []
    words: list[Word] = [("G", "0")]
    for letter, side in turning.items():
        axis = run.axes[letter]
        words.append((letter, run.number_at(axis, command.after, side, "0")))
        axis.land(axis.position, side, axis.framed)
        run.tally.take_ups.update(letter)
    run.tally.blocks_in_air += 1
    return [new_line(words, run.look(command))]


def _plane_words(run: Running, command: Command, sides: Mapping[str, int]) -> list[str]:
    pieces = list(command.pieces)
    for letter, side in sides.items():
        axis = run.axes[letter]
        if command.has(letter):
            index = command.shape.at[letter]
            pieces[index] = run.shifted_word(axis, pieces[index], command.after, side)
            _step_aside(run, command, pieces, axis, side)
        elif side != axis.side:
            reason = f"back boring over the place where {letter} stands, from its other side"
            raise command.refusal("G87", reason, f"State {letter} in the block")
    return pieces


def _step_aside(run: Running, command: Command, pieces: list[str], axis: AxisKnowledge, side: int) -> None:
    """I, J of back boring: the place beside the hole has the other side than the hole, so the step is longer."""
    name = "IJ"[PLANE_AXES[command.after.plane].index(axis.letter)]
    if command.after.motion == "G87" and command.has(name) and command.quanta(name):
        inch = run.is_inch(axis, command.after)
        index = command.shape.at[name]
        add = axis.shift_on(-side, inch) - axis.shift_on(side, inch)
        pieces[index] = run.plus(axis, pieces[index], command.after, add)


# ---- how deep
# ----------------------------------------------------------------------------------------------------------


def _depth_words(run: Running, command: Command, asked: Cycle, pieces: list[str], drilling: Drilling) -> list[str]:
    axis = run.axes[asked.plane[2]]
    if axis.idle:
        return pieces
    _check_depth(run, command, asked, axis)
    inch = run.is_inch(axis, command.after)
    low, high = axis.shift_on(-1, inch), axis.shift_on(1, inch)
    changes = {"K": high if asked.absolute else high - low} if asked.word == "G87" else {}
    if asked.absolute:
        changes |= {axis.letter: low, "R": low}
    for letter, add in changes.items():
        if command.has(letter):
            index = command.shape.at[letter]
            pieces[index] = run.plus(axis, pieces[index], command.after, add)
    if not asked.absolute:
        pieces = _level_word(run, command, asked, pieces, drilling)
    return pieces


def _level_word(run: Running, command: Command, asked: Cycle, pieces: list[str], drilling: Drilling) -> list[str]:
    """R in G91 counts from the command as it stands, whose shift changes from hole to hole."""
    axis = run.axes[asked.plane[2]]
    if axis.shift is None:
        reason = f"an incremental cycle where it is not known how far {axis.letter} is off"
        raise command.refusal(asked.word, reason, f"Move {axis.letter} with a rapid (G0) in G90 before it")
    add = _low(run, command, axis) - axis.shift
    text, _ = drilling.sticky.words["R"]
    wanted = asked.level - axis.position + add
    if command.has("R"):
        index = command.shape.at["R"]
        pieces[index] = run.plus(axis, pieces[index], command.after, add)
    elif wanted != drilling.level_written:
        number = run.plus(axis, text.strip(), command.after, add)
        pieces = with_word(pieces, ("R", number), run.look(command))
    drilling.level_written = wanted
    return pieces


def _check_depth(run: Running, command: Command, asked: Cycle, axis: AxisKnowledge) -> None:
    """The bottom is exact only if the way down to it crosses the lash for sure."""
    if axis.side < 0 and not axis.adrift:
        return
    lash = axis.lash(run.is_inch(axis, command.after))
    start = max(asked.level, axis.position) if axis.side and axis.framed else asked.level
    if start - asked.bottom < lash and not (axis.side > 0 and not axis.adrift):
        word = command.block.text.strip()[:40]
        raise command.refusal(word, "a hole shallower than the lash, from an unknown side", "Start the cycle higher")


def _respelled(run: Running, command: Command, asked: Cycle, pieces: list[str], drilling: Drilling) -> list[str]:
    """A line before the block has ended the cycle: state it again with all it keeps."""
    look = run.look(command)
    if not command.g.motion:
        pieces = run.with_motion(command, pieces)
    axis = run.axes[asked.plane[2]]
    for letter, (text, _) in drilling.sticky.words.items():
        if any(pieces[i].upper() == letter for i in range(1, len(pieces), 3)):
            continue
        number = text.strip()
        if not axis.idle and (letter == "R" or (asked.absolute and letter == axis.letter)):
            # in G91 depth counts from R, and R from the command as it stands
            add = 0 if asked.absolute else axis.shift or 0
            number = run.plus(axis, number, command.after, _low(run, command, axis) - add)
        pieces = with_word(pieces, (letter, number), look)
    return pieces


# ---- how it is left
# ----------------------------------------------------------------------------------------------------


def _leave(run: Running, command: Command, asked: Cycle, sides: Mapping[str, int]) -> None:
    for letter, step in asked.steps.items():
        axis = run.axes[letter]
        target = step if asked.absolute else axis.position + step * asked.repeats
        framed = axis.framed or asked.absolute
        side = sides.get(letter, axis.side)
        if axis.side == side and axis.side and not axis.adrift and not asked.aside:
            axis.go(target)
        else:
            axis.land(target, side, framed)
    for letter in asked.aside:
        if letter not in asked.steps:
            run.axes[letter].side = sides.get(letter, run.axes[letter].side)
    _leave_normal(run, command, asked, run.axes[asked.plane[2]])


def _leave_normal(run: Running, command: Command, asked: Cycle, axis: AxisKnowledge) -> None:
    at_level = command.after.retract == "G99" or (axis.framed and axis.position <= asked.level) or not asked.absolute
    if command.after.retract == "G98" and not asked.absolute:
        at_level = asked.level >= axis.position
    framed = axis.framed or asked.absolute
    if axis.idle:
        axis.land(asked.clear if at_level else axis.position, 0, framed and (at_level or axis.framed))
        return
    low = _low(run, command, axis)
    kept = axis.shift
    if at_level:
        axis.land(asked.level, 1, framed)
        axis.shift = low
    else:
        # back to the level the command had before; what that was may not be known
        axis.land(axis.position, 1, axis.framed)
        axis.shift = kept
    if asked.clear - asked.bottom < axis.mm_lash or axis.shift is None:
        axis.lose_side(command_is_exact=False)
    else:
        run.maybe_adrift = True
        axis.adrift = axis.shift != axis.shift_on(1, run.is_inch(axis, command.after))


def _doubt_level(run: Running, asked: Cycle, height: int, entry: int) -> None:
    """G98 after G99 in one series: some controllers come back to where this hole began, others the series."""
    if max(height, asked.level) != max(entry, asked.level):
        axis = run.axes[asked.plane[2]]
        axis.lose_side(command_is_exact=False)


# ---- probing
# -----------------------------------------------------------------------------------------------------------


def probe(run: Running, command: Command) -> None:
    """G38: the target stays as it is; where it touches, the side is that of the motion, the position not known."""
    run.out.close()
    absolute = command.after.distance == "G90"
    texts = run.reseat(command)
    for letter, _ in command.shape.axes:
        axis = run.axes[letter]
        value = command.quanta(letter)
        way = value - axis.position if absolute else value
        if absolute and not axis.framed:
            axis.lose_side(command_is_exact=False)
        elif way:
            axis.land(axis.position, 0 if axis.idle else 1 if way > 0 else -1, False)
            axis.shift = axis.shift_on(axis.side, run.is_inch(axis, command.after)) if axis.side else 0
    run.put(command, [*texts, join_words(run.with_feed(command, command.pieces))])
