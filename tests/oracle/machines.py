"""Random concrete machines: what a program does not say and a rewriter cannot know."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import replace

import numpy as np

from tests.oracle.compare import TOLERANCE, Report, deviation
from tests.oracle.controller import run
from tests.oracle.machine import Machine, Motion, Point


def _point(rng: np.random.Generator, span: float) -> Point:
    return tuple(np.round(rng.uniform(-span, span, 6), 4).tolist())


def random_machine(rng: np.random.Generator, *, inch: bool = False, delete_blocks: bool = False) -> Machine:
    """Start, offsets, tool lengths, homes, tool changer and G98 habit drawn at random, in mm and degrees."""
    changer = {axis: float(np.round(rng.uniform(-80, 80), 4)) for axis in range(3) if rng.random() < 0.7}
    return Machine(
        start=_point(rng, 60),
        work=tuple(_point(rng, 200) for _ in range(9)),
        lengths={h: float(np.round(rng.uniform(1, 120), 4)) for h in range(1, 200)},
        home28=_point(rng, 250),
        home30=_point(rng, 250),
        inch=inch,
        delete_blocks=delete_blocks,
        tool_change=changer if rng.random() < 0.5 else {},
        level_at_entry=bool(rng.random() < 0.5),
    )


def with_probe(machine: Machine, program: bytes, rng: np.random.Generator) -> Machine:
    """The same machine with something to touch for every probe move of ``program`` (twenty at most)."""
    for _ in range(20):
        moves = (item for item in run(program, machine) if isinstance(item, Motion) and item.kind == "probe")
        miss = next((move for move in moves if not move.touched), None)
        if miss is None:
            break
        axis = max(miss.named)
        place = miss.start[axis] + rng.uniform(0.3, 0.9) * (miss.end[axis] - miss.start[axis])
        places = (*machine.probes.get(axis, ()), float(np.round(place, 4)))
        machine = replace(machine, probes={**machine.probes, axis: places})
    return machine


def random_sides(rng: np.random.Generator) -> tuple[float, ...]:
    """Start sides per axis: mostly on one flank or the other, sometimes inside the play."""
    return tuple(float(rng.integers(0, 2)) if rng.random() < 0.8 else float(rng.random()) for _ in range(6))


def worst_of(
    original: bytes,
    result: bytes,
    lash: Mapping[str, float],
    *,
    datum: Mapping[str, str] | None = None,
    inch: bool = False,
    seeds: Iterable[int] = range(8),
    delete: tuple[bool, ...] = (False, True),
    tolerance: float = TOLERANCE,
    settle: float = 0.5,
    approach: float = 0.0,
    allow_mismatch: bool = False,
) -> Report:
    """Worst report over random machines; block delete is tried each way in ``delete`` if the program has any."""
    report = Report()
    for seed in seeds:
        for switch in delete if b"/" in original else delete[:1]:
            rng = np.random.default_rng(seed)
            machine = with_probe(random_machine(rng, inch=inch, delete_blocks=switch), original, rng)
            report = report.merge(deviation(
                original, result, lash, machine, datum=datum, sides=random_sides(rng), tolerance=tolerance,
                settle=settle, approach=approach, allow_mismatch=allow_mismatch, disturb=seed,
            ))  # fmt: skip
    return report
