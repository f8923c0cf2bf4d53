"""Limits: travel, keep-out areas, feeds, spindle speeds, the bottom of the stock, rapids that meet material."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import shapely

from gcodetool.inspection.audit_records import AxisEnvelope, StockTaken
from gcodetool.inspection.cutting_records import Engagement, Flags, Floats, Ints, Kind, Labels, Path
from gcodetool.inspection.job_records import Cutter, Job, KeepOut
from gcodetool.inspection.lash_path import turning_points
from gcodetool.inspection.toolpath import places
from gcodetool.machine import Machine

NAMES = "XYZ"
# a rapid counts as meeting material from this much on, mm^2 of engaged face
MEETS = 0.02
# chords of an arc when it is compared with a keep-out area
CHORDS = 64
REACH = 1e-9


@dataclass(frozen=True, slots=True)
class Hit:
    """One move (by index) that breaks a limit; ``value`` is how far, in the unit of that limit."""

    move: int
    value: float
    name: str = ""


def envelope(path: Path, machine: Machine) -> list[AxisEnvelope]:
    """The commanded range of X, Y and Z in machine positions, as compensation would command it.

    Take-ups reach one lash beyond the path, away from the datum side; settles one lash and the settle margin past the
    targets of the first rapids and of those after a tool change.
    """
    found = []
    for k, letter in enumerate(NAMES):
        axis = machine.axis(letter)
        used = ~path.unplaced | ~path.rapid
        if not used.any() or not np.any(path.start[:, k] != path.end[:, k]):
            continue
        offset = path.base[k] + (path.length_offset if letter == "Z" else np.zeros(path.count))
        move, place = turning_points(path, k)
        place = (place + offset[move])[used[move]]
        lash, away = float(axis.lash), -axis.datum
        low, high = float(place.min()), float(place.max())
        low, high = min(low, low + away * lash), max(high, high + away * lash)
        first = path.rapid & path.unplaced & (path.start[:, k] != path.end[:, k])
        if lash and first.any():
            past = (path.end[first, k] + offset[first]) + away * (lash + float(machine.settle_margin))
            low, high = min(low, float(past.min())), max(high, float(past.max()))
        travel = None if axis.travel is None else (float(axis.travel[0]), float(axis.travel[1]))
        found.append(AxisEnvelope(letter, low, high, travel, letter in path.placed))
    return found


def beyond(axis: AxisEnvelope) -> float:
    """How far an axis leaves its travel, mm; 0 where it does not or where nothing is known."""
    if axis.travel is None:
        return 0.0
    if not axis.placed:
        return max(axis.high - axis.low - (axis.travel[1] - axis.travel[0]), 0.0)
    return max(axis.travel[0] - axis.low, axis.high - axis.travel[1], 0.0)


def reserve_below(axis: AxisEnvelope) -> float | None:
    """Travel left below the lowest position, mm; None where it is not known."""
    if axis.travel is None or not axis.placed:
        return None
    return axis.low - axis.travel[0]


def below_stock(path: Path, stock: StockTaken) -> list[Hit]:
    """The deepest feed motion below the bottom of the stock."""
    if stock.bottom is None:
        return []
    move, place = turning_points(path, 2)
    lowest = np.minimum(path.start[:, 2], path.end[:, 2])
    np.minimum.at(lowest, move, place)
    deep = np.flatnonzero(~path.rapid & ~path.turning & (lowest < stock.bottom - 1e-6))
    if not len(deep):
        return []
    worst = int(deep[np.argmin(lowest[deep])])
    return [Hit(worst, float(stock.bottom - lowest[worst]))]


def keep_out_hits(path: Path, cutters: Sequence[Cutter], keep_outs: Sequence[KeepOut]) -> list[Hit]:
    """The first move, rapid or feed, on which the cutter enters each keep-out area below its top."""
    if not keep_outs or not path.count:
        return []
    radius = np.array([cutter.radius for cutter in cutters] or [0.0])[path.tool]
    lowest = lowest_points(path)
    known = ~path.turning & ~(path.rapid & path.unplaced)
    found = []
    for area in keep_outs:
        shape = shapely.Polygon(area.outline)
        low = np.flatnonzero(known & (lowest < area.top - 1e-9))
        near = low[_boxes_meet(path, low, radius, shape.bounds)]
        for k in near.tolist():
            line = _below(path, k, area.top)
            into = float(radius[k]) - float(shapely.distance(line, shape))
            if into > 1e-6:
                found.append(Hit(k, into, area.name))
                break
    return found


def _boxes_meet(path: Path, moves: Ints, radius: Floats, bounds: tuple[float, float, float, float]) -> Flags:
    reach = radius[moves] + np.where(path.plane[moves] == 1, 2.0 * path.radius[moves], 0.0) + REACH
    low = np.minimum(path.start[moves, :2], path.end[moves, :2]) - reach[:, None]
    high = np.maximum(path.start[moves, :2], path.end[moves, :2]) + reach[:, None]
    meets: Flags = (low[:, 0] <= bounds[2]) & (high[:, 0] >= bounds[0])
    meets &= (low[:, 1] <= bounds[3]) & (high[:, 1] >= bounds[1])
    return meets


def _below(path: Path, move: int, top: float) -> shapely.Geometry:
    """The part of a move that lies below a height, in plan."""
    share = np.linspace(0.0, 1.0, CHORDS + 1 if path.plane[move] else 2)
    points = places(path, np.full(len(share), move), share)
    low = points[:, 2] < top
    if not path.plane[move] and low[0] != low[1]:
        z0, z1 = points[:, 2]
        points[0 if low[1] else 1] = points[0] + (top - z0) / (z1 - z0) * (points[1] - points[0])
    elif path.plane[move]:
        points = points[low]
    return shapely.LineString(points[:, :2]) if len(points) > 1 else shapely.MultiPoint(points[:, :2])


def lowest_points(path: Path) -> Floats:
    """The lowest Z of each move; for arcs with Z in their plane that of the whole circle."""
    found = np.minimum(path.start[:, 2], path.end[:, 2])
    for plane, column in ((2, 0), (3, 1)):
        found = np.where(path.plane == plane, np.minimum(found, path.centre[:, column] - path.radius), found)
    return found


def rapids_in_material(path: Path, labels: Labels, engagement: Engagement, area: Floats) -> list[Hit]:
    """Rapids that meet material, sideways or with the end face; ``value`` is the engaged face, mm^2."""
    samples = engagement.samples
    face = np.where(samples.vertical, engagement.volume, area)
    meets = path.rapid[samples.move] & (face > MEETS)
    meets &= labels.kind[samples.move] == Kind.RAPID
    moves, where = np.unique(samples.move[meets], return_inverse=True)
    worst = np.zeros(len(moves))
    np.maximum.at(worst, where, face[meets])
    return [Hit(int(move), float(value)) for move, value in zip(moves, worst, strict=True)]


def too_fast(path: Path, machine: Machine) -> list[Hit]:
    """Feed motion faster than an axis can go: ``value`` is the share of the axis limit, largest first."""
    step = path.end - path.start
    size = np.maximum(path.length, 1e-12)
    worst, name = np.zeros(path.count), np.full(path.count, " ")
    for k, letter in enumerate(NAMES):
        limit = machine.axis(letter).max_feed
        if limit is None:
            continue
        part = np.where(path.plane > 0, 1.0 if letter in "XY" else 0.0, np.abs(step[:, k]) / size)
        ratio = np.where(~path.rapid, path.feed * part / float(limit), 0.0)
        better = np.nan_to_num(ratio) > worst
        worst[better], name[better] = ratio[better], letter
    over = np.flatnonzero(worst > 1.0 + 1e-9)
    hits = [Hit(int(k), float(worst[k]), str(name[k])) for k in over]
    return sorted(hits, key=lambda hit: -hit.value)


def speeds(path: Path, job: Job) -> list[Hit]:
    """Spindle speeds outside the machine's range or above what is marked on the cutter; the first move of each."""
    found, seen = [], set()
    for k in np.flatnonzero(~path.rapid & ~np.isnan(path.speed)).tolist():
        speed, tool = float(path.speed[k]), int(path.tool[k])
        if (speed, tool) in seen:
            continue
        seen.add((speed, tool))
        marked = job.cutters[tool].most_speed
        if marked is not None and speed > marked:
            found.append(Hit(k, speed, f"marked {marked:g}"))
        elif job.most_speed is not None and speed > job.most_speed:
            found.append(Hit(k, speed, f"at most {job.most_speed:g}"))
        elif job.least_speed is not None and speed < job.least_speed:
            found.append(Hit(k, speed, f"at least {job.least_speed:g}"))
    return found
