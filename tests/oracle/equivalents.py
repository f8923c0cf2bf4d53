"""One set of moves spelled in four ways: mm and inch, absolute and incremental."""

from __future__ import annotations

import random
from decimal import Decimal

from tests.oracle.dialect import random_dialect
from tests.oracle.frames import FEEDS, X, Y, Z
from tests.oracle.writer import Writer

GRID = Decimal("0.0254")
"""mm: a whole number of digits both in mm (4 decimals) and in inch (3 decimals)."""


def equivalents(rng: random.Random, operations: int = 5) -> dict[str, bytes]:
    """The same moves in mm and inch, absolute and incremental: keys ``mm-absolute`` to ``inch-incremental``.

    All points lie on a grid that both units write exactly, arcs start and end on 3-4-5 points, so the four programs ask
    for the same path to the last bit of rounding.
    """
    seed, hand = rng.random(), random_dialect(rng)
    out = {}
    for inch in (False, True):
        for incremental in (False, True):
            writer = Writer(random.Random(rng.random()), hand, inch=inch, decimals=4)
            _exact_moves(random.Random(seed), writer, operations, incremental)
            out[f"{'inch' if inch else 'mm'}-{'incremental' if incremental else 'absolute'}"] = writer.text()
    return out


def _exact_moves(rng: random.Random, writer: Writer, operations: int, incremental: bool) -> None:
    def point(span: int) -> Decimal:
        return GRID * rng.randint(-span, span)

    writer.codes(200 if writer.inch else 210, 900, 170, 940)
    writer.move(0, {Z: GRID * 400})
    writer.move(0, {X: point(900), Y: point(900)})
    if incremental:
        writer.codes(910)
        writer.incremental = True
    for _ in range(operations):
        writer.move(0, {X: point(900), Y: point(900)})
        writer.move(0, {Z: GRID * rng.randint(20, 80)})
        writer.move(1, {Z: -GRID * rng.randint(5, 90)}, rng.choice(FEEDS))
        for _ in range(rng.randint(2, 8)):
            if rng.random() < 0.5:
                axes = rng.sample([X, Y, Z], rng.randint(1, 3))
                writer.move(1, {axis: writer.at(axis) + point(300) for axis in sorted(axes)}, rng.choice(FEEDS))
            else:
                _exact_arc(rng, writer)
        writer.move(0, {Z: GRID * 400})
    writer.line("M30")


def _exact_arc(rng: random.Random, writer: Writer) -> None:
    writer.use_plane(rng.choice([17, 17, 18, 19]))
    k = rng.randint(1, 120)
    circle = [(5, 0), (4, 3), (3, 4), (0, 5), (-3, 4), (-4, 3), (-5, 0), (-4, -3), (-3, -4), (0, -5), (3, -4), (4, -3)]
    begin, end = rng.choice(circle), rng.choice(circle)
    step = GRID * k
    centre = -begin[0] * step, -begin[1] * step
    way = (end[0] - begin[0]) * step, (end[1] - begin[1]) * step
    clockwise = rng.random() < 0.5
    rise = GRID * rng.randint(-60, 60) if rng.random() < 0.3 else None
    radius = None
    if any(way) and rng.random() < 0.4:
        cross = begin[0] * end[1] - begin[1] * end[0]
        short = cross == 0 or (cross > 0) != clockwise
        radius = 5 * step if short else -5 * step
    turns = 1 if radius is not None else rng.choice([1, 1, 1, 2])
    writer.arc(clockwise, centre, way, radius=radius, rise=rise, turns=turns)
