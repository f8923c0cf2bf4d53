"""What a caliper will show: predicted sizes and form errors of the recognised shapes, without and with compensation.

Closed forms of the model (friction holds the axes, lash B on both): a round path of radius R has extents 2R - B,
flats of sqrt(2RB - B^2) after each quadrant and a radius of sqrt(R^2 - B^2/2) on the diagonals.  The figures here
come from driving the sampled path through the play of each axis, so that start sides, single laps, unequal lash and
dragged axes are in them.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
import shapely

from gcodetool.inspection.audit_records import Feature, Shape
from gcodetool.inspection.cutting_records import Flags, Floats, Holding, Ints, Path, Samples
from gcodetool.inspection.lash_path import AxisCase, AxisState, follow, states_before
from gcodetool.inspection.spacing import Wall, drag_words, hole_pairs, measure, widths
from gcodetool.inspection.toolpath import places
from gcodetool.machine import Axis, Machine

PLAN = "XY"
PER_TURN = 1440
LEAST_SAMPLES = 48
# sides of a quarter of a round wall; a path shorter than so many cutter radii is taken as a line
QUARTER, SMALL = 180, 6.0
# pairs are looked for among at most this many
MOST_WALLS, MOST_HOLES = 400, 2000
Variant = Mapping[str, AxisCase]


@dataclass(frozen=True, slots=True)
class Case:
    """One way the part may come out: a case for X and Y, and whether dragging by the cut counts."""

    axes: Variant
    dragged: bool


def cases(machine: Machine) -> list[Case]:
    """Uncompensated; compensated; compensated and held everywhere; the same with the largest and least lash."""

    def both(make: Callable[[Axis], AxisCase]) -> Variant:
        return {letter: make(machine.axis(letter)) for letter in PLAN}

    def true(axis: Axis, sign: int, compensated: bool = True) -> AxisCase:
        lash = float(axis.lash)
        off = sign * float(axis.uncertainty or 0)
        return AxisCase(max(lash + off, 0.0), lash if compensated else None, axis.datum)

    exact = both(lambda axis: true(axis, 0))
    return [
        Case(both(lambda axis: true(axis, 0, False)), True),
        Case(exact, True),
        Case(exact, False),
        Case(both(lambda axis: true(axis, 1)), False),
        Case(both(lambda axis: true(axis, -1)), False),
    ]


class Predictor:
    """Predicts actual paths of stretches of a program, in every case."""

    def __init__(self, path: Path, machine: Machine, samples: Samples, holdings: Sequence[Holding]) -> None:
        """Follow the whole program once in each case, so that every stretch begins on its right side."""
        self.path, self.samples = path, samples
        self.cases = cases(machine)
        self._push = {holding.axis: holding.push for holding in holdings}
        known: dict[tuple[int, AxisCase], tuple[Floats, Ints]] = {}
        self._before: list[dict[str, tuple[Floats, Ints]]] = []
        for case in self.cases:
            for k, letter in enumerate(PLAN):
                known.setdefault((k, case.axes[letter]), states_before(path, k, case.axes[letter]))
            self._before.append({letter: known[k, case.axes[letter]] for k, letter in enumerate(PLAN)})

    def pushes(self, letter: str, move: Ints, share: Floats) -> Ints:
        """Where the cut drags an axis at places on moves."""
        push = self._push.get(letter)
        if push is None or not len(push):
            return np.zeros(len(move), np.int64)
        at = np.searchsorted(self.samples.move + self.samples.share, move + share)
        near = np.clip(at, 0, len(push) - 1)
        earlier = np.clip(at - 1, 0, len(push) - 1)
        same = self.samples.move[near] == move
        return np.where(same, push[near], np.where(self.samples.move[earlier] == move, push[earlier], 0))

    def paths(self, move: Ints, share: Floats) -> tuple[Floats, list[Floats], bool]:
        """Wanted places (n, 2), the actual ones in each case, and whether the cut drags an axis anywhere.

        ``move`` must begin at the start of a move.
        """
        wanted = places(self.path, move, share)[:, :2]
        push = {letter: self.pushes(letter, move, share) for letter in PLAN}
        found = []
        for case, before in zip(self.cases, self._before, strict=True):
            columns = []
            for k, letter in enumerate(PLAN):
                actual, side = before[letter]
                state = AxisState(float(actual[move[0]]), int(side[move[0]]))
                drag = push[letter] if case.dragged else None
                columns.append(follow(wanted[:, k], case.axes[letter], state, drag)[0])
            found.append(np.column_stack(columns))
        return wanted, found, any(bool(values.any()) for values in push.values())

    def ends(self, move: int) -> tuple[Floats, list[Floats]]:
        """Wanted and actual place at the end of a move."""
        found = [np.array([before[letter][0][move + 1] for letter in PLAN]) for before in self._before]
        return self.path.end[move, :2], found


def predict(shapes: Sequence[Shape], predictor: Predictor) -> list[Feature]:
    """The measures of every shape, worst first."""
    found: list[Feature] = []
    walls: list[Wall] = []
    for shape in shapes:
        if shape.kind in ("bore", "boss"):
            found.append(_round(shape, predictor))
        elif shape.kind == "arc":
            found.append(_arc(shape, predictor))
        elif shape.kind in ("wall", "slot"):
            feature, place, dragged = _wall(shape, predictor)
            found.append(feature)
            walls.extend(_both_walls(shape, place, dragged) if shape.kind == "slot" else [(shape, place, dragged)])
    found.extend(widths(walls[:MOST_WALLS]))
    holes = [shape for shape in shapes if shape.kind == "hole"][:MOST_HOLES]
    found.extend(hole_pairs(holes, [predictor.ends(shape.moves[-1]) for shape in holes]))
    return sorted(found, key=lambda feature: (-feature.worst, feature.lines))


def _stretch(shape: Shape, predictor: Predictor) -> tuple[Ints, Floats]:
    """Samples along the moves of a shape: even steps on the last turn, and where an axis turns or gets into contact."""
    path, moves, shares = predictor.path, [], []
    least = LEAST_SAMPLES if len(shape.moves) < 12 else 4
    for k in shape.moves:
        sweep = float(path.sweep[k]) if path.plane[k] == 1 else 0.0
        turns = abs(sweep) / (2.0 * math.pi)
        count = max(least, math.ceil(PER_TURN * min(turns, 1.0)))
        share = np.linspace(max(0.0, 1.0 - 1.0 / turns) if sweep else 0.0, 1.0, count + 1)
        if sweep:
            special = _special_shares(float(path.angle[k]), sweep, float(path.radius[k]), predictor)
            share = np.union1d(share, np.concatenate([[0.0], special]))
        moves.append(np.full(len(share), k, np.int64))
        shares.append(share)
    return np.concatenate(moves), np.concatenate(shares)


def _special_shares(start: float, sweep: float, radius: float, predictor: Predictor) -> Floats:
    """Shares of quadrant points, and of the angles acos(1 - B/R) past them at which lash B has been crossed."""
    axes = [case.axes[letter] for case in predictor.cases for letter in PLAN]
    left = {axis.lash - (axis.compensated or 0.0) for axis in axes}
    past = [0.0, *(math.acos(1.0 - lash / radius) for lash in left if 0.0 < lash < radius)]
    low, high = sorted((start, start + sweep))
    quarter = 0.5 * math.pi
    quadrants = np.arange(math.floor(low / quarter) - 2, math.ceil(high / quarter) + 3) * quarter
    shares = np.concatenate([quadrants + math.copysign(delta, sweep) - start for delta in past]) / sweep
    return shares[(shares > 0.0) & (shares < 1.0)]


def _both_walls(shape: Shape, place: Sequence[float], dragged: bool) -> list[Wall]:
    """The two walls of a slot, each with the place of its surface along its own normal."""
    (nx, ny), half = shape.normal, shape.cutter
    other = replace(shape, normal=(-nx, -ny))
    return [(shape, [each + half for each in place], dragged), (other, [half - each for each in place], dragged)]


# ---- round ones -----------------------------------------------------------------------------------------------------


def _round(shape: Shape, predictor: Predictor) -> Feature:
    move, share = _stretch(shape, predictor)
    wanted, actual, dragged = predictor.paths(move, share)
    last = _last_turn(wanted, shape)
    sign = 1.0 if shape.kind == "bore" else -1.0
    walls = [_Ring(part[last], sign * shape.cutter) for part in (wanted, *actual)]
    size = 2.0 * (shape.radius + sign * shape.cutter)
    rows = [measure("diameter X", size, [ring.wide for ring in walls[1:]])]
    rows.append(measure("diameter Y", size, [ring.tall for ring in walls[1:]]))
    rows.append(measure("diameter 45 deg", size, [ring.across(0.25 * math.pi) for ring in walls[1:]]))
    rows.append(measure("diameter 135 deg", size, [ring.across(0.75 * math.pi) for ring in walls[1:]]))
    noise = walls[0].out_of_round
    rows.append(measure("out of round", 0.0, [max(ring.out_of_round - noise, 0.0) for ring in walls[1:]]))
    radius = shape.radius if shape.kind == "bore" else 0.5 * size
    for letter in PLAN:
        lengths = [_flat(radius, case.axes[letter]) for case in predictor.cases]
        rows.append(measure(f"flat across {letter}", 0.0, lengths, counts=False))
    name = f"{shape.kind} {size:.3f} at X{shape.centre[0]:.3f} Y{shape.centre[1]:.3f}"
    return Feature(shape.kind, name, shape.lines, shape.centre, shape.depth, tuple(rows), drag_words(dragged))


def _last_turn(wanted: Floats, shape: Shape) -> Flags:
    """Marks the samples of the last whole turn."""
    angle = np.unwrap(np.arctan2(wanted[:, 1] - shape.centre[1], wanted[:, 0] - shape.centre[0]))
    mark: Flags = np.abs(angle - angle[-1]) <= 2.0 * math.pi + 1e-9
    return mark


def _swept(path: Floats, radius: float) -> shapely.Geometry:
    still = np.ptp(path, axis=0).max() < 1e-9
    spine = shapely.Point(path[0]) if still else shapely.LineString(path)
    return shapely.Polygon(shapely.get_exterior_ring(spine.buffer(radius, quad_segs=QUARTER)))


class _Ring:
    """The wall that a closed path leaves at a distance from it (negative: inside)."""

    def __init__(self, path: Floats, offset: float) -> None:
        wall = shapely.Polygon(path).buffer(0.0)
        small = wall.length < SMALL * offset
        # a path that lash has nearly closed to a line has no inside; what the cutter sweeps along it has
        wall = _swept(path, offset) if small else wall.buffer(offset, quad_segs=QUARTER)
        self._wall = wall
        x0, y0, x1, y1 = wall.bounds if not wall.is_empty else (0.0, 0.0, 0.0, 0.0)
        self.wide, self.tall = x1 - x0, y1 - y0
        self._middle = (0.5 * (x0 + x1), 0.5 * (y0 + y1))

    def across(self, angle: float) -> float:
        """The diameter through the middle at an angle."""
        x, y = self._middle
        reach = self.wide + self.tall
        dx, dy = reach * math.cos(angle), reach * math.sin(angle)
        return float(shapely.LineString([(x - dx, y - dy), (x + dx, y + dy)]).intersection(self._wall).length)

    @property
    def out_of_round(self) -> float:
        """Largest minus smallest radius about the middle."""
        points = shapely.get_coordinates(self._wall)
        if not len(points):
            return 0.0
        largest = float(np.hypot(points[:, 0] - self._middle[0], points[:, 1] - self._middle[1]).max())
        return largest - float(shapely.distance(shapely.Point(self._middle), shapely.boundary(self._wall)))


def _flat(radius: float, case: AxisCase) -> float:
    """Length of the flat after a quadrant: sqrt(2RB - B^2) with the lash that is left."""
    left = case.lash - (case.compensated or 0.0)
    return math.sqrt(max(2.0 * radius * left - left * left, 0.0)) if 0.0 < left < radius else 0.0


def _arc(shape: Shape, predictor: Predictor) -> Feature:
    move, share = _stretch(shape, predictor)
    wanted, actual, dragged = predictor.paths(move, share)
    ray = wanted - np.array(shape.centre)
    ray /= np.maximum(np.hypot(ray[:, 0], ray[:, 1]), 1e-12)[:, None]
    outward = [((part - wanted) * ray).sum(axis=1) for part in actual]
    middle = len(share) // 2
    size = shape.radius + (shape.cutter if shape.side * predictor.path.sweep[shape.moves[0]] < 0.0 else -shape.cutter)
    rows = [
        measure("radius at its middle", size, [size + float(off[middle]) for off in outward]),
        measure("largest deviation", 0.0, [float(np.max(np.abs(off))) for off in outward], counts=False),
    ]
    name = f"arc radius {size:.3f} about X{shape.centre[0]:.3f} Y{shape.centre[1]:.3f}"
    return Feature("arc", name, shape.lines, shape.centre, shape.depth, tuple(rows), drag_words(dragged))


# ---- straight ones --------------------------------------------------------------------------------------------------


def _wall(shape: Shape, predictor: Predictor) -> tuple[Feature, list[float], bool]:
    """Where a wall (or the middle of a slot) comes out, and how much it bends; with the place in each case."""
    move, share = _stretch(shape, predictor)
    wanted, actual, dragged = predictor.paths(move, share)
    normal = np.array(shape.normal)
    off = [((part - wanted) * normal).sum(axis=1) for part in actual]
    surface = float(wanted[-1] @ normal) + (shape.cutter if shape.kind == "wall" else 0.0)
    place = [surface + float(each[-1]) for each in off]
    name, sign = _position(shape)
    rows = [measure(name, sign * surface, [sign * each for each in place])]
    bend = [float(each.max() - each.min()) for each in off]
    if max(bend) > 1e-4:
        rows.append(measure("step along it", 0.0, bend))
    if shape.kind == "slot":
        rows.append(measure("width", 2.0 * shape.cutter, [2.0 * shape.cutter + value for value in bend]))
    middle = wanted[len(wanted) // 2] + normal * (shape.cutter if shape.kind == "wall" else 0.0)
    at = float(middle[0]), float(middle[1])
    name = f"{shape.kind} at X{at[0]:.3f} Y{at[1]:.3f}"
    return Feature(shape.kind, name, shape.lines, at, shape.depth, tuple(rows), drag_words(dragged)), place, dragged


def _position(shape: Shape) -> tuple[str, float]:
    """Which coordinate the place of a wall is, and the sign by which it counts."""
    nx, ny = shape.normal
    if abs(ny) < 1e-6:
        return "position X", math.copysign(1.0, nx)
    if abs(nx) < 1e-6:
        return "position Y", math.copysign(1.0, ny)
    return "distance from program zero", 1.0
