"""The stock as the audit takes it: outline in plan, top, bottom; and where a cutter's circle lies outside of it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
import shapely

from gcodetool.inspection.audit_records import Point, StockTaken
from gcodetool.inspection.cutting_records import Cutters, Flags, Floats, Ints, Path
from gcodetool.inspection.job_records import Cutter, Job
from gcodetool.inspection.swept import PI, Circles, meet_segment

# a stretch of feed motion that moves less than this in plan is no lateral cut
NO_TRAVEL = 1e-3
# points on an arc when the hull is drawn round it, and arcs looked at in one go
ARC_POINTS, SOME_ARCS = 129, 1000
# sides of a quarter of a round corner
QUARTER = 64


def take_stock(job: Job, path: Path) -> StockTaken:
    """The stock of a job; what the job does not say is guessed from the path, and said."""
    said: list[str] = []
    top = job.stock.top
    if top is None:
        top, how = guess_top(path)
        said.append(f"the top of the stock was not given; taken as Z{top:g} ({how})")
    outline = job.stock.outline
    if outline is None:
        outline = hull_of_cuts(path, job.cutters, top)
        said.append("the stock was not given; taken as the hull of all cuts, so an outer contour counts as a slot")
    return StockTaken(outline, top, job.stock.bottom, tuple(said))


def guess_top(path: Path) -> tuple[float, str]:
    """The top of the stock from the cuts: Z0 where they lie below it, else one step above the highest level."""
    plan = np.hypot(*(path.end[:, :2] - path.start[:, :2]).T)
    feed = ~path.rapid & ~path.turning
    lateral = feed & ((plan > NO_TRAVEL) | (path.plane == 1))
    down = feed & ~lateral & (path.end[:, 2] < path.start[:, 2])
    cuts = lateral if lateral.any() else down
    if not cuts.any():
        return 0.0, "program zero"
    z = 0.5 * (path.start[:, 2] + path.end[:, 2]) if lateral.any() else path.end[:, 2]
    if path.length[cuts & (z < 0.0)].sum() >= 0.5 * path.length[cuts].sum():
        return 0.0, "program zero, since most cuts lie below it"
    level = lateral & (np.abs(path.start[:, 2] - path.end[:, 2]) < 1e-6)
    heights = np.unique(np.round(path.end[level, 2], 4))
    if len(heights) > 1:
        above = round(float(2.0 * heights[-1] - heights[-2]), 4)
        return above, "one step above the highest level, since Z0 lies below the cuts"
    if down.any():
        return float(np.min(path.start[down, 2])), "where the plunges begin, since Z0 lies below the cuts"
    return float(np.max(path.start[lateral, 2])), "the highest point of the cuts, since Z0 lies below them"


def hull_of_cuts(path: Path, cutters: tuple[Cutter, ...], top: float) -> tuple[Point, ...]:
    """The convex hull of all that the cutters sweep below ``top``; empty where nothing is cut."""
    low = np.minimum(path.start[:, 2], path.end[:, 2]) < top - 1e-9
    low |= (path.plane > 1) & (path.radius > 0.0)
    low &= ~path.rapid & ~path.turning
    parts = []
    for tool in np.unique(path.tool[low]):
        mine = np.flatnonzero(low & (path.tool == tool))
        hull = shapely.MultiPoint(np.concatenate([path.start[mine, :2], path.end[mine, :2]])).convex_hull
        for points in _arc_points(path, mine[path.plane[mine] == 1], hull):
            hull = shapely.union(hull, shapely.MultiPoint(points)).convex_hull
        parts.append(hull.buffer(cutters[tool].radius, quad_segs=QUARTER))
    if not parts:
        return ()
    whole = shapely.union_all(parts).convex_hull
    return tuple((float(x), float(y)) for x, y in whole.exterior.coords[:-1])


def _arc_points(path: Path, arcs: Ints, hull: shapely.Geometry) -> Iterator[Floats]:
    """Points along the arcs in XY that may reach out of a hull, some arcs at a time."""
    shape = np.column_stack([path.centre[arcs], path.radius[arcs], path.angle[arcs], path.sweep[arcs]])
    shape = np.unique(np.round(shape, 6), axis=0)
    centre = shapely.points(shape[:, :2])
    inside = shapely.contains(hull, centre) & (shapely.distance(shapely.boundary(hull), centre) > shape[:, 2])
    share = np.linspace(0.0, 1.0, ARC_POINTS)
    rest = shape[~inside]
    for start in range(0, len(rest), SOME_ARCS):
        x, y, radius, angle, sweep = (column[:, None] for column in rest[start : start + SOME_ARCS].T)
        turned = angle + sweep * share
        yield np.column_stack([(x + radius * np.cos(turned)).ravel(), (y + radius * np.sin(turned)).ravel()])


class Outline:
    """An outline with a search tree of its sides."""

    def __init__(self, outline: tuple[Point, ...]) -> None:
        """Take an outline of three corners or more."""
        self.polygon = shapely.Polygon(outline).buffer(0.0)
        shapely.prepare(self.polygon)
        rings = shapely.get_parts(shapely.boundary(self.polygon))
        pairs = [np.concatenate([c[:-1], c[1:]], axis=1) for c in (shapely.get_coordinates(ring) for ring in rings)]
        self.sides = np.concatenate(pairs)
        self._tree = shapely.STRtree(shapely.linestrings(self.sides.reshape(-1, 2, 2)))
        x0, y0, x1, y1 = self.polygon.bounds
        self.low, self.high = (x0, y0), (x1, y1)

    def holds(self, x: Floats, y: Floats) -> Flags:
        """True for points inside."""
        return np.asarray(shapely.contains_xy(self.polygon, x, y), np.bool_)

    def along(self, step: float) -> tuple[Floats, Floats]:
        """Points along the sides, at most ``step`` apart."""
        length = np.hypot(self.sides[:, 2] - self.sides[:, 0], self.sides[:, 3] - self.sides[:, 1])
        count = np.ceil(length / step).astype(np.int64) + 1
        row = np.repeat(np.arange(len(count)), count)
        share = (np.arange(len(row)) - (np.cumsum(count) - count)[row]) / np.maximum(count[row] - 1, 1)
        side = self.sides[row]
        return side[:, 0] + share * (side[:, 2] - side[:, 0]), side[:, 1] + share * (side[:, 3] - side[:, 1])

    def outside(self, circles: Circles) -> tuple[Ints, Floats, Floats]:
        """The intervals of phi in which circles lie outside the outline: ``(row, first, last)``."""
        r = circles.radius
        boxes = shapely.box(circles.x - r, circles.y - r, circles.x + r, circles.y + r)
        row, side = self._tree.query(boxes)
        part, near = self.sides[side], circles.of(row)
        cuts = meet_segment(near.radius, *near.framed(part[:, 0], part[:, 1]), *near.framed(part[:, 2], part[:, 3]))
        every = np.arange(len(r))
        rows = np.concatenate([row, row, every, every])
        angle = np.concatenate([*cuts, np.zeros(len(r)), np.full(len(r), PI)])
        order = np.argsort(rows * 4.0 + angle, kind="stable")
        rows, angle = rows[order], angle[order]
        open_ = np.flatnonzero((rows[1:] == rows[:-1]) & (angle[1:] - angle[:-1] > 1e-9))
        row, first, last = rows[open_], angle[open_], angle[open_ + 1]
        out = ~self.holds(*circles.of(row).point(0.5 * (first + last)))
        return row[out], first[out], last[out]


def cutters_of(job: Job) -> Cutters:
    """The tools of a job as columns."""
    return Cutters.of(job.cutters)
