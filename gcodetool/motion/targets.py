"""From the words of a command to target positions and arcs, in the frame the program is written in."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from gcodetool.motion.arcs import Arc, ArcError, from_centre, from_radius
from gcodetool.motion.command import Command, turns_of
from gcodetool.motion.dialect import CENTRE_LETTER, PLANE_AXES
from gcodetool.program.numbers import QUANTA_PER_MM

# a looser arc than this is a damaged program; controllers stop on far less (NISTIR 6556, 3.5.3.2: 0.002 mm)
LOOSEST_MISMATCH_MM = 0.05
LOOSEST_MISMATCH_SHARE = 0.005


class ArcMove(NamedTuple):
    """An arc with its letters: first and second plane axis, the normal axis, the centre in quanta (None for R arcs)."""

    arc: Arc
    first: str
    second: str
    normal: str
    centre: tuple[int, int] | None


def targets(command: Command, position: Mapping[str, int]) -> dict[str, int]:
    """Target of each axis word, quanta; ``position`` is needed for the axes named where G91 is in force."""
    if command.after.distance == "G90":
        return {letter: command.quanta(letter) for letter, _ in command.shape.axes}
    return {letter: position[letter] + command.quanta(letter) for letter, _ in command.shape.axes}


def arc_move(command: Command, start: Mapping[str, int], end: Mapping[str, int]) -> ArcMove:
    """The arc a command asks for; ``start`` and ``end`` hold quanta of both plane axes in one frame.

    Raises Refusal where the words make no arc.
    """
    first, second, normal = PLANE_AXES[command.after.plane]
    begin = start[first], start[second]
    finish = end.get(first, begin[0]), end.get(second, begin[1])
    turns = turns_of(command)
    clockwise = command.after.motion == "G2"
    try:
        if command.has("R"):
            centre = None
            arc = _by_radius(command, begin, finish, clockwise, turns)
        else:
            centre = _centre(command, first, second, begin)
            arc = from_centre(_mm(begin), _mm(finish), _mm(centre), clockwise, begin == finish, turns)
    except ArcError as fault:
        raise command.refusal(_words(command), str(fault), "Post the arc again, or as short lines") from None
    if arc.mismatch > max(LOOSEST_MISMATCH_MM, LOOSEST_MISMATCH_SHARE * arc.start_radius):
        reason = f"start and end lie {arc.start_radius:.4f} and {arc.end_radius:.4f} mm from the centre"
        raise command.refusal(_words(command), reason, "Check G90.1 / G91.1 and the arc settings of the post")
    return ArcMove(arc, first, second, normal, centre)


def _mm(point: tuple[int, int]) -> tuple[float, float]:
    return point[0] / QUANTA_PER_MM, point[1] / QUANTA_PER_MM


def _by_radius(command: Command, begin: tuple[int, int], finish: tuple[int, int], clockwise: bool, turns: int) -> Arc:
    if any(command.has(letter) for letter in "IJK"):
        raise ArcError("both a radius and a centre")
    radius = command.quanta("R") / QUANTA_PER_MM
    return from_radius(_mm(begin), _mm(finish), radius, clockwise, turns)


def _centre(command: Command, first: str, second: str, begin: tuple[int, int]) -> tuple[int, int]:
    letters = CENTRE_LETTER[first], CENTRE_LETTER[second]
    if not any(command.has(letter) for letter in letters):
        raise ArcError("an arc without a centre or a radius")
    other = next(letter for letter in "IJK" if letter not in letters)
    if command.has(other) and command.quanta(other):
        raise ArcError(f"{other} is no centre word in {command.after.plane}")
    if command.after.centre == "G91.1":
        offsets = [command.quanta(letter) if command.has(letter) else 0 for letter in letters]
        return begin[0] + offsets[0], begin[1] + offsets[1]
    if not all(command.has(letter) for letter in letters):
        raise ArcError("an absolute centre needs both of its words")
    return command.quanta(letters[0]), command.quanta(letters[1])


def _words(command: Command) -> str:
    return command.block.text.strip()[:40]
