"""What lash does to simple parts, in closed form, and what is left of it after ``gcodetool compensate``.

Before: the original is driven through the play of each axis and measured.  After: the real command rewrites it, the
result is driven through the same play, and the part has its intended size to within output rounding.

All values are derived from the friction-dominated model (the table stays put until the play is used up) and were
checked by a separate simulation; ISO 230-4's circular test measures the same effects.  Lash B, path radius R, both axes
alike where nothing else is said.  The model there is two-sided (half of the lash to each side), so positions are
compared after adding B / 2.
"""

from __future__ import annotations

import math
from collections.abc import Mapping

import numpy as np
import pytest
from numpy.typing import NDArray
from shapely.geometry import LineString, Point, Polygon

from gcodetool.lash.path import Follower
from gcodetool.motion.controller import Controller
from gcodetool.motion.moves import ORDER, Move, Setup
from gcodetool.program.blocks import blocks_of
from tests.case_files import run_command
from tests.lash.rewriting import assert_right

Points = NDArray[np.float64]
ROUNDING = 2e-4
"""Two last digits: split points and centres have four decimals."""
WAYS = pytest.mark.parametrize("way", ["G3", "G2"])
TABLE = pytest.mark.parametrize(
    ("radius", "b", "diameter", "flat", "high", "low", "diagonal"),
    [
        (10, 0.2, 19.800, 1.9900, 0.0788, -0.1000, -0.0010),
        (10, 0.1, 19.900, 1.4107, 0.0426, -0.0500, -0.00025),
        (10, 0.05, 19.950, 0.9987, 0.0224, -0.0250, -0.00006),
        (5, 0.1, 9.900, 0.9950, 0.0394, -0.0500, -0.0005),
        (5, 0.2, 9.800, 1.4000, 0.0695, -0.1000, -0.0020),
        (20, 0.2, 39.800, 2.8213, 0.0852, -0.1000, -0.0005),
        (25, 0.2, 49.800, 3.1559, 0.0868, -0.1000, -0.0004),
        (50, 0.2, 99.800, 4.4677, 0.0908, -0.1000, -0.0002),
        (3, 0.3, 5.700, 1.3077, 0.0762, -0.1500, -0.0075),
    ],
)
"""Out of round: 2R - B; sqrt(2RB - B^2); extremes of the radius; radius at 45 degrees sqrt(R^2 - B^2 / 2)."""


def driven(
    program: str | bytes,
    lash: Mapping[str, float],
    sides: Mapping[str, int] | None = None,
    place: tuple[float, float] = (0, 0),
) -> list[tuple[Move, Points]]:
    """Every move with the path that the table takes in it: points (n, 6), corners and samples of arcs."""
    data = program.encode() if isinstance(program, str) else program
    start = {"X": round(place[0] * 1e10), "Y": round(place[1] * 1e10)}
    at = [start.get(letter, 0) for letter in ORDER]
    follower = Follower({a.upper(): b for a, b in lash.items()}, {}, at, dict.fromkeys(ORDER, -1), sides)
    found = []
    for item in Controller(Setup(units="mm", start=start)).run(blocks_of(data)):
        if isinstance(item, Move):
            pieces = list(follower.drive(item))
            points = [piece.point(k / 720) for piece in pieces for k in range(0, 721, 720 if item.rapid else 1)]
            found.append((item, np.array(points)))
    return found


def fed(program: str | bytes, lash: Mapping[str, float], **options: object) -> Points:
    """X and Y of all feeds, in the two-sided form."""
    paths = [points for move, points in driven(program, lash, **options) if not move.rapid]  # type: ignore[arg-type]
    half = np.array([lash.get("x", 0.0), lash.get("y", 0.0)]) / 2
    return np.vstack(paths)[:, :2] + half


def compensated(program: str, lash: Mapping[str, float]) -> bytes:
    """The result of the real command; the oracle has agreed with it."""
    flags = [text for axis, b in lash.items() for text in ("--lash", f"{axis}={b}")]
    outcome = run_command("compensate", "-", "-q", *flags, program=program.encode())
    assert outcome.code == 0, outcome.messages
    assert_right(program, outcome.output, {axis: str(b) for axis, b in lash.items()}, seeds=range(2))
    return outcome.output


def after(program: str, lash: Mapping[str, float], told: Mapping[str, float] | None = None) -> Points:
    """X and Y of the feeds of the compensated program on the machine."""
    result = compensated(program, told or lash)
    paths = [points for move, points in driven(result, lash) if not move.rapid]
    return np.vstack(paths)[:, :2]


def laps(way: str, radius: float, count: int = 2) -> str:
    """Full circles from (R, 0) about (0, 0)."""
    return f"G21 G90\nG0 X0 Y0\nG0 X{radius} Y0\nF100\n" + f"{way} X{radius} Y0 I-{radius}\n" * count


def last_lap(way: str, radius: float, lash: Mapping[str, float]) -> Points:
    """The second lap, in the steady state."""
    moves = [points for move, points in driven(laps(way, radius), lash) if not move.rapid]
    return moves[-1][:, :2] + np.array([lash.get("x", 0.0), lash.get("y", 0.0)]) / 2


def flat_at_top(points: Points) -> float:
    """Length of the straight at the largest Y."""
    top = points[points[:, 1] > points[:, 1].max() - 1e-7, 0]
    return float(np.ptp(top))


def radius_at(points: Points, degrees: float) -> float:
    """Radius of a path in one direction from the centre, between the samples."""
    angles = np.degrees(np.arctan2(points[:, 1], points[:, 0])) % 360
    order = np.argsort(angles)
    return float(np.interp(degrees, angles[order], np.hypot(points[:, 0], points[:, 1])[order]))


def flat_of_wall(path: Points, reach: float) -> float:
    """Length of the straight at the top of the wall that a cutter leaves; ``reach`` is + outside the path, - inside.

    A place at that height is on the wall if the middle of the cutter comes as near as its radius and no nearer.
    """
    way = LineString(path)
    height = path[:, 1].max() + reach
    places = np.arange(-4, 4, 0.002)
    clear = np.array([abs(way.distance(Point(x, height)) - abs(reach)) <= 1e-5 for x in places])
    return float(np.ptp(places[clear]))


# ---- circles ---------------------------------------------------------------------------------------------------------


@WAYS
@TABLE
def test_a_circle_before(
    way: str, radius: float, b: float, diameter: float, flat: float, high: float, low: float, diagonal: float
) -> None:
    lap = last_lap(way, radius, {"x": b, "y": b})
    assert np.ptp(lap, axis=0) == pytest.approx([diameter, diameter], abs=5e-4)
    assert (
        flat_at_top(lap) == pytest.approx(flat, abs=1e-4) == pytest.approx(math.sqrt(2 * radius * b - b * b), abs=1e-4)
    )
    radii = np.hypot(lap[:, 0], lap[:, 1])
    assert (radii.max() - radius, radii.min() - radius) == pytest.approx((high, low), abs=1e-4)
    assert radius_at(lap, 45) - radius == pytest.approx(diagonal, abs=6e-5)
    assert math.sqrt(radius**2 - b**2 / 2) - radius == pytest.approx(diagonal, abs=6e-5)


@WAYS
@TABLE
def test_a_circle_after(
    way: str, radius: float, b: float, diameter: float, flat: float, high: float, low: float, diagonal: float
) -> None:
    path = after(laps(way, radius), {"x": b, "y": b})
    assert np.ptp(path, axis=0) == pytest.approx([2 * radius, 2 * radius], abs=ROUNDING)
    assert np.abs(np.hypot(path[:, 0], path[:, 1]) - radius).max() < ROUNDING


@pytest.mark.parametrize(
    ("bx", "by", "plus", "minus"),
    [(0.2, 0.0, 0.0705, -0.0710), (0.2, 0.1, 0.0348, -0.0359), (0.1, 0.1, -0.00025, -0.00025)],
)
@WAYS
def test_unequal_lash_shows_on_the_diagonals(way: str, bx: float, by: float, plus: float, minus: float) -> None:
    """R 10: about +-(Bx - By) / (2 sqrt 2), and the sign flips with the direction, unlike an error of squareness."""
    lash = {axis: b for axis, b in (("x", bx), ("y", by)) if b}
    lap = last_lap(way, 10, lash)
    first, second = (plus, minus) if way == "G3" else (minus, plus)
    assert [radius_at(lap, angle) - 10 for angle in (45, 135, 225, 315)] == pytest.approx([first, second] * 2, abs=1e-4)
    assert abs(plus) == pytest.approx((bx - by) / (2 * math.sqrt(2)), abs=1e-3)
    path = after(laps(way, 10), lash)
    assert np.abs(np.hypot(path[:, 0], path[:, 1]) - 10).max() < ROUNDING


@pytest.mark.parametrize(
    ("x", "y", "gap", "extent"),
    [(1, 1, 0.0, 19.8), (-1, 1, 0.2, 20.0), (1, -1, 0.2, 19.8), (-1, -1, 0.2 * math.sqrt(2), 20.0)],
)
def test_the_first_lap_closes_only_from_one_state(x: int, y: int, gap: float, extent: float) -> None:
    """R 10, B 0.2, counter-clockwise from (R, 0): it closes if both axes start seated as after a + move."""
    lash = {"x": 0.2, "y": 0.2}
    path = fed("G21 G90 F100\nG3 X10 Y0 I-10\n", lash, sides={"X": x, "Y": y}, place=(10, 0))
    assert math.dist(path[0], path[-1]) == pytest.approx(gap, abs=1e-9)
    assert np.ptp(path[:, 0]) == pytest.approx(extent, abs=1e-6)


def test_the_first_lap_closes_after() -> None:
    path = after(laps("G3", 10, count=1), {"x": 0.2, "y": 0.2})
    assert math.dist(path[0], path[-1]) < ROUNDING


# ---- what is left where the lash is another one ----------------------------------------------------------------------


@pytest.mark.parametrize(("told", "extent"), [(0.1, 19.9), (0.15, 19.95), (0.2, 20.0), (0.25, 20.05), (0.3, 20.1)])
def test_a_wrong_value_leaves_the_difference(told: float, extent: float) -> None:
    """True lash 0.2: the circle is that of lash B - Bc; told too much, the path jumps outward, 2R + (Bc - B)."""
    path = after(laps("G3", 10), {"x": 0.2, "y": 0.2}, {"x": told, "y": told})
    half = len(path) // 2
    assert np.ptp(path[half:], axis=0) == pytest.approx([extent, extent], abs=3 * ROUNDING)


# ---- parts of circles: holes and bosses ------------------------------------------------------------------------------


@pytest.mark.parametrize(("cutter", "flat", "high"), [(1.5, 1.833, 0.0769), (3.0, 1.661, 0.0744)])
def test_a_bored_hole_is_undersize_by_the_lash(cutter: float, flat: float, high: float) -> None:
    """Radius 10, B 0.2: 19.8 across X and Y; the flat is that of the smaller path, then a fillet of the cutter."""
    path = last_lap("G3", 10 - cutter, {"x": 0.2, "y": 0.2})
    wall = np.array(Polygon(path).buffer(cutter, quad_segs=2000).exterior.coords)
    assert np.ptp(wall, axis=0) == pytest.approx([19.8, 19.8], abs=1e-4)
    assert math.sqrt(2 * (10 - cutter) * 0.2 - 0.04) == pytest.approx(flat, abs=1e-3)
    assert flat_of_wall(path, cutter) == pytest.approx(flat, abs=0.03)
    assert np.hypot(wall[:, 0], wall[:, 1]).max() - 10 == pytest.approx(high, abs=1e-4)


@pytest.mark.parametrize("cutter", [1.5, 3.0])
def test_a_boss_is_undersize_by_the_lash(cutter: float) -> None:
    """Radius 10, B 0.2: 19.8 across X and Y, flat 1.990 whatever the cutter, largest radius +0.0788."""
    path = last_lap("G2", 10 + cutter, {"x": 0.2, "y": 0.2})
    wall = np.array(Polygon(path).buffer(-cutter, quad_segs=2000).exterior.coords)
    assert np.ptp(wall, axis=0) == pytest.approx([19.8, 19.8], abs=1e-4)
    assert flat_of_wall(path, -cutter) == pytest.approx(1.990, abs=0.03)
    assert np.hypot(wall[:, 0], wall[:, 1]).max() - 10 == pytest.approx(0.0788, abs=4e-4)


@pytest.mark.parametrize(
    ("way", "radius", "grow"), [("G3", 8.5, 1.5), ("G3", 7.0, 3.0), ("G2", 11.5, -1.5), ("G2", 13.0, -3.0)]
)
def test_holes_and_bosses_after(way: str, radius: float, grow: float) -> None:
    path = after(laps(way, radius), {"x": 0.2, "y": 0.2})
    part = np.array(Polygon(path[: len(path) // 2]).buffer(0).buffer(grow, quad_segs=2000).exterior.coords)
    assert np.ptp(part, axis=0) == pytest.approx([20.0, 20.0], abs=3 * ROUNDING)


# ---- straight sides --------------------------------------------------------------------------------------------------

SQUARES = {
    "CCW": "G21 G90\nG0 X0 Y0\nF100\nG1 X10 Y0\nY10\nX-10\nY-10\nX10\nY10\nX-10\nY-10\nX10\nY0\n",
    "CW": "G21 G90\nG0 X0 Y0\nF100\nG1 X10 Y0\nY-10\nX-10\nY10\nX10\nY-10\nX-10\nY10\nX10\nY0\n",
}


@pytest.mark.parametrize("way", SQUARES)
@pytest.mark.parametrize(("bx", "by"), [(0.2, 0.2), (0.1, 0.3)])
def test_a_square_is_smaller_by_each_axis_own_lash(way: str, bx: float, by: float) -> None:
    """Half side 10: each wall is reached moving outward; the sides stay straight and square."""
    lash = {"x": bx, "y": by}
    path = fed(SQUARES[way], lash)
    steady = path[len(path) // 2 :]
    assert np.ptp(steady, axis=0) == pytest.approx([20 - bx, 20 - by], abs=1e-9)
    edge = np.abs(np.abs(steady) - np.array([10 - bx / 2, 10 - by / 2])).min(axis=1)
    assert edge.max() < 1e-9
    assert np.ptp(after(SQUARES[way], lash), axis=0) == pytest.approx([20, 20], abs=ROUNDING)


@pytest.mark.parametrize(
    ("degrees", "piece", "offset"), [(45, 0.2000, 0.1414), (30, 0.3464, 0.1732), (60, 0.1155, 0.1000)]
)
def test_a_slanted_line_after_the_reversal_of_one_axis(degrees: float, piece: float, offset: float) -> None:
    """Y turns, X goes on: a level piece of B / tan(a), then the line parallel to itself, displaced by B cos(a)."""
    rise = 10 * math.tan(math.radians(degrees))
    program = f"G21 G90\nG0 X0 Y0\nF100\nG1 X10 Y{rise:.6f}\nX20 Y0\n"
    path = fed(program, {"y": 0.2})
    level = path[np.abs(path[:, 1] - path[:, 1].max()) < 1e-9]
    assert np.ptp(level[:, 0]) == pytest.approx(piece, abs=1e-4)
    across = np.array([math.sin(math.radians(degrees)), math.cos(math.radians(degrees))])
    legs = [(point - np.array([10.0, rise])) @ across for point in path[path[:, 0] > 10 + piece + 1e-6]]
    # the leg that went up was 0.1 low in Y; the one that comes down is 0.1 high: together B cos(a)
    assert 2 * np.mean(legs) == pytest.approx(offset, abs=1e-4)
    found = after(program, {"y": 0.2})
    down = [(point - np.array([10.0, rise])) @ across for point in found[found[:, 0] > 10 + 1e-6]]
    assert np.abs(down).max() < ROUNDING


@pytest.mark.parametrize(
    ("degrees", "bx", "by", "offset"),
    [(45, 0.2, 0.2, 0.0), (30, 0.2, 0.2, 0.0732), (60, 0.2, 0.2, 0.0732), (45, 0.2, 0.1, 0.0707)],
)
def test_out_and_back_on_one_line(degrees: float, bx: float, by: float, offset: float) -> None:
    """Both axes turn: the ways are abs(Bx sin(a) - By cos(a)) apart; nothing at 45 degrees with equal lash."""
    angle = math.radians(degrees)
    end = f"X{20 * math.cos(angle):.6f} Y{20 * math.sin(angle):.6f}"
    program = f"G21 G90\nG0 X-1 Y-1\nG0 X0 Y0\nF100\nG1 {end}\nX0 Y0\n"
    assert abs(bx * math.sin(angle) - by * math.cos(angle)) == pytest.approx(offset, abs=1e-4)
    lash = {"x": bx, "y": by}
    out, back = [points for move, points in driven(program, lash) if not move.rapid]
    across = np.array([-math.sin(angle), math.cos(angle)])
    middle = [(points[:, :2] @ across)[len(points) // 2 :] for points in (out[-2:], back[-2:])]
    assert abs(middle[0][-1] - middle[1][-1]) == pytest.approx(offset, abs=1e-4)
    assert np.abs(after(program, lash) @ across).max() < ROUNDING


# ---- drilled holes ---------------------------------------------------------------------------------------------------

LASH = {"x": 0.2, "y": 0.2}


def drilled(program: str | bytes, lash: Mapping[str, float]) -> list[tuple[float, float]]:
    """Where the holes are: X and Y at the end of each plunge."""
    plunges = [points[-1] for move, points in driven(program, lash) if not move.rapid and move.end[2] < 0]
    return [(point[0], point[1]) for point in plunges]


def drill(*places: tuple[float, float]) -> str:
    """A program that comes from (-50, -50) and drills the places in order."""
    holes = "".join(f"G0 X{x} Y{y}\nG1 Z-1 F100\nG0 Z5\n" for x, y in places)
    return f"G21 G90\nG0 Z5\nG0 X-60 Y-60\nG0 X-50 Y-50\n{holes}"


def test_holes_of_a_square_before_and_after() -> None:
    """A(0,0) B(30,0) C(30,30) D(0,30), then A and B again: an axis that does not move keeps its old side."""
    square = [(0, 0), (30, 0), (30, 30), (0, 30), (0, 0), (30, 0)]
    errors = [(-0.1, -0.1), (-0.1, -0.1), (-0.1, -0.1), (0.1, -0.1), (0.1, 0.1), (-0.1, 0.1)]
    program = drill(*square)
    found = np.array(drilled(program, LASH)) + 0.1
    assert found == pytest.approx(np.array(square) + np.array(errors), abs=1e-9)
    result = compensated(program, LASH)
    assert np.array(drilled(result, LASH)) == pytest.approx(np.array(square), abs=ROUNDING)


@pytest.mark.parametrize(
    ("places", "spacing"),
    [
        ([(0, 0), (30, 0)], 30.0),  # both reached in +
        ([(40, 0), (30, 0), (0, 0)], 30.0),  # both reached in -
        ([(40, 0), (0, 0), (30, 0)], 29.8),  # each reached moving away from the other
        ([(40, 0), (30, 0), (-9, 0), (0, 0)], 30.2),  # each reached moving towards the other
    ],
)
def test_two_holes_are_s_or_s_minus_or_plus_b_apart(places: list[tuple[float, float]], spacing: float) -> None:
    program = drill(*places)
    found = dict(zip(places, drilled(program, LASH), strict=True))
    assert found[30, 0][0] - found[0, 0][0] == pytest.approx(spacing, abs=1e-9)
    right = dict(zip(places, drilled(compensated(program, LASH), LASH), strict=True))
    assert right[30, 0][0] - right[0, 0][0] == pytest.approx(30.0, abs=ROUNDING)


def test_the_spread_over_the_diagonal() -> None:
    """One hole reached from four corners: a spread of B per axis, B sqrt 2 over the diagonal (0.283 for 0.2)."""
    corners = [(-20, -20), (0, 0), (20, -20), (0, 0), (20, 20), (0, 0), (-20, 20), (0, 0)]
    program = drill(*corners)
    found = np.array(drilled(program, LASH)[1::2])
    assert np.ptp(found, axis=0) == pytest.approx([0.2, 0.2], abs=1e-9)
    assert max(math.dist(a, b) for a in found for b in found) == pytest.approx(0.283, abs=5e-4)
    assert np.abs(np.array(drilled(compensated(program, LASH), LASH)[1::2])).max() < ROUNDING
