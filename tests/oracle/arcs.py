"""Arcs as a strict controller reads them: centre from I/J/K or R, sweep, turns, radius mismatch, dense samples.

Plane axes are in right-handed order (G17 X Y, G18 Z X, G19 Y Z), so counter-clockwise, seen from the positive end of
the normal axis, is a growing angle (NISTIR 6556 3.5.3).  Lengths are in mm, angles in radians.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]
Point = tuple[float, ...]

SAME_POINT = 5e-7
"""mm: an arc whose end lies this close to its start, on both plane axes, is read as a full circle."""
LARGEST_MISMATCH = (0.05, 0.005)
"""An arc is an error when start and end radius differ by more than 0.05 mm and more than 0.5 % of the radius."""
CHORD_SLACK = 1e-3
"""mm by which the chord of an R arc may exceed 2 R."""
SAGITTA = 1e-5
"""mm between a dense sample chord and its arc, at most."""


class ArcError(ValueError):
    """An arc that a strict controller stops at."""


@dataclass(frozen=True, slots=True)
class Arc:
    """Circle, spiral by its rounding mismatch, or helix; the sweep is positive counter-clockwise, with all turns."""

    axes: tuple[int, int]
    centre: tuple[float, float]
    angle: float
    sweep: float
    start_radius: float
    end_radius: float

    @property
    def mismatch(self) -> float:
        """End radius less start radius, mm."""
        return self.end_radius - self.start_radius


def _sweep(begin: float, end: float, clockwise: bool, turns: int, closed: bool) -> float:
    span = (begin - end if clockwise else end - begin) % math.tau
    if closed or span == 0.0:
        span = math.tau
    span += (turns - 1) * math.tau
    return -span if clockwise else span


def arc_by_centre(
    axes: tuple[int, int], start: Point, end: Point, centre: tuple[float, float], clockwise: bool, turns: int
) -> Arc:
    """Arc about ``centre`` (absolute, mm); an end on the start is a full circle (of no radius: no motion)."""
    p, q = axes
    from_p, from_q = start[p] - centre[0], start[q] - centre[1]
    to_p, to_q = end[p] - centre[0], end[q] - centre[1]
    radius, end_radius = math.hypot(from_p, from_q), math.hypot(to_p, to_q)
    gap = abs(end_radius - radius)
    if gap > LARGEST_MISMATCH[0] and gap > LARGEST_MISMATCH[1] * radius:
        raise ArcError(f"start and end radius differ by {gap:.4f} mm")
    closed = abs(end[p] - start[p]) <= SAME_POINT and abs(end[q] - start[q]) <= SAME_POINT
    begin = math.atan2(from_q, from_p)
    sweep = _sweep(begin, math.atan2(to_q, to_p), clockwise, turns, closed)
    return Arc(axes, centre, begin, sweep, radius, end_radius)


def arc_by_radius(axes: tuple[int, int], start: Point, end: Point, radius: float, clockwise: bool, turns: int) -> Arc:
    """Arc of a signed radius in mm: positive turns at most half a circle, negative at least (NISTIR 6556 3.5.3.1)."""
    p, q = axes
    chord_p, chord_q = end[p] - start[p], end[q] - start[q]
    chord = math.hypot(chord_p, chord_q)
    if chord <= SAME_POINT or abs(radius) < 1e-9:
        raise ArcError("arc with R whose end is its start, or of no radius")
    if chord > 2 * abs(radius) + CHORD_SLACK:
        raise ArcError(f"chord {chord:.4f} mm exceeds twice the radius {abs(radius):.4f} mm")
    height = math.sqrt(max(0.0, radius * radius - chord * chord / 4))
    left = (not clockwise) == (radius > 0)
    side = height / chord if left else -height / chord
    centre = ((start[p] + end[p]) / 2 - chord_q * side, (start[q] + end[q]) / 2 + chord_p * side)
    return arc_by_centre(axes, start, end, centre, clockwise, turns)


def sample_arc(arc: Arc, start: Point, end: Point) -> Array:
    """Points (n, axes) from ``start`` to ``end`` at fixed absolute angles, so that pieces of one arc share samples.

    The step divides a quarter turn (quadrant points are always among the samples), is at most half a degree, and keeps
    the chord within ``SAGITTA`` of the arc.  The radius runs linearly from start to end radius.
    """
    largest = max(arc.start_radius, arc.end_radius)
    count = 180
    while largest * (1 - math.cos(math.pi / (4 * count))) > SAGITTA:
        count *= 2
    step = math.pi / 2 / count
    low, high = sorted((arc.angle, arc.angle + arc.sweep))
    grid = np.arange(math.floor(low / step) + 1, math.ceil(high / step)) * step
    grid = grid[(grid > low + 1e-9) & (grid < high - 1e-9)]
    if arc.sweep < 0:
        grid = grid[::-1]
    share = (grid - arc.angle) / arc.sweep
    first, last = np.array(start), np.array(end)
    points = first + share[:, None] * (last - first)
    radii = arc.start_radius + share * arc.mismatch
    points[:, arc.axes[0]] = arc.centre[0] + radii * np.cos(grid)
    points[:, arc.axes[1]] = arc.centre[1] + radii * np.sin(grid)
    return np.vstack([first, points, last])
