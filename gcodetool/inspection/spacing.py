"""Sizes that lie between two shapes: widths of pockets and ribs between parallel walls, spacings of drilled holes."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import numpy as np

from gcodetool.inspection.audit_records import Feature, Measure, Shape
from gcodetool.inspection.cutting_records import Floats

# walls whose directions differ by less than this are parallel, rad
PARALLEL = math.radians(0.2)
# two walls face each other where they overlap by this share of the shorter one
FACING = 0.5
# a hole is paired with this many of its nearest neighbours
NEIGHBOURS = 2
Wall = tuple[Shape, Sequence[float], bool]
"""A wall, the place of its surface along its own normal in each case, and whether the cut drags an axis there."""


def measure(name: str, intended: float, values: Sequence[float], counts: bool = True) -> Measure:
    """A figure from its values: uncompensated first, then compensated, then the other compensated cases."""
    after = values[1:]
    return Measure(name, intended, values[0], values[1], min(after), max(after), counts)


def drag_words(dragged: bool) -> str:
    """What to say of a shape where the cut drags an axis."""
    return "the cut drags an axis across its lash here" if dragged else ""


def widths(walls: Sequence[Wall]) -> Iterator[Feature]:
    """Pockets and ribs: each wall with the nearest one across the air before it, and across the material behind it.

    Neighbours are looked for in the same contour, and once more among all.  With both normals pointing into the
    material, the sum of the two places is the width of a pocket, or minus that of a rib.
    """
    if len(walls) < 2:
        return
    normal = np.array([shape.normal for shape, _, _ in walls])
    meant = np.array([_meant(shape) for shape, _, _ in walls])
    chain = np.array([shape.chain for shape, _, _ in walls])
    opposite = normal @ normal.T < -math.cos(PARALLEL)
    between = np.where(opposite, meant[:, None] + meant[None, :], np.nan)
    same = np.where(chain[:, None] == chain[None, :], between, np.nan)
    done: set[tuple[int, int]] = set()
    for table in (same, between):
        for k in range(len(walls)):
            for sign in (1.0, -1.0):
                j = _partner(walls, k, sign * table[k])
                pair = min(j, k), max(j, k)
                if j >= 0 and pair not in done:
                    done.add(pair)
                    yield _width(walls[k], walls[j], float(table[k, j]))


def _partner(walls: Sequence[Wall], k: int, distance: Floats) -> int:
    """The nearest wall that faces wall k at a positive distance, -1 where there is none or it is of the same slot."""
    order = np.argsort(np.where(distance > 1e-6, distance, np.inf), kind="stable")
    for j in order.tolist():
        if not distance[j] > 1e-6:
            return -1
        if _facing(walls[k][0], walls[j][0]):
            return -1 if walls[k][0].moves == walls[j][0].moves else j
    return -1


def _meant(shape: Shape) -> float:
    """The intended place of a wall's surface along its normal."""
    return shape.ends[1][0] * shape.normal[0] + shape.ends[1][1] * shape.normal[1] + shape.cutter


def _facing(one: Shape, other: Shape) -> bool:
    along = (-one.normal[1], one.normal[0])
    first, second = (sorted(x * along[0] + y * along[1] for x, y in shape.ends) for shape in (one, other))
    shorter = min(first[1] - first[0], second[1] - second[0])
    return min(first[1], second[1]) - max(first[0], second[0]) > FACING * shorter


def _width(one: Wall, other: Wall, meant: float) -> Feature:
    sign = 1.0 if meant > 0.0 else -1.0
    values = [sign * (first + second) for first, second in zip(one[1], other[1], strict=True)]
    kind = "pocket width" if meant > 0.0 else "rib width"
    middle = [0.25 * sum(place[k] for shape in (one[0], other[0]) for place in shape.ends) for k in (0, 1)]
    lines = sorted([*one[0].lines, *other[0].lines])
    name = f"{kind} {abs(meant):.3f} at X{middle[0]:.3f} Y{middle[1]:.3f}"
    row = measure("width", abs(meant), values)
    depth = max(one[0].depth, other[0].depth)
    return Feature(
        "width", name, (lines[0], lines[-1]), (middle[0], middle[1]), depth, (row,), drag_words(one[2] or other[2])
    )


def hole_pairs(holes: Sequence[Shape], places: Sequence[tuple[Floats, list[Floats]]]) -> Iterator[Feature]:
    """Spacings of each hole and its nearest neighbours; ``places`` are their wanted and actual places."""
    wanted = np.array([want for want, _ in places]).reshape(-1, 2)
    done: set[tuple[int, int]] = set()
    for k in range(len(holes)):
        far = np.hypot(*(wanted - wanted[k]).T)
        far[k] = np.inf
        for j in np.argsort(far, kind="stable")[:NEIGHBOURS].tolist():
            pair = min(j, k), max(j, k)
            if pair not in done and np.isfinite(far[j]) and far[j] > 1e-6:
                done.add(pair)
                yield _pair(holes[pair[0]], holes[pair[1]], places[pair[0]], places[pair[1]])


def _pair(one: Shape, other: Shape, here: tuple[Floats, list[Floats]], there: tuple[Floats, list[Floats]]) -> Feature:
    meant = math.dist(here[0], there[0])
    values = [math.dist(a, b) for a, b in zip(here[1], there[1], strict=True)]
    middle = 0.5 * (here[0] + there[0])
    lines = sorted([*one.lines, *other.lines])
    name = f"holes X{here[0][0]:.3f} Y{here[0][1]:.3f} and X{there[0][0]:.3f} Y{there[0][1]:.3f}"
    at = float(middle[0]), float(middle[1])
    return Feature(
        "hole pair", name, (lines[0], lines[-1]), at, max(one.depth, other.depth), (measure("spacing", meant, values),)
    )
