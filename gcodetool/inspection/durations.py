"""How long the job takes, with and without take-ups.

Two figures bound the truth.  At programmed feeds each move takes length / feed.  From stop to stop each move also
speeds up and slows down: with acceleration a and feed v a move of length s takes s/v + v/a, or 2 sqrt(s/a) where it
is too short to reach v (uniform acceleration, the trapezoid of any mechanics text).  A controller that looks ahead
lies between the two.
"""

from __future__ import annotations

import math

import numpy as np

from gcodetool.inspection.audit_records import Durations
from gcodetool.inspection.cutting_records import Floats, Path
from gcodetool.inspection.lash_path import turning_points
from gcodetool.machine import Machine

NAMES = "XYZ"
# a move along an axis by less than this share of its length does not ask that axis for speed
IDLE = 1e-6


def trapezoid(length: Floats, speed: Floats, acceleration: Floats) -> Floats:
    """Time from stop to stop, s; length in mm, speed in mm/s, acceleration in mm/s^2."""
    safe = np.maximum(acceleration, 1e-12)
    reaches = length * safe >= speed * speed
    return np.where(reaches, length / np.maximum(speed, 1e-12) + speed / safe, 2.0 * np.sqrt(length / safe))


def durations(path: Path, machine: Machine) -> Durations:
    """Times of all moves; what is not known is left out, and said."""
    said: list[str] = []
    rapid = _along(path, machine, "max_feed")
    if path.rapid.any() and np.isinf(rapid[path.rapid]).any():
        said.append("rapids whose axes have no max_feed in the machine sheet are not counted")
    speed = np.where(path.rapid, rapid, np.minimum(np.nan_to_num(path.feed, nan=math.inf), rapid)) / 60.0
    unknown = ~path.rapid & np.isnan(path.feed)
    if unknown.any():
        said.append("feed motion without a feed is not counted")
        speed = np.where(unknown, math.inf, speed)
    time = np.where(np.isinf(speed), 0.0, path.length / np.maximum(speed, 1e-12))
    acceleration = _along(path, machine, "acceleration")
    stops = None
    if path.count and not np.isinf(acceleration).any():
        stops = float(
            np.sum(
                np.where(np.isinf(speed), 0.0, trapezoid(path.length, np.nan_to_num(speed, posinf=1e9), acceleration))
            )
        )
    else:
        said.append("without accelerations in the machine sheet the time from stop to stop is not known")
    count, extra = _take_ups(path, machine)
    return Durations(
        float(time[~path.rapid].sum()), float(time[path.rapid].sum()), stops, count, extra, time, tuple(said)
    )


def _along(path: Path, machine: Machine, key: str) -> Floats:
    """The largest feed or acceleration along each move that keeps every axis within its own, or inf."""
    step = np.abs(path.end - path.start)
    size = np.maximum(path.length, 1e-12)
    found = np.full(path.count, math.inf)
    for k, letter in enumerate(NAMES):
        value = getattr(machine.axis(letter), key)
        share = np.where((path.plane == 1) & (k < 2), 1.0, step[:, k] / size)
        moving = share > IDLE
        if value is not None:
            found = np.where(moving, np.minimum(found, float(value) / np.maximum(share, IDLE)), found)
    return found


def _take_ups(path: Path, machine: Machine) -> tuple[int, float]:
    """Take-ups on feed motion and the time they add."""
    count, time = 0, 0.0
    for k, letter in enumerate(NAMES):
        axis = machine.axis(letter)
        if not axis.lash or not path.count:
            continue
        move, place = turning_points(path, k)
        step = np.sign(np.diff(place, prepend=float(path.start[0, k])))
        moving = np.flatnonzero(step != 0.0)
        turns = moving[1:][step[moving[1:]] != step[moving[:-1]]]
        turns = turns[~path.rapid[move[turns]]]
        count += len(turns)
        feed = float(machine.take_up_feed) if machine.take_up_feed else math.nan
        speed = (path.feed[move[turns]] if math.isnan(feed) else np.full(len(turns), feed)) / 60.0
        lash = np.full(len(turns), float(axis.lash))
        if axis.acceleration is None:
            time += float(np.nansum(lash / speed))
        else:
            time += float(np.nansum(trapezoid(lash, speed, np.full(len(turns), float(axis.acceleration)))))
    return count, time
