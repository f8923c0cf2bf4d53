"""Distance of two polylines walked in order: the Frechet distance (Alt & Godau 1995), made quick for near-equal curves.

``frechet`` first pairs vertices along both curves, which proves an upper bound; where that fails it decides the exact
free-space problem.  Points are rows; columns may mix mm and degrees.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from tests.oracle.arcs import Array

Interval = tuple[float, float]
_LEVELS = (1e-9, 1e-6, 2e-5, 1e-4, 2.5e-4)
_WINDOW = 8


@dataclass(frozen=True, slots=True)
class Match:
    """Upper bound of the distance, worst difference per column, and the vertices (first, second) at the worst place."""

    distance: float
    per_axis: tuple[float, ...]
    first: int
    second: int


def length(points: Array) -> float:
    """Length of a polyline."""
    return float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())


def frechet(p: Array, q: Array, tolerance: float) -> Match:
    """Distance of curves ``p`` and ``q``: a bound that is at most ``tolerance`` if they match, else above it."""
    for level in (*(x for x in _LEVELS if x < tolerance), tolerance):
        found = _walk(p, q, level)
        if found is not None:
            return found
    reached = decide(p, q, tolerance)
    if reached is None:
        worst = _nearest(p, q)
        return Match(tolerance, tuple(np.minimum(worst.per_axis, tolerance)), worst.first, worst.second)
    worst = _nearest(p, q)
    # the segment after the last that could be reached ends two vertices on
    return Match(_measure(p, q, tolerance, worst.distance), worst.per_axis, reached[0] + 2, reached[1] + 2)


def _measure(p: Array, q: Array, low: float, nearest: float) -> float:
    """The distance of curves that are known to be further apart than ``low``, to a fiftieth or so.

    ``nearest``: distance of some vertex of one curve from the other curve, which no walk can beat.
    """
    ends = max(float(np.linalg.norm(p[0] - q[0])), float(np.linalg.norm(p[-1] - q[-1])))
    low = max(low, ends * 0.999, nearest * 0.999)
    high = low * 1.1
    while decide(_thin(p, high / 20), _thin(q, high / 20), high) is not None:
        low, high = high, high * 1.5
        if high > 1e4:
            return math.inf
    while high > low * 1.02:
        middle = math.sqrt(low * high)
        if decide(_thin(p, middle / 20), _thin(q, middle / 20), middle) is None:
            high = middle
        else:
            low = middle
    return high


def _thin(points: Array, gap: float) -> Array:
    """Leave out vertices so that the curve moves by no more than ``gap`` (Douglas & Peucker 1973); the ends stay."""
    keep = np.zeros(len(points), dtype=bool)
    keep[[0, -1]] = True
    spans = [(0, len(points) - 1)]
    while spans:
        low, high = spans.pop()
        if high - low < 2:
            continue
        off = _from_chord(points[low : high + 1])
        at = int(off.argmax())
        if off[at] > gap:
            keep[low + at] = True
            spans += [(low, low + at), (low + at, high)]
    thinned: Array = points[keep]
    return thinned


def _from_chord(points: Array) -> Array:
    """Distance of each point from the segment from first to last, or how far it has run back along that segment."""
    way = points[-1] - points[0]
    size = max(float(np.linalg.norm(way)), 1e-150)
    along = np.clip((points - points[0]) @ way / size, 0.0, size)
    off = np.linalg.norm(points[0] + along[:, None] * (way / size) - points, axis=1)
    off[1:-1] = np.maximum(off, np.maximum.accumulate(along) - along)[1:-1]
    return np.asarray(off, dtype=np.float64)


def _walk(p: Array, q: Array, eps: float) -> Match | None:
    """Pair vertices in order; where counts differ, join again within a small window and prove the piece exactly."""
    if np.linalg.norm(p[0] - q[0]) > eps:
        return None
    i = j = first = second = 0
    worst, per_axis = 0.0, np.zeros(p.shape[1])
    while True:
        count = min(len(p) - i, len(q) - j)
        diff = np.abs(p[i : i + count] - q[j : j + count])
        gaps = np.linalg.norm(diff, axis=1)
        bad = np.flatnonzero(gaps > eps)
        good = int(bad[0]) if len(bad) else count
        at = int(gaps[:good].argmax())
        if gaps[at] >= worst:
            worst, first, second = float(gaps[at]), i + at, j + at
        per_axis = np.maximum(per_axis, diff[:good].max(axis=0))
        i, j = i + good - 1, j + good - 1
        if i == len(p) - 1 and j == len(q) - 1:
            return Match(worst, tuple(per_axis.tolist()), first, second)
        joint = _rejoin(p, q, i, j, eps)
        if joint is None:
            return None
        worst = max(worst, eps)
        i, j = joint


def _rejoin(p: Array, q: Array, i: int, j: int, eps: float) -> tuple[int, int] | None:
    steps = [(a, s - a) for s in range(1, 2 * _WINDOW) for a in range(s + 1) if a <= _WINDOW and s - a <= _WINDOW]
    for a, b in steps:
        near = i + a < len(p) and j + b < len(q) and np.linalg.norm(p[i + a] - q[j + b]) <= eps
        if near and decide(p[i : i + a + 1], q[j : j + b + 1], eps) is None:
            return i + a, j + b
    return None


def _nearest(p: Array, q: Array) -> Match:
    """Largest distance of a vertex of either curve from the other curve, blind to order (for reports only)."""
    step = max(1, len(p) // 500), max(1, len(q) // 500)
    there, at_q = _to_curve(q[:: step[1]], p)
    back, at_p = _to_curve(p[:: step[0]], q)
    per_axis = np.maximum(there.max(axis=0), back.max(axis=0))
    gaps = np.linalg.norm(there, axis=1), np.linalg.norm(back, axis=1)
    if gaps[0].max() >= gaps[1].max():
        j = int(gaps[0].argmax())
        return Match(float(gaps[0].max()), tuple(per_axis.tolist()), int(at_q[j]), j * step[1])
    i = int(gaps[1].argmax())
    return Match(float(gaps[1].max()), tuple(per_axis.tolist()), i * step[0], int(at_p[i]))


def _to_curve(points: Array, curve: Array) -> tuple[Array, np.ndarray[tuple[int], np.dtype[np.intp]]]:
    """Absolute difference per column of each point to its nearest point on ``curve``, and the vertex before that."""
    if len(curve) == 1:
        curve = np.vstack([curve, curve])
    begin, way = curve[:-1], np.diff(curve, axis=0)
    square = np.maximum((way * way).sum(axis=1), 1e-300)
    out, where = np.empty_like(points), np.empty(len(points), dtype=np.intp)
    for k, point in enumerate(points):
        share = np.clip(((point - begin) * way).sum(axis=1) / square, 0.0, 1.0)
        diff = begin + share[:, None] * way - point
        where[k] = (diff * diff).sum(axis=1).argmin()
        out[k] = np.abs(diff[where[k]])
    return out, where


def stray(p: Array, q: Array) -> float:
    """Hausdorff distance of two short polylines, taken at vertices and mid points."""
    dense = [np.vstack([c, (c[1:] + c[:-1]) / 2]) for c in (p, q)]
    there, back = _to_curve(dense[0], q)[0], _to_curve(dense[1], p)[0]
    return float(max(np.linalg.norm(there, axis=1).max(), np.linalg.norm(back, axis=1).max()))


# --- exact decision ---------------------------------------------------------------------------------------------


def _free(point: list[float], a: list[float], b: list[float], eps: float) -> Interval | None:
    """Part [0, 1] of segment a b within ``eps`` of ``point``."""
    aa = bb = ab = 0.0
    for x, y, z in zip(point, a, b, strict=True):
        d, w = y - x, z - y
        aa += d * d
        bb += w * w
        ab += d * w
    rest = aa - eps * eps
    if bb < 1e-24:
        return (0.0, 1.0) if rest <= 0 else None
    root = ab * ab - bb * rest
    if root < 0:
        return None
    root = math.sqrt(root)
    low, high = (-ab - root) / bb, (-ab + root) / bb
    if high < 0 or low > 1:
        return None
    return max(low, 0.0), min(high, 1.0)


def decide(p: Array, q: Array, eps: float) -> tuple[int, int] | None:
    """None if the Frechet distance is at most ``eps``, else the furthest pair of segments that could be reached."""
    ps, qs = _rows(p), _rows(q)
    if math.dist(ps[0], qs[0]) > eps:
        return 0, 0
    n, m = len(ps) - 1, len(qs) - 1
    left = _column_start(ps[0], qs, eps)
    floor: Interval | None = _free(qs[0], ps[0], ps[1], eps)
    best = (0, 0)
    for i in range(n):
        right, top_end = _sweep_column(ps, qs, i, left, floor, eps)
        if right:
            best = (i, max(right))
        if i == n - 1:
            done = (m - 1 in right and right[m - 1][1] >= 1.0) or top_end
            return None if done and math.dist(ps[-1], qs[-1]) <= eps else best
        if not right and (floor is None or floor[1] < 1.0):
            return best
        along = floor is not None and floor[0] <= 0.0 and floor[1] >= 1.0
        floor = _free(qs[0], ps[i + 1], ps[i + 2], eps) if along else None
        if floor is not None and floor[0] > 0.0:
            floor = None
        left = right
    return best


def _rows(points: Array) -> list[list[float]]:
    rows: list[list[float]] = points.tolist()
    return rows * 2 if len(rows) == 1 else rows


def _column_start(point: list[float], qs: list[list[float]], eps: float) -> dict[int, Interval]:
    """Reachable part of the left edge of the diagram: the first vertex against the start of q."""
    left: dict[int, Interval] = {}
    for j in range(len(qs) - 1):
        free = _free(point, qs[j], qs[j + 1], eps)
        if free is None or free[0] > 0.0:
            break
        left[j] = free
        if free[1] < 1.0:
            break
    return left


def _sweep_column(
    ps: list[list[float]], qs: list[list[float]], i: int, left: dict[int, Interval], floor: Interval | None, eps: float
) -> tuple[dict[int, Interval], bool]:
    """Reach through the cells of column ``i``: reachable right edges, and whether the far top corner is reached."""
    m = len(qs) - 1
    right: dict[int, Interval] = {}
    below = floor
    starts = sorted(left)
    j = 0 if below is not None else (starts[0] if starts else m)
    top_end = False
    while j < m:
        enter = left.get(j)
        if enter is None and below is None:
            j = next((s for s in starts if s > j), m)
            continue
        edge = _free(ps[i + 1], qs[j], qs[j + 1], eps)
        if edge is not None and (below is not None or (enter is not None and enter[0] <= edge[1])):
            right[j] = edge if below is not None or enter is None else (max(edge[0], enter[0]), edge[1])
        top = _free(qs[j + 1], ps[i], ps[i + 1], eps)
        if top is not None and enter is None:
            assert below is not None
            top = (max(top[0], below[0]), top[1]) if below[0] <= top[1] else None
        below = top
        top_end = j == m - 1 and below is not None and below[1] >= 1.0
        j += 1
    return right, top_end
