"""Distance between two paths, curve against curve; both are lists of pieces in travel order.

The distance is that of Hausdorff taken inside a window that moves along both paths: each point of one path to the
nearest point of the other near the same place of the journey, and the other way round.  Where both paths fall into
the same lines and arcs it is bounded piece by piece instead, which is quicker and never smaller.  Lengths in mm
(degrees on A B C).
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from gcodetool.lash.path import Piece, Vector

Floats = NDArray[np.float64]
STILL = 1e-6
# pieces that differ by more than this are not taken for the same piece
ALIKE = 0.002
SURE = 0.0003
# an axis that stands still near a quadrant point makes a short flat there, which sweeps no angle
LOST_SWEEP = 0.3
CHORD_ERROR = 1e-5
COARSE_CHORDS = 1e-4
WINDOW = 400
STEP = 100


@dataclass(frozen=True, slots=True)
class Gap:
    """The widest place between two paths: the distance, the worst of each axis, source lines in both programs."""

    distance: float = 0.0
    by_axis: tuple[float, ...] = (0.0,) * 6
    lines: tuple[int, int] = (0, 0)

    def wider(self, other: Gap) -> Gap:
        """The wider of two gaps, with the worst of both on each axis."""
        wide = self if self.distance >= other.distance else other
        return Gap(wide.distance, tuple(map(max, self.by_axis, other.by_axis)), wide.lines)


@dataclass(frozen=True, slots=True)
class Ease:
    """What is allowed where: on a source line of the first path, on these axes, up to ``amount`` (X Y Z A B C)."""

    amount: tuple[float, ...]
    lines: Mapping[int, frozenset[int]]

    def on(self, line: int) -> tuple[float, ...]:
        """What is allowed on a line, by axis."""
        axes = self.lines.get(line, frozenset())
        return tuple(value if k in axes else 0.0 for k, value in enumerate(self.amount))


def is_still(piece: Piece) -> bool:
    """True for a piece on which the tool does not move."""
    if piece.arc is not None and abs(piece.arc.sweep) * piece.arc.start_radius > STILL:
        return False
    return all(abs(a - b) <= STILL for a, b in zip(piece.start, piece.end, strict=True))


def gap(first: Sequence[Piece], second: Sequence[Piece], ease: Ease | None = None) -> Gap:
    """The widest place between two feed paths, either of which may be empty (the tool then stands at one point).

    What ``ease`` allows is taken off before it is measured.
    """
    if not first or not second:
        return _ends_only(first, second)
    if ease is not None and any(piece.line in ease.lines for piece in first):
        return by_window(first, second, ease=ease)
    found = _line_by_line(first, second)
    if found is None:
        found = _walk(first, second)
    if found is None or found.distance > SURE:
        # the walk may have taken a neighbour for the nearest piece; the window sees more of the path
        wide = by_window(first, second, COARSE_CHORDS)
        if wide.distance <= ALIKE:
            wide = by_window(first, second)
        found = wide if found is None or wide.distance < found.distance else found
    return found


def stray(first: Sequence[Piece], second: Sequence[Piece]) -> Gap:
    """How far the corners of the second path, of straight pieces, lie from the first path."""
    if len(first) > WINDOW:
        return by_window(first, second)
    found = Gap()
    for piece in second:
        for point in (piece.start, piece.end):
            found = found.wider(nearest(first, point, piece.line))
    return found


def nearest(pieces: Sequence[Piece], point: Vector, line: int) -> Gap:
    """The gap between a point, made by a source line, and the nearest of some pieces."""
    best = Gap(math.inf)
    for piece in pieces:
        if piece.arc is None or not piece.arc.sweep:
            vector = _from_line(piece, point)
            found = Gap(math.hypot(*vector), tuple(map(abs, vector)), (piece.line, line))
        else:
            found = _from_arc(piece, point, line)
        best = found if found.distance < best.distance else best
    return best


def _from_line(piece: Piece, point: Vector) -> Vector:
    """Vector from the nearest place of a straight piece to a point."""
    start, end = piece.start, piece.end
    if start[3:] == end[3:]:
        # no rotary axis turns, as nearly always: the same sum without the loops
        wx, wy, wz = end[0] - start[0], end[1] - start[1], end[2] - start[2]
        ox, oy, oz = point[0] - start[0], point[1] - start[1], point[2] - start[2]
        square = wx * wx + wy * wy + wz * wz
        share = min(max((wx * ox + wy * oy + wz * oz) / square, 0.0), 1.0) if square else 0.0
        rest = point[3] - start[3], point[4] - start[4], point[5] - start[5]
        return (ox - share * wx, oy - share * wy, oz - share * wz, *rest)
    way = [b - a for a, b in zip(piece.start, piece.end, strict=True)]
    offset = [p - a for p, a in zip(point, piece.start, strict=True)]
    square = sum(w * w for w in way)
    share = min(max(sum(w * o for w, o in zip(way, offset, strict=True)) / square, 0.0), 1.0) if square else 0.0
    return tuple([o - share * w for o, w in zip(offset, way, strict=True)])


def _ends_only(first: Sequence[Piece], second: Sequence[Piece]) -> Gap:
    pieces = list(first or second)
    if not pieces:
        return Gap()
    length = max(math.dist(pieces[0].start, piece.end) for piece in pieces)
    return Gap(length, (0.0,) * 6, (first[0].line if first else 0, second[0].line if second else 0))


def _line_by_line(first: Sequence[Piece], second: Sequence[Piece]) -> Gap | None:
    """The bound for two polylines with as many corners; None where they are something else."""
    if len(first) != len(second) or any(p.arc for p in first) or any(p.arc for p in second):
        return None
    ends = np.array([second[0].start, *(p.end for p in second)]) - np.array([first[0].start, *(p.end for p in first)])
    widths = np.sqrt((ends * ends).sum(axis=1))
    worst = int(widths.argmax())
    if widths[worst] > ALIKE:
        return None
    by_axis = tuple(np.abs(ends).max(axis=0).tolist())
    at = max(worst - 1, 0)
    return Gap(float(widths[worst]), by_axis, (first[at].line, second[at].line))


def _walk(first: Sequence[Piece], second: Sequence[Piece]) -> Gap | None:
    """Walk both paths at once, each point against the three pieces around it; None where they part.

    Of the three ways to step on, the one that brings the ends nearest is taken; a circle has to be swept before it is
    left.
    """
    worst = _apart(first[0].start, second[0].start, first[0], second[0])
    i = j = began = 0
    swept = 0.0
    level = worst.distance <= SURE
    while i < len(first) and j < len(second):
        piece, part = first[i], second[j]
        if level and piece.arc is None and part.arc is None:
            # two lines that begin together and end together are nowhere farther apart than at their ends
            ends = _apart(piece.end, part.end, piece, part)
            if ends.distance <= SURE:
                worst = worst.wider(ends)
                i, j = i + 1, j + 1
                began = j
                continue
        for share in (0.25, 0.5, 0.75, 1.0) if part.arc else (0.5, 1.0):
            worst = worst.wider(nearest(first[max(0, i - 1) : i + 2], part.point(share), part.line))
        if worst.distance > ALIKE:
            return None
        swept += abs(part.arc.sweep) if part.arc else 0.0
        unswept = piece.arc is not None and swept < abs(piece.arc.sweep) - LOST_SWEEP
        on_i, on_j = _steps(first, second, i, j, unswept)
        if on_i:
            worst = worst.wider(_inner_gap(piece, second[max(0, began - 1) : j + 2]))
            swept, began = 0.0, j + on_j
        level = bool(on_i and on_j) and math.dist(piece.end, part.end) <= SURE
        i, j = i + on_i, j + on_j
    for part in second[j:]:
        for share in (0.25, 0.5, 0.75, 1.0):
            worst = worst.wider(nearest(first[-1:], part.point(share), part.line))
    for piece in first[i:]:
        worst = worst.wider(_inner_gap(piece, second[max(0, began - 1) :]))
    return worst if worst.distance <= ALIKE else None


def _steps(first: Sequence[Piece], second: Sequence[Piece], i: int, j: int, unswept: bool) -> tuple[int, int]:
    """How far to step on each path."""
    if unswept:
        return 0, 1
    here = math.dist(first[i].end, second[j].end)
    wait = math.dist(first[i].end, second[j + 1].end) if j + 1 < len(second) else math.inf
    lead = math.dist(first[i + 1].end, second[j].end) if i + 1 < len(first) else math.inf
    if here <= wait and here <= lead:
        return 1, 1
    return (0, 1) if wait < lead else (1, 0)


def _inner_gap(piece: Piece, parts: Sequence[Piece]) -> Gap:
    """How far places of a piece lie from the parts that should be there: a circle left out begins where it ends."""
    worst = Gap()
    for share in (0.25, 0.5, 0.75, 1.0) if piece.arc else (1.0,):
        found = nearest(parts, piece.point(share), piece.line)
        worst = worst.wider(Gap(found.distance, found.by_axis, (piece.line, found.lines[0])))
    return worst


def _apart(a: Vector, b: Vector, piece: Piece, part: Piece) -> Gap:
    return Gap(math.dist(a, b), tuple(abs(x - y) for x, y in zip(a, b, strict=True)), (piece.line, part.line))


def _from_arc(piece: Piece, point: Vector, line: int) -> Gap:
    """Gap between a point and the place of an arc in the same direction from its centre."""
    arc = piece.arc
    assert arc is not None
    first, second = piece.axes
    across, up = point[first] - arc.centre[0], point[second] - arc.centre[1]
    turned = (math.atan2(up, across) - arc.start_angle) * math.copysign(1.0, arc.sweep) % (2.0 * math.pi)
    whole = abs(arc.sweep)
    best = Gap(math.inf)
    slack = 0.01
    for lap in range(math.ceil(whole / (2.0 * math.pi)) + 1):
        angle = turned + lap * 2.0 * math.pi
        angle = (
            angle - 2.0 * math.pi if angle - 2.0 * math.pi > -slack and lap == 0 and angle > whole + slack else angle
        )
        if angle > whole + slack:
            break
        share = min(max(angle / whole, 0.0), 1.0)
        spot = piece.point(share) if 0.0 < share < 1.0 else (piece.end if share else piece.start)
        found = Gap(
            math.dist(spot, point), tuple(abs(a - b) for a, b in zip(spot, point, strict=True)), (piece.line, line)
        )
        best = found if found.distance < best.distance else best
    return best


# ---- the window -----------------------------------------------------------------------------------------------------


def polyline(pieces: Sequence[Piece], chord_error: float = CHORD_ERROR) -> tuple[Floats, NDArray[np.int64]]:
    """Points of a path with chords at most ``chord_error`` from its arcs, and for each point the index of its piece."""
    points: list[Vector] = [pieces[0].start]
    owner = [0]
    for index, piece in enumerate(pieces):
        if index and math.dist(points[-1], piece.start) > STILL:
            # a tool changer has moved the machine between two pieces
            points.append(piece.start)
            owner.append(index)
        for share in _shares(piece, chord_error):
            points.append(piece.point(share))
            owner.append(index)
        points.append(piece.end)
        owner.append(index)
    return np.array(points), np.array(owner)


def _shares(piece: Piece, chord_error: float) -> list[float]:
    arc = piece.arc
    if arc is None or not arc.sweep:
        return []
    radius = max(arc.start_radius, arc.end_radius)
    angle = 2.0 * math.acos(max(0.5, 1.0 - chord_error / radius))
    count = max(1, math.ceil(abs(arc.sweep) / angle))
    return [k / count for k in range(1, count)]


def by_window(
    first: Sequence[Piece], second: Sequence[Piece], chord_error: float = CHORD_ERROR, ease: Ease | None = None
) -> Gap:
    """The windowed Hausdorff distance of two paths, less what ``ease`` allows."""
    one, one_owner = polyline(first, chord_error)
    two, two_owner = polyline(second, chord_error)
    found = Gap()
    skipped = np.array([_settles(piece, first) for piece in second])[two_owner]
    skipped |= np.append(skipped[1:], False)
    for points, path, swap in ((two, one, False), (one, two, True)):
        away, vector, at = _nearest(points, path, *_allowed(first, one_owner, swap, ease))
        if not swap:
            away = np.where(skipped, 0.0, away)
            vector = np.where(skipped[:, None], 0.0, vector)
        worst = int(away.argmax())
        here, there = (one_owner, two_owner) if swap else (two_owner, one_owner)
        mine, other = int(here[worst]), int(there[min(int(at[worst]) + 1, len(there) - 1)])
        lines = (first[mine].line, second[other].line) if swap else (first[other].line, second[mine].line)
        found = found.wider(Gap(float(away[worst]), tuple(np.abs(vector).max(axis=0).tolist()), lines))
    return found


def _allowed(
    first: Sequence[Piece], one_owner: NDArray[np.int64], swap: bool, ease: Ease | None
) -> tuple[Floats | None, Floats | None]:
    """What is allowed at each point, and on each segment of the path it is held against; it hangs on the first path."""
    if ease is None:
        return None, None
    rows = np.array([ease.on(first[k].line) for k in one_owner])
    return (rows, None) if swap else (None, rows[1:])


def _settles(piece: Piece, intended: Sequence[Piece]) -> bool:
    """True for a loose feed of Z alone that stays above where the intended path ends: a settle, in air."""
    if not piece.loose:
        return False
    moved = [k for k in range(6) if abs(piece.start[k] - piece.end[k]) > STILL]
    return moved == [2] and piece.end[2] >= min(p.end[2] for p in intended) - STILL


def _nearest(
    points: Floats, path: Floats, at_points: Floats | None = None, on_segments: Floats | None = None
) -> tuple[Floats, Floats, NDArray[np.int64]]:
    """For each point its distance from the polyline, the vector to it and the segment, inside a moving window.

    What is allowed at points or on segments, by axis, is taken off the vectors before the nearest is chosen.
    """
    away = np.zeros(len(points))
    vector = np.zeros_like(points)
    at = np.zeros(len(points), dtype=np.int64)
    if len(path) < 2:
        vector = points - path[0]
        return np.sqrt((vector**2).sum(axis=1)), vector, at
    travelled, along = _lengths(points), _lengths(path)
    for low in range(0, len(points), STEP):
        chunk = points[low : low + STEP]
        # both paths are about as long: the same share of the journey is the place to look at, on circles run round
        # twice too
        first, last = np.searchsorted(
            along, travelled[[low, low + len(chunk) - 1]] * along[-1] / (travelled[-1] or 1.0)
        )
        lowest, highest = max(0, int(first) - WINDOW), min(len(path) - 1, int(last) + WINDOW)
        allowed = None
        if at_points is not None:
            allowed = at_points[low : low + STEP, None, :]
        elif on_segments is not None:
            allowed = on_segments[None, lowest:highest, :]
        d, v, index = _to_segments(chunk, path[lowest : highest + 1], allowed)
        away[low : low + STEP], vector[low : low + STEP], at[low : low + STEP] = d, v, index + lowest
    return away, vector, at


def _lengths(points: Floats) -> Floats:
    """Length of the path up to each point."""
    steps = np.sqrt((np.diff(points, axis=0) ** 2).sum(axis=1))
    return np.concatenate(([0.0], np.cumsum(steps)))


def _to_segments(points: Floats, path: Floats, allowed: Floats | None) -> tuple[Floats, Floats, NDArray[np.int64]]:
    start, way = path[:-1], np.diff(path, axis=0)
    length = (way * way).sum(axis=1)
    length[length == 0.0] = 1.0
    offset = points[:, None, :] - start[None, :, :]
    share = np.clip(np.einsum("ijk,jk->ij", offset, way) / length, 0.0, 1.0)
    rest = offset - share[:, :, None] * way[None, :, :]
    if allowed is not None:
        rest = np.sign(rest) * np.maximum(np.abs(rest) - allowed, 0.0)
    square = np.einsum("ijk,ijk->ij", rest, rest)
    index = square.argmin(axis=1)
    rows = np.arange(len(points))
    return np.sqrt(square[rows, index]), rest[rows, index], index
