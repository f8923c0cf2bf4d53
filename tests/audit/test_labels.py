"""Climb and conventional by the facts of the trade, which all say the same thing in different words."""

from __future__ import annotations

import math
import random

import numpy as np
import pytest
import shapely

from gcodetool.inspection.audit import labels_by_line
from gcodetool.inspection.cutting_records import Label
from gcodetool.inspection.job_records import Cutter, Job, StockShape
from gcodetool.inspection.outlines import box, disc
from tests.audit.conftest import CORPUS, HEAD, SETUP, look

D = 6.0
BOSS = disc(0.0, 0.0, 20.0)


def ring(word: str, path: float) -> str:
    """A whole circle about zero, which begins at X+."""
    return HEAD + f"G0 X{path} Y0 Z5\nG0 Z-2\n{word} X{path} Y0 I{-path} J0\n"


def bored(word: str, path: float, first: float) -> str:
    """A circle inside a bore that was opened to ``first`` + 3 before."""
    return (
        HEAD + f"G0 X{first} Y0 Z5\nG0 Z-2\nG3 X{first} Y0 I{-first} J0\nG0 Z5\n"
        f"G0 X{path} Y0\nG0 Z-2\n{word} X{path} Y0 I{-path} J0\n"
    )


# Outside contours: clockwise is climb; inside: counter-clockwise is climb (right-hand cutter, M3; common practice, no
# source).
@pytest.mark.parametrize(("word", "label"), [("G2", "climb"), ("G3", "conventional")])
def test_outside_contours(word: str, label: str) -> None:
    assert look(ring(word, 22.0), D, BOSS).words()[6] == label


@pytest.mark.parametrize(("word", "label"), [("G3", "climb"), ("G2", "conventional")])
def test_inside_contours(word: str, label: str) -> None:
    assert look(bored(word, 18.0, 16.5), D).words()[10] == label


@pytest.mark.parametrize(("side", "label"), [(1, "conventional"), (-1, "climb")])
def test_material_left_is_conventional_material_right_is_climb(side: int, label: str) -> None:
    """A cutter left of its contour (G41) has the material on its right: climb.  G42 is the other way round."""
    edges = (2.0, 100.0) if side > 0 else (-100.0, -2.0)
    assert look(HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40\n", D, box(-30.0, edges[0], 30.0, edges[1])).words()[6] == label


@pytest.mark.parametrize("side", [1, -1])
def test_half_engagement_lies_wholly_on_one_side(side: int) -> None:
    edges = (0.0, 100.0) if side > 0 else (-100.0, 0.0)
    seen = look(HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40\n", D, box(-30.0, edges[0], 30.0, edges[1]))
    k = seen.at(6)
    left, right = seen.cut.left[k], seen.cut.right[k]
    assert (left, right) == pytest.approx((2 * D / 2, 0.0) if side > 0 else (0.0, 2 * D / 2), abs=1e-9)
    assert seen.words()[6] == ("conventional" if side > 0 else "climb")


@pytest.mark.parametrize("share", [0.3, 0.75, 1.0, 1.5])
def test_a_cut_on_both_sides_alike_is_a_slot(share: float) -> None:
    half = 0.5 * share * D
    assert look(HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40\n", D, box(-30.0, -half, 30.0, half)).words()[6] == "slot"


@pytest.mark.parametrize(("share", "label"), [(0.80, "conventional"), (0.86, "slot")])
def test_a_one_sided_cut_becomes_a_slot_at_five_sixths_of_the_cutter(share: float, label: str) -> None:
    edge = D / 2 - share * D
    assert look(HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40\n", D, box(-30.0, edge, 30.0, 100.0)).words()[6] == label


# Source: Kramer, Proctor, Messina, The NIST RS274/NGC Interpreter - Version 3, NISTIR 6556, tables 12 and 13: a part
# edge for a cutter of diameter 1 with G41, and the same part written as centre line.  The edge here is what table 13
# leaves at a distance of 0.5.
CENTRE_LINE = (
    HEAD + "G0 X1.1 Y3.2 Z5\nG0 Z-1\nG2 X2 Y3.5 I0.9 J-1.2\nG2 X3.5 Y2 I0 J-1.5\nG1 Y-1\nG2 X2 Y-2.5 I-1.5 J0\nG1 X-2\n"
    "G2 X-2.9 Y0.2 I0 J1.5\nG1 X1.1 Y3.2\n"
)
PART = shapely.union_all([
    shapely.Polygon([(2, 3), (3, 2), (3, -1), (2, -2), (-2, -2), (-2.6, -0.2), (1.4, 2.8)]),
    *(shapely.Point(x, y).buffer(1.0, quad_segs=64) for x, y in ((2, 2), (2, -1), (-2, -1))),
]).convex_hull  # fmt: skip


def test_the_published_centre_line_is_climb_all_round() -> None:
    outline = tuple(shapely.get_coordinates(PART.buffer(0.25, quad_segs=64))[:-1].tolist())
    seen = look(CENTRE_LINE, 1.0, tuple((x, y) for x, y in outline))
    assert [seen.words()[line] for line in range(6, 13)] == ["climb"] * 7
    turned = look(reversed_centre_line(), 1.0, tuple((x, y) for x, y in outline))
    assert set(turned.words().values()) == {"conventional"}


def reversed_centre_line() -> str:
    return (
        HEAD + "G0 X1.1 Y3.2 Z5\nG0 Z-1\nG1 X-2.9 Y0.2\nG3 X-2 Y-2.5 I0.9 J-1.2\nG1 X2\nG3 X3.5 Y-1 I0 J1.5\nG1 Y2\n"
        "G3 X2 Y3.5 I-1.5 J0\nG3 X1.1 Y3.2 I0 J-1.5\n"
    )


def test_the_published_centre_line_lies_left_of_the_part_at_half_the_diameter() -> None:
    """Table 12 travels with the cutter on the left (G41), table 13 half a diameter beside it: the pair agrees with
    the label."""
    seen = look(CENTRE_LINE, 1.0)
    samples = seen.engagement.samples
    rows = ~samples.vertical & ~seen.path.rapid[samples.move]
    x, y, fx, fy = (column[rows] for column in (samples.x, samples.y, samples.fx, samples.fy))
    assert shapely.distance(PART, shapely.points(x, y)) == pytest.approx(0.5, abs=2e-3)
    to_the_right = shapely.points(x + 0.6 * fy, y - 0.6 * fx)
    assert shapely.contains(PART, to_the_right).all()


def test_the_published_edge_with_the_cutter_beside_it_is_refused() -> None:
    with pytest.raises(ValueError, match="G41"):
        look(HEAD + "G41 G1 X2 Y3\n", 1.0)


def test_a_zig_zag_alternates_after_its_first_pass() -> None:
    lines = ["G0 X-40 Y-18 Z5", "G0 Z-1"]
    for k in range(8):
        lines.append(f"G1 Y{-18 + 2.4 * k:.3f}")
        lines.append(f"G1 X{40 if k % 2 == 0 else -40}")
    seen = look(HEAD + "\n".join(lines), D, box(-30.0, -16.0, 30.0, 16.0))
    passes = [seen.words()[line] for line in range(7, 22, 2)]
    assert passes[1:] == ["climb", "conventional"] * 3 + ["climb"]
    flips = [(int(seen.path.line[b]), old.word, new.word) for _, b, old, new in seen.labels.flips]
    assert flips == []  # between passes the cutter runs out of the stock
    inside = look(HEAD + "\n".join(lines).replace("40", "20"), D, box(-30.0, -16.0, 30.0, 16.0))
    assert len(inside.labels.flips) >= 5


def test_arcs_that_bite_in_from_one_side_are_climb() -> None:
    """Loops that move along a slot and cut only on their forward side, counter-clockwise, as adaptive clearing does."""
    lines = ["G0 X0 Y-4 Z5", "G0 Z-1"]
    for k in range(1, 30):
        x = 0.4 * k
        lines += [f"G3 X{x:.4f} Y4 R4.005", f"G3 X{x:.4f} Y-4 I0 J-4"]
    seen = look(HEAD + "\n".join(lines), D)
    labels = [seen.words()[line] for line in range(20, 60, 2)]
    assert set(labels) == {"climb"}
    assert {seen.words()[line] for line in range(21, 60, 2)} == {"air"}
    widest = max(float(seen.cut.width[seen.at(line)]) for line in range(20, 60, 2))
    assert widest < 0.2 * D


def test_a_real_adaptive_program_is_nearly_all_climb() -> None:
    file = CORPUS / "adaptive-clearing.nc"
    if not file.exists():
        pytest.skip("the collection of real programs is not here")
    seen = look(file.read_bytes()[:300_000].decode("latin-1"), 3.175, None, None)
    samples = seen.engagement.samples
    length = np.bincount(seen.labels.by_sample, samples.weight * ~seen.path.rapid[samples.move], len(Label))
    assert length[Label.CLIMB] > 0.85 * length[1:].sum()


# ---- two flips cancel ----------------------------------------------------------------------------------------------

SWAP = {"climb": "conventional", "conventional": "climb"}


def random_moves(seed: int) -> list[tuple[float, float]]:
    rnd = random.Random(seed)
    return [(round(rnd.uniform(-30, 30), 3), round(rnd.uniform(-30, 30), 3)) for _ in range(12)]


def lines_of(
    points: list[tuple[float, float]], mirror: bool = False, first_cut: tuple[float, float] | None = None
) -> str:
    sign = -1.0 if mirror else 1.0
    cut = first_cut or (0.0, 0.0)
    text = [HEAD.rstrip(), f"G0 X{sign * cut[0]:.3f} Y-40 Z5", "G0 Z-1", "G1 Y40", "G0 Z5"]
    text += [f"G0 X{sign * points[0][0]:.3f} Y{points[0][1]:.3f}", "G0 Z-1"]
    return "\n".join(text + [f"G1 X{sign * x:.3f} Y{y:.3f}" for x, y in points[1:]]) + "\n"


@pytest.mark.parametrize("seed", range(12))
def test_a_mirror_image_exchanges_the_labels_and_a_left_hand_cutter_exchanges_them_back(seed: int) -> None:
    points = random_moves(seed)
    plain = look(lines_of(points), D)
    mirrored = look(lines_of(points, mirror=True), D)
    both = look(lines_of(points, mirror=True).replace("M3", "M4"), D, hand=-1)
    assert both.labels.by_sample.tolist() == plain.labels.by_sample.tolist()
    swap = np.array([Label.AIR, Label.CONVENTIONAL, Label.CLIMB, Label.SLOT])
    assert swap[mirrored.labels.by_sample].tolist() == plain.labels.by_sample.tolist()
    one_sided = np.isin(plain.labels.by_sample, [Label.CLIMB, Label.CONVENTIONAL])
    assert one_sided.any()


@pytest.mark.parametrize("y", [1.0, 2.0, 3.5, -1.0, -2.5])
def test_the_same_pass_the_other_way_exchanges_the_label(y: float) -> None:
    slot = "G0 X-40 Y0 Z5\nG0 Z-1\nG1 X40\nG0 Z5\n"
    there = look(HEAD + slot + f"G0 X-40 Y{y}\nG0 Z-1\nG1 X40\n", D, box(-30.0, -50.0, 30.0, 50.0)).words()[10]
    back = look(HEAD + slot + f"G0 X40 Y{y}\nG0 Z-1\nG1 X-40\n", D, box(-30.0, -50.0, 30.0, 50.0)).words()[10]
    assert (there, back) in {("climb", "conventional"), ("conventional", "climb")}
    assert there == ("conventional" if y > 0 else "climb")
    mirrored = look(HEAD + slot + f"G0 X40 Y{-y}\nG0 Z-1\nG1 X-40\n", D, box(-30.0, -50.0, 30.0, 50.0)).words()[10]
    assert mirrored == there  # half a turn of the part changes nothing


def test_m4_alone_does_not_make_a_right_hand_cutter_cut_the_other_way() -> None:
    """It does not cut at all then; the labels stay those of the sense in which it would."""
    program = HEAD + "G0 X-40 Y0 Z5\nG0 Z-2\nG1 X40\n"
    stock = box(-30.0, 2.0, 30.0, 100.0)
    assert look(program.replace("M3", "M4"), D, stock).words()[6] == look(program, D, stock).words()[6]


# ---- flips inside a contour, lines ---------------------------------------------------------------------------------


def test_a_contour_that_crosses_a_slot_flips_where_the_wall_changes_side() -> None:
    """Down the left wall of a slot, across, and back up the right wall: climb on one, conventional on the other in
    one chain."""
    program = (
        HEAD + "G0 X0 Y-40 Z5\nG0 Z-1\nG1 Y40\nG0 Z5\nG0 X-1 Y-40\nG0 Z-1\nG1 Y-10\nG1 X1\nG1 Y40\n"
    )  # fmt: skip
    seen = look(program, D, box(-60.0, -30.0, 60.0, 60.0))
    flips = [
        (int(seen.path.line[a]), int(seen.path.line[b]), old.word, new.word) for a, b, old, new in seen.labels.flips
    ]
    assert flips == [(10, 12, "conventional", "climb")]


def test_labels_by_line_know_every_feed_line_and_no_other() -> None:
    program = (
        HEAD
        + "G0 X-40 Y0 Z5\nG1 Z-2\nG1 X40\n(a remark)\nG0 Z5\nG0 X0 Y20\nG1 Z-2\nG0 Z5\nG81 X5 Y30 Z-2 R1\nX9\nG80\n"
    )
    job = Job(cutters=(Cutter("*", D),), stock=StockShape(box(-30.0, -1.0, 30.0, 60.0), 0.0))
    assert labels_by_line(program.encode(), job, SETUP) == {
        5: "plunge", 6: "conventional", 10: "drill", 12: "drill", 13: "drill",
    }  # fmt: skip


def test_shares_of_a_move_are_kept_where_it_changes_on_the_way() -> None:
    """The first half of the pass lies in the open slot, the second in full material."""
    program = HEAD + "G0 X-40 Y0 Z5\nG0 Z-1\nG1 X0\nG0 Z5\nG0 X-40 Y0\nG0 Z-1\nG1 X40\n"
    seen = look(program, D, box(-50.0, -50.0, 50.0, 50.0))
    samples = seen.engagement.samples
    rows = seen.path.line[samples.move] == 10
    length = np.bincount(seen.labels.by_sample[rows], samples.weight[rows], len(Label))
    assert length[Label.SLOT] == pytest.approx(40.0, abs=D)
    assert length[Label.AIR] == pytest.approx(40.0, abs=D)
    assert math.isclose(length.sum(), 80.0)
