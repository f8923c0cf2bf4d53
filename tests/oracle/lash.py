"""The play operator on whole machine paths: commanded motion in, true tool path out.

One axis with lash B (Krasnosel'skii & Pokrovskii 1989): command less actual stays in [low, high], which is [0, B] when
zero was set on the minus side and [-B, 0] when it was set on the plus side; between samples of a monotone command
``a' = min(max(a, c - low'), c - high')`` is exact.  Lines are taken from end to end, with the points where an axis
engages added so that the polyline is the true path; arcs are taken sample by sample, with such points added too.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from tests.oracle.arcs import Array, sample_arc
from tests.oracle.machine import AXES, Event, Item, Motion, Point

Bounds = tuple[tuple[float, float], ...]


@dataclass(frozen=True, slots=True)
class Stroke:
    """True path of one commanded move: ``points`` (n >= 1, 6), first and last included."""

    motion: Motion
    points: Array


Track = list[Stroke | Event]


def play_bounds(lash: Mapping[str, float], datum: Mapping[str, str] | None = None) -> Bounds:
    """(low, high) of command less actual for the six axes; axis letters in either case, datum ``-`` if not named."""
    sizes = {name.upper(): value for name, value in lash.items()}
    sides = {name.upper(): side for name, side in (datum or {}).items()}
    if sizes.keys() - set(AXES) or sides.keys() - set(AXES) or any(value < 0 for value in sizes.values()):
        raise ValueError("lash and datum are given by axis letter, lash is not negative")
    return tuple((-sizes.get(a, 0.0), 0.0) if sides.get(a, "-") == "+" else (0.0, sizes.get(a, 0.0)) for a in AXES)


def play(commands: Iterable[float], actual: float, low: float, high: float) -> list[float]:
    """Actual position after each command; exact where the command is monotone between them."""
    out = []
    for command in commands:
        actual = min(max(actual, command - high), command - low)
        out.append(actual)
    return out


def flank(command: Sequence[float], bounds: Bounds, sides: Sequence[float]) -> Point:
    """Actual start point for side values from 0 (minus flank) to 1 (plus flank), anything between is in the play."""
    return tuple(c - low - side * (high - low) for c, (low, high), side in zip(command, bounds, sides, strict=True))


def drive(
    items: Iterable[Item], bounds: Bounds, actual: Sequence[float], disturb: np.random.Generator | None = None
) -> Track:
    """True path of every move, from the true start point ``actual``; events pass through.

    ``disturb``: a tool change leaves every axis anywhere within its play (a hand or the changer has pushed it).
    """
    track: Track = []
    here = tuple(actual)
    command: Point | None = None
    for item in items:
        if isinstance(item, Motion):
            points = _stroke(item, bounds, here)
            here = tuple(points[-1].tolist())
            command = item.end
            track.append(Stroke(item, points))
        else:
            if disturb is not None and item.what == "tool change" and command is not None:
                here = flank(command, bounds, disturb.random(6).tolist())
            track.append(item)
    return track


def _stroke(motion: Motion, bounds: Bounds, here: Point) -> Array:
    if motion.arc is None:
        return _line(motion, bounds, here)
    commands = sample_arc(motion.arc, motion.start, motion.end)
    if all(low == high for low, high in bounds) and here == motion.start:
        return commands
    commands = _with_kinks(commands, _follow(commands, bounds, here))
    return _follow(commands, bounds, here)


def _follow(commands: Array, bounds: Bounds, here: Point) -> Array:
    """True points at command samples."""
    out = np.empty_like(commands)
    for axis, (low, high) in enumerate(bounds):
        out[:, axis] = [here[axis], *play(commands[1:, axis].tolist(), here[axis], low, high)]
    return out


def _with_kinks(commands: Array, actual: Array) -> Array:
    """Add the command at which an axis takes up its play inside a step, so that no corner of the path is cut."""
    asked, made = np.abs(np.diff(commands, axis=0)), np.abs(np.diff(actual, axis=0))
    steps, axes = np.nonzero((made > 0) & (made < asked - 1e-9))
    share = 1 - made[steps, axes] / asked[steps, axes]
    order = np.lexsort((share, steps))
    steps, share = steps[order], share[order, None]
    extra = commands[steps] + share * (commands[steps + 1] - commands[steps])
    return np.insert(commands, steps + 1, extra, axis=0)


def _line(motion: Motion, bounds: Bounds, here: Point) -> Array:
    shares = sorted({1.0, *_engagements(motion, bounds, here)})
    rows = [here]
    for share in shares:
        rows.append(tuple(
            min(max(a, c - high), c - low)
            for a, c, (low, high) in zip(here, _at(motion, share), bounds, strict=True)
        ))  # fmt: skip
    return np.array(rows)


def _at(motion: Motion, share: float) -> Iterator[float]:
    for begin, end in zip(motion.start, motion.end, strict=True):
        yield end if share == 1.0 else begin + share * (end - begin)


def _engagements(motion: Motion, bounds: Bounds, here: Point) -> Iterator[float]:
    """Shares of the move, inside it, at which an axis takes up its play."""
    for begin, end, a, (low, high) in zip(motion.start, motion.end, here, bounds, strict=True):
        if end != begin:
            share = (a + (high if end > begin else low) - begin) / (end - begin)
            if 0.0 < share < 1.0:
                yield share
