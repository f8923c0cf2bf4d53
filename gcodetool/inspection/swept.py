"""Where a cutter's circle lies inside areas swept by earlier cutters: exact angles, for many pairs at once.

A *piece* is a short stretch of a path of the cutter's tip: a straight line (sloping in Z or not) or an arc in the XY
plane of at most a sixth of a turn.  At a height ``h`` a piece has swept, from above, all points within the cutter's
radius of the part of it that lies at or below ``h``: a capsule (a tapering one where the radius changes on the way)
or a part of a ring with round ends.

Angles are those of milling (Martellotti, Trans. ASME 63, 1941; Altintas, Manufacturing Automation, ch. 2, both from
memory): phi is measured clockwise seen from above, from the left of the feed: 0 left, pi/2 ahead, pi right.  Only
0..pi, the leading half of the circle, can meet material.  Here every pair is turned into a frame (left, ahead) about
the centre of the circle, so that phi is the ordinary polar angle in it.

Lengths in mm, angles in radians.  One row of an array is one piece, one pair or one interval.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from gcodetool.inspection.cutting_records import Cutters
from gcodetool.inspection.job_records import BALL, FLAT

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]

# columns of the table of pieces
X0, Y0, X1, Y1, Z0, Z1, CX, CY, RC, A0, SWEEP, TOOL = range(12)
COLUMNS = 12
# an interval shorter than this is rounding
NO_ANGLE = 1e-9
PI = float(np.pi)


def radius_at(cutters: Cutters, tool: Ints, height: Floats) -> Floats:
    """Radius of the cutter at a height above its tip; 0 below the tip."""
    full, kind = cutters.radius[tool], cutters.kind[tool]
    up = np.maximum(height, 0.0)
    low = np.minimum(up, full)
    ball = np.sqrt(np.maximum(low * (2.0 * full - low), 0.0))
    vee = np.minimum(cutters.tip[tool] + up * cutters.slope[tool], full)
    found = np.where(kind == FLAT, full, np.where(kind == BALL, ball, vee))
    return np.where(height < -1e-9, 0.0, found)


def height_at(cutters: Cutters, tool: Ints, radius: Floats) -> Floats:
    """Lowest height above the tip at which the cutter has this radius; infinite where it never does."""
    full, kind = cutters.radius[tool], cutters.kind[tool]
    ball = full - np.sqrt(np.maximum(full**2 - radius**2, 0.0))
    vee = np.maximum(radius - cutters.tip[tool], 0.0) / np.maximum(cutters.slope[tool], 1e-9)
    found = np.where(kind == FLAT, 0.0, np.where(kind == BALL, ball, vee))
    return np.where(radius > full, np.inf, found)


def path_distance(pieces: Floats, x: Floats, y: Floats) -> Floats:
    """Distance in plan from points to the centre line of their piece, row by row."""
    found = _line_distance(pieces, x, y)
    arcs = np.flatnonzero(pieces[:, RC] > 0.0)
    if len(arcs):
        part = pieces[arcs]
        u, v = x[arcs] - part[:, CX], y[arcs] - part[:, CY]
        far = _wrapped(np.arctan2(v, u) - part[:, A0], part[:, SWEEP])
        ends = np.minimum(
            np.hypot(x[arcs] - part[:, X0], y[arcs] - part[:, Y0]),
            np.hypot(x[arcs] - part[:, X1], y[arcs] - part[:, Y1]),
        )
        found[arcs] = np.where(far <= np.abs(part[:, SWEEP]), np.abs(np.hypot(u, v) - part[:, RC]), ends)
    return found


def _line_distance(pieces: Floats, x: Floats, y: Floats) -> Floats:
    dx, dy = pieces[:, X1] - pieces[:, X0], pieces[:, Y1] - pieces[:, Y0]
    u, v = x - pieces[:, X0], y - pieces[:, Y0]
    square = dx * dx + dy * dy
    share = np.clip((u * dx + v * dy) / np.where(square > 0.0, square, 1.0), 0.0, 1.0)
    return np.hypot(u - share * dx, v - share * dy)


def _wrapped(angle: Floats, sweep: Floats) -> Floats:
    """The angle from a start in the direction of the sweep, 0 to a turn."""
    return np.mod(np.where(sweep < 0.0, -angle, angle), 2.0 * PI)


class Circles:
    """Circles of cutters at one moment: centre, feed direction (a unit vector), radius; one row each."""

    def __init__(self, x: Floats, y: Floats, fx: Floats, fy: Floats, radius: Floats) -> None:
        """Hold the columns; all have one length."""
        self.x, self.y, self.fx, self.fy, self.radius = x, y, fx, fy, radius

    def of(self, rows: Ints | Flags) -> Circles:
        """Some of the rows, perhaps repeated."""
        return Circles(self.x[rows], self.y[rows], self.fx[rows], self.fy[rows], self.radius[rows])

    def point(self, phi: Floats) -> tuple[Floats, Floats]:
        """The points of the circles at these angles, one for each row."""
        ahead, left = self.radius * np.sin(phi), self.radius * np.cos(phi)
        return self.x + ahead * self.fx - left * self.fy, self.y + ahead * self.fy + left * self.fx

    def framed(self, x: Floats, y: Floats) -> tuple[Floats, Floats]:
        """Points as (left, ahead) of the centres."""
        u, v = x - self.x, y - self.y
        return v * self.fx - u * self.fy, u * self.fx + v * self.fy


def covered(circles: Circles, pieces: Floats, height: Floats, cutters: Cutters) -> tuple[Ints, Floats, Floats]:
    """The intervals of phi of each circle that its piece has swept at its height: ``(row, first, last)``.

    Row k of all arguments is one pair.  A row may have no interval or several; touching intervals are not joined.
    """
    tool = pieces[:, TOOL].astype(np.int64)
    low, high = _shares_below(pieces, height)
    z_low, z_high = (pieces[:, Z0] + (pieces[:, Z1] - pieces[:, Z0]) * share for share in (low, high))
    r_low, r_high = radius_at(cutters, tool, height - z_low), radius_at(cutters, tool, height - z_high)
    usable = (high >= low) & (np.maximum(r_low, r_high) > 0.0)
    line = pieces[:, RC] == 0.0
    parts = []
    for chosen, work in ((line, _lines), (~line, _arcs)):
        rows = np.flatnonzero(usable & chosen)
        if len(rows):
            row, first, last = work(circles.of(rows), pieces[rows], low[rows], high[rows], r_low[rows], r_high[rows])
            parts.append((rows[row], first, last))
    if not parts:
        return np.empty(0, np.int64), np.empty(0), np.empty(0)
    return tuple(np.concatenate(column) for column in zip(*parts, strict=True))  # type: ignore[return-value]


def _shares_below(pieces: Floats, height: Floats) -> tuple[Floats, Floats]:
    """The part of each piece whose tip is at or below a height, as shares; (1, 0) where there is none."""
    z0, z1 = pieces[:, Z0], pieces[:, Z1]
    fall = z1 - z0
    cross = np.clip((height - z0) / np.where(fall == 0.0, 1.0, fall), 0.0, 1.0)
    in0, in1 = z0 <= height, z1 <= height
    low = np.where(in0, 0.0, np.where(in1, cross, 1.0))
    high = np.where(in1, 1.0, np.where(in0, cross, 0.0))
    return low, high


def _lines(
    circles: Circles, pieces: Floats, low: Floats, high: Floats, r_low: Floats, r_high: Floats
) -> tuple[Ints, Floats, Floats]:
    dx, dy = pieces[:, X1] - pieces[:, X0], pieces[:, Y1] - pieces[:, Y0]
    au, av = circles.framed(pieces[:, X0] + low * dx, pieces[:, Y0] + low * dy)
    bu, bv = circles.framed(pieces[:, X0] + high * dx, pieces[:, Y0] + high * dy)
    near = _reach(au, av, bu, bv) < circles.radius + np.maximum(r_low, r_high)
    near &= np.maximum(av + r_low, bv + r_high) > 0.0
    keep = np.flatnonzero(near)
    cone = _Cone(*(column[keep] for column in (au, av, bu, bv, r_low, r_high)))
    radius = circles.radius[keep]
    crossings = [
        *_meet_circle(radius, cone.au, cone.av, cone.ra),
        *_meet_circle(radius, cone.bu, cone.bv, cone.rb),
        *meet_segment(radius, *cone.side(1.0)),
        *meet_segment(radius, *cone.side(-1.0)),
    ]
    row, first, last = _between(crossings)
    middle = 0.5 * (first + last)
    inside = cone.of(row).holds(radius[row] * np.cos(middle), radius[row] * np.sin(middle))
    return keep[row[inside]], first[inside], last[inside]


def _reach(au: Floats, av: Floats, bu: Floats, bv: Floats) -> Floats:
    """Distance of the origin from the segment a b."""
    du, dv = bu - au, bv - av
    square = du * du + dv * dv
    share = np.clip(-(au * du + av * dv) / np.where(square > 0.0, square, 1.0), 0.0, 1.0)
    return np.hypot(au + share * du, av + share * dv)


class _Cone:
    """Tapering capsules: all circles about a..b with a radius that goes linearly from ra to rb."""

    def __init__(self, au: Floats, av: Floats, bu: Floats, bv: Floats, ra: Floats, rb: Floats) -> None:
        self.au, self.av, self.bu, self.bv, self.ra, self.rb = au, av, bu, bv, ra, rb
        self.length = np.hypot(bu - au, bv - av)
        safe = np.where(self.length > 1e-12, self.length, 1.0)
        self.tu = np.where(self.length > 1e-12, (bu - au) / safe, 1.0)
        self.tv = np.where(self.length > 1e-12, (bv - av) / safe, 0.0)
        # sine of the angle by which the sides open; at 1 the larger end circle holds the other
        self.opening = np.clip(np.where(self.length > 1e-12, (rb - ra) / safe, 0.0), -1.0, 1.0)
        self.closing = np.sqrt(1.0 - self.opening**2)

    def of(self, rows: Ints) -> _Cone:
        return _Cone(*(column[rows] for column in (self.au, self.av, self.bu, self.bv, self.ra, self.rb)))

    def side(self, hand: float) -> tuple[Floats, Floats, Floats, Floats]:
        """Both ends of the straight side on one hand."""
        mu = -self.opening * self.tu - hand * self.closing * self.tv
        mv = -self.opening * self.tv + hand * self.closing * self.tu
        return self.au + self.ra * mu, self.av + self.ra * mv, self.bu + self.rb * mu, self.bv + self.rb * mv

    def holds(self, u: Floats, v: Floats) -> Flags:
        """True for points inside, row by row."""
        pu, pv = u - self.au, v - self.av
        along, across = pu * self.tu + pv * self.tv, np.abs(pv * self.tu - pu * self.tv)
        best = along + across * self.opening / np.maximum(self.closing, 1e-12)
        share = np.clip(best / np.maximum(self.length, 1e-12), 0.0, 1.0)
        found: Flags = np.hypot(along - share * self.length, across) <= self.ra + (self.rb - self.ra) * share
        return found


def _meet_circle(radius: Floats, u: Floats, v: Floats, other: Floats) -> list[Floats]:
    """Angles at which circles about the origin meet circles about (u, v); pi where they do not."""
    distance = np.hypot(u, v)
    safe = np.maximum(distance, 1e-12)
    cosine = (radius * radius + safe * safe - other * other) / (2.0 * radius * safe)
    towards = np.arctan2(v, u)
    meets = (np.abs(cosine) < 1.0) & (distance > 1e-12)
    away = np.arccos(np.clip(cosine, -1.0, 1.0))
    return [_front(np.where(meets, towards + sign * away, PI)) for sign in (1.0, -1.0)]


def meet_segment(radius: Floats, au: Floats, av: Floats, bu: Floats, bv: Floats) -> list[Floats]:
    """Angles at which circles about the origin meet segments; pi where they do not."""
    du, dv = bu - au, bv - av
    square = np.maximum(du * du + dv * dv, 1e-30)
    half = (au * du + av * dv) / square
    rest = half * half - (au * au + av * av - radius * radius) / square
    root = np.sqrt(np.maximum(rest, 0.0))
    found = []
    for share in (-half - root, -half + root):
        meets = (rest > 0.0) & (share >= 0.0) & (share <= 1.0)
        found.append(np.where(meets, _front(np.arctan2(av + share * dv, au + share * du)), PI))
    return found


def _front(angle: Floats) -> Floats:
    """Angles in the leading half as they are, all others as pi."""
    turned = np.where(angle > PI, angle - 2.0 * PI, np.where(angle < -PI, angle + 2.0 * PI, angle))
    return np.where(turned > 0.0, turned, PI)


def _between(crossings: list[Floats]) -> tuple[Ints, Floats, Floats]:
    """The intervals between sorted crossings, from 0 to pi, without those of no length."""
    count = len(crossings[0])
    cuts = np.empty((count, len(crossings) + 2))
    cuts[:, 0], cuts[:, -1] = 0.0, PI
    cuts[:, 1:-1] = np.sort(np.column_stack(crossings), axis=1)
    row, column = np.nonzero(np.diff(cuts, axis=1) > NO_ANGLE)
    return row, cuts[row, column], cuts[row, column + 1]


def _arcs(
    circles: Circles, pieces: Floats, low: Floats, high: Floats, r_low: Floats, r_high: Floats
) -> tuple[Ints, Floats, Floats]:
    near = path_distance(pieces, circles.x, circles.y) < circles.radius + np.maximum(r_low, r_high)
    keep = np.flatnonzero(near)
    ring = _Ring(circles.of(keep), pieces[keep], low[keep], high[keep], 0.5 * (r_low + r_high)[keep])
    radius = circles.radius[keep]
    crossings = [
        *_meet_circle(radius, *ring.end(0.0), ring.half),
        *_meet_circle(radius, *ring.end(1.0), ring.half),
        *_meet_circle(radius, ring.cu, ring.cv, ring.radius + ring.half),
        *_meet_circle(radius, ring.cu, ring.cv, np.abs(ring.radius - ring.half)),
    ]
    row, first, last = _between(crossings)
    middle = 0.5 * (first + last)
    inside = ring.holds(row, radius[row] * np.cos(middle), radius[row] * np.sin(middle))
    return keep[row[inside]], first[inside], last[inside]


class _Ring:
    """Parts of rings with round ends, in the frames of their circles; the frame mirrors, so sweeps change sign."""

    def __init__(self, circles: Circles, pieces: Floats, low: Floats, high: Floats, half: Floats) -> None:
        self.half, self.radius = half, pieces[:, RC]
        self.cu, self.cv = circles.framed(pieces[:, CX], pieces[:, CY])
        angle = pieces[:, A0] + low * pieces[:, SWEEP]
        su, sv = circles.framed(
            pieces[:, CX] + self.radius * np.cos(angle), pieces[:, CY] + self.radius * np.sin(angle)
        )
        self.start = np.arctan2(sv - self.cv, su - self.cu)
        self.sweep = -pieces[:, SWEEP] * (high - low)

    def end(self, share: float) -> tuple[Floats, Floats]:
        angle = self.start + share * self.sweep
        return self.cu + self.radius * np.cos(angle), self.cv + self.radius * np.sin(angle)

    def holds(self, row: Ints, u: Floats, v: Floats) -> Flags:
        pu, pv = u - self.cu[row], v - self.cv[row]
        far = _wrapped(np.arctan2(pv, pu) - self.start[row], self.sweep[row])
        between = (far <= np.abs(self.sweep[row])) & (np.abs(np.hypot(pu, pv) - self.radius[row]) <= self.half[row])
        for share in (0.0, 1.0):
            eu, ev = self.end(share)
            between |= np.hypot(u - eu[row], v - ev[row]) <= self.half[row]
        return between


def gaps(count: int, row: Ints, first: Floats, last: Floats) -> tuple[Ints, Floats, Floats]:
    """What intervals leave open of 0..pi in each of ``count`` rows: ``(row, first, last)``, sorted by row."""
    every = np.arange(count)
    row = np.concatenate([row, every, every])
    first = np.concatenate([first, np.zeros(count), np.full(count, PI)])
    last = np.concatenate([last, np.zeros(count), np.full(count, PI)])
    order = np.argsort(row * 4.0 + first, kind="stable")
    row, first, last = row[order], first[order], last[order]
    # rows lie 4 apart, farther than pi, so one running maximum serves all of them
    reach = np.maximum.accumulate(row * 4.0 + last)[:-1] - row[:-1] * 4.0
    opened = (row[1:] == row[:-1]) & (first[1:] - reach > NO_ANGLE)
    return row[1:][opened], reach[opened], first[1:][opened]
