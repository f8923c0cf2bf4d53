"""Where the cutter meets material along a program: the one place that follows stock and cut through time.

Moves are cut into pieces, and places are sampled along them.  At each place the leading half of the cutter's circle
is compared with all that was cut before, at every height at which that changes: an angle is engaged where the stock
is still there.  Angles are exact for straight and circular paths of flat cutters; ball and vee cutters are taken in
slices of their height.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from gcodetool.inspection.audit_records import StockTaken
from gcodetool.inspection.clearing import NO_HEIGHT, Clearing, Grid
from gcodetool.inspection.cutting_records import Cutters, Engagement, Flags, Floats, Ints, Path, Samples, Slices
from gcodetool.inspection.job_records import FLAT, Job
from gcodetool.inspection.stock import Outline
from gcodetool.inspection.swept import PI, RC, SWEEP, X0, X1, Y0, Y1, Circles, covered, gaps, radius_at
from gcodetool.inspection.toolpath import cut_up, directions, places, plan_length, vertical_moves

# material thinner than this, measured across the feed, does not count as cut: rounding of a program, spring of a cutter
SKIN = 0.005
# a cutter that clears a wall or a floor by less than this rubs along it
TOUCH = 0.02
# places along a move are at most this share of the cutter's radius apart
SPACING = 0.5
# as many places as that at most, the longest moves having fewer then; bounds the memory
MOST_SAMPLES = 600_000
# a place lies at least this share of a piece behind its beginning
CLEAR = 0.05
# cells that all pieces together may cover before the cells are made larger
MOST_GROUND = 40e6
# pieces are at most this many radii long
PIECE = 4.0
# a slice is at least this thick, and at least this share of its height above the tip
THIN, GROWTH = 0.005, 0.35
BLOCK = 512
# the radius of a point, mm
SPECK = 1e-3
PROBES = 4096
# a motion that falls by less than this share of its length cuts with its sides only
STEEP = 0.02
RINGS = 4
"""The end face of a plunge is looked at on this many rings of equal area."""


def engage(path: Path, job: Job, stock: StockTaken) -> tuple[Engagement, Remains]:
    """The engagement of every feed motion and of rapids below the top of the stock, and what is left in the end.

    Rapids remove nothing.  Moves of rotary axes, and rapids from unknown places, are left out.
    """
    if len(stock.outline) < 3 or not len(chosen_moves(path, stock.top)):
        return _nothing(), Remains(None)
    follower = _Follower(path, Cutters.of(job.cutters), stock)
    return follower.run(), Remains(follower)


def _nothing() -> Engagement:
    none, some = np.empty(0), np.empty(0, np.int64)
    flags = np.empty(0, np.bool_)
    samples = Samples(some, none, none, none, none, none, none, none, flags)
    return Engagement(samples, Slices(some, none, none, none, none, none), flags, none, none)


class Remains:
    """The stock after the whole program."""

    def __init__(self, follower: _Follower | None) -> None:
        """Keep the follower that has run."""
        self._follower = follower

    def stands(self, x: Floats, y: Floats, height: Floats) -> Flags:
        """True for points (columns) at which material still stands at a height."""
        found = np.zeros(len(x), np.bool_)
        if self._follower is None:
            return found
        for rows in _split(np.arange(len(x))):
            found[rows] = self._follower.stands(x[rows], y[rows], height[rows])
        return found


def chosen_moves(path: Path, top: float) -> Ints:
    """Moves that can meet the stock: below its top, followed, from a known place if they are rapids."""
    low = np.minimum(path.start[:, 2], path.end[:, 2]) < top - NO_HEIGHT
    low |= path.plane > 1
    moves = low & ~path.turning & ~(path.rapid & path.unplaced)
    return np.flatnonzero(moves & (path.length > 0.0))


class _Probes:
    """Questions to the clearing: a circle at a place, a height to begin at, the piece that is being cut."""

    def __init__(self, sample: Ints, circle: Circles, tip: Floats, tool: Ints, piece: Ints, ring: Floats) -> None:
        """``ring`` is a fixed radius, nan for the cutter's own."""
        self.sample, self.circle, self.tip, self.tool, self.piece, self.ring = sample, circle, tip, tool, piece, ring

    def of(self, rows: Ints | Flags) -> _Probes:
        return _Probes(
            self.sample[rows], self.circle.of(rows), self.tip[rows], self.tool[rows], self.piece[rows], self.ring[rows]
        )

    def wider(self, radius: Floats) -> Circles:
        c = self.circle
        return Circles(c.x, c.y, c.fx, c.fy, radius)


Found = tuple[Ints, Floats, Floats, Floats, Floats, Floats]


class _Follower:
    def __init__(self, path: Path, cutters: Cutters, stock: StockTaken) -> None:
        self.path, self.cutters, self.top = path, cutters, stock.top
        self.outline = Outline(stock.outline)
        chosen = chosen_moves(path, stock.top)
        tool = path.tool[chosen]
        upright = vertical_moves(path)[chosen]
        steep = np.where((cutters.kind[tool] == FLAT) | upright, np.inf, cutters.radius[tool] / 8.0)
        self.pieces, self.move, self.low, self.high = cut_up(path, chosen, PIECE * cutters.radius[tool], steep)
        self.tool = path.tool[self.move]
        self.samples, self.piece_of = self._sample()
        self.grid = self._grid()
        self.edge, depth = self._edges()
        self.clearing = Clearing(self.pieces, ~path.rapid[self.move], cutters, self.grid, depth)
        self.touching = np.zeros(len(self.piece_of), np.bool_)
        self.buried = np.zeros(len(self.piece_of))
        self.volume = np.zeros(len(self.piece_of))

    # ---- setting up -----------------------------------------------------------------------------------------------

    def _sample(self) -> tuple[Samples, Ints]:
        """Places at the middles of equal parts of each move, at the end of a vertical one; with the piece of each."""
        moves, first, pieces = np.unique(self.move, return_index=True, return_counts=True)
        radius, length = self.cutters.radius[self.path.tool[moves]], plan_length(self.path, moves)
        count = np.maximum(np.ceil(length / (SPACING * radius) - 1e-9), 1.0)
        count = _at_most(count, MOST_SAMPLES).astype(np.int64)
        row = np.repeat(np.arange(len(moves)), count)
        index = np.arange(len(row)) - (np.cumsum(count) - count)[row]
        move = moves[row]
        share = (index + 0.5) / count[row]
        inner = np.floor(share * pieces[row])
        # where a piece begins, the circle is that of the end of the one before: stay clear of it
        share = np.maximum(share, (inner + CLEAR) / pieces[row])
        share = np.where(vertical_moves(self.path)[move], 1.0, share)
        piece = first[row] + np.minimum(inner.astype(np.int64), pieces[row] - 1)
        fx, fy, vertical = directions(self.path, move, share)
        spot = places(self.path, move, share)
        weight = (self.path.length[moves] / count)[row]
        return Samples(move, share, weight, spot[:, 0], spot[:, 1], spot[:, 2], fx, fy, vertical), piece

    def _grid(self) -> Grid:
        used = self.cutters.radius[np.unique(self.tool)] if len(self.tool) else np.array([1.0])
        size = max(float(used.min()) / 4.0, float(used.max()) / 12.0)
        # coarser where the cutter covers so much ground that the cells would be the work
        ground = float(np.sum(2.0 * self.cutters.radius[self.tool] * self._piece_length()))
        size = max(size, min(float(np.sqrt(ground / MOST_GROUND)), float(used.min()) / 2.5))
        low, high = self.outline.low, self.outline.high
        size = Grid(low, high, size).size
        return Grid((low[0] - 3 * size, low[1] - 3 * size), (high[0] + 3 * size, high[1] + 3 * size), size)

    def _piece_length(self) -> Floats:
        p = self.pieces
        return np.maximum(np.hypot(p[:, X1] - p[:, X0], p[:, Y1] - p[:, Y0]), p[:, RC] * np.abs(p[:, SWEEP]))

    def _edges(self) -> tuple[Flags, Floats]:
        """Cells near the outline, and the height of the material in each cell."""
        grid = self.grid
        inside = self.outline.holds(*grid.centres(np.arange(grid.count)))
        edge = np.zeros(grid.count, np.bool_)
        x, y = self.outline.along(0.5 * grid.size)
        for i in range(-2, 3):
            for j in range(-2, 3):
                edge[grid.cell(x + i * grid.size, y + j * grid.size)] = True
        return edge, np.where(inside | edge, self.top, -np.inf)

    # ---- the run --------------------------------------------------------------------------------------------------

    def run(self) -> Engagement:
        """Everything, block by block."""
        found: list[Found] = []
        for first, last in self._blocks():
            self.clearing.begin(first, last)
            rows = np.arange(*np.searchsorted(self.piece_of, [first, last]))
            lateral = rows[~self.samples.vertical[rows]]
            for some in _split(lateral):
                found.extend(self._lateral(some))
            for some in _split(rows[self._falling(rows)]):
                self._end_face(some)
            self.clearing.end()
        return Engagement(self.samples, _joined(found), self.touching, self.buried, self.volume)

    def _blocks(self) -> Iterator[tuple[int, int]]:
        """Ranges of pieces that touch a bounded number of cells."""
        p = self.pieces
        reach = self.cutters.radius[self.tool] + 2.0 * self.grid.size
        cells = (
            (np.abs(p[:, X1] - p[:, X0]) + 2 * reach) * (np.abs(p[:, Y1] - p[:, Y0]) + 2 * reach) / self.grid.size**2
        )
        number = np.maximum(np.cumsum(cells) // 2e6, np.arange(len(p)) // BLOCK)
        starts = np.flatnonzero(np.diff(number, prepend=-1.0) > 0)
        yield from zip(starts.tolist(), [*starts[1:].tolist(), len(p)], strict=True)

    def _lateral(self, rows: Ints) -> Iterator[Found]:
        s, piece = self.samples, self.piece_of[rows]
        tool = self.tool[piece]
        circle = Circles(s.x[rows], s.y[rows], s.fx[rows], s.fy[rows], self.cutters.radius[tool])
        probes = _Probes(rows, circle, s.z[rows], tool, piece, np.full(len(rows), np.nan))
        probes = probes.of(probes.tip < self.top - NO_HEIGHT)
        met = np.zeros(len(self.piece_of), np.bool_)
        for slices in self._rise(probes):
            met[slices[0]] = True
            yield slices
        quiet = probes.of(~met[probes.sample])
        self.touching[quiet.sample[self._touches(quiet)]] = True

    def _touches(self, probes: _Probes) -> Flags:
        """True where the cutter rubs along a wall beside it or along the floor below it."""
        radius = radius_at(self.cutters, probes.tool, np.full(len(probes.tool), 0.5 * TOUCH))
        found = np.zeros(len(probes.tool), np.bool_)
        for height, wide in ((0.5 * TOUCH, radius + TOUCH), (-TOUCH, np.maximum(radius, TOUCH))):
            row, first, last = self._open(probes, wide, probes.tip + height)
            thick = wide[row] * (np.cos(first) - np.cos(last)) > 0.5 * TOUCH
            found[row[thick]] = True
        return found

    def _falling(self, rows: Ints) -> Flags:
        """Plunges, and ramps steep enough for the end face to count."""
        move = self.samples.move[rows]
        fall = self.path.start[move, 2] - self.path.end[move, 2]
        steep = fall > np.where(self.samples.vertical[rows], 0.0, STEEP * self.path.length[move])
        found: Flags = steep & (self.samples.z[rows] < self.top - NO_HEIGHT)
        return found

    def _end_face(self, rows: Ints) -> None:
        """The share of the end face that stands on material, and the volume that a plunge removes."""
        piece, upright = self.piece_of[rows], self.samples.vertical[rows]
        tool = self.tool[piece]
        # a plunge is looked at where it ends, with what was cut before it; a ramp while it goes down
        tip = self.samples.z[rows] - np.where(upright, 0.0, TOUCH)
        for k in range(RINGS):
            ring = self.cutters.radius[tool] * np.sqrt((k + 0.5) / RINGS)
            for ahead in (1.0, -1.0):
                x, y = self.samples.x[rows], self.samples.y[rows]
                circle = Circles(x, y, np.full(len(rows), ahead), np.zeros(len(rows)), ring)
                probes = _Probes(rows, circle, tip, tool, piece, ring)
                row, first, last = self._open(probes, ring, tip + NO_HEIGHT)
                np.add.at(self.buried, rows[row], (last - first) / (2.0 * PI * RINGS))
                for sample, first, last, low, high, _ in self._rise(probes.of(upright)):
                    share = (last - first) / (2.0 * PI * RINGS) * (high - low)
                    np.add.at(
                        self.volume, sample, share * PI * self.cutters.radius[self.tool[self.piece_of[sample]]] ** 2
                    )

    def stands(self, x: Floats, y: Floats, height: Floats) -> Flags:
        """True for points with material, after everything; a point is a very small circle."""
        count, late = len(x), np.full(len(x), len(self.pieces), np.int64)
        found = np.zeros(count, np.bool_)
        for ahead in (1.0, -1.0):
            circles = Circles(x, y, np.full(count, ahead), np.zeros(count), np.full(count, SPECK))
            row, _, _ = _Asked(self, circles, late, height).gaps(height)
            found[row] = True
        return found & (height < self.top - NO_HEIGHT)

    # ---- one probe ------------------------------------------------------------------------------------------------

    def _rise(self, probes: _Probes) -> Iterator[Found]:
        """Engaged intervals from the tip upwards, slice by slice, until there is no material above."""
        low = probes.tip.copy()
        shaped = (self.cutters.kind[probes.tool] != FLAT) & np.isnan(probes.ring)
        full = self.cutters.radius[probes.tool]
        while len(low):
            zone = shaped & (low - probes.tip < full)
            cap = np.where(zone, low + np.maximum(0.03 * full, 0.25 * (low - probes.tip)), self.top)
            cap = np.minimum(cap, self.top)
            radius = np.where(zone, radius_at(self.cutters, probes.tool, 0.5 * (low + cap) - probes.tip), full)
            radius = np.where(np.isnan(probes.ring), radius, probes.ring)
            circles = probes.wider(radius)
            asked = _Asked(self, circles, probes.piece, low)
            least = np.maximum(THIN, GROWTH * (low - probes.tip))
            high = np.where(zone, cap, np.minimum(np.maximum(asked.next_height(), low + least), cap))
            row, first, last = asked.gaps(0.5 * (low + high))
            thick = radius[row] * (np.cos(first) - np.cos(last)) > SKIN
            row, first, last = row[thick], first[thick], last[thick]
            yield probes.sample[row], first, last, low[row], high[row], radius[row]
            more = np.zeros(len(low), np.bool_)
            more[row] = True
            on = np.flatnonzero((more | zone) & (high < self.top - NO_HEIGHT))
            probes, low, shaped, full = probes.of(on), high[on], shaped[on], full[on]

    def _open(self, probes: _Probes, radius: Floats, height: Floats) -> tuple[Ints, Floats, Floats]:
        """Open intervals at one height."""
        if not len(height):
            return np.empty(0, np.int64), np.empty(0), np.empty(0)
        return _Asked(self, probes.wider(radius), probes.piece, height).gaps(height)


class _Asked:
    """The cells and pieces that circles must be compared with, at heights from ``low`` up."""

    def __init__(self, follower: _Follower, circles: Circles, piece: Ints, low: Floats) -> None:
        self.follower, self.circles, self.piece, self.low = follower, circles, piece, low
        grid = follower.grid
        count = np.ceil(PI * circles.radius / grid.step).astype(np.int64) + 1
        self.row = np.repeat(np.arange(len(count)), count)
        index = np.arange(len(self.row)) - (np.cumsum(count) - count)[self.row]
        self.half = 0.5 * PI / count[self.row]
        self.phi = (2 * index + 1) * self.half
        cell = grid.cell(*circles.of(self.row).point(self.phi))
        self.before = follower.clearing.before(cell, piece[self.row])
        self.edge = np.zeros(len(count), np.bool_)
        self.edge[self.row[follower.edge[cell]]] = True
        open_ = np.flatnonzero(self.before > low[self.row] + NO_HEIGHT)
        self.cell, self.cell_row = cell[open_], self.row[open_]
        which, self.recent_piece, self.recent_low = follower.clearing.recent(self.cell, piece[self.cell_row])
        self.recent_row = self.cell_row[which]

    def next_height(self) -> Floats:
        """The lowest height above ``low`` at which the picture can change."""
        found = np.full(len(self.low), np.inf)
        older = self.follower.clearing.older_above(self.cell, self.low[self.cell_row] + NO_HEIGHT)
        levels = ((self.row, self.before), (self.recent_row, self.recent_low), (self.cell_row, older))
        for row, height in levels:
            above = np.flatnonzero(height > self.low[row] + NO_HEIGHT)
            np.minimum.at(found, row[above], height[above])
        return found

    def gaps(self, height: Floats) -> tuple[Ints, Floats, Floats]:
        """The open intervals of each circle at a height."""
        follower, circles = self.follower, self.circles
        done = self.before <= height[self.row] + NO_HEIGHT
        parts = [(self.row[done], (self.phi - self.half)[done], (self.phi + self.half)[done])]
        row, piece = self._pairs(height)
        if len(row):
            pair, first, last = covered(circles.of(row), follower.pieces[piece], height[row], follower.cutters)
            parts.append((row[pair], first, last))
        edge = np.flatnonzero(self.edge)
        if len(edge):
            row, first, last = follower.outline.outside(circles.of(edge))
            parts.append((edge[row], first, last))
        return gaps(len(height), *(np.concatenate(column) for column in zip(*parts, strict=True)))

    def _pairs(self, height: Floats) -> tuple[Ints, Ints]:
        """Each row with each piece that has cut its cells at or below a height, once."""
        use = np.flatnonzero(self.recent_low <= height[self.recent_row] + NO_HEIGHT)
        which, old = self.follower.clearing.older(self.cell, height[self.cell_row] + NO_HEIGHT)
        row = np.concatenate([self.recent_row[use], self.cell_row[which]])
        count = max(len(self.follower.pieces), 1)
        key = np.sort(row * count + np.concatenate([self.recent_piece[use], old]))
        return np.divmod(key[np.flatnonzero(np.diff(key, prepend=-1))], count)


def _at_most(count: Floats, most: int) -> Floats:
    """Counts with the largest cut down so far that their sum is at most ``most``, or all are 1."""
    if count.sum() <= most:
        return count
    low, high = 1.0, float(count.max())
    while high - low > 1.0:
        middle = 0.5 * (low + high)
        low, high = (middle, high) if np.minimum(count, middle).sum() <= most else (low, middle)
    return np.floor(np.minimum(count, low))


def _split(rows: Ints) -> Iterator[Ints]:
    for start in range(0, len(rows), PROBES):
        yield rows[start : start + PROBES]


def _joined(found: list[Found]) -> Slices:
    """All slices, sorted by sample and height."""
    if not found:
        return Slices(np.empty(0, np.int64), *(np.empty(0) for _ in range(5)))
    columns = [np.concatenate(column) for column in zip(*found, strict=True)]
    order = np.lexsort((columns[1], columns[3], columns[0]))
    return Slices(*(column[order] for column in columns))
