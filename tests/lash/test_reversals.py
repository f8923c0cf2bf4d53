"""Reversals of programs: against dense sampling by another interpreter, through deadbands, in statistics."""

from __future__ import annotations

import itertools
import json
import random
from collections.abc import Iterator

import numpy as np
import pytest

from gcodetool.lash.reversals import BINS, reversals, statistics
from gcodetool.motion.moves import Setup
from gcodetool.program.blocks import blocks_of
from tests.case_files import run_command
from tests.oracle.arcs import sample_arc
from tests.oracle.controller import run
from tests.oracle.equivalents import equivalents
from tests.oracle.machine import Machine, Motion

MM = 10**10
PLAIN = Setup(units="mm")


def found(program: str, ripple: dict[str, int] | None = None) -> list[tuple[str, float, int]]:
    """Axis, place in mm and new direction of every reversal."""
    items = reversals(blocks_of(program.encode()), PLAIN, ripple or {})
    return [(r.axis, round(r.position, 6), r.direction) for r in items]


# ---- against a densely sampled path ----------------------------------------------------------------------------------


def sampled(program: bytes) -> Iterator[tuple[np.ndarray, int]]:
    """Points of every move of the oracle's controller, arcs in chords of half a degree, quadrant points too."""
    for motion in run(program, Machine()):
        if isinstance(motion, Motion):
            points = sample_arc(motion.arc, motion.start, motion.end) if motion.arc else np.array([motion.end])
            yield points, motion.line


def brute_force(program: bytes, axis: int, ripple: float) -> list[tuple[int, int]]:
    """(line, direction) of each reversal of one axis, by walking along all samples."""
    side, extreme, turns = 0, 0.0, []
    for points, line in sampled(program):
        for value in points[:, axis].tolist():
            ahead = (value - extreme) * (side or 1)
            if side == 0 and value != extreme:
                side, extreme = (1 if value > extreme else -1), value
            elif side and ahead >= 0:
                extreme = value
            elif side and -ahead > ripple:
                side, extreme = -side, value
                turns.append((line, side))
    return turns


@pytest.mark.parametrize("ripple", [0.0002, 0.05, 2.0])
@pytest.mark.parametrize("seed", range(6))
def test_reversals_are_those_of_a_densely_sampled_path(seed: int, ripple: float) -> None:
    """Lines, arcs in three planes, helices, several turns; below the smallest ripple samples themselves are noise."""
    program = equivalents(random.Random(seed), operations=4)["mm-absolute"]
    band = {letter: round(ripple * MM) for letter in "XYZ"}
    items = list(reversals(blocks_of(program), PLAIN, band))
    for axis, letter in enumerate("XYZ"):
        mine = [(r.line, r.direction) for r in items if r.axis == letter]
        assert mine == brute_force(program, axis, ripple), letter


@pytest.mark.parametrize("seed", range(10))
def test_all_spellings_of_one_path_turn_at_the_same_places(seed: int) -> None:
    """The same moves in mm and inch, G90 and G91."""
    spellings = equivalents(random.Random(seed), operations=4)
    ripple = dict.fromkeys("XYZ", 20000)  # rounding of arcs
    lists = [
        [(r.axis, r.direction, round(r.position, 4), r.rapid, r.in_arc) for r in reversals(blocks_of(p), PLAIN, ripple)]
        for p in spellings.values()
    ]
    assert all(len(one) > 10 for one in lists)
    assert all(one == lists[0] for one in lists)


# ---- small programs --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "program",
    [
        "",
        "G21\n(nothing)\nM3 S100",
        "G21 G0 X1\nX2\nG1 X3 Y5 F100",
        "G21 G0 X5\nX5\nG4 X2\nX5.0",
        "G21 G3 X10 Y10 J10 F1",  # a quarter
        "G21 G0 X-5\nG92 X0\nG1 X-1 F10",
        "G21 G1 X1 F10\n(X-5)\n; X-9\nX2",
    ],
)
def test_programs_that_never_turn(program: str) -> None:
    assert found(program) == []


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        ("G21 G1 X10 F1\nX5\nX7", [("X", 10, -1), ("X", 5, 1)]),
        ("G21 G1 X10 F1\nX10\nY1\nX5", [("X", 10, -1)]),
        ("G21 G91 G1 X10 F1\nX-1\nX-1\nX1", [("X", 10, -1), ("X", 8, 1)]),
        ("G20 G1 X1 F1\nX0", [("X", 25.4, -1)]),
        ("G21 G0 X10\nG1 X5 F1\nG0 X6", [("X", 10, -1), ("X", 5, 1)]),
        # the example of NISTIR 6556 3.5.3.2: X turns once, at (5,11); the run-up to (7,7) is a move in +
        ("G21 G0 X7 Y7\nG17 G2 X10 Y16 I3 J4 Z9 F1", [("X", 7, -1), ("X", 5, 1)]),
        # a full circle counter-clockwise from its right-hand point, reached in + on X and - on Y before
        (
            "G21 G0 X10 Y1\nY0\nG3 I-10 F1",
            [("Y", 1, -1), ("X", 10, -1), ("Y", 0, 1), ("Y", 10, -1), ("X", -10, 1), ("Y", -10, 1)],
        ),
        # a cycle: down, up; the bottom and R are turning points
        ("G21 G0 Z5\nG99 G81 X1 Z-2 R1 F1\nX2", [("Z", 5, -1), ("Z", -2, 1), ("Z", 1, -1), ("Z", -2, 1)]),
    ],
)
def test_places_and_directions(program: str, expected: list[tuple[str, float, int]]) -> None:
    assert sorted(found(program)) == sorted(expected)


@pytest.mark.parametrize(
    ("ripple", "expected"),
    [
        (0.0, [1, -3, 5, -1, 3, -4, 4]),
        (3.5, [1, -3, 5, -1, 3, -4, 4]),
        (4.5, [5, -4, 4]),
        (8.5, [5]),
    ],
)
def test_a_deadband_over_the_series_of_astm_e1049(ripple: float, expected: list[float]) -> None:
    """ASTM E1049 figure 6 (from memory) as a program; which turning points are kept is derived."""
    places = [-2, 1, -3, 5, -1, 3, -4, 4, -2]
    program = "G21 G0 X-2\n" + "".join(f"G1 X{place} F100\n" for place in places[1:])
    # the run-up from 0 to -2 is taken out by starting there
    items = reversals(blocks_of(program.encode()), Setup(units="mm", start={"X": -2 * MM}), {"X": round(ripple * MM)})
    assert [r.position for r in items] == expected


def test_sides_are_forgotten_where_nobody_knows_them() -> None:
    """After a tool change, home or machine coordinates the next direction follows from nothing."""
    assert found("G21 G1 X10 F1\nM6 T2\nG1 X5\nX7\nX6") == [("X", 7, -1)]
    assert found("G21 G1 X10 F1\nG28 X20\nG1 X5\nX7\nX6") == [("X", 7, -1)]
    assert found("G21 G1 X10 F1\nG53 G0 X2\nG1 X5\nX3\nX4") == [("X", 3, 1)]


# ---- statistics ------------------------------------------------------------------------------------------------------

SAW = "G21 G0 X0 Y0\n" + "".join(f"G1 X{10 + k % 2 * k} F100\n" for k in range(1, 9)) + "G0 X0\nG0 X5\n"
"""X goes 11, 10, 13, 10, 15, 10, 17, 10, then by rapids 0, 5."""


def test_statistics_of_a_saw() -> None:
    (x,) = [axis for axis in statistics(blocks_of(SAW.encode()), PLAIN, {}) if axis.axis == "X"]
    assert (x.feed, x.rapid, x.in_arcs, x.take_ups) == (7, 1, 0, 7)
    places = [11, 10, 13, 10, 15, 10, 17, 0]
    travels = sorted(abs(b - a) for a, b in itertools.pairwise(places))
    assert x.median_travel == pytest.approx(np.median(travels)) and x.shortest_travel == pytest.approx(min(travels))
    assert (x.low, x.high) == (0, 17)
    assert len(x.bins) == BINS and sum(x.bins) == 8 and x.bins[0] == 1 and x.bins[-1] == 1
    assert x.suppressed == 0


def test_a_ripple_says_what_it_has_passed_over() -> None:
    (x,) = [a for a in statistics(blocks_of(SAW.encode()), PLAIN, {"X": 2 * MM}) if a.axis == "X"]
    assert x.suppressed + x.feed + x.rapid == 8
    assert x.suppressed == 2  # 11 to 10 and back


def test_the_busiest_blocks_are_named() -> None:
    program = b"G21 G0 X10 Y0\nG3 I-10 P3 F100\nG1 X5\n"
    axes = {axis.axis: axis for axis in statistics(blocks_of(program), PLAIN, {})}
    assert axes["Y"].busiest[0] == (2, 6)
    assert axes["X"].in_arcs == 5


def test_an_axis_that_never_turns_has_no_travel() -> None:
    (x,) = statistics(blocks_of(b"G21 G0 X1\nX2"), PLAIN, {})
    assert (x.feed, x.rapid, x.median_travel, x.shortest_travel) == (0, 0, None, None)


# ---- the command -----------------------------------------------------------------------------------------------------


def test_the_command_counts_what_the_library_counts() -> None:
    outcome = run_command("reversals", "-", "--json", program=SAW.encode())
    data = json.loads(outcome.output)
    (x,) = [axis for axis in data["axes"] if axis["axis"] == "X"]
    assert outcome.code == 0 and data["units"] == "mm"
    assert x["feed"] == 7


def test_the_command_lists_each_reversal_with_its_line() -> None:
    outcome = run_command("reversals", "-", "--list", program=b"G21 G0 X0\nG1 X10 F100\nX5\n")
    rows = [line.split("\t") for line in outcome.output.decode().splitlines()]
    assert rows[1][0] == "3" and "X" in rows[1]


def test_the_command_refuses_what_it_cannot_read() -> None:
    outcome = run_command("reversals", "-", program=b"G21\nG1 X[5]\n")
    assert outcome.code == 65 and "line 2: X[5]" in outcome.messages and not outcome.output
