"""Random programs against a height map of pixels that was written only for this: angles, labels, and the volume
removed."""

from __future__ import annotations

import math
import random

import numpy as np
import pytest

from gcodetool.inspection.cutting_records import Label
from gcodetool.inspection.outlines import box
from tests.audit.conftest import Seen, look, volume
from tests.audit.raster import HeightMap, Point, steps

Moves = list[tuple[str, Point, tuple[float, float] | None]]
DIAMETER = 3.0
RADIUS = 0.5 * DIAMETER
FIRST_LINE = 4
LOW, HIGH = (0.0, 0.0), (20.0, 20.0)
START = (0.0, 0.0, 5.0)
PIXEL = 0.05
# heights at which both are compared lie this far above the tip
ABOVE = 0.05


def random_program(  # noqa: C901 - one kind of move after the other
    seed: int, count: int, levels: tuple[float, ...]
) -> tuple[str, Moves]:
    """Lines, ramps, arcs, whole circles and jumps at some levels, partly outside of the stock."""
    rnd = random.Random(seed)
    moves: Moves = []
    text = ["G21 G90 G17", "S10000 M3", "F300"]
    here = START

    def go(kind: str, end: Point, centre: tuple[float, float] | None = None) -> None:
        nonlocal here
        if end == here and centre is None:
            return
        moves.append((kind, end, centre))
        word = f"{kind} X{end[0]:.4f} Y{end[1]:.4f} Z{end[2]:.8f}"
        text.append(word if centre is None else f"{word} I{centre[0] - here[0]:.5f} J{centre[1] - here[1]:.5f}")
        here = end

    def somewhere() -> tuple[float, float]:
        return round(rnd.uniform(-2, 22), 3), round(rnd.uniform(-2, 22), 3)

    def arc(depth: float) -> None:
        centre = round(here[0] + rnd.uniform(-6, 6), 3), round(here[1] + rnd.uniform(-6, 6), 3)
        radius = math.dist(here[:2], centre)
        angle = math.atan2(here[1] - centre[1], here[0] - centre[0]) + rnd.uniform(-4, 4)
        end = round(centre[0] + radius * math.cos(angle), 4), round(centre[1] + radius * math.sin(angle), 4)
        if radius > 0.3 and math.dist(end, here[:2]) > 0.05:
            go(rnd.choice(["G2", "G3"]), (*(here[:2] if rnd.random() < 0.2 else end), depth), centre)

    for level in levels:
        depth = level
        go("G0", (*here[:2], 5.0))
        go("G0", (*somewhere(), 5.0))
        go("G1", (*here[:2], depth))
        for _ in range(count):
            choice = rnd.random()
            if choice < 0.55:
                go("G1", (*somewhere(), depth))
            elif choice < 0.65:
                depth -= rnd.uniform(0.1, 0.5)
                go("G1", (*somewhere(), depth))
            elif choice < 0.95:
                arc(depth)
            else:
                go("G0", (*here[:2], 5.0))
                go("G0", (*somewhere(), 5.0))
                go("G1", (*here[:2], depth))
    return "\n".join(text) + "\nM30\n", moves


def compare(seen: Seen, moves: Moves) -> tuple[np.ndarray, np.ndarray, float]:
    """For each sample the share of angles that differ, the engaged angles of both in degrees, and the volume by
    pixels."""
    samples, slices = seen.engagement.samples, seen.engagement.slices
    starts = np.searchsorted(slices.sample, np.arange(len(samples.move) + 1))
    number = seen.path.line[samples.move] - FIRST_LINE
    field = HeightMap(LOW, HIGH, 0.0, PIXEL)
    differ, engaged, taken, k = [], [], 0.0, 0
    for step in steps(moves, START, 0.04):
        while k < len(number) and (number[k], samples.share[k]) <= (step.move, step.share):
            if number[k] == step.move and not samples.vertical[k] and not step.rapid:
                at = (samples.x[k], samples.y[k], samples.z[k])
                phi, there = field.engaged(at, (samples.fx[k], samples.fy[k]), RADIUS, ABOVE)
                mine = np.zeros(len(phi), bool)
                for row in range(starts[k], starts[k + 1]):
                    if slices.low[row] <= samples.z[k] + ABOVE <= slices.high[row]:
                        mine |= (phi > slices.first[row]) & (phi < slices.last[row])
                differ.append(np.mean(mine != there))
                engaged.append((180 * np.mean(mine), 180 * np.mean(there)))
            k += 1
        if not step.rapid:
            taken += field.cut(step.at, RADIUS)
    return np.array(differ), np.array(engaged), taken


@pytest.mark.parametrize("seed", [1, 2, 3])
def test_random_programs(seed: int) -> None:
    check(seed, 18)


@pytest.mark.long
@pytest.mark.parametrize("seed", range(10, 40))
def test_more_random_programs(seed: int) -> None:
    check(seed, 25)


def check(seed: int, count: int) -> None:
    program, moves = random_program(seed, count, (-1.0, -2.0))
    seen = look(program, DIAMETER, box(*LOW, *HIGH))
    differ, engaged, taken = compare(seen, moves)
    assert len(differ) > 300
    # a pixel is 2 degrees of this circle, so a few of the 180 angles at the ends of an interval may differ
    assert np.mean(differ) < 0.015
    assert np.quantile(differ, 0.95) < 0.06
    assert np.mean(engaged[:, 1]) == pytest.approx(np.mean(engaged[:, 0]), rel=0.02)
    assert volume(seen) == pytest.approx(taken, rel=0.015)
    assert len(set(seen.labels.by_sample.tolist())) == len(Label)


def test_the_raster_itself_measures_a_slot_and_a_half_cut() -> None:
    """The reference is checked too: a slot 10 long and 1 deep, then half of it again."""
    field = HeightMap(LOW, HIGH, 0.0, PIXEL)
    moves: Moves = [("G1", (5.0, 10.0, -1.0), None), ("G1", (15.0, 10.0, -1.0), None)]
    taken = sum(field.cut(step.at, RADIUS) for step in steps(moves, (5.0, 10.0, -1.0), 0.02))
    assert taken == pytest.approx(10 * DIAMETER + math.pi * RADIUS**2, rel=0.01)
    phi, there = field.engaged((10.0, 10.0 + RADIUS, -1.0), (1.0, 0.0), RADIUS, ABOVE)
    assert np.degrees(phi[there].max()) == pytest.approx(90.0, abs=3.0)
    assert np.degrees(phi[there].min()) < 3.0
