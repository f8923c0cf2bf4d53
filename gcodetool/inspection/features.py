"""What a caliper could measure, recognised in the path: bores, bosses, arcs, straight walls, slots, drilled holes.

A stretch of path counts only where it leaves a wall, that is where material still stands beside the cutter after the
whole program has run.  The same shape cut at several depths counts once, at its deepest.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Iterator
from itertools import pairwise

import numpy as np

from gcodetool.inspection.audit_records import Shape
from gcodetool.inspection.cutting_records import Flags, Floats, Ints, Kind, Labels, Path
from gcodetool.inspection.job_records import Cutter

# two centres or radii closer than this are one, mm
SAME = 0.005
# the material must stand within this distance of the cutter's edge, mm
BESIDE = 0.02
# a circle written as straight lines has at least this many, each turning at most this far, and this much off the circle
FEWEST_CHORDS = 12
CHORD_TURN = math.radians(31.0)
OFF_CIRCLE = 0.01
# an arc that turns less than this is no feature of its own
LEAST_ARC = math.radians(15.0)
MOST_SHAPES = 4000
# the shortest wall, mm, and the angle by which lines of one wall may differ, rad
LEAST_WALL, SAME_WAY = 1.0, 1e-4
TURN = 2.0 * math.pi

Stands = Callable[[Floats, Floats, Floats], Flags]
"""Whether material stands at points (x, y) at heights, after the whole program."""


def shapes(path: Path, cutters: tuple[Cutter, ...], labels: Labels, stands: Stands) -> list[Shape]:
    """All shapes of a program, at most ``MOST_SHAPES``, the deepest of each only."""
    radius = np.array([cutter.radius for cutter in cutters] or [0.0])[path.tool]
    feed = ~path.rapid & ~path.turning
    walls = _Walls(path, radius, stands)
    found = [*_holes(path, radius, labels)]
    used: set[int] = set()
    for group in [*_circles(path, feed), *_chord_circles(path, feed)]:
        used.update(group.moves)
        found.extend(_round(path, radius, group, walls))
    loose = np.array([k for k in np.flatnonzero(feed & (path.plane == 1)) if k not in used], np.int64)
    found.extend(_arcs(path, radius, loose[np.abs(path.sweep[loose]) >= LEAST_ARC], walls))
    straight = feed & (path.plane == 0) & (labels.kind == Kind.LEVEL)
    straight[list(used)] = False
    found.extend(_straight(path, radius, np.flatnonzero(straight), walls))
    return _deepest(found)[:MOST_SHAPES]


class _Walls:
    """Asks on which sides of a path material stands in the end."""

    def __init__(self, path: Path, radius: Floats, stands: Stands) -> None:
        self._path, self._radius, self._stands = path, radius, stands

    def beside(self, move: Ints, x: Floats, y: Floats, fx: Floats, fy: Floats) -> tuple[Flags, Flags]:
        """Left and right of points on moves with unit directions."""
        out = self._radius[move] + BESIDE
        height = np.maximum(self._path.start[move, 2], self._path.end[move, 2]) + BESIDE
        left = self._stands(x - out * fy, y + out * fx, height)
        return left, self._stands(x + out * fy, y - out * fx, height)


class _Group:
    """Consecutive moves that make at least one whole circle; ``sense`` is +1 counter-clockwise."""

    def __init__(self, moves: list[int], centre: tuple[float, float], radius: float, sense: int) -> None:
        self.moves, self.centre, self.radius, self.sense = moves, centre, radius, sense


# ---- circles --------------------------------------------------------------------------------------------------------


def _circles(path: Path, feed: Flags) -> Iterator[_Group]:
    """Runs of arcs about one centre that turn once or more; the last turns of each run."""
    run: list[int] = []
    for k in np.flatnonzero(feed & (path.plane == 1) & (path.radius > 0.0)).tolist():
        if run and not _goes_on(path, run[-1], k):
            yield from _whole(path, run)
            run = []
        run.append(k)
    yield from _whole(path, run)


def _goes_on(path: Path, last: int, k: int) -> bool:
    return (
        k == last + 1
        and path.sweep[k] * path.sweep[last] > 0.0
        and abs(path.radius[k] - path.radius[last]) < SAME
        and math.dist(path.centre[k], path.centre[last]) < SAME
    )


def _whole(path: Path, run: list[int]) -> Iterator[_Group]:
    turned = 0.0
    moves: list[int] = []
    for k in reversed(run):
        moves.insert(0, k)
        turned += abs(float(path.sweep[k]))
        if turned >= 2.0 * TURN - 0.01:
            break
    if turned >= TURN - 0.01:
        centre = float(path.centre[run[-1], 0]), float(path.centre[run[-1], 1])
        yield _Group(moves, centre, float(path.radius[run[-1]]), 1 if path.sweep[run[-1]] > 0.0 else -1)


def _chord_circles(path: Path, feed: Flags) -> Iterator[_Group]:
    """Circles written as many short lines: runs that keep turning one way by small angles, once round."""
    step = path.end[:, :2] - path.start[:, :2]
    usable = feed & (path.plane == 0) & (np.hypot(step[:, 0], step[:, 1]) > 1e-9)
    heading = np.arctan2(step[:, 1], step[:, 0])
    turn = np.diff(heading, prepend=0.0)
    turn = np.mod(turn + math.pi, TURN) - math.pi
    joined = usable.copy()
    joined[1:] &= usable[:-1] & (np.abs(turn[1:]) < CHORD_TURN) & (np.abs(turn[1:]) > 1e-6)
    joined[:1] = False
    sense = np.where(joined, np.sign(turn), 0.0)
    change = np.flatnonzero(np.diff(sense, prepend=0.0, append=0.0) != 0.0)
    for first, last in pairwise(change.tolist()):
        if sense[first] and last - first >= FEWEST_CHORDS - 2:
            yield from _fitted(path, first - 1, last, turn, int(sense[first]))


def _fitted(path: Path, first: int, last: int, turn: Floats, sense: int) -> Iterator[_Group]:
    """The last turn of a run of chords, if its corners lie on a circle and it closes."""
    turned = np.abs(turn[first + 1 : last][::-1])
    # one chord more than its corners turn
    count = int(np.searchsorted(np.cumsum(turned), TURN - 1.25 * float(np.median(turned)))) + 2
    if count > last - first or count < FEWEST_CHORDS:
        return
    moves = list(range(last - count, last))
    points = path.end[moves, :2]
    centre, radius = _fit_circle(points)
    off = np.abs(np.hypot(points[:, 0] - centre[0], points[:, 1] - centre[1]) - radius)
    closes = math.dist(path.start[moves[0], :2], path.end[moves[-1], :2]) < 1.5 * float(path.length[moves].max())
    if off.max() < OFF_CIRCLE and closes:
        yield _Group(moves, centre, radius, sense)


def _fit_circle(points: Floats) -> tuple[tuple[float, float], float]:
    """Least-squares circle (Kasa, IEEE Trans. Instrum. Meas. 25, 1976, from memory): linear in centre and radius."""
    middle = points.mean(axis=0)
    u = points - middle
    matrix = np.column_stack([2.0 * u, np.ones(len(u))])
    a, b, c = np.linalg.lstsq(matrix, (u**2).sum(axis=1), rcond=None)[0]
    return (float(middle[0] + a), float(middle[1] + b)), float(math.sqrt(max(c + a * a + b * b, 0.0)))


def _round(path: Path, radius: Floats, group: _Group, walls: _Walls) -> Iterator[Shape]:
    """A bore where material stands outside a circle, a boss where it stands inside; both for a ring-shaped groove."""
    last = group.moves[-1]
    angle = np.arange(16) * (TURN / 16.0)
    x, y = group.centre[0] + group.radius * np.cos(angle), group.centre[1] + group.radius * np.sin(angle)
    fx, fy = -np.sin(angle) * group.sense, np.cos(angle) * group.sense
    left, right = walls.beside(np.full(16, last), x, y, fx, fy)
    inner, outer = (left, right) if group.sense > 0 else (right, left)
    for kind, there, side in (("bore", outer, -group.sense), ("boss", inner, group.sense)):
        if there.mean() > 0.5 and (kind == "bore" or group.radius > radius[last]):
            yield _shape(path, radius, kind, group.moves, side, group.centre, group.radius)


def _arcs(path: Path, radius: Floats, moves: Ints, walls: _Walls) -> Iterator[Shape]:
    if not len(moves):
        return
    votes = np.zeros((2, len(moves)))
    turn = np.sign(path.sweep[moves])
    for share in (0.25, 0.5, 0.75):
        angle = path.angle[moves] + share * path.sweep[moves]
        x = path.centre[moves, 0] + path.radius[moves] * np.cos(angle)
        y = path.centre[moves, 1] + path.radius[moves] * np.sin(angle)
        votes += walls.beside(moves, x, y, -np.sin(angle) * turn, np.cos(angle) * turn)
    for k, left, right in zip(moves.tolist(), votes[0] >= 2, votes[1] >= 2, strict=True):
        if left or right:
            centre = float(path.centre[k, 0]), float(path.centre[k, 1])
            yield _shape(path, radius, "arc", [k], int(left) - int(right), centre, float(path.radius[k]))


# ---- straight ones --------------------------------------------------------------------------------------------------


def _straight(path: Path, radius: Floats, moves: Ints, walls: _Walls) -> Iterator[Shape]:
    """Walls and slots; lines that go on in one direction are one."""
    first, last = _straight_runs(path, moves)
    step = path.end[last, :2] - path.start[first, :2]
    length = np.hypot(step[:, 0], step[:, 1])
    long = length >= np.maximum(2.0 * radius[last], LEAST_WALL)
    first, last, step = first[long], last[long], step[long]
    way = step / length[long, None]
    votes = np.zeros((2, len(first)))
    for share in (0.25, 0.5, 0.75):
        spot = path.start[first, :2] + share * step
        votes += walls.beside(last, spot[:, 0], spot[:, 1], way[:, 0], way[:, 1])
    sides = zip(first.tolist(), last.tolist(), way.tolist(), votes[0] >= 2, votes[1] >= 2, strict=True)
    for begin, end, (fx, fy), left, right in sides:
        run = list(range(begin, end + 1))
        if left and right:
            yield _shape(path, radius, "slot", run, 0, normal=(-fy, fx))
        elif left or right:
            sign = 1.0 if left else -1.0
            yield _shape(path, radius, "wall", run, int(sign), normal=(-sign * fy, sign * fx))


def _straight_runs(path: Path, moves: Ints) -> tuple[Ints, Ints]:
    """First and last of each run of consecutive lines in one direction and at one height."""
    step = path.end[moves, :2] - path.start[moves, :2]
    moves = moves[np.hypot(step[:, 0], step[:, 1]) > 1e-9]
    step = path.end[moves, :2] - path.start[moves, :2]
    way = step / np.hypot(step[:, 0], step[:, 1])[:, None]
    turned = np.abs(way[1:, 0] * way[:-1, 1] - way[1:, 1] * way[:-1, 0]) > SAME_WAY
    turned |= (way[1:] * way[:-1]).sum(axis=1) < 0.0
    apart = turned | (moves[1:] != moves[:-1] + 1) | (path.end[moves[1:], 2] != path.end[moves[:-1], 2])
    return moves[np.concatenate([[True], apart])[: len(moves)]], moves[np.concatenate([apart, [True]])[: len(moves)]]


def _holes(path: Path, radius: Floats, labels: Labels) -> Iterator[Shape]:
    for k in np.flatnonzero(labels.kind == Kind.DRILL).tolist():
        centre = float(path.end[k, 0]), float(path.end[k, 1])
        yield _shape(path, radius, "hole", [k], 0, centre, 0.0)


def _shape(
    path: Path, radius: Floats, kind: str, moves: list[int], side: int,
    centre: tuple[float, float] = (0.0, 0.0), ring: float = 0.0, normal: tuple[float, float] = (0.0, 0.0),
) -> Shape:  # fmt: skip
    lines = int(path.line[moves[0]]), int(path.line[moves[-1]])
    depth = float(path.end[moves[-1], 2])
    first, last = (tuple(map(float, place)) for place in (path.start[moves[0], :2], path.end[moves[-1], :2]))
    ends = (first[0], first[1]), (last[0], last[1])
    cutter, chain = float(radius[moves[-1]]), int(path.chain[moves[-1]])
    return Shape(kind, tuple(moves), lines, ends, cutter, depth, centre, ring, side, normal, chain)


def _deepest(found: Iterable[Shape]) -> list[Shape]:
    """One of each shape: the deepest, and of equally deep ones the last."""
    best: dict[tuple[object, ...], Shape] = {}
    for shape in found:
        key = (shape.kind, *(round(value, 2) for value in _place(shape)))
        if key not in best or shape.depth <= best[key].depth + 1e-9:
            best[key] = shape
    return list(best.values())


def _place(shape: Shape) -> tuple[float, ...]:
    """What makes two shapes the same: where they are, whichever way they were travelled."""
    if shape.kind in ("bore", "boss", "hole"):
        return *shape.centre, shape.radius
    first, second = sorted(shape.ends)
    return *first, *second, shape.radius
