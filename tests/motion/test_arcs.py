"""Circle geometry against the worked examples of NISTIR 6556 (3.5.3, appendix C) and against dense sampling."""

from __future__ import annotations

import itertools
import math

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from gcodetool.motion.arcs import TURN, Arc, ArcError, from_centre, from_radius
from tests.motion.driving import mm, moves

DEGREES = math.pi / 180


def arc_of(program: str) -> Arc:
    """The last arc of a program, in machine coordinates."""
    return [move.arc for move in moves(program) if move.arc][-1]


# ---- worked examples -------------------------------------------------------------------------------------------------


def test_the_centre_example() -> None:
    """NISTIR 6556 3.5.3.2: from (7,7), centre (10,11), radius 5; sweep derived: 143.130 degrees, X turns at (5,11)."""
    arc = arc_of("G21 G0 X7 Y7\nG17 G2 X10 Y16 I3 J4 Z9")
    assert arc.centre == pytest.approx((10, 11))
    assert (arc.start_radius, arc.end_radius) == pytest.approx((5, 5))
    assert arc.sweep / DEGREES == pytest.approx(-143.130, abs=5e-4)
    ((share, axis),) = arc.quadrants()
    assert axis == 0 and arc.point(share) == pytest.approx((5, 11))


def test_the_radius_arc_of_the_table_10_session() -> None:
    """NISTIR 6556 table 10: from (3,1) to (0,1), R 7.01, clockwise; centre printed as (1.5, 7.8476), digits derived."""
    arc = arc_of("G21 G1 X3 Y1 F20\nG2 X0 R 7.01 Z0.5")
    assert arc.centre == pytest.approx((1.5, 7.84763), abs=5e-6)
    assert arc.sweep / DEGREES == pytest.approx(-24.7114, abs=5e-5)
    assert math.hypot(arc.sweep * 7.01, 0.5) == pytest.approx(3.06444, abs=5e-6)


@pytest.mark.parametrize(
    ("start", "block", "centre", "radius", "sweep"),
    [
        ("X16 Y2.5", "G3 X13.5 Y0 I-2.5", (13.5, 2.5), 2.5, 270),
        ("X32.5 Y5", "G3 J-2.5", (32.5, 2.5), 2.5, 360),
        ("X57.5 Y5", "G3 X57.5 J-2.5", (57.5, 2.5), 2.5, 360),
        ("X64 Y4", "G2 X69 R4", (66.5, 0.8775), 4, -77.364),
        ("X79.5 Y0", "G2 Y5 J2.5", (79.5, 2.5), 2.5, -180),
    ],
)
def test_arcs_of_the_lettering_example(
    start: str, block: str, centre: tuple[float, float], radius: float, sweep: float
) -> None:
    """NISTIR 6556 appendix C.1; centres and sweeps derived from its blocks."""
    arc = arc_of(f"G21 G0 {start}\n{block}")
    assert arc.centre == pytest.approx(centre, abs=5e-5)
    assert arc.start_radius == pytest.approx(radius) and arc.end_radius == pytest.approx(radius)
    assert arc.sweep / DEGREES == pytest.approx(sweep, abs=5e-4)


def test_the_top_of_the_flat_arc() -> None:
    """The same appendix: G2 X69 R4 from (64,4) rises to Y 4.8775 (derived)."""
    arc = arc_of("G21 G0 X64 Y4\nG2 X69 R4")
    ((share, axis),) = arc.quadrants()
    assert axis == 1 and arc.point(share)[1] == pytest.approx(4.8775, abs=5e-5)


@pytest.mark.parametrize(
    ("plane", "block", "axes"),
    [("G17", "X10 I5", "XY"), ("G18", "Z10 K5", "ZX"), ("G19", "Y10 J5", "YZ")],
)
def test_clockwise_is_seen_from_the_positive_end_of_the_normal_axis(plane: str, block: str, axes: str) -> None:
    """NISTIR 6556 3.5.3: G2 from the plane's first axis -r to +r goes over the positive second axis."""
    (move,) = moves(f"G21 {plane} G2 {block}")
    assert move.arc is not None and move.arc.point(0.5) == pytest.approx((5, 5))
    assert "".join("XYZ"[k] for k in move.axes) == axes


@pytest.mark.parametrize(
    ("block", "sweep"),
    [("G3 X0 Y10 R10", 90), ("G3 X0 Y10 R-10", 270), ("G2 X0 Y10 R10", -90), ("G2 X0 Y10 R-10", -270)],
)
def test_a_negative_radius_asks_for_the_long_way(block: str, sweep: float) -> None:
    """NISTIR 6556 3.5.3.1; from (10, 0)."""
    assert arc_of(f"G21 G0 X10\n{block}").sweep / DEGREES == pytest.approx(sweep)


@pytest.mark.parametrize(("turns", "sweep"), [("", 90), ("P1", 90), ("P2", 450), ("P3", 810)])
def test_turns(turns: str, sweep: float) -> None:
    assert arc_of(f"G21 G0 X10\nG3 X0 Y10 I-10 {turns}").sweep / DEGREES == pytest.approx(sweep)


def test_an_end_on_the_start_is_a_full_circle() -> None:
    """NISTIR 6556 3.5.3.2."""
    assert arc_of("G21 G0 X10\nG2 X10 Y0 I-10").sweep == pytest.approx(-TURN)
    assert arc_of("G21 G0 X10\nG3 I-10").sweep == pytest.approx(TURN)


def test_absolute_centres() -> None:
    """G90.1 gives the centre itself, G91.1 its distance from the start (from memory)."""
    assert arc_of("G21 G90.1 G0 X10\nG3 X0 Y10 I0 J0").centre == pytest.approx((0, 0))
    assert arc_of("G21 G91.1 G0 X10\nG3 X0 Y10 I-10 J0").centre == pytest.approx((0, 0))


def test_g91_leaves_the_meaning_of_centres_alone() -> None:
    """NISTIR 6556 3.5.13: I, J and K are always incremental, whatever the distance mode."""
    (_, move) = moves("G21 G0 X10\nG91 G3 X-10 Y10 I-10")
    assert move.arc is not None and move.arc.centre == pytest.approx((0, 0))
    assert mm(move.end) == pytest.approx((0, 10, 0))


# ---- properties ------------------------------------------------------------------------------------------------------

ANGLE = st.floats(-math.pi, math.pi)
CENTRE = st.tuples(st.floats(-100, 100), st.floats(-100, 100))


@given(CENTRE, st.floats(0.1, 200), ANGLE, st.floats(0.01, TURN - 0.01), st.booleans())
def test_an_arc_by_centre_starts_and_ends_where_it_should(
    centre: tuple[float, float], radius: float, first: float, sweep: float, clockwise: bool
) -> None:
    turn = -sweep if clockwise else sweep
    start, end = (
        (centre[0] + radius * math.cos(angle), centre[1] + radius * math.sin(angle)) for angle in (first, first + turn)
    )
    arc = from_centre(start, end, centre, clockwise, closed=False)
    assert arc.sweep == pytest.approx(turn, abs=1e-7)
    assert arc.point(0.0) == pytest.approx(start, abs=1e-7) and arc.point(1.0) == pytest.approx(end, abs=1e-6)


@given(CENTRE, CENTRE, st.floats(1.001, 20), st.booleans(), st.booleans())
def test_an_arc_by_radius_has_its_radius_and_takes_the_way_asked_for(
    start: tuple[float, float], end: tuple[float, float], share: float, clockwise: bool, long: bool
) -> None:
    chord = math.dist(start, end)
    assume(chord > 0.01)
    radius = 0.5 * chord * share
    arc = from_radius(start, end, -radius if long else radius, clockwise)
    assert arc.start_radius == pytest.approx(radius, rel=1e-6) and arc.end_radius == pytest.approx(radius, rel=1e-6)
    assert (abs(arc.sweep) > math.pi) is long
    assert (arc.sweep < 0) is clockwise
    assert arc.point(1.0) == pytest.approx(end, abs=1e-6)


@given(st.floats(-10, 10), st.floats(-4 * TURN, 4 * TURN))
def test_quadrant_points_are_where_a_densely_sampled_arc_turns(first: float, sweep: float) -> None:
    arc = Arc((1.0, -2.0), 5.0, 5.0, first, sweep)
    assume(abs(sweep) > 0.01)
    count = max(8, math.ceil(abs(sweep) / 0.002))
    points = [arc.point(k / count) for k in range(count + 1)]
    for axis in (0, 1):
        steps = [b[axis] - a[axis] for a, b in itertools.pairwise(points) if abs(b[axis] - a[axis]) > 1e-12]
        turns = sum(one * two < 0 for one, two in itertools.pairwise(steps))
        shares = [share for share, which in arc.quadrants() if which == axis]
        edge = 1.5 / count
        inner = sum(edge < share < 1 - edge for share in shares)
        assert inner <= turns <= len(shares)
        for share in shares:
            off = arc.point(share)[axis] - arc.centre[axis]
            assert abs(off) == pytest.approx(5.0, abs=1e-9), "an axis turns at the end of a diameter"
    shares = [share for share, _ in arc.quadrants()]
    assert shares == sorted(shares) and all(0 < share < 1 for share in shares)


@pytest.mark.parametrize(("first", "sweep"), [(0.0, math.pi / 2), (math.pi, -math.pi / 2), (-math.pi / 2, math.pi / 2)])
def test_a_quadrant_arc_turns_nowhere(first: float, sweep: float) -> None:
    assert Arc((0.0, 0.0), 3.0, 3.0, first, sweep).quadrants() == []


# ---- what is no arc --------------------------------------------------------------------------------------------------


def test_a_chord_longer_than_the_diameter_by_rounding_only_is_a_half_turn() -> None:
    arc = from_radius((0.0, 0.0), (10.001, 0.0), 5.0, clockwise=False)
    assert abs(arc.sweep) == pytest.approx(math.pi) and arc.centre == pytest.approx((5.0005, 0.0))


@pytest.mark.parametrize(
    ("start", "end", "radius"),
    [((0, 0), (0, 0), 5.0), ((0, 0), (1, 0), 0.0), ((0, 0), (10.5, 0), 5.0), ((0, 0), (30, 0), -5.0)],
)
def test_words_that_make_no_arc_by_radius(start: tuple[float, float], end: tuple[float, float], radius: float) -> None:
    """NISTIR 6556 3.5.3.1: an error where the end is the start, and where no circle fits."""
    with pytest.raises(ArcError):
        from_radius(start, end, radius, clockwise=True)


def test_words_that_make_no_arc_by_centre() -> None:
    with pytest.raises(ArcError):
        from_centre((0.0, 0.0), (1.0, 0.0), (0.0, 0.0), clockwise=True, closed=False)


def test_a_full_circle_of_no_radius_moves_nothing() -> None:
    arc = from_centre((3.0, 4.0), (3.0, 4.0), (3.0, 4.0), clockwise=True, closed=True)
    assert arc.sweep == 0.0 and arc.quadrants() == [] and arc.point(0.5) == (3.0, 4.0)


def test_a_mismatch_of_the_radii_is_kept_and_told() -> None:
    """NISTIR 6556 3.5.3.2 allows 0.002 mm; real posts write more, and the difference is spread along the arc."""
    arc = from_centre((10.0, 0.0), (0.0, 10.01), (0.0, 0.0), clockwise=False, closed=False)
    assert arc.mismatch == pytest.approx(0.01)
    assert arc.radius(0.5) == pytest.approx(10.005)
    assert arc.point(1.0) == pytest.approx((0.0, 10.01), abs=1e-9)
