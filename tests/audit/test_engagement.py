"""Engaged angles against handbook values and closed forms; what is gone, what is left, what kind of motion it is.

Angles by Martellotti's circular path: theta = acos(1 - 2 ae/D) for a cut with material on one side, phi measured
clockwise from the left of the feed (Altintas, Manufacturing Automation, ch. 2, from memory).  Handbook engagement
angles, rounded: ae/D of 5 % gives 26 degrees, 10 % 37, 25 % 60; a centred cut of 75 % gives 97, 100 % 180 (handbook
table of engagement angles). Arcs: cos(theta) = (Rs^2 - Rc^2 - r^2) / (2 Rc r) inside, Rs = Rc + r - ae, and (Rc^2 +
r^2 - Rs^2) / (2 Rc r) outside, Rs = Rc - r + ae, both by the cosine rule.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from gcodetool.inspection import engagement as module
from gcodetool.inspection.cutting_records import Kind, Label
from gcodetool.inspection.outlines import box, disc
from tests.audit.conftest import BIG, HEAD, look

D = 10.0


def straight(low: float, high: float) -> str:
    """A cut along +X at Y0 in stock that reaches from ``low`` to ``high`` in Y."""
    return HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40 Y0\n"


def cut_angles(low: float, high: float, depth: float = 2.0):
    seen = look(straight(low, high), D, box(-30.0, low, 30.0, high))
    return seen, seen.angles(6)


@pytest.mark.parametrize(
    ("share", "handbook", "exact"), [(0.05, 26, 25.84), (0.10, 37, 36.87), (0.25, 60, 60.00), (0.5, 90, 90.0)]
)
def test_one_sided_cuts_have_the_handbook_angles(share: float, handbook: float, exact: float) -> None:
    edge = 0.5 * D - share * D
    _, left = cut_angles(edge, 100.0)
    assert left == pytest.approx((0.0, exact), abs=0.005)
    _, right = cut_angles(-100.0, -edge)
    assert right == pytest.approx((180.0 - exact, 180.0), abs=0.005)
    assert round(left[1]) == handbook


@pytest.mark.parametrize(("share", "handbook", "exact"), [(0.75, 97, 97.18), (1.0, 180, 180.0)])
def test_centred_cuts_have_the_handbook_angles(share: float, handbook: float, exact: float) -> None:
    seen, (first, last) = cut_angles(-0.5 * share * D, 0.5 * share * D)
    assert last - first == pytest.approx(exact, abs=0.01)
    assert 0.5 * (first + last) == pytest.approx(90.0, abs=0.01)
    assert round(last - first) == handbook
    assert seen.cut.width[seen.at(6)] == pytest.approx(share * D, abs=1e-6)


@pytest.mark.parametrize(("left", "right"), [(4.0, 1.0), (4.9, -3.0), (-1.0, -4.5)])
def test_a_strip_anywhere_begins_and_ends_where_its_edges_meet_the_circle(left: float, right: float) -> None:
    _, (first, last) = cut_angles(right, left)
    expected = math.degrees(math.acos(2 * left / D)), math.degrees(math.acos(2 * right / D))
    assert (first, last) == pytest.approx(expected, abs=0.005)


def test_width_depth_and_area_are_those_of_the_cut() -> None:
    seen, _ = cut_angles(2.0, 100.0)
    k = seen.at(6)
    assert (seen.cut.width[k], seen.cut.depth[k], seen.cut.area[k]) == pytest.approx((3.0, 2.0, 6.0), abs=1e-6)
    assert (seen.cut.left[k], seen.cut.right[k]) == pytest.approx((6.0, 0.0), abs=1e-6)


# (Rc, r, ae, inside, outside, straight), degrees: computed from the cosine rule above
ARCS = [
    (8.5, 1.5, 0.3, 39.804, 33.720, 36.870), (20.0, 3.0, 1.0, 51.318, 44.901, 48.190),
    (8.5, 1.5, 1.5, 95.062, 84.938, 90.0),
]  # fmt: skip


@pytest.mark.parametrize(("path", "r", "ae", "inside", "outside", "line"), ARCS)
def test_engagement_on_a_curve_is_not_that_of_a_line(path, r, ae, inside, outside, line) -> None:
    rs_in, rs_out = path + r - ae, path - r + ae
    assert inside == pytest.approx(math.degrees(math.acos((rs_in**2 - path**2 - r**2) / (2 * path * r))), abs=6e-4)
    assert outside == pytest.approx(math.degrees(math.acos((path**2 + r**2 - rs_out**2) / (2 * path * r))), abs=6e-4)
    assert line == pytest.approx(math.degrees(math.acos(1 - ae / r)), abs=6e-4)
    # a bore of radius rs_in is opened out by ae: cut it first, then go round inside it
    first = path - ae
    bore = (
        HEAD + f"G0 X{first} Y0 Z5\nG0 Z-1\nG3 X{first} Y0 I{-first} J0\nG0 Z5\n"
        f"G0 X{path} Y0\nG0 Z-1\nG3 X{path} Y0 I{-path} J0\n"
    )
    seen = look(bore, 2 * r)
    low, high = seen.angles(10, 0.6)
    assert high - low == pytest.approx(inside, abs=0.01)
    assert high == pytest.approx(180.0, abs=0.01)
    # a boss of radius rs_out is turned down by ae
    seen = look(HEAD + f"G0 X{path} Y0 Z5\nG0 Z-1\nG2 X{path} Y0 I{-path} J0\n", 2 * r, disc(0.0, 0.0, rs_out))
    low, high = seen.angles(6, 0.6)
    assert high - low == pytest.approx(outside, abs=0.25)  # the stock is a polygon of 256 sides
    k = seen.at(6, 0.6)
    assert seen.cut.width[k] * path * 2 == pytest.approx(rs_out**2 - (path - r) ** 2, rel=0.01)


def test_area_per_length_of_centre_path_times_length_is_the_area_removed_on_arcs() -> None:
    """The ring between radius 9.7 and 10 has an area of 18.566 mm^2."""
    program = HEAD + "G0 X8.2 Y0 Z5\nG0 Z-1\nG3 X8.2 Y0 I-8.2\nG0 Z5\nG0 X8.5 Y0\nG1 Z-1\nG3 X8.5 Y0 I-8.5\n"
    seen = look(program, 3.0)
    samples = seen.engagement.samples
    rows = np.isin(seen.path.line[samples.move], [9, 10])
    removed = (seen.cut.area * samples.weight + seen.engagement.volume)[rows].sum()  # 1 deep, the plunge included
    assert removed == pytest.approx(math.pi * (10**2 - 9.7**2), rel=0.005)


def test_a_pass_beside_another_meets_what_that_left() -> None:
    program = HEAD + "G0 X-20 Y0 Z5\nG1 Z-2\nG1 X20\nG0 Z5\nG0 X-20 Y4\nG1 Z-2\nG1 X20\n"
    seen = look(program, D)
    assert seen.angles(6) == pytest.approx((0.0, 180.0), abs=1e-6)
    assert seen.angles(10) == pytest.approx((0.0, math.degrees(math.acos(1 - 2 * 4 / D))), abs=0.01)


def test_material_above_counts_at_its_own_height() -> None:
    """After a pass 1 deep, a pass 3 deep over the same line is a slot of 2; a pass beside it meets two heights."""
    program = HEAD + "G0 X-20 Y0 Z5\nG1 Z-1\nG1 X20\nG1 Z-3\nG1 X-20\nG0 Z5\nG0 X-20 Y3\nG1 Z-3\nG1 X20\n"
    seen = look(program, D)
    assert seen.cut.depth[seen.at(8)] == pytest.approx(2.0, abs=1e-6)
    k = seen.at(12)
    assert seen.cut.depth[k] == pytest.approx(3.0, abs=1e-6)
    assert seen.cut.width[k] == pytest.approx(3.0, abs=1e-6)
    only_upper = HEAD + "G0 X-20 Y0 Z5\nG1 Z-1\nG1 X20\nG0 Z5\nG0 X-20 Y3\nG1 Z-3\nG1 X20\n"
    k = look(only_upper, D).at(10)
    seen = look(only_upper, D)
    assert seen.cut.area[k] == pytest.approx(2.0 * D + 1.0 * 3.0, abs=1e-6)


def test_what_is_cut_deeper_is_gone_for_a_later_higher_pass() -> None:
    seen = look(HEAD + "G0 X-20 Y0 Z5\nG1 Z-3\nG1 X20\nG1 Z-1\nG1 X-20\n", D)
    assert seen.cut.area[seen.at(8)] == 0.0


def test_a_spring_pass_is_told_from_air() -> None:
    program = (
        HEAD
        + "G0 X-20 Y0 Z5\nG1 Z-3\nG1 X20\nG0 Z5\nG0 X-20\nG1 Z-3\nG1 X20\nG0 Z5\nG0 X-20 Y50\n"
        + "G1 Z5\nG1 X20\nG1 Z1 X-20\n"
    )
    seen = look(program, D)
    spring = {int(line) for line in seen.path.line[seen.labels.spring]}
    assert spring == {10}
    assert seen.words()[10] == "air"
    assert seen.words()[14] == seen.words()[15] == "air"


def test_a_facet_of_rounding_is_no_cut() -> None:
    """The second pass lies 1 um beside the first."""
    seen = look(HEAD + "G0 X-20 Y0 Z5\nG1 Z-3\nG1 X20\nG0 Z5\nG0 X-20 Y0.001\nG1 Z-3\nG1 X20\n", D)
    assert seen.words()[10] == "air"


def test_motion_outside_of_the_stock_is_air() -> None:
    seen = look(HEAD + "G0 X-40 Y0 Z5\nG1 Z-2\nG1 X40\n", D, box(-10.0, -50.0, 10.0, 50.0))
    samples = seen.engagement.samples
    x = samples.x[(seen.path.line[samples.move] == 6) & (seen.cut.area > 0.0)]
    assert (x.min(), x.max()) == pytest.approx((-15.0, 10.0), abs=2.6)
    assert seen.labels.air_share[seen.path.line == 6] == pytest.approx(1 - 25 / 80, abs=0.04)


def test_kinds_of_motion_are_told_apart() -> None:
    program = (
        HEAD + "G0 X0 Y0 Z5\nG1 Z-2\nG1 X10 Z-3\nG2 X10 Y0 Z-4 I-5 J0\nG1 X20\nG1 X30 Z-2\nG0 Z5\n"
        "G0 X50 Y50\nG1 Z-4\nG0 Z5\nG81 X60 Y50 Z-4 R1\nG80\n"
    )
    seen = look(program, D)
    kinds = {int(line): Kind(int(kind)) for line, kind in zip(seen.path.line, seen.labels.kind, strict=True) if kind}
    assert kinds == {
        5: Kind.PLUNGE, 6: Kind.RAMP, 7: Kind.HELIX, 8: Kind.LEVEL, 9: Kind.RISE, 12: Kind.DRILL, 14: Kind.DRILL,
    }  # fmt: skip


def test_a_plunge_removes_a_cylinder_and_half_of_one_beside_a_cut() -> None:
    seen = look(
        HEAD + "G0 X0 Y0 Z5\nG1 Z-2\nG0 Z5\nG1 Z-3\nG0 Z5\nG0 X40 Y0\nG1 Z-2\nG1 X60\nG0 Z5\nG0 X50 Y5\nG1 Z-2\n", D
    )
    lines = seen.path.line[seen.engagement.samples.move]
    removed = {line: float(seen.engagement.volume[lines == line].sum()) for line in (5, 7, 10, 14)}
    face = math.pi * D**2 / 4
    assert removed[5] == pytest.approx(2 * face, rel=1e-6)
    assert removed[7] == pytest.approx(face, rel=1e-6)
    assert removed[10] == pytest.approx(2 * face, rel=1e-6)
    assert removed[14] == pytest.approx(2 * face / 2, rel=0.02)


def test_a_helix_cuts_its_pitch_after_the_first_turn() -> None:
    program = HEAD + "G0 X5 Y0 Z5\nG1 Z0\nG3 X5 Y0 Z-0.5 I-5\nG3 X5 Y0 Z-1 I-5\nG3 X5 Y0 I-5\nG3 X5 Y0 I-5\n"
    seen = look(program, 4.0)
    second = seen.path.line[seen.engagement.samples.move] == 7
    assert seen.cut.depth[second].mean() == pytest.approx(0.5, abs=0.02)
    assert seen.words()[7] == "slot"
    assert seen.words()[9] == "air"


def test_a_whole_circle_smaller_than_the_cutter_closes_on_itself() -> None:
    """After the first turn of a path of radius 1 nothing is left for a cutter of radius 2."""
    seen = look(HEAD + "G0 X1 Y0 Z5\nG1 Z-1\nG3 X1 Y0 I-1\nG3 X1 Y0 I-1\n", 4.0)
    assert seen.cut.area[seen.at(7)] == 0.0
    samples = seen.engagement.samples
    taken = (seen.cut.area * samples.weight)[seen.path.line[samples.move] == 6].sum()
    assert taken == pytest.approx(math.pi * (3**2 - 2**2), rel=0.02)  # the ring around the plunge


def test_arcs_in_other_planes_are_followed() -> None:
    seen = look(HEAD + "G0 X-10 Y0 Z5\nG1 Z-1\nG18\nG3 X10 Z-1 I10 K0\nG3 X-10 Z-1 I-10 K0\n", D)
    assert seen.cut.area[seen.at(7, 0.5)] == 0.0  # over the top
    assert seen.cut.depth[seen.at(8, 0.25)] > 6.0


@pytest.mark.parametrize(
    ("shape", "depth", "width"),
    [("ball", 1.0, 2 * math.sqrt(5.0**2 - 4.0**2)), ("vee", 1.0, 2.0)],
)
def test_shaped_cutters_cut_the_width_of_their_shape(shape: str, depth: float, width: float) -> None:
    """A ball of radius 5 is 6 wide 1 above its tip; a vee of 90 degrees is 2 wide."""
    seen = look(HEAD + f"G0 X-20 Y0 Z5\nG1 Z-{depth}\nG1 X20\n", D, shape=shape)
    section = {"ball": 25 * math.acos(0.8) - 4 * 3, "vee": 1.0}[shape]
    assert seen.cut.area[seen.at(6)] == pytest.approx(section, rel=0.03)
    mine = seen.engagement.slices.sample == seen.at(6)
    assert 2 * seen.engagement.slices.radius[mine].max() == pytest.approx(width, rel=0.1)


def test_the_next_pass_of_a_ball_meets_the_ridge_only() -> None:
    seen = look(HEAD + "G0 X-20 Y0 Z5\nG1 Z-1\nG1 X20\nG0 Z5\nG0 X-20 Y3\nG1 Z-1\nG1 X20\n", D, shape="ball")
    area = 25 * math.acos(0.8) - 12
    lens = 2 * (25 * math.acos(4 / 5)) / 2 - 12  # the same section again
    overlap = _overlap(3.0)
    assert area == pytest.approx(lens)
    assert seen.cut.area[seen.at(10)] == pytest.approx(area - overlap, rel=0.04)


def _overlap(step: float) -> float:
    """Common area, below the surface, of two sections of a ball of radius 5 cut 1 deep, by plain summation."""
    y = np.linspace(-5.0, 8.0, 200_001)
    one = np.maximum(np.sqrt(np.maximum(25 - y**2, 0.0)) - 4.0, 0.0)
    other = np.maximum(np.sqrt(np.maximum(25 - (y - step) ** 2, 0.0)) - 4.0, 0.0)
    return float(np.minimum(one, other).sum() * (y[1] - y[0]))


def test_rapids_are_looked_at_but_remove_nothing() -> None:
    seen = look(HEAD + "G0 X-20 Y0 Z5\nG0 Z-2\nG0 X20\nG1 X-20\n", D)
    assert seen.cut.area[seen.at(6)] == pytest.approx(2 * D)
    assert seen.cut.area[seen.at(7)] == pytest.approx(2 * D)


def test_the_hull_of_the_cuts_is_the_stock_where_none_is_given() -> None:
    seen = look(HEAD + "G0 X0 Y0 Z5\nG1 Z-1\nG1 X20\nG1 Y10\nG1 X0\nG1 Y0\n", 4.0, None, None)
    x, y = np.array(seen.stock.outline).T
    assert (x.min(), x.max(), y.min(), y.max()) == pytest.approx((-2.0, 22.0, -2.0, 12.0), abs=1e-3)
    assert seen.stock.top == 0.0
    assert len(seen.stock.said) == 2
    assert seen.words()[7] == "slot"


@pytest.mark.parametrize(
    ("program", "top"),
    [
        ("G0 Z5\nG1 Z-1\nG1 X20\nG1 Z-2\nG1 X0\n", 0.0),
        ("G0 Z9\nG1 Z4\nG1 X20\nG1 Z3\nG1 X0\nG1 Z0\nG1 X20\n", 5.0),
        ("G0 Z9\nG0 X0 Y0\nG0 Z5\nG1 Z0\nG1 X20\n", 5.0),
    ],
)
def test_the_top_is_guessed_from_the_levels(program: str, top: float) -> None:
    assert look(HEAD + program, 4.0, None, None).stock.top == top


def test_blocks_of_pieces_do_not_change_the_answer(monkeypatch: pytest.MonkeyPatch) -> None:
    lines = [f"G1 X{20 * math.cos(k):.3f} Y{20 * math.sin(2.3 * k):.3f} Z{-1 - k % 3}" for k in range(60)]
    program = HEAD + "G0 X0 Y0 Z5\n" + "\n".join(lines) + "\n"
    whole = look(program, 6.0)
    monkeypatch.setattr(module, "BLOCK", 7)
    monkeypatch.setattr(module, "PROBES", 5)
    parts = look(program, 6.0)
    assert parts.cut.area == pytest.approx(whole.cut.area, abs=1e-6)
    assert np.array_equal(parts.labels.by_sample, whole.labels.by_sample)


def test_nothing_to_cut_is_no_error() -> None:
    for program in ("", HEAD, HEAD + "G0 X1\nG0 Z5\n", HEAD + "G1 Z5\nG1 X10\n"):
        seen = look(program, 3.0, None, None)
        assert not seen.cut.area.any()
        assert set(seen.words().values()) <= {"air", "plunge"}


def test_remains_tell_what_still_stands() -> None:
    seen = look(HEAD + "G0 X-20 Y0 Z5\nG1 Z-3\nG1 X20\n", D)
    x, y = np.array([0.0, 0.0, 0.0, 0.0, 0.0]), np.array([0.0, 4.9, 5.1, 0.0, -5.1])
    height = np.array([-2.9, -2.9, -2.9, -3.1, 0.1])
    assert seen.remains.stands(x, y, height).tolist() == [False, False, True, True, False]


def test_labels_are_small_numbers_with_words() -> None:
    assert [label.word for label in Label] == ["air", "climb", "conventional", "slot"]
    assert box(-200.0, -200.0, 200.0, 200.0) == BIG
