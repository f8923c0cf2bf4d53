"""Predicted sizes against the closed forms of play: circles, squares, holes, inclined lines, and a cut that drags the
axes.

Closed forms (path radius R, lash B on both axes, friction holding): centre path extents 2R - B; flats sqrt(2RB -
B^2); radius on the diagonals sqrt(R^2 - B^2/2); unequal lash +-(Bx - By)/(2 sqrt 2) on the diagonals, the sign by the
direction of travel; hole and boss undersize by B; two holes S, S - B or S + B apart.  Derived from the play operator
(see docs), not published.
"""

from __future__ import annotations

import math
from dataclasses import replace
from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.inspection.audit import audit
from gcodetool.inspection.audit_records import Feature, Measure
from gcodetool.inspection.cutting_records import Holding
from gcodetool.inspection.features import shapes
from gcodetool.inspection.job_records import Cutter, Job, StockShape
from gcodetool.inspection.lash_path import AxisCase, AxisState, follow, start_state, states_before, turning_points
from gcodetool.inspection.outlines import Outline, box, disc
from gcodetool.inspection.sizes import Predictor, predict
from gcodetool.lash.path import Follower
from gcodetool.lash.play import play
from gcodetool.machine import Axis, Machine
from gcodetool.motion.controller import Controller
from gcodetool.motion.moves import Move
from gcodetool.program.blocks import blocks_of
from tests.audit.conftest import BIG, HEAD, SETUP, look
from tests.audit.test_against_raster import random_program

PLATE = box(-60.0, -60.0, 60.0, 60.0)


def machine(x: float, y: float | None = None, **values: object) -> Machine:
    axes = {
        letter: Axis(letter, lash=Decimal(str(lash)), **values)  # type: ignore[arg-type]
        for letter, lash in (("X", x), ("Y", x if y is None else y))
    }
    return Machine(axes=axes)


def features(program: str, sheet: Machine, diameter: float = 3.0, stock: Outline = PLATE) -> list[Feature]:
    job = Job(cutters=(Cutter("*", diameter),), stock=StockShape(stock, 0.0))
    return list(audit(program.encode(), job, sheet, SETUP).features)


def figures(feature: Feature) -> dict[str, Measure]:
    return {each.name: each for each in feature.measures}


def one(found: list[Feature], kind: str) -> Feature:
    (feature,) = [each for each in found if each.kind == kind]
    return feature


def laps(word: str, path: float, count: int = 2) -> str:
    """A lead-in that leaves X moving + last, then laps from X+."""
    turn = f"{word} X{path} Y0 I{-path} J0\n"
    return HEAD + f"G0 X0 Y-1 Z5\nG0 X0 Y0\nG1 Z-1\nG1 X{path}\n" + turn * count


# R part, B, diameter, flat, out of round by the closed forms; r cutter
CIRCLES = [(10.0, 0.2), (10.0, 0.1), (10.0, 0.05), (5.0, 0.1), (20.0, 0.2)]


@pytest.mark.parametrize("word", ["G2", "G3"])
@pytest.mark.parametrize(("size", "lash"), CIRCLES)
def test_a_bore_comes_out_undersize_by_the_lash(size: float, lash: float, word: str) -> None:
    r = 1.5
    found = figures(one(features(laps(word, size - r), machine(lash)), "bore"))
    assert found["diameter X"].intended == pytest.approx(2 * size)
    assert found["diameter X"].before == pytest.approx(2 * size - lash, abs=2e-5)
    assert found["diameter Y"].before == pytest.approx(2 * size - lash, abs=2e-5)
    path, diagonal = size - r, math.sqrt(size**2 - lash**2 / 2)
    assert found["diameter 45 deg"].before == pytest.approx(2 * diagonal, abs=2e-4)
    assert found["diameter 135 deg"].before == pytest.approx(2 * diagonal, abs=2e-4)
    assert found["flat across X"].before == pytest.approx(math.sqrt(2 * path * lash - lash**2), abs=1e-9)
    for each in found.values():
        assert each.after == pytest.approx(each.intended, abs=2e-5)


def test_the_figures_of_a_ten_millimetre_circle() -> None:
    """Offset-polygon check of a part of radius 10, lash 0.2: 19.800 across, flat 1.833 (r 1.5) and 1.661 (r 3),
    largest radius +0.0769 and +0.0744 for a hole, +0.0788 and a flat of 1.990 for a boss."""
    for r, flat, largest in ((1.5, 1.833, 0.0769), (3.0, 1.661, 0.0744)):
        found = figures(one(features(laps("G3", 10.0 - r), machine(0.2), 2 * r), "bore"))
        assert found["diameter X"].before == pytest.approx(19.800, abs=5e-4)
        assert found["flat across X"].before == pytest.approx(flat, abs=5e-4)
        assert found["out of round"].before == pytest.approx(0.1 + largest, abs=5e-4)
    found = figures(one(features(laps("G2", 11.5), machine(0.2), 3.0), "boss"))
    assert found["diameter X"].before == pytest.approx(19.800, abs=5e-4)
    assert found["diameter 45 deg"].before == pytest.approx(20.0 - 0.002, abs=5e-4)
    assert found["flat across Y"].before == pytest.approx(1.990, abs=5e-4)
    assert found["out of round"].before == pytest.approx(0.1788, abs=5e-4)


def test_the_flat_that_is_stated_is_the_flat_that_is_cut() -> None:
    """The longest stretch of the predicted path on which X stands still while Y moves, against the closed form."""
    seen = look(laps("G3", 10.0), 3.0, PLATE)
    predictor = Predictor(seen.path, machine(0.2), seen.engagement.samples, [])
    moves = np.flatnonzero(seen.path.plane == 1)
    share = np.linspace(0.0, 1.0, 40_001)
    actual = predictor.paths(np.full(len(share), moves[0]), share)[1][0]
    still = np.abs(np.diff(actual[:, 0])) < 1e-12
    cuts = np.flatnonzero(np.diff(still.astype(int))) + 1
    runs = zip(np.split(np.diff(actual[:, 1]), cuts), np.split(still, cuts), strict=True)
    longest = max(abs(float(run.sum())) for run, quiet in runs if quiet[0])
    assert longest == pytest.approx(math.sqrt(2 * 10 * 0.2 - 0.04), abs=2e-3)
    assert longest == pytest.approx(1.990, abs=2e-3)


@pytest.mark.parametrize(("word", "sign"), [("G3", 1.0), ("G2", -1.0)])
def test_unequal_lash_shows_on_the_diagonals_and_changes_sign_with_the_direction(word: str, sign: float) -> None:
    """R 10, Bx 0.2, By 0, counter-clockwise: radius +0.0705 at 45 degrees, -0.0710 at 135; clockwise swapped."""
    found = figures(one(features(laps(word, 10.0), machine(0.2, 0.0)), "bore"))
    first, second = ("45", "135") if sign > 0 else ("135", "45")
    plus, minus = found[f"diameter {first} deg"].error_before, found[f"diameter {second} deg"].error_before
    assert (plus, minus) == pytest.approx((2 * 0.0705, -2 * 0.0710), abs=1e-3)
    assert (found["diameter X"].error_before, found["diameter Y"].error_before) == pytest.approx((-0.2, 0.0), abs=2e-5)


def test_the_uncertainty_of_the_lash_is_the_range_of_the_compensated_size() -> None:
    sheet = machine(0.2, uncertainty=Decimal("0.03"))
    found = figures(one(features(laps("G3", 8.5), sheet), "bore"))["diameter X"]
    assert (found.low, found.high) == pytest.approx((20.0 - 0.03, 20.0 + 0.03), abs=2e-5)
    assert found.after == pytest.approx(20.0, abs=2e-5)


def test_another_datum_moves_the_part_and_keeps_its_size() -> None:
    for datum in (1, -1):
        sheet = machine(0.2, datum=datum)
        found = figures(one(features(laps("G3", 8.5), sheet), "bore"))
        assert found["diameter X"].before == pytest.approx(19.8, abs=2e-5)
        assert found["diameter Y"].before == pytest.approx(19.8, abs=2e-5)


def square(half: float, clockwise: bool) -> str:
    """A square pocket of half side ``half`` (centre path), every wall reached moving outward."""
    corners = [(half, -half), (half, half), (-half, half), (-half, -half), (half, -half)]
    if clockwise:
        corners = [(-x, y) for x, y in corners]
    text = HEAD + f"G0 X0 Y0 Z5\nG0 X{corners[0][0]} Y{corners[0][1]}\nG1 Z-1\n"
    return text + "\n".join(f"G1 X{x} Y{y}" for x, y in corners[1:]) + "\n"


@pytest.mark.parametrize("clockwise", [False, True])
def test_a_square_pocket_is_undersize_by_the_lash_of_each_axis(clockwise: bool) -> None:
    found = features(square(10.0, clockwise), machine(0.2, 0.1))
    sizes = sorted((each.measures[0].intended, each.measures[0].before) for each in found if each.kind == "width")
    part = [(meant, size) for meant, size in sizes if meant == 17.0]
    assert [size for _, size in part] == pytest.approx([17.0 - 0.2, 17.0 - 0.1], abs=1e-6)
    walls = [each for each in found if each.kind == "slot"]  # the island of 17 still stands
    assert len(walls) == 4
    assert all(abs(each.measures[0].error_after) < 1e-9 for each in walls)
    assert {round(each.measures[0].error_before, 6) for each in walls} <= {0.0, -0.2, -0.1}


def test_a_rib_between_two_slots_is_found() -> None:
    program = HEAD + "G0 X-20 Y0 Z5\nG1 Z-1\nG1 X20\nG0 Z5\nG0 X-20 Y10\nG1 Z-1\nG1 Y16\nG1 X20\nG1 Y10\nG1 X-20\n"
    found = features(program, machine(0.1))
    slots = [each for each in found if each.kind == "slot"]
    assert {figures(each)["width"].intended for each in slots} == {3.0}
    ribs = {round(each.measures[0].intended, 3): each.measures[0].before for each in found if each.kind == "width"}
    assert ribs == pytest.approx({3.0: 2.9, 7.0: 7.0, 37.0: 36.9})


def test_a_wall_written_in_many_pieces_is_one_wall() -> None:
    lines = "".join(f"G1 X{x}\n" for x in range(-19, 21))
    program = HEAD + "G0 X-20 Y0 Z5\nG1 Z-1\n" + lines + "G0 Z5\nG0 X-30 Y20\nG1 Z-1\nG1 X30\n"
    slots = [each for each in features(program, machine(0.1)) if each.kind == "slot"]
    assert sorted(each.lines for each in slots) == [(6, 45), (49, 49)]


def holes(*places: tuple[float, float]) -> str:
    return HEAD + "G0 Z5\n" + "".join(f"G0 X{x} Y{y}\nG1 Z-2\nG0 Z5\n" for x, y in places)


def spacing(program: str, lash: float) -> float:
    return one(features(program, machine(lash)), "hole pair").measures[0].before


def test_holes_are_as_far_apart_as_their_approaches_say() -> None:
    """The same side: S; each reached moving away from the other: S - B; each moving towards the other: S + B."""
    assert spacing(holes((-50, 0), (-50, 0), (0, 0), (30, 0))[:0] + holes((0, 0), (30, 0)), 0.2) == pytest.approx(
        30.0, abs=0.21
    )
    same = HEAD + "G0 X-9 Y0 Z5\nG0 X0\nG1 Z-2\nG0 Z5\nG0 X30\nG1 Z-2\n"
    assert spacing(same, 0.2) == pytest.approx(30.0)
    away = HEAD + "G0 X15 Y0 Z5\nG0 X0\nG1 Z-2\nG0 Z5\nG0 X30\nG1 Z-2\n"
    assert spacing(away, 0.2) == pytest.approx(29.8)
    towards = HEAD + "G0 X-9 Y0 Z5\nG0 X0\nG1 Z-2\nG0 Z5\nG0 X40\nG0 X30\nG1 Z-2\n"
    assert spacing(towards, 0.2) == pytest.approx(30.2)


def test_four_holes_visited_in_order_keep_the_side_of_an_axis_that_does_not_move() -> None:
    """Square of 30, lash 0.2, from (-50, -50): A, B, C at one offset, D off by 0.2 in X (simulated with the play
    operator)."""
    found = features(HEAD + "G0 X-50 Y-50 Z5\n" + holes((0, 0), (30, 0), (30, 30), (0, 30))[len(HEAD) :], machine(0.2))
    errors = {each.name: each.measures[0].error_before for each in found if each.kind == "hole pair"}
    wrong = {name: error for name, error in errors.items() if abs(error) > 1e-3}
    assert len(errors) == 4
    assert list(wrong.values()) == pytest.approx([-0.2], abs=1e-3)  # C to D: moved + before, - now


@pytest.mark.parametrize(("degrees", "piece", "offset"), [(45, 0.2, 0.1414), (30, 0.3464, 0.1732), (60, 0.1155, 0.1)])
def test_a_line_after_the_reversal_of_one_axis_runs_beside_itself(degrees: float, piece: float, offset: float) -> None:
    """Y reverses, X goes on: a flat piece of B / tan(alpha), then an offset of B cos(alpha)."""
    alpha, lash = math.radians(degrees), 0.2
    assert (piece, offset) == pytest.approx((lash / math.tan(alpha), lash * math.cos(alpha)), abs=6e-5)
    x, y = 20 * math.cos(alpha), 20 * math.sin(alpha)
    program = HEAD + f"G0 X-30 Y30 Z5\nG1 Z-1\nG1 X-10 Y0\nG1 X{x - 10:.6f} Y{y:.6f}\n"
    wall = [each for each in features(program, machine(0.0, lash)) if each.lines == (7, 7)]
    position = figures(wall[0])["distance from program zero"]
    assert abs(position.error_before) == pytest.approx(offset, abs=6e-5)


def test_a_boss_and_an_arc_and_a_chord_circle_are_recognised() -> None:
    """A circle written as 90 short lines is a circle to a caliper."""
    points = [(10 * math.cos(2 * math.pi * k / 90), 10 * math.sin(2 * math.pi * k / 90)) for k in range(91)]
    program = (
        HEAD
        + "G0 X0 Y-1 Z5\nG0 Y0\nG1 Z-1\nG1 X10\n"
        + "".join(f"G1 X{x:.4f} Y{y:.4f}\n" for x, y in points[1:] + points[1:])
    )
    found = figures(one(features(program, machine(0.2)), "bore"))
    assert found["diameter X"].intended == pytest.approx(23.0, abs=0.002)
    assert found["diameter X"].error_before == pytest.approx(-0.2, abs=0.005)
    arc = HEAD + "G0 X-20 Y-20 Z5\nG1 Z-1\nG1 Y0\nG2 X0 Y20 I20 J0\nG1 X20\n"
    assert [each.kind for each in features(arc, machine(0.2)) if each.lines == (7, 7)] == ["arc"]


def test_what_is_cut_away_later_is_no_feature() -> None:
    program = laps("G3", 5.0) + "G1 X8\nG3 X8 Y0 I-8 J0\nG3 X8 Y0 I-8 J0\n"
    assert [round(each.measures[0].intended, 3) for each in features(program, machine(0.1)) if each.kind == "bore"] == [
        19.0
    ]


# ---- the play of one axis, sampled ---------------------------------------------------------------------------------


@given(st.lists(st.floats(-5, 5), min_size=2, max_size=40), st.floats(0.0, 1.0), st.sampled_from([1, -1]))
def test_following_samples_is_the_play_operator(wanted: list[float], lash: float, datum: int) -> None:
    case = AxisCase(lash, None, datum)
    found, _ = follow(np.array(wanted), case, start_state(case, wanted[0]))
    now, expected = wanted[0], []
    for value in wanted:
        now = play(now, value, lash, datum)
        expected.append(now)
    assert found == pytest.approx(expected, abs=1e-9)


@given(st.lists(st.floats(-5, 5), min_size=2, max_size=40), st.floats(0.0, 1.0), st.sampled_from([1, -1]))
def test_compensated_for_its_own_lash_an_axis_does_what_is_wanted(wanted: list[float], lash: float, datum: int) -> None:
    case = AxisCase(lash, lash, datum)
    state = AxisState(wanted[0], datum)
    found, _ = follow(np.array(wanted), case, state)
    assert found == pytest.approx(wanted, abs=1e-9)


@given(st.lists(st.floats(-5, 5), min_size=2, max_size=30), st.floats(0.01, 0.5), st.floats(0.0, 0.5))
def test_too_little_compensation_leaves_the_rest_of_the_lash(wanted: list[float], lash: float, missing: float) -> None:
    """Residual rule: compensated by Bc < B, an axis behaves as if it had a lash of B - Bc."""
    short = AxisCase(lash + missing, lash, -1)
    found, _ = follow(np.array(wanted), short, AxisState(wanted[0], -1))
    plain = AxisCase(missing, None, -1)
    expected, _ = follow(np.array(wanted), plain, AxisState(wanted[0], -1))
    assert found == pytest.approx(expected, abs=1e-9)


def test_a_dragged_axis_sits_at_that_end_of_its_lash() -> None:
    case = AxisCase(0.2, None, -1)
    wanted = np.linspace(0.0, 1.0, 11)
    push = np.array([0] * 5 + [1] * 3 + [-1] * 3)
    found, _ = follow(wanted, case, AxisState(-0.2, 1), push)
    assert found[:5] == pytest.approx(wanted[:5] - 0.2)
    assert found[5:8] == pytest.approx(wanted[5:8])
    assert found[8:] == pytest.approx(wanted[8:] - 0.2)


def test_turning_points_of_arcs_are_their_quadrants() -> None:
    seen = look(HEAD + "G0 X10 Y0 Z5\nG1 Z-1\nG3 X0 Y-10 I-10 J0\nG2 X10 Y0 I0 J10\n", 3.0, BIG)
    move, place = turning_points(seen.path, 0)
    assert place[move == 2].tolist() == pytest.approx([-10.0, 0.0])
    assert place[move == 3].tolist() == pytest.approx([-10.0, 10.0])
    move, place = turning_points(seen.path, 1)
    assert place[move == 2].tolist() == pytest.approx([10.0, -10.0])
    actual, side = states_before(seen.path, 0, AxisCase(0.2, None, -1))
    assert actual[-1] == pytest.approx(10.0 - 0.2)
    assert side[-1] == 1


@pytest.mark.parametrize("datum", [1, -1])
def test_the_states_along_a_program_are_those_of_the_follower_that_the_proof_uses(datum: int) -> None:
    program, _ = random_program(5, 30, (-1.0,))
    seen = look(program, 3.0, BIG)
    follower = Follower({"X": 0.13, "Y": 0.09}, {"X": datum, "Y": -datum}, (0,) * 6, {"X": datum, "Y": -datum})
    mine = [
        states_before(seen.path, k, AxisCase(lash, None, side))[0]
        for k, lash, side in ((0, 0.13, datum), (1, 0.09, -datum))
    ]
    moves = [each for each in Controller(SETUP).run(blocks_of(program.encode())) if isinstance(each, Move)]
    number = 0
    for move in moves:
        for _ in follower.drive(move):
            pass
        if move.start != move.end or move.arc is not None:
            number += 1
            assert follower.actual[:2] == pytest.approx(
                [mine[0][number], mine[1][number]], abs=1e-4
            )  # radii differ by so much
    assert number == seen.path.count


# ---- a cut that drags the axes across their lash -------------------------------------------------------------------


@pytest.mark.parametrize(
    ("sign", "name", "across", "diagonal"),
    [
        (-1, "uncompensated", 20.0 - 0.2, -0.1414), (-1, "compensated", 20.0, -0.1424),
        (1, "uncompensated", 20.0 + 0.2, 0.1414), (1, "compensated", 20.0 + 0.4, 0.1404),
    ],
)  # fmt: skip
def test_a_force_normal_to_a_circle_makes_it_wrong_on_the_diagonals(sign, name, across, diagonal) -> None:
    """Path radius 10, lash 0.2, the normal force beats friction everywhere: good X and Y with a small 45-degree
    diameter mean lash crossed by the cut, not a wrong lash (simulated with the rule that a dragged axis sits on the
    flank it is pushed to)."""
    seen = look(laps("G3", 10.0), 3.0, PLATE)
    samples = seen.engagement.samples
    x, y = samples.x, samples.y
    round_ = seen.path.plane[samples.move] == 1
    none = np.zeros(0)
    push = [
        Holding(letter, none.astype(np.int64), none, np.where(round_, sign * np.sign(value), 0).astype(np.int64))
        for letter, value in (("X", x), ("Y", y))
    ]
    predictor = Predictor(seen.path, machine(0.2), samples, push)
    moves = np.flatnonzero(seen.path.plane == 1)
    share = np.linspace(0.0, 1.0, 1441)
    wanted, actual, dragged = predictor.paths(np.full(len(share), moves[1]), share)
    assert dragged
    case = actual[0 if name == "uncompensated" else 1]
    middle = 0.5 * (case.max(axis=0) + case.min(axis=0))
    assert case.max(axis=0) - case.min(axis=0) == pytest.approx([across, across], abs=0.01)
    radius = np.hypot(*(case - middle).T)
    angle = np.arctan2(wanted[:, 1], wanted[:, 0])
    near = np.argmin(np.abs(angle - math.radians(45.0)))
    assert radius[near] - 10.0 == pytest.approx(diagonal, abs=0.004)


def test_a_dragged_feature_says_so_and_its_range_holds_the_drag() -> None:
    seen = look(laps("G3", 10.0), 3.0, PLATE)
    samples = seen.engagement.samples
    push = [Holding("X", np.zeros(0, np.int64), np.zeros(0), -np.sign(samples.x).astype(np.int64))]
    predictor = Predictor(seen.path, machine(0.2), samples, push)
    found = predict(shapes(seen.path, (Cutter("*", 3.0),), seen.labels, seen.remains.stands), predictor)
    bore = one(found, "bore")
    assert "drags" in bore.dragged
    plain = one(predict(shapes(seen.path, (Cutter("*", 3.0),), seen.labels, seen.remains.stands),
                        Predictor(seen.path, machine(0.2), samples, [])), "bore")  # fmt: skip
    assert figures(bore)["diameter 45 deg"].low < figures(plain)["diameter 45 deg"].low - 0.05


def test_a_soft_machine_in_a_heavy_cut_is_dragged_end_to_end() -> None:
    """Friction 1 N, aluminium, climb in a bore: the audit finds the drag, says how much, and what would help."""
    from gcodetool.inspection.materials import material_named

    job = Job(cutters=(Cutter("*", 6.0),), stock=StockShape(PLATE, 0.0), material=material_named("aluminium-6082"))
    program = "G21 G90\nS10000 M3\nF1000\nG0 X12 Y0 Z5\nG1 Z-3\nG3 X12 Y0 I-12\nG1 X13\nG3 X13 Y0 I-13\nG0 Z5\nM30\n"
    soft = audit(program.encode(), job, machine(0.2, friction=Decimal(1)), SETUP)
    stiff = audit(program.encode(), job, machine(0.2, friction=Decimal(500)), SETUP)
    dragged = [each for each in soft.findings if each.code == 501]
    assert {each.line for each in dragged}
    assert any("wrong by up to 0.2 mm" in each.text and "conventional" in each.action for each in dragged)
    assert not [each for each in stiff.findings if each.code in (501, 502)]
    assert max(row.dragged for row in soft.axes) > 0.0
    middle = replace(machine(0.2).axis("X"), friction=Decimal(30))
    doubtful = audit(program.encode(), job, Machine(axes={"X": middle}), SETUP)
    assert {each.code for each in doubtful.findings if 500 < each.code < 600} <= {501, 502}


def test_boss_in_a_disc_of_stock() -> None:
    found = features(ring_of_stock(), machine(0.1), 6.0, disc(0.0, 0.0, 12.0))
    assert figures(one(found, "boss"))["diameter X"].before == pytest.approx(20.0 - 0.1, abs=2e-5)


def ring_of_stock() -> str:
    return HEAD + "G0 X0 Y-16 Z5\nG0 Z-1\nG1 X13 Y-1\nG1 Y0\nG2 X13 Y0 I-13 J0\nG2 X13 Y0 I-13 J0\n"
