"""Where an arc must be cut so that each piece keeps one side on every axis; plain geometry, no text.

A reversal of a plane axis lies at a quadrant point.  The arc is cut there only where the axis moves by more than its
ripple on both sides of the point: a piece so short that its written end is its written start would be read as a full
circle.
"""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.lash.play import advance
from gcodetool.motion.targets import ArcMove
from gcodetool.program.numbers import QUANTA_PER_MM

# R arcs near a half turn hang on the last digit of their chord; pieces of R arcs are kept well below that
LONGEST_RADIUS_PIECE = 2.1


@dataclass(frozen=True, slots=True)
class Piece:
    """A part of an arc, as shares of its sweep, and the side each lashed axis has on it."""

    start: float
    end: float
    sides: dict[str, int]


@dataclass(frozen=True, slots=True)
class Cut:
    """The pieces of an arc, and ``extremes``: the farthest point of each lashed axis on its last side, quanta."""

    pieces: tuple[Piece, ...]
    extremes: dict[str, int]


def cut_arc(move: ArcMove, axes: Mapping[str, AxisKnowledge], goal: Mapping[str, int]) -> Cut:
    """Cut an arc; ``axes`` are the lashed axes it moves, standing at its start on known sides."""
    shares = [0.0, *(share for share, _ in move.arc.quadrants()), 1.0]
    sides: dict[str, list[int]] = {}
    extremes: dict[str, int] = {}
    for letter, axis in axes.items():
        points = [_at(move, letter, axis.position, goal.get(letter, axis.position), share) for share in shares]
        sides[letter], extremes[letter] = _sides(axis, points)
    pieces: list[Piece] = []
    for index in range(len(shares) - 1):
        here = {letter: found[index] for letter, found in sides.items()}
        if pieces and pieces[-1].sides == here:
            pieces[-1] = Piece(pieces[-1].start, shares[index + 1], here)
        else:
            pieces.append(Piece(shares[index], shares[index + 1], here))
    return Cut(tuple(pieces), extremes)


def _at(move: ArcMove, letter: str, begin: int, end: int, share: float) -> int:
    """Position of an axis at a share of the sweep; the ends exactly as written."""
    if share in (0.0, 1.0):
        return end if share else begin
    if letter == move.normal:
        return begin + round((end - begin) * share)
    point = move.arc.point(share)
    return round(point[letter == move.second] * QUANTA_PER_MM)


def _sides(axis: AxisKnowledge, points: list[int]) -> tuple[list[int], int]:
    """The side on each stretch between neighbouring points, by the detector of ``play.advance``."""
    side, extreme = axis.side, axis.extreme
    found: list[int] = []
    turned_at = 0
    for index, point in enumerate(points[1:]):
        new, extreme = advance(side, extreme, point, axis.ripple)
        stretch = points[turned_at : index + 1]
        if new != side and max(abs(p - stretch[0]) for p in stretch) <= axis.ripple:
            # a sliver before the quadrant point: the take-up goes to its start, and the arc is not cut
            found[turned_at:] = [new] * (index - turned_at)
        if new != side:
            turned_at = index
        side = new
        found.append(side)
    return found, extreme


def cut_long(pieces: tuple[Piece, ...], sweep: float) -> tuple[Piece, ...]:
    """Halve the pieces of an R arc until none is near a half turn."""
    done: list[Piece] = []
    for piece in pieces:
        parts = 1
        while abs(sweep) * (piece.end - piece.start) / parts > LONGEST_RADIUS_PIECE:
            parts += 1
        step = (piece.end - piece.start) / parts
        bounds = [piece.start + k * step for k in range(parts)] + [piece.end]
        done += [Piece(a, b, piece.sides) for a, b in itertools.pairwise(bounds)]
    return tuple(done)
