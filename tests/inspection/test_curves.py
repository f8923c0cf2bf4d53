"""Distances between paths: closed forms, and a brute-force measure over dense samples."""

from __future__ import annotations

import itertools
import math
import random

import numpy as np
import pytest
from scipy.spatial.distance import directed_hausdorff

from gcodetool.inspection.curves import by_window, gap, is_still, nearest, polyline, stray
from gcodetool.lash.path import Piece
from gcodetool.motion.arcs import Arc, from_centre

PLANE = (0, 1)


def six(*values: float) -> tuple[float, ...]:
    """A point with the axes that are not given at 0."""
    return (*values, *(0.0,) * (6 - len(values)))


def line(begin: tuple[float, ...], end: tuple[float, ...], number: int = 1) -> Piece:
    """A straight feed piece."""
    return Piece(False, number, six(*begin), six(*end), None, PLANE)


def chain(*points: tuple[float, ...]) -> list[Piece]:
    """A polyline; piece k has line number k."""
    return [line(a, b, k) for k, (a, b) in enumerate(itertools.pairwise(points), 1)]


def arc(
    begin: tuple[float, float], end: tuple[float, float], centre: tuple[float, float], clockwise: bool = False
) -> Piece:
    """An arc in XY."""
    found: Arc = from_centre(begin, end, centre, clockwise, begin == end)
    return Piece(False, 1, six(*begin), six(*end), found, PLANE)


# ---- the same path ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "path",
    [
        chain((0, 0), (10, 0), (10, 5), (0, 0)),
        [arc((10, 0), (10, 0), (0, 0))],
        [arc((10, 0), (0, 10), (0, 0)), line((0, 10), (0, 0))],
        [line((0, 0), (0, 0))],
        [],
    ],
)
def test_a_path_is_at_no_distance_from_itself(path: list[Piece]) -> None:
    assert gap(path, path).distance == pytest.approx(0.0, abs=1e-12)


def test_how_a_line_or_an_arc_is_cut_does_not_matter() -> None:
    whole, cut = chain((0, 0), (10, 0)), chain((0, 0), (3, 0), (3, 0), (7, 0), (10, 0))
    assert gap(whole, cut).distance == pytest.approx(0.0, abs=1e-9)
    circle = [arc((10, 0), (10, 0), (0, 0))]
    halves = [arc((10, 0), (-10, 0), (0, 0)), arc((-10, 0), (10, 0), (0, 0))]
    quarters = [arc((10, 0), (0, 10), (0, 0)), arc((0, 10), (-10, 0), (0, 0)), halves[1]]
    for pieces in (halves, quarters):
        assert gap(circle, pieces).distance == pytest.approx(0.0, abs=2e-5)


# ---- closed forms ----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("off", [0.0001, 0.01, 0.3])
@pytest.mark.parametrize("axis", [0, 1, 2, 3])
def test_a_path_beside_another_is_at_its_offset(off: float, axis: int) -> None:
    points = [six(0, 0, 0), six(10, 3, 0), six(12, -4, 1), six(5, 5, 5)]
    moved = [tuple(v + off * (k == axis) for k, v in enumerate(p)) for p in points]
    found = gap(chain(*points), chain(*moved))
    # at the ends the whole offset shows; along the lines only what is across them
    assert found.distance == pytest.approx(off, rel=1e-6)
    assert found.by_axis[axis] == pytest.approx(off, rel=1e-6)


@pytest.mark.parametrize("off", [0.001, 0.05, 0.3])
def test_concentric_circles(off: float) -> None:
    one, two = [arc((10, 0), (10, 0), (0, 0))], [arc((10 + off, 0), (10 + off, 0), (0, 0))]
    assert gap(one, two).distance == pytest.approx(off, rel=1e-3, abs=2e-4)


def test_a_missing_piece_is_seen_from_the_other_side() -> None:
    """Each path to the other: a spike that is left out is no gap of the shorter path."""
    spiked, plain = chain((0, 0), (5, 0), (5, 2), (5, 0), (10, 0)), chain((0, 0), (10, 0))
    assert gap(spiked, plain).distance == pytest.approx(2.0, rel=1e-3)
    assert gap(plain, spiked).distance == pytest.approx(2.0, rel=1e-3)


def test_a_path_against_a_point() -> None:
    assert gap(chain((0, 0), (3, 4)), []).distance == pytest.approx(5.0)
    assert gap([], []).distance == 0.0


def test_a_circle_left_out_is_not_overlooked() -> None:
    """It begins and ends where the path goes on anyway."""
    before, after = chain((0, 0), (10, 0)), chain((10, 0), (20, 0))
    with_circle = [*before, arc((10, 0), (10, 0), (10, 5)), *after]
    assert gap(with_circle, [*before, *after]).distance == pytest.approx(10.0, rel=1e-3)
    assert gap([*before, *after], with_circle).distance == pytest.approx(10.0, rel=1e-3)


def test_the_lines_of_the_widest_place_are_told() -> None:
    one = chain((0, 0), (10, 0), (20, 0), (30, 0))
    two = [*one[:1], line((10, 0), (15, 0.4), 7), line((15, 0.4), (20, 0), 8), *one[2:]]
    found = gap(one, two)
    assert found.distance == pytest.approx(0.4, rel=1e-3)
    assert found.lines[0] == 2 and found.lines[1] in (7, 8)


# ---- brute force -----------------------------------------------------------------------------------------------------


def dense(pieces: list[Piece], step: float) -> np.ndarray:
    """Points along a path."""
    out = []
    for piece in pieces:
        long = math.dist(piece.start, piece.end) if piece.arc is None else abs(piece.arc.sweep) * piece.arc.start_radius
        out += [piece.point(k / max(2, math.ceil(long / step))) for k in range(max(2, math.ceil(long / step)) + 1)]
    return np.array(out)


def wander(rng: random.Random, count: int) -> list[Piece]:
    """Lines and arcs in a row that go on to the right, so that no part comes near another."""
    pieces: list[Piece] = []
    here = (0.0, 0.0)
    for _ in range(count):
        there = (here[0] + rng.uniform(2, 6), here[1] + rng.uniform(-3, 3))
        if rng.random() < 0.5:
            pieces.append(line(here, there))
        else:
            middle = ((here[0] + there[0]) / 2, (here[1] + there[1]) / 2)
            pieces.append(arc(here, there, middle, rng.random() < 0.5))
        here = there
    return pieces


def nudged(pieces: list[Piece], rng: random.Random, by: float) -> list[Piece]:
    """The same pieces with every one moved a little as a whole."""
    out = []
    for piece in pieces:
        aside = (rng.uniform(-by, by), rng.uniform(-by, by))
        start, end = (six(p[0] + aside[0], p[1] + aside[1]) for p in (piece.start, piece.end))
        moved = piece.arc
        if moved is not None:
            centre = (moved.centre[0] + aside[0], moved.centre[1] + aside[1])
            moved = Arc(centre, moved.start_radius, moved.end_radius, moved.start_angle, moved.sweep)
        out.append(piece._replace(start=start, end=end, arc=moved))
    return out


@pytest.mark.parametrize("by", [0.0004, 0.02, 0.2])
@pytest.mark.parametrize("seed", range(3))
def test_gap_against_the_hausdorff_distance_of_dense_samples(seed: int, by: float) -> None:
    """scipy's directed distance both ways; the gap may be a little wider (it is taken in order), never narrower."""
    rng = random.Random(seed)
    one = wander(rng, 12)
    two = nudged(one, rng, by)
    a, b = dense(one, 0.02), dense(two, 0.02)
    true = max(directed_hausdorff(a, b)[0], directed_hausdorff(b, a)[0])
    for found in (gap(one, two).distance, by_window(one, two).distance):
        assert true - 0.021 <= found <= true + 0.021 + by


def test_polylines_keep_the_chord_error() -> None:
    points, owner = polyline([arc((10, 0), (10, 0), (0, 0))], 1e-3)
    middles = (points[1:, :2] + points[:-1, :2]) / 2
    assert 10 - np.hypot(middles[:, 0], middles[:, 1]).min() <= 1e-3
    assert set(owner.tolist()) == {0}


# ---- single places ---------------------------------------------------------------------------------------------------


def test_nearest_place_of_a_path() -> None:
    path = chain((0, 0), (10, 0), (10, 10))
    found = nearest(path, six(12, 5), 7)
    assert found.distance == pytest.approx(2.0) and found.by_axis[0] == pytest.approx(2.0) and found.lines == (2, 7)


def test_stray_measures_the_corners_of_the_second_path() -> None:
    assert stray(chain((0, 0), (10, 0)), chain((0, 0), (5, 1), (10, 0))).distance == pytest.approx(1.0)


@pytest.mark.parametrize(
    ("piece", "still"),
    [
        (line((1, 2), (1, 2)), True),
        (line((1, 2), (1, 2.001)), False),
        (line((1, 2, 0, 5), (1, 2, 0, 6)), False),
        (arc((10, 0), (10, 0), (0, 0)), False),
        (arc((3, 4), (3, 4), (3, 4)), True),
    ],
)
def test_what_counts_as_standing_still(piece: Piece, still: bool) -> None:
    assert is_still(piece) is still
