"""Circle geometry of G2 and G3: centre, sweep, quadrant points.

Plane coordinates ``(p, q)`` are right-handed seen from the positive end of the normal axis: (X, Y) in G17, (Z, X) in
G18, (Y, Z) in G19 (NISTIR 6556, 3.5.3).  Lengths in mm, angles in radians, counter-clockwise positive.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

TURN = 2.0 * math.pi
QUARTER = 0.5 * math.pi
# two directions closer than this are one: far below any written digit, far above the rounding of a float
ANGLE_NOISE = 1e-9
NO_RADIUS = 1e-7
Point = tuple[float, float]


class ArcError(ValueError):
    """The words do not make an arc; the text says why."""


@dataclass(frozen=True, slots=True)
class Arc:
    """One arc, perhaps of several turns; where the two radii differ it is a spiral with radius linear in the angle.

    ``sweep`` is signed.  The start angle of a point on the centre is 0.
    """

    centre: Point
    start_radius: float
    end_radius: float
    start_angle: float
    sweep: float

    def radius(self, share: float) -> float:
        """Radius at a share (0 to 1) of the sweep."""
        return self.start_radius + (self.end_radius - self.start_radius) * share

    def point(self, share: float) -> Point:
        """Plane point at a share (0 to 1) of the sweep."""
        angle = self.start_angle + self.sweep * share
        radius = self.radius(share)
        return self.centre[0] + radius * math.cos(angle), self.centre[1] + radius * math.sin(angle)

    @property
    def mismatch(self) -> float:
        """How far start and end radius differ, mm."""
        return abs(self.end_radius - self.start_radius)

    def quadrants(self) -> list[tuple[float, int]]:
        """Quadrant points strictly inside the sweep, in travel order, as ``(share, axis)``.

        ``axis`` is 0 where the first plane axis reverses (angle 0 or pi) and 1 where the second does.
        """
        if self.sweep == 0.0:
            return []
        first, last = sorted((self.start_angle, self.start_angle + self.sweep))
        low = math.ceil((first + ANGLE_NOISE) / QUARTER)
        high = math.floor((last - ANGLE_NOISE) / QUARTER)
        found = [((k * QUARTER - self.start_angle) / self.sweep, k % 2) for k in range(low, high + 1)]
        return found if self.sweep > 0 else found[::-1]


def from_centre(start: Point, end: Point, centre: Point, clockwise: bool, closed: bool, turns: int = 1) -> Arc:
    """Arc about a given centre; ``closed`` says that the written end is the written start (a full circle).

    ``turns`` is the P word: 1 for at most one full circle, 2 for one turn more.  A full circle of radius 0, which
    posts do write, is an arc without sweep; any other arc of radius 0 raises ArcError.
    """
    ux, uy = start[0] - centre[0], start[1] - centre[1]
    vx, vy = end[0] - centre[0], end[1] - centre[1]
    radius, end_radius = math.hypot(ux, uy), math.hypot(vx, vy)
    if closed and radius < NO_RADIUS:
        return Arc(centre, 0.0, 0.0, 0.0, 0.0)
    if radius < NO_RADIUS or end_radius < NO_RADIUS:
        raise ArcError("the arc has no radius")
    between = math.atan2(ux * vy - uy * vx, ux * vx + uy * vy)
    if clockwise:
        between = -between
    if closed or abs(between) < ANGLE_NOISE:
        between = TURN
    elif between < 0.0:
        between += TURN
    between += TURN * (turns - 1)
    return Arc(centre, radius, end_radius, math.atan2(uy, ux), -between if clockwise else between)


def from_radius(start: Point, end: Point, radius: float, clockwise: bool, turns: int = 1) -> Arc:
    """Arc of a given radius; a negative radius asks for the longer way round (NISTIR 6556, 3.5.3.1).

    Where the chord is longer than the diameter by rounding only, the centre is the middle of the chord.  Raises
    ArcError for a chord that is clearly too long, a zero chord, a zero radius.
    """
    dx, dy = end[0] - start[0], end[1] - start[1]
    chord = math.hypot(dx, dy)
    if chord == 0.0:
        raise ArcError("an arc by radius cannot end where it starts")
    if radius == 0.0:
        raise ArcError("the arc has no radius")
    height_squared = radius * radius - 0.25 * chord * chord
    if height_squared < 0.0 and 0.5 * chord - abs(radius) > 0.005:
        raise ArcError("the end is farther away than the diameter")
    height = math.sqrt(max(0.0, height_squared))
    # the centre of the shorter arc lies left of the chord for counter-clockwise travel, right of it for clockwise
    if clockwise != (radius < 0.0):
        height = -height
    centre = (start[0] + 0.5 * dx - dy / chord * height, start[1] + 0.5 * dy + dx / chord * height)
    return from_centre(start, end, centre, clockwise, False, turns)
