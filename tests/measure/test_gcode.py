"""The programs are plain G-code, and the estimate of their time is that of uniform acceleration."""

from __future__ import annotations

import math
import re
from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from gcodetool.inspection.coupon_tongues import TonguesRequest, tongues_plan
from gcodetool.inspection.coupon_vernier import VernierRequest, vernier_plan
from gcodetool.inspection.measure_gcode import minutes, number, plan_bounds, plan_seconds, program_text
from gcodetool.inspection.measure_records import Move, Note, Pause, ProgramPlan, Spindle
from gcodetool.inspection.measure_targets import CYCLES, IndicatorRequest, indicator_plan
from tests.oracle import controller
from tests.oracle.machine import Machine as OracleMachine

D = Decimal
PLANS = [
    *(indicator_plan(IndicatorRequest("X", D(0), D("123.4"), cycle=cycle))[0] for cycle in CYCLES),
    indicator_plan(IndicatorRequest("Z", D(-30), D(0), dwell=D(4)))[0],
    indicator_plan(IndicatorRequest("A", D(0), D(360), cycle="step", reading_z=D(-3)))[0],
    vernier_plan(VernierRequest()),
    vernier_plan(VernierRequest(step=D("0.005"), largest=D("0.3"), rpm=D(10000), x=D("-3.25"))),
    tongues_plan(TonguesRequest()),
    tongues_plan(TonguesRequest(cutter=D("3.175"), slot=D("9.5"), rpm=D(20000))),
]
WORD = re.compile(r"(G\d+|M\d+|S\d+|F\d+(\.\d+)?|P\d+\.\d+|[XYZABC]-?\d+\.\d{3,})")


@pytest.mark.parametrize("plan", PLANS, ids=lambda plan: plan.title)
def test_programs_are_plain(plan: ProgramPlan) -> None:
    lines = program_text(plan, 100.0).splitlines()
    assert all(len(line) <= 80 and line.isascii() for line in lines)
    code = [line for line in lines if not line.startswith("(")]
    assert all(line.endswith(")") and line.count("(") == line.count(")") == 1 for line in lines if line not in code)
    assert code[0] == "G21 G90 G17 G94"
    assert code[-1] == "M2"
    assert all(WORD.fullmatch(word) for line in code for word in line.split(" "))
    assert lines[1] == "(gcodetool measure: run as it is, never compensate)"
    head = " ".join(lines[: lines.index(code[0])])
    for caution in ("Clearance", "Hands off", "Takes about", "Program positions"):
        assert caution in head


@pytest.mark.parametrize("plan", PLANS, ids=lambda plan: plan.title)
def test_the_first_moves_are_rapids_on_every_axis_with_z_first(plan: ProgramPlan) -> None:
    moves = [step for step in plan.steps if isinstance(step, Move)]
    rapids = moves[: next(place for place, move in enumerate(moves) if move.feed is not None)]
    assert [letter for letter, _ in rapids[0].words] == ["Z"]
    assert {letter for move in rapids for letter, _ in move.words} == {letter for m in moves for letter, _ in m.words}
    assert rapids[0].words[0][1] > 0
    heights = [dict(move.words)["Z"] for move in moves if "Z" in dict(move.words)]
    assert heights[-1] == heights[0]


@pytest.mark.parametrize("plan", PLANS, ids=lambda plan: plan.title)
def test_no_rapid_moves_sideways_below_the_top(plan: ProgramPlan) -> None:
    z = None
    for step in plan.steps:
        if isinstance(step, Move):
            words = dict(step.words)
            assert step.feed is not None or z is None or z > 0 or set(words) == {"Z"}
            z = words.get("Z", z)


def test_numbers_have_a_point_and_no_minus_zero() -> None:
    assert [number(D(text)) for text in ("0", "-0.0", "5", "-0.5", "1.2345", "1E+1")] == [
        "0.000", "0.000", "5.000", "-0.500", "1.2345", "10.000",
    ]  # fmt: skip


def test_parentheses_and_other_alphabets_cannot_break_a_comment() -> None:
    text = program_text(ProgramPlan("a (b) \u00b5", ("x" * 50 + " " + "y" * 50,), (Note("(in)"), Move((("X", D(1)),)))))
    assert text.splitlines()[0] == "(a [b] ?)"
    assert "([in])" in text
    with pytest.raises(ValueError, match="longer"):
        program_text(ProgramPlan("a", (), (Pause("x" * 90),)))


def plan_of(*steps: Move | Pause | Spindle) -> ProgramPlan:
    return ProgramPlan("test", (), steps)


def test_time_by_hand() -> None:
    """10 mm at 600 mm/min: 1 s; at 100 mm/s^2 one more 0.1 s; 0.5 mm never reaches it: 2 sqrt(0.005); stops 10 s."""
    here, there = Move((("X", D(0)),)), Move((("X", D(10)),), D(600))
    assert plan_seconds(plan_of(here, there), rapid=1000) == pytest.approx(1.0)
    assert plan_seconds(plan_of(here, there), rapid=1000, acceleration=100) == pytest.approx(1.1)
    short = Move((("X", D("0.5")),), D(600))
    assert plan_seconds(plan_of(here, short), rapid=1000, acceleration=100) == pytest.approx(2 * math.sqrt(0.005))
    waits = plan_of(Pause("a"), Pause("b", D(4)))
    assert plan_seconds(waits, rapid=1000, per_stop=7) == pytest.approx(11)
    slanted = plan_of(Move((("X", D(0)), ("Y", D(0)))), Move((("X", D(30)), ("Y", D(40)))))
    assert plan_seconds(slanted, rapid=3000) == pytest.approx(1.0)


@given(st.floats(0.01, 500), st.floats(1, 100), st.floats(10, 1000))
def test_time_against_a_simulation_of_the_move(distance: float, speed: float, acceleration: float) -> None:
    """Speed up, run, slow down, in small steps of time."""
    plan = plan_of(Move((("X", D(0)),)), Move((("X", D(repr(distance))),), D(repr(speed * 60))))
    found = plan_seconds(plan, rapid=1, acceleration=acceleration)
    top = min(speed, math.sqrt(distance * acceleration))
    step = found / 20000
    travelled = sum(
        step * min(top, acceleration * t, acceleration * (found - t)) for t in (step * (i + 0.5) for i in range(20000))
    )
    assert travelled == pytest.approx(distance, rel=1e-3)


def test_bounds() -> None:
    plan = plan_of(Move((("X", D(3)), ("Y", D(1)))), Move((("X", D(-2)),)))
    assert plan_bounds(plan) == {"X": (D(-2), D(3)), "Y": (D(1), D(1))}


def test_times_in_words() -> None:
    assert [minutes(seconds) for seconds in (0.2, 44.6, 100, 3600, 9000)] == [
        "1 s",
        "45 s",
        "2 min",
        "60 min",
        "2 h 30 min",
    ]


@pytest.mark.parametrize("plan", PLANS, ids=lambda plan: plan.title)
def test_a_strict_controller_makes_the_moves_of_the_plan(plan: ProgramPlan) -> None:
    """The oracle is written from NISTIR 6556 and refuses what that does not hold."""
    made = [
        item.end for item in controller.run(program_text(plan, 100.0).encode(), OracleMachine()) if hasattr(item, "end")
    ]
    place, wanted = dict.fromkeys("XYZABC", 0.0), []
    for step in plan.steps:
        if isinstance(step, Move):
            place |= {letter: float(value) for letter, value in step.words}
            wanted.append(tuple(place.values()))
    assert [tuple(end) for end in made] == wanted
