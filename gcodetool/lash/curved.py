"""Arcs: split where a plane axis reverses, take up there, and write true arcs again.

The first piece is the block itself with a nearer end, so that F, plane, units and comments stay where they act; the
further pieces follow it.  Inside a piece the shift is constant, and a shifted arc is the same arc.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

from gcodetool.lash.arc_pieces import Cut, Piece, cut_arc, cut_long
from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.lash.running import DEEPEST_DECIMALS, Running
from gcodetool.lash.straight import split_last_words, targets
from gcodetool.motion.command import Command
from gcodetool.motion.dialect import CENTRE_LETTER, PLANE_AXES
from gcodetool.motion.targets import ArcMove, arc_move
from gcodetool.program.numbers import (
    INCH_DIGIT,
    MM_DIGIT,
    QUANTA_PER_MM,
    decimals_of,
    exact,
    round_to_grid,
    shifted,
    write_quanta,
)
from gcodetool.program.rewrite import Word, join_words, new_line, with_word, without_words


@dataclass(frozen=True, slots=True)
class _Task:
    """One arc block on its way out: the block, its arc, where each axis ends and begins, decimals of split points."""

    run: Running
    command: Command
    move: ArcMove
    goal: dict[str, int]
    begin: dict[str, int]
    places: int = 0

    @property
    def plane(self) -> tuple[str, str]:
        """Letters of the plane axes."""
        return self.move.first, self.move.second

    @property
    def full_goal(self) -> dict[str, int]:
        """Where the arc ends, with the plane axes that have no word in the block."""
        return {letter: self.begin[letter] for letter in self.plane} | self.goal

    @property
    def digit(self) -> tuple[int, ...]:
        """Quanta of the last digit, in the units of the block."""
        return INCH_DIGIT if self.command.after.units == "G20" else MM_DIGIT


def arc(run: Running, command: Command) -> None:
    """Rewrite one arc block."""
    goal = targets(run, command)
    plane = PLANE_AXES[command.after.plane][:2]
    if all(run.axes[letter].idle for letter in (*plane, *goal)):
        # nothing to shift; the geometry is not needed and may not even be known
        run.note_decimals(command)
        for letter, target in goal.items():
            axis = run.axes[letter]
            axis.land(target, 0, axis.framed or command.after.distance == "G90")
        texts = run.reseat(command)
        pieces = run.with_feed(command, command.pieces)
        if texts and not command.g.motion:
            pieces = run.with_motion(command, pieces)
        run.put(command, [*texts, join_words(pieces)], plane)
        return
    _check_known(run, command, goal)
    begin = {letter: axis.position for letter, axis in run.axes.items()}
    move = arc_move(command, begin, goal)
    _write(_Task(run, command, move, goal, begin))


def _check_known(run: Running, command: Command, goal: Mapping[str, int]) -> None:
    absolute = command.after.distance == "G90" or command.after.centre == "G90.1"
    for letter in dict.fromkeys([*PLANE_AXES[command.after.plane][:2], *goal]):
        axis = run.axes[letter]
        unplaced = absolute and not axis.framed and letter in PLANE_AXES[command.after.plane]
        if unplaced or (not axis.idle and not (axis.side and (axis.framed or not absolute))):
            what = "position" if unplaced else "side"
            reason = f"an arc that starts from an unknown {what} of {letter}"
            way_out = f"Bring the axis there with a rapid (G0) first, or state --start {letter.lower()}=POSITION+"
            raise command.refusal(command.block.text.strip()[:40], reason, way_out)


def _places(task: _Task) -> int:
    """Decimals of split points and centres: those of the grid, of the block's words and of the start."""
    run, command = task.run, task.command
    words = [decimals_of(command.number(a)) for a in "XYZIJKR" if command.has(a)]
    stands = [run.axes[a].decimals for a in (*task.plane, *task.goal) if not run.axes[a].rotary]
    return min(max(run.least(command.after.units == "G20"), *words, *stands), DEEPEST_DECIMALS)


def _write(task: _Task) -> None:
    run, command = task.run, task.command
    moved = {a: run.axes[a] for a in (*task.plane, *task.goal) if not run.axes[a].idle}
    cut = cut_arc(task.move, moved, task.goal)
    pieces = cut.pieces
    if len(pieces) > 1 and command.has("R"):
        pieces = cut_long(pieces, task.move.arc.sweep)
    if len(pieces) > 1:
        task = replace(task, places=_places(task))
        for letter in (*task.plane, *task.goal):
            run.axes[letter].decimals = max(run.axes[letter].decimals, task.places)
    texts = run.reseat(command)
    texts += _take_up(task, pieces[0], first=True, in_air=not texts)
    last: list[Word] = []
    for index, piece in enumerate(pieces):
        if index:
            texts += _take_up(task, piece, first=False)
        end = _split_point(task, piece.end) if piece.end < 1.0 else task.goal if len(pieces) == 1 else task.full_goal
        if index == 0:
            respell = bool(texts) and run.motion_written != command.after.motion
            block, last = _first(task, piece, end, len(pieces) > 1, respell)
            texts.append(block)
        else:
            texts.append(_next(task, piece, end, last if piece.end == 1.0 else []))
        _arrive(task, end, piece.sides)
    run.note_decimals(command)
    _finish(task, cut)
    run.tally.splits += len(pieces) - 1
    run.put(command, texts, task.plane)


def _take_up(task: _Task, piece: Piece, first: bool, in_air: bool = False) -> list[str]:
    axes = task.run.axes
    turning = {letter: side for letter, side in piece.sides.items() if side != axes[letter].side}
    if not turning:
        return []
    state = task.command.before if first else task.command.after
    made = task.run.take_up(task.command, turning, state, in_air=in_air)
    for letter, side in turning.items():
        axes[letter].side = side
    return made


def _split_point(task: _Task, share: float) -> dict[str, int]:
    """End of a piece inside the arc, rounded to digits that can be written: plane axes, and others that move."""
    point = task.move.arc.point(share)
    end = {}
    for letter in dict.fromkeys([*task.plane, *task.goal]):
        axis = task.run.axes[letter]
        begin, goal = task.begin[letter], task.goal.get(letter, task.begin[letter])
        if letter in task.plane:
            value = round(point[letter == task.move.second] * QUANTA_PER_MM)
        else:
            value = begin + round((goal - begin) * share)
        # in G91 the step is what gets written, so the step is what must fall on a digit
        base = axis.position if task.command.after.distance == "G91" else 0
        digit = MM_DIGIT if axis.rotary else task.digit
        end[letter] = base + round_to_grid(value - base, digit, task.places)
    return end


def _arrive(task: _Task, end: Mapping[str, int], sides: Mapping[str, int]) -> None:
    for letter, target in end.items():
        axis = task.run.axes[letter]
        axis.land(target, sides.get(letter, 0), axis.framed or task.command.after.distance == "G90")


def _finish(task: _Task, cut: Cut) -> None:
    """Set the farthest points: a piece that ends within the ripple after a quadrant point has not turned."""
    for letter, extreme in cut.extremes.items():
        task.run.axes[letter].extreme = extreme


def _first(task: _Task, piece: Piece, end: Mapping[str, int], split: bool, respell: bool) -> tuple[str, list[Word]]:
    """The block itself, up to the end of the first piece, and the M words it must hand on to the last one."""
    run, command = task.run, task.command
    pieces = list(command.pieces)
    look = run.look(command)
    added: list[Word] = []
    for letter, target in end.items():
        axis = run.axes[letter]
        if command.has(letter) and target == task.goal.get(letter):
            index = command.shape.at[letter]
            if not axis.idle:
                pieces[index] = run.shifted_word(axis, pieces[index], command.after, piece.sides[letter])
        else:
            number = _end_number(task, axis, target, piece)
            if command.has(letter):
                pieces[command.shape.at[letter]] = number
            else:
                added.append((letter, number))
    _shift_centre(task, pieces, piece)
    for word in added:
        pieces = with_word(pieces, word, look)
    pieces = run.with_feed(command, pieces)
    if respell and not command.g.motion:
        pieces = run.with_motion(command, pieces)
    last: list[Word] = []
    if split and command.after.feed_mode == "G93" and command.has("F"):
        pieces[_index(pieces, "F")] = _share_of_time(command, piece)
    if split:
        pieces, last = split_last_words(command, _split_block(task, pieces, piece))
    return join_words(pieces), last


def _split_block(task: _Task, pieces: list[str], piece: Piece) -> list[str]:
    """What changes in the words of a block that is cut: the long way round becomes a short one, turns go."""
    command = task.command
    sweep = abs(task.move.arc.sweep) * (piece.end - piece.start)
    if command.has("R"):
        index = _index(pieces, "R")
        pieces[index] = _radius_number(command, sweep)
    if command.has("P"):
        pieces = without_words(pieces, [_index(pieces, "P")])
    return pieces


def _index(pieces: list[str], letter: str) -> int:
    return 1 + max(i for i in range(1, len(pieces), 3) if pieces[i].upper() == letter)


def _radius_number(command: Command, sweep: float) -> str:
    text = command.number("R").strip()
    bare = text.lstrip("+- \t")
    return f"-{bare}" if sweep > 3.15 else bare


def _shift_centre(task: _Task, pieces: list[str], piece: Piece) -> None:
    if task.command.after.centre != "G90.1" or task.move.centre is None:
        return
    for letter in task.plane:
        axis = task.run.axes[letter]
        if not axis.idle:
            inch = task.command.after.units == "G20"
            index = _index(pieces, CENTRE_LETTER[letter])
            add = axis.shift_on(piece.sides[letter], inch)
            pieces[index] = shifted(pieces[index], add, task.digit, task.run.least(inch))[0] if add else pieces[index]


def _end_number(task: _Task, axis: AxisKnowledge, target: int, piece: Piece) -> str:
    """The number of a target word at a split point; the axis still stands at the start of the piece."""
    run, state = task.run, task.command.after
    inch = run.is_inch(axis, state)
    want = 0 if axis.idle else axis.shift_on(piece.sides[axis.letter], inch)
    like = task.command.number(axis.letter).strip() if task.command.has(axis.letter) else "0"
    digit = INCH_DIGIT if inch else MM_DIGIT
    value = target + want
    if state.distance == "G91":
        value -= axis.position + (axis.shift or 0)
    axis.shift = want
    return write_quanta(value, digit, task.places, like)


def _next(task: _Task, piece: Piece, end: Mapping[str, int], last: list[Word]) -> str:
    """A further piece, as a new line after the block."""
    run, command = task.run, task.command
    words: list[Word] = [("G", command.after.motion[1:])]
    centre = _centre_words(task, piece)
    words += [(letter, _end_number(task, run.axes[letter], target, piece)) for letter, target in end.items()]
    words += centre
    if command.after.feed_mode == "G93" and command.has("F"):
        words.append(("F", _share_of_time(command, piece)))
    elif run.feed is not None and run.feed_written not in (None, run.feed) and command.after.feed_mode == "G94":
        words.append(("F", run.feed))
        run.feed_written = run.feed
    return new_line([*words, *last], run.look(command))


def _share_of_time(command: Command, piece: Piece) -> str:
    """F of a piece in inverse time (1/minutes): its share of the sweep is that of the time (NISTIR 6556, 3.5.19)."""
    value, decimals = exact(command.number("F"))
    return f"{value / 10**decimals / (piece.end - piece.start):.6f}"


def _centre_words(task: _Task, piece: Piece) -> list[Word]:
    """I, J, K or R of a further piece; taken while the axes still stand at its start."""
    command, move = task.command, task.move
    if move.centre is None:
        return [("R", _radius_number(command, abs(move.arc.sweep) * (piece.end - piece.start)))]
    words = []
    for letter, centre in zip(task.plane, move.centre, strict=True):
        axis = task.run.axes[letter]
        if command.after.centre == "G91.1":
            value = centre - axis.position
        else:
            shift = 0 if axis.idle else axis.shift_on(piece.sides[letter], command.after.units == "G20")
            value = centre + shift
        name = CENTRE_LETTER[letter]
        like = command.number(name).strip() if command.has(name) else "0"
        words.append((name, write_quanta(value, task.digit, task.places, like)))
    return words
