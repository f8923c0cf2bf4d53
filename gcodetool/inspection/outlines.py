"""Outlines in plan: boxes, discs and polygons as rings of corners, mm."""

from __future__ import annotations

import math
from collections.abc import Sequence

Outline = tuple[tuple[float, float], ...]
CORNERS = 256
"""Corners of a round outline; its sides lie at most 0.0075 % of its radius inside the circle."""


def disc(x: float, y: float, radius: float) -> Outline:
    """A round outline."""
    turn = 2.0 * math.pi / CORNERS
    return tuple((x + radius * math.cos(turn * k), y + radius * math.sin(turn * k)) for k in range(CORNERS))


def box(x0: float, y0: float, x1: float, y1: float) -> Outline:
    """A rectangular outline from two opposite corners."""
    low, high = (min(x0, x1), min(y0, y1)), (max(x0, x1), max(y0, y1))
    return low, (high[0], low[1]), high, (low[0], high[1])


def outline_of(kind: str, numbers: Sequence[float]) -> Outline:
    """The outline of ``box`` (x0 y0 x1 y1), ``disc`` (x y diameter) or ``polygon`` (x y for each corner).

    Raises ValueError, in words, for a wrong count of numbers and for an outline without an area.
    """
    if not all(map(math.isfinite, numbers)):
        raise ValueError("an outline is made of numbers in mm")
    if kind == "box":
        if len(numbers) != 4:
            raise ValueError("a box is two opposite corners: x0, y0, x1, y1")
        outline = box(*numbers)
    elif kind == "disc":
        if len(numbers) != 3:
            raise ValueError("a disc is its middle and its diameter: x, y, diameter")
        outline = disc(numbers[0], numbers[1], 0.5 * abs(numbers[2]))
    else:
        if len(numbers) < 6 or len(numbers) % 2:
            raise ValueError("a polygon is three corners or more, x and y of each")
        outline = tuple(zip(numbers[::2], numbers[1::2], strict=True))
    if abs(_area(outline)) < 1e-9:
        raise ValueError("the outline has no area")
    return outline


def _area(outline: Outline) -> float:
    pairs = zip(outline, (*outline[1:], outline[0]), strict=True)
    return 0.5 * sum(a[0] * b[1] - b[0] * a[1] for a, b in pairs)
