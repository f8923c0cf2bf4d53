"""What is left of the stock, in cells: which earlier pieces of path can matter at a place, and which places are done.

The plane is cut into square cells.  For each cell the map keeps ``depth``, the height down to which the whole cell is
cleared, and a list of the pieces that cleared a part of it deeper than that.  A piece that lies above the depth of a
cell can no longer matter there and is dropped, so the lists stay short however long the program is, and time grows
with its length only.

The cells never decide a shape: they only say which pieces to ask.  The exact answer comes from the pieces (see
``swept``). Everything is widened by ``margin`` so that a point anywhere within half a sampling step of a cell is
served by that cell.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from gcodetool.inspection.cutting_records import Cutters
from gcodetool.inspection.swept import RC, SWEEP, TOOL, X0, X1, Y0, Y1, Z0, Z1, height_at, path_distance

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]
Flags = NDArray[np.bool_]

MOST_CELLS = 4_000_000
# cells that one call may look at; bounds the memory
BATCH = 1_000_000
# heights closer than this are one
NO_HEIGHT = 1e-6
# heights within a sort key: steps of a tenth of that, and how many there can be (1000 m)
HEIGHT_STEP = 1e-7
TALL = 1 << 40
# a layer is joined with the next younger one that has more than a share of 1 / JOIN of its size
JOIN = 3


class Grid:
    """Square cells of ``size`` mm over a rectangle; points outside count with the nearest border cell."""

    def __init__(self, low: tuple[float, float], high: tuple[float, float], size: float) -> None:
        """Cover low..high; the size grows where there would be too many cells."""
        wide, tall = max(high[0] - low[0], size), max(high[1] - low[1], size)
        self.size = max(size, float(np.sqrt(wide * tall / MOST_CELLS)))
        self.x, self.y = low
        self.columns, self.rows = int(wide / self.size) + 1, int(tall / self.size) + 1

    @property
    def count(self) -> int:
        """Number of cells."""
        return self.columns * self.rows

    @property
    def step(self) -> float:
        """Spacing at which a curve is sampled to find its cells."""
        return 0.5 * self.size

    @property
    def margin(self) -> float:
        """Half the diagonal of a cell and half a sampling step."""
        return (0.7072 + 0.25) * self.size

    def cell(self, x: Floats, y: Floats) -> Ints:
        """The cells of points."""
        column = np.clip(((x - self.x) / self.size).astype(np.int64), 0, self.columns - 1)
        row = np.clip(((y - self.y) / self.size).astype(np.int64), 0, self.rows - 1)
        return row * self.columns + column

    def centres(self, cells: Ints) -> tuple[Floats, Floats]:
        """The middles of cells."""
        column, row = (cells % self.columns).astype(np.float64), (cells // self.columns).astype(np.float64)
        return self.x + (column + 0.5) * self.size, self.y + (row + 0.5) * self.size

    def boxes(self, low_x: Floats, low_y: Floats, high_x: Floats, high_y: Floats) -> tuple[Ints, Ints]:
        """All cells of rectangles: ``(row, cell)``."""
        first, last = self.cell(low_x, low_y), self.cell(high_x, high_y)
        wide = last % self.columns - first % self.columns + 1
        tall = last // self.columns - first // self.columns + 1
        row, index = expand(np.zeros(len(first), np.int64), wide * tall)
        return row, first[row] + index // wide[row] * self.columns + index % wide[row]


def expand(start: Ints, count: Ints) -> tuple[Ints, Ints]:
    """Ranges start..start+count written out: ``(row, index)``."""
    row = np.repeat(np.arange(len(start)), count)
    before = np.cumsum(count) - count
    return row, np.arange(len(row)) - before[row] + start[row]


class Clearing:
    """The cells, worked through block by block of pieces: ``begin``, ask, ``end``."""

    def __init__(self, pieces: Floats, cuts: Flags, cutters: Cutters, grid: Grid, depth: Floats) -> None:
        """``cuts`` marks pieces that remove material; ``depth`` is the height of the material by cell (-inf: none)."""
        self._pieces, self._cuts, self._cutters, self.grid = pieces, cuts, cutters, grid
        self.depth = depth
        self._shape = _shapes(pieces)
        self._base = float(min(pieces[:, Z0].min(), pieces[:, Z1].min())) - 1.0 if len(pieces) else 0.0
        # what earlier blocks left, the oldest and largest first
        self._layers: list[_Layer] = []
        self._open(0, 1)

    def _open(self, first: int, span: int) -> None:
        self._first, self._span = first, span
        self._full_key, self._full_least = np.empty(0, np.int64), np.empty(0)
        self._part_key, self._part_piece, self._part_low = np.empty(0, np.int64), np.empty(0, np.int64), np.empty(0)

    def begin(self, first: int, last: int) -> None:
        """Take up the pieces first..last (last excluded)."""
        self._open(first, last - first + 1)
        chosen = np.flatnonzero(self._cuts[first:last]) + first
        cell, piece, full, low = self._raster(chosen)
        self._take_full(cell, piece, full)
        keep = (low < self.before(cell, piece) - NO_HEIGHT) & (low < full - NO_HEIGHT)
        cell, piece, low = cell[keep], piece[keep], low[keep]
        key = cell * self._span + (piece - first)
        order = np.argsort(key, kind="stable")
        self._part_key, self._part_piece, self._part_low = key[order], piece[order], low[order]

    def _raster(self, chosen: Ints) -> tuple[Ints, Ints, Floats, Floats]:
        """Cells that the pieces touch: the height each is cleared to as a whole, and in part (inf where not)."""
        found = []
        per_piece = max(1, BATCH // 512)
        for start in range(0, len(chosen), per_piece):
            found.append(self._raster_some(chosen[start : start + per_piece]))
        if not found:
            none = np.empty(0, np.int64)
            return none, none, np.empty(0), np.empty(0)
        return tuple(np.concatenate(column) for column in zip(*found, strict=True))  # type: ignore[return-value]

    def _raster_some(self, chosen: Ints) -> tuple[Ints, Ints, Floats, Floats]:
        part, margin = self._pieces[chosen], self.grid.margin
        tool = part[:, TOOL].astype(np.int64)
        bulge = part[:, RC] * (1.0 - np.cos(0.5 * part[:, SWEEP]))
        wide = self._cutters.radius[tool] + margin + bulge
        row, cell = self.grid.boxes(
            np.minimum(part[:, X0], part[:, X1]) - wide,
            np.minimum(part[:, Y0], part[:, Y1]) - wide,
            np.maximum(part[:, X0], part[:, X1]) + wide,
            np.maximum(part[:, Y0], part[:, Y1]) + wide,
        )
        distance = path_distance(part[row], *self.grid.centres(cell))
        near = np.flatnonzero(distance - margin < self._cutters.radius[tool[row]])
        row, cell, distance = row[near], cell[near], distance[near]
        lowest, highest = np.minimum(part[:, Z0], part[:, Z1]), np.maximum(part[:, Z0], part[:, Z1])
        full = highest[row] + height_at(self._cutters, tool[row], distance + margin)
        low = lowest[row] + height_at(self._cutters, tool[row], np.maximum(distance - margin, 0.0))
        useful = low < self.depth[cell] - NO_HEIGHT
        row, cell, full, low = row[useful], cell[useful], full[useful], low[useful]
        return cell, chosen[row], full, low

    def _take_full(self, cell: Ints, piece: Ints, full: Floats) -> None:
        keep = np.flatnonzero(full < self.depth[cell] - NO_HEIGHT)
        key = cell[keep] * self._span + (piece[keep] - self._first)
        order = np.argsort(key, kind="stable")
        self._full_key = key[order]
        self._full_least = _running_least(cell[keep][order], full[keep][order])

    def before(self, cell: Ints, piece: Ints) -> Floats:
        """The height to which whole cells are cleared just before a piece begins."""
        found = self.depth[cell]
        if not len(self._full_key):
            return found
        place = np.searchsorted(self._full_key, cell * self._span + (piece - self._first)) - 1
        same = (place >= 0) & (self._full_key[place] // self._span == cell)
        return np.where(same, np.minimum(found, self._full_least[place]), found)

    def recent(self, cell: Ints, piece: Ints) -> tuple[Ints, Ints, Floats]:
        """Pieces of this block before ``piece`` that cleared a part of a cell: ``(row, piece, lowest height)``."""
        base = cell * self._span
        low, high = np.searchsorted(self._part_key, base), np.searchsorted(self._part_key, base + (piece - self._first))
        row, index = expand(low, high - low)
        return row, self._part_piece[index], self._part_low[index]

    def older(self, cell: Ints, height: Floats) -> tuple[Ints, Ints]:
        """Pieces of earlier blocks that cleared a part of a cell at or below a height: ``(row, piece)``."""
        first, last = cell * TALL, self._key(cell, height)
        found = [layer.between(first, last) for layer in self._layers]
        if not found:
            return np.empty(0, np.int64), np.empty(0, np.int64)
        return np.concatenate([row for row, _ in found]), np.concatenate([piece for _, piece in found])

    def older_above(self, cell: Ints, height: Floats) -> Floats:
        """The next height above a height at which an earlier block cleared a part of a cell, or inf."""
        found = np.full(len(cell), np.inf)
        key = self._key(cell, height)
        for layer in self._layers:
            found = np.minimum(found, layer.above(cell, key))
        return found

    def _key(self, cell: Ints, height: Floats) -> Ints:
        """Cells and heights as one whole number in their order."""
        step = np.clip((height - self._base) / HEIGHT_STEP, 0.0, TALL - 1.0)
        return cell * TALL + step.astype(np.int64)

    def end(self) -> None:
        """Lay the block down: from now on it is part of what was cut before."""
        np.minimum.at(self.depth, self._full_key // self._span, self._full_least)
        self._layers.append(self._layer(self._part_key // self._span, self._part_piece, self._part_low))
        # layers of like size are joined, so that each entry is sorted a few times only, however long the program is
        while len(self._layers) > 1 and len(self._layers[-2].key) < JOIN * len(self._layers[-1].key):
            pair = self._layers[-2:]
            columns = ((layer.key // TALL, layer.piece, layer.low) for layer in pair)
            self._layers[-2:] = [self._layer(*(np.concatenate(column) for column in zip(*columns, strict=True)))]
        self._open(self._first + self._span - 1, 1)

    def _layer(self, cell: Ints, piece: Ints, low: Floats) -> _Layer:
        """A layer without what can no longer matter."""
        keep = low < self.depth[cell] - NO_HEIGHT
        cell, piece, low = cell[keep], piece[keep], low[keep]
        order = np.lexsort((low, self._shape[piece], cell))
        cell, piece, low = cell[order], piece[order], low[order]
        # the same stretch cut again deeper makes the shallower one useless
        first = np.ones(len(cell), np.bool_)
        first[1:] = (cell[1:] != cell[:-1]) | (self._shape[piece[1:]] != self._shape[piece[:-1]])
        key = self._key(cell[first], low[first])
        order = np.argsort(key, kind="stable")
        return _Layer(key[order], piece[first][order], low[first][order])


class _Layer:
    """Pieces that cleared a part of a cell in earlier blocks, sorted by cell and height."""

    def __init__(self, key: Ints, piece: Ints, low: Floats) -> None:
        self.key, self.piece, self.low = key, piece, low

    def between(self, first: Ints, last: Ints) -> tuple[Ints, Ints]:
        """Pieces with keys from first to last: ``(row, piece)``."""
        start = np.searchsorted(self.key, first)
        row, index = expand(start, np.searchsorted(self.key, last, "right") - start)
        return row, self.piece[index]

    def above(self, cell: Ints, key: Ints) -> Floats:
        """The lowest height above a key in the same cell, or inf."""
        place = np.searchsorted(self.key, key, "right")
        there = place < len(self.key)
        there[there] = self.key[place[there]] // TALL == cell[there]
        found = np.full(len(cell), np.inf)
        found[there] = self.low[place[there]]
        return found


def _running_least(group: Ints, value: Floats) -> Floats:
    """The running minimum within each group; groups lie together."""
    if not len(value):
        return value
    number = np.cumsum(np.concatenate([[0], (group[1:] != group[:-1]).astype(np.int64)]))
    # each group lies below all groups before it, so one running minimum serves all of them
    apart = 2.0 * float(np.max(np.abs(value))) + 1.0
    return np.minimum.accumulate(value - number * apart) + number * apart


def _shapes(pieces: Floats) -> Ints:
    """A number for each piece that is the same for pieces of the same plan, tool and slope."""
    key = np.round(pieces * 1e6).astype(np.int64)
    key[:, Z1] -= key[:, Z0]
    key[:, Z0] = 0
    # there and back is the same stretch
    swap = (key[:, X0] > key[:, X1]) | ((key[:, X0] == key[:, X1]) & (key[:, Y0] > key[:, Y1]))
    swap &= key[:, RC] == 0
    key[swap] = key[swap][:, [X1, Y1, X0, Y0, *range(4, key.shape[1])]]
    key[swap, Z1] *= -1
    return np.unique(key, axis=0, return_inverse=True)[1].reshape(-1).astype(np.int64)
