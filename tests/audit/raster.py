"""A height map of square pixels, cut by brute force: slow, coarse, and made of nothing that the audit uses.

Only for tests.  It reads its own list of moves, not a program: (kind, target, centre or None) with kind G0 G1 G2 G3.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

Point = tuple[float, float, float]


@dataclass
class Step:
    """A place on the path: number of the move, share of it, tip, feed direction, and whether it is a rapid."""

    move: int
    share: float
    at: Point
    towards: tuple[float, float]
    rapid: bool


def steps(moves: list[tuple[str, Point, tuple[float, float] | None]], start: Point, length: float) -> Iterator[Step]:
    """Places along the moves, ``length`` apart."""
    here = start
    for number, (kind, end, centre) in enumerate(moves):
        if centre is None:
            way = math.dist(here, end)
            plan = math.hypot(end[0] - here[0], end[1] - here[1])
            count = max(1, math.ceil(way / length))
            towards = ((end[0] - here[0]) / plan, (end[1] - here[1]) / plan) if plan else (0.0, 0.0)
            for k in range(count + 1):
                t = k / count
                at = tuple(a + t * (b - a) for a, b in zip(here, end, strict=True))
                yield Step(number, t, at, towards, kind == "G0")
        else:
            yield from _round(number, kind, here, end, centre, length)
        here = end


def _round(number, kind, here, end, centre, length):
    sign = -1.0 if kind == "G2" else 1.0
    first = math.atan2(here[1] - centre[1], here[0] - centre[0])
    last = math.atan2(end[1] - centre[1], end[0] - centre[0])
    sweep = (sign * (last - first)) % (2 * math.pi)
    sweep = sign * (sweep if sweep > 1e-9 else 2 * math.pi)
    radius = math.hypot(here[0] - centre[0], here[1] - centre[1])
    count = max(1, math.ceil(abs(sweep) * radius / length))
    for k in range(count + 1):
        t = k / count
        angle = first + t * sweep
        at = (
            centre[0] + radius * math.cos(angle),
            centre[1] + radius * math.sin(angle),
            here[2] + t * (end[2] - here[2]),
        )
        yield Step(number, t, at, (-sign * math.sin(angle), sign * math.cos(angle)), False)


class HeightMap:
    """Material heights over a rectangle; nothing outside of it."""

    def __init__(self, low: tuple[float, float], high: tuple[float, float], top: float, pixel: float) -> None:
        self.low, self.pixel = low, pixel
        self.columns = round((high[0] - low[0]) / pixel)
        self.rows = round((high[1] - low[1]) / pixel)
        self.height = np.full((self.rows, self.columns), top)

    def cut(self, at: Point, radius: float, ball: bool = False) -> float:
        """Take away what the cutter touches; returns the volume taken."""
        x = (at[0] - self.low[0]) / self.pixel
        y = (at[1] - self.low[1]) / self.pixel
        r = radius / self.pixel
        i0, i1 = max(0, math.floor(y - r)), min(self.rows, math.ceil(y + r) + 1)
        j0, j1 = max(0, math.floor(x - r)), min(self.columns, math.ceil(x + r) + 1)
        if i0 >= i1 or j0 >= j1:
            return 0.0
        yy, xx = np.mgrid[i0:i1, j0:j1] + 0.5
        square = (xx - x) ** 2 + (yy - y) ** 2
        floor = np.where(square <= r * r, at[2], np.inf)
        if ball:
            floor += radius - np.sqrt(np.maximum(radius**2 - square * self.pixel**2, 0.0))
        part = self.height[i0:i1, j0:j1]
        after = np.minimum(part, floor)
        taken = float((part - after).sum()) * self.pixel**2
        self.height[i0:i1, j0:j1] = after
        return taken

    def engaged(self, at: Point, towards: tuple[float, float], radius: float, above: float, count: int = 180):
        """For angles from the left of the feed to its right: is there material just outside the circle, ``above`` the
        tip?"""
        phi = (np.arange(count) + 0.5) / count * np.pi
        out = radius + 0.75 * self.pixel
        x = at[0] + out * (np.sin(phi) * towards[0] - np.cos(phi) * towards[1])
        y = at[1] + out * (np.sin(phi) * towards[1] + np.cos(phi) * towards[0])
        j = np.floor((x - self.low[0]) / self.pixel).astype(int)
        i = np.floor((y - self.low[1]) / self.pixel).astype(int)
        inside = (i >= 0) & (i < self.rows) & (j >= 0) & (j < self.columns)
        found = np.zeros(count, bool)
        found[inside] = self.height[i[inside], j[inside]] > at[2] + above
        return phi, found
