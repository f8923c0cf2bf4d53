"""Limits and sense: what stops a job before it starts."""

from __future__ import annotations

from decimal import Decimal

import numpy as np
import pytest

from gcodetool.inspection.audit import audit
from gcodetool.inspection.audit_records import Audit, Severity
from gcodetool.inspection.durations import trapezoid
from gcodetool.inspection.job_records import Cutter, Job, KeepOut, StockShape
from gcodetool.inspection.materials import material_named
from gcodetool.inspection.outlines import box, disc
from gcodetool.machine import Axis, Machine
from gcodetool.motion.moves import ORDER, Setup
from gcodetool.program.numbers import QUANTA_PER_MM
from tests.audit.conftest import HEAD, SETUP

STOCK = StockShape(box(-50.0, -50.0, 50.0, 50.0), 0.0, -5.0)
PASS = "G0 X-40 Y0 Z5\nG1 Z-1\nG1 X40\nG0 Z5\n"


def judge(program: str, machine: Machine | None = None, setup: Setup = SETUP, **job: object) -> Audit:
    values: dict[str, object] = {"cutters": (Cutter("*", 6.0),), "stock": STOCK}
    values.update(job)
    return audit(program.encode("latin-1"), Job(**values), machine or Machine(), setup)  # type: ignore[arg-type]


def codes(found: Audit, least: int = 0) -> set[int]:
    return {each.code for each in found.findings if each.code >= least}


def line_of(found: Audit, code: int) -> int:
    return next(each.line for each in found.findings if each.code == code)


def test_a_good_program_draws_notes_only() -> None:
    found = judge(HEAD + PASS)
    assert all(each.severity is Severity.NOTE for each in found.findings)


# ---- spindle -------------------------------------------------------------------------------------------------------


def test_a_cutter_that_was_never_started() -> None:
    found = judge("G21 G90\nF300 S1000\n" + PASS)
    assert line_of(found, 201) == 4  # the plunge
    assert 201 not in codes(judge("G21 G90\nF300 S1000\nG0 Z5\nG1 Z1\nM3\n" + PASS))
    assert 201 in codes(judge(HEAD + "M5\n" + PASS))


@pytest.mark.parametrize(
    ("word", "hand", "wrong"), [("M3", 1, False), ("M4", 1, True), ("M3", -1, True), ("M4", -1, False)]
)
def test_the_sense_of_the_spindle_against_the_hand_of_the_cutter(word: str, hand: int, wrong: bool) -> None:
    found = judge((HEAD + PASS).replace("M3", word), cutters=(Cutter("*", 6.0, hand=hand),))
    assert (202 in codes(found)) == wrong


def test_speeds_outside_the_machine_and_above_the_mark_on_the_cutter() -> None:
    assert 306 in codes(judge(HEAD + PASS, most_speed=8000.0))
    assert 306 in codes(judge(HEAD + PASS, least_speed=12000.0))
    assert 307 in codes(judge(HEAD + PASS, cutters=(Cutter("*", 6.0, most_speed=9000.0),)))
    assert not codes(judge(HEAD + PASS, least_speed=8000.0, most_speed=12000.0)) & {306, 307}


# ---- travel --------------------------------------------------------------------------------------------------------


def axes(**travel: tuple[int, int]) -> Machine:
    return Machine(
        axes={
            letter.upper(): Axis(letter.upper(), lash=Decimal("0.1"), travel=(Decimal(low), Decimal(high)))
            for letter, (low, high) in travel.items()
        }
    )


def offset(**places: float) -> Setup:
    at = {letter.upper(): round(value * QUANTA_PER_MM) for letter, value in places.items()}
    return Setup(units="mm", unplaced=ORDER, offsets={"G54": at})


def test_take_ups_and_settles_count_towards_the_envelope() -> None:
    """From -40 to 40, a take-up reaches 0.1 beyond; the first rapid settles 0.1 + 0.5 past -40 on the plus side,
    inside."""
    found = judge(HEAD + PASS, axes(x=(-100, 100)))
    assert [(each.low, each.high) for each in found.envelope if each.axis == "X"] == [(-40.0, pytest.approx(40.1))]
    other = judge(HEAD + "G0 X40 Y0 Z5\nG1 Z-1\nG1 X-40\nG0 Z5\n", axes(x=(-100, 100)))
    assert [each.high for each in other.envelope if each.axis == "X"] == [pytest.approx(40.6)]


def test_positions_are_compared_with_the_travel_where_the_work_offset_is_known() -> None:
    sheet = axes(x=(-300, 0))
    assert 302 not in codes(judge(HEAD + PASS, sheet, offset(x=-100)))
    beyond = judge(HEAD + PASS, sheet, offset(x=-40))
    assert "0.100" in next(each.text for each in beyond.findings if each.code == 302)
    assert 302 in codes(judge(HEAD + PASS, sheet, offset(x=-270)))


def test_only_the_size_is_compared_where_it_is_not() -> None:
    small = judge(HEAD + PASS, axes(x=(0, 80)))
    assert {303, 309} <= codes(small)
    assert 303 not in codes(judge(HEAD + PASS, axes(x=(0, 81))))


def test_little_travel_below_the_deepest_point() -> None:
    sheet = axes(z=(-60, 0))
    assert 310 in codes(judge(HEAD + PASS, sheet, offset(z=-58)))
    assert 310 not in codes(judge(HEAD + PASS, sheet, offset(z=-40)))


def test_stock_keeps_its_place_when_a_work_offset_is_given() -> None:
    plain, moved = judge(HEAD + PASS), judge(HEAD + PASS, setup=offset(x=-120, y=33, z=-40))
    assert [row.length for row in plain.shares] == pytest.approx([row.length for row in moved.shares])


def test_work_offsets_of_unknown_place() -> None:
    two = HEAD + "G54\n" + PASS + "G55\n" + PASS
    assert 108 in codes(judge(two))
    both = {word: {"X": 0, "Y": at * QUANTA_PER_MM, "Z": 0} for word, at in (("G54", 0), ("G55", 20))}
    known = judge(two, setup=Setup(units="mm", unplaced=ORDER, offsets=both))
    assert 108 not in codes(known)
    cut = {row.label for row in known.shares if row.length > 50}
    assert "slot" in cut
    assert "spring pass" not in cut
    assert "spring pass" in {row.label for row in judge(two).shares if row.length > 50}


def test_below_the_stock() -> None:
    found = judge(HEAD + PASS.replace("Z-1", "Z-5.2"))
    assert line_of(found, 308) == 5
    assert 308 not in codes(judge(HEAD + PASS.replace("Z-1", "Z-5")))


# ---- clamps and rapids ---------------------------------------------------------------------------------------------

CLAMP = KeepOut("left clamp", box(-45.0, 20.0, -35.0, 30.0), 10.0)


@pytest.mark.parametrize(
    ("program", "line"),
    [
        ("G0 X-40 Y-40 Z15\nG0 Z5\nG1 Y40 F500\n", 6),  # through it on feed
        ("G0 X-40 Y-40 Z15\nG0 Z9\nG0 Y40\n", 6),  # through it on a rapid
        ("G0 X-32.5 Y-40 Z15\nG0 Z5\nG1 Y40 F500\n", 6),  # 2.5 beside it, the cutter's radius is 3
        ("G0 X-60 Y25 Z15\nG0 X40 Z5\n", None),  # over its edge while it goes down: 13 and more above it there
        ("G0 X-40 Y-40 Z15\nG0 Y40\n", None),  # above it
        ("G0 X-31.9 Y-40 Z15\nG0 Z5\nG1 Y40 F500\n", None),  # 3.1 beside it
        ("G0 X-20 Y25 Z15\nG0 Z5\nG2 X-20 Y25 I-10 J0 F500\n", 6),  # an arc round its far side
    ],
)
def test_keep_out_areas(program: str, line: int | None) -> None:
    found = judge(HEAD + program, keep_outs=(CLAMP,))
    assert (304 in codes(found)) == (line is not None)
    if line:
        assert line_of(found, 304) == line
        assert "left clamp" in next(each.text for each in found.findings if each.code == 304)


def test_a_slanted_rapid_into_a_clamp_counts_below_its_height_only() -> None:
    low = "G0 X-80 Y25 Z60\nG0 X-40 Z0\n"
    assert 304 in codes(judge(HEAD + low, keep_outs=(CLAMP,)))
    high = "G0 X-80 Y25 Z60\nG0 X0 Z0\n"  # 25 above the clamp's far edge
    assert 304 not in codes(judge(HEAD + high, keep_outs=(CLAMP,)))


def test_an_arc_in_another_plane_dips_into_a_clamp_and_below_the_stock() -> None:
    """From X-60 to X-20 at Z12, G18 G3 with radius 20: down to Z-8 over the clamp; G2 goes over it."""
    start = "G0 X-20 Y25 Z12\nG18\n"
    dips, passes = (judge(HEAD + start + f"{word} X-60 Z12 I-20 K0\n", keep_outs=(CLAMP,)) for word in ("G3", "G2"))
    assert 304 in codes(dips) and 308 in codes(dips)
    assert not codes(passes) & {304, 308}


def test_round_clamps() -> None:
    screw = KeepOut("screw", disc(0.0, 10.0, 4.0), 3.0)
    assert 304 in codes(judge(HEAD + "G0 X-40 Y4 Z5\nG1 Z-1\nG1 X40\n", keep_outs=(screw,)))
    assert 304 not in codes(judge(HEAD + "G0 X-40 Y2.9 Z5\nG1 Z-1\nG1 X40\n", keep_outs=(screw,)))


@pytest.mark.parametrize(
    ("program", "line"),
    [
        ("G0 X-40 Y0 Z5\nG0 Z-1\n", 5),  # straight down into it
        ("G0 X-60 Y0 Z5\nG0 Z-1\nG0 X0\n", 6),  # sideways into it
        (PASS + "G0 X-40\nG0 Z-0.9\nG0 X40\n", None),  # inside the slot just cut
        ("G0 X-40 Y0 Z5\nG1 Z-1\nG0 X40\n", 6),
        ("G0 X-40 Y0 Z5\nG0 Z0.1\nG0 X40\n", None),
        ("G0 X-40 Y0 Z5\nG83 X0 Y0 Z-4 R1 Q1\nG80\n", None),  # pecks come down in their own hole
    ],
)
def test_rapids_that_meet_material(program: str, line: int | None) -> None:
    found = judge(HEAD + program)
    assert (304 in codes(found), 301 in codes(found)) == (False, line is not None)
    if line:
        assert line_of(found, 301) == line


def test_going_home_through_an_unknown_place_is_no_collision() -> None:
    assert 301 not in codes(judge(HEAD + PASS + "G28\nG0 X0 Y0\nG0 Z5\n", stock=StockShape(STOCK.outline, 8.0)))


# ---- feeds and time ------------------------------------------------------------------------------------------------


def test_a_feed_that_an_axis_cannot_reach() -> None:
    sheet = Machine(axes={"X": Axis("X", max_feed=Decimal(200)), "Y": Axis("Y", max_feed=Decimal(1000))})
    found = judge(HEAD + PASS, sheet)
    assert line_of(found, 305) == 6
    assert "150 %" in next(each.text for each in found.findings if each.code == 305)
    slanted = HEAD + "G0 X-40 Y-40 Z5\nG1 Z-1\nG1 X0 Y40 F400\n"  # X gets 0.447 of 400
    assert 305 not in codes(judge(slanted, sheet))


def test_time_from_stop_to_stop() -> None:
    """s/v + v/a for a move that reaches its feed, 2 sqrt(s/a) for one that does not (uniform acceleration)."""
    length, speed, acceleration = np.array([100.0, 1.0]), np.array([10.0, 100.0]), np.array([50.0, 50.0])
    assert trapezoid(length, speed, acceleration) == pytest.approx([100 / 10 + 10 / 50, 2 * (1 / 50) ** 0.5])


def test_the_time_of_a_job() -> None:
    """80 mm at 300 mm/min and 6 at 300; rapids at 1200 mm/min; stops at 100 mm/s^2."""
    values = {"max_feed": Decimal(1200), "acceleration": Decimal(100)}
    sheet = Machine(axes={letter: Axis(letter, lash=Decimal("0.1"), **values) for letter in "XYZ"})
    times = judge(HEAD + "G0 Z5\nG1 Z-1\nG1 X80\nG1 X0\n", sheet).durations
    assert times.feed == pytest.approx((6 + 160) / 5)
    assert times.rapid == pytest.approx(5 / 20)
    assert times.stop_to_stop == pytest.approx(166 / 5 + 3 * 5 / 100 + 5 / 20 + 20 / 100)
    assert times.take_ups == 2  # Z after the rapid up, X at its end
    assert times.take_up_time == pytest.approx(2 * (0.1 / 5 + 5 / 100), rel=0.6)
    bare = judge(HEAD + PASS).durations
    assert bare.stop_to_stop is None
    assert len(bare.said) == 2


def test_inverse_time_and_feed_per_turn() -> None:
    inverse = judge("G21 G90 G93\nS1000 M3\nG0 Z5\nG1 Z-1 F30\nG1 X80 F0.5\n").durations
    assert inverse.feed == pytest.approx(60 / 30 + 60 / 0.5)
    per_turn = judge("G21 G90 G95\nS1000 M3\nG0 Z5\nG1 Z-1 F0.1\nG1 X80\n").durations
    assert per_turn.feed == pytest.approx(86 / 100 * 60)


# ---- chips ---------------------------------------------------------------------------------------------------------


def test_chips_too_thin_and_too_thick() -> None:
    brass = material_named("brass")
    thin = judge(HEAD.replace("F300", "F30") + PASS, material=brass)  # 0.0015 mm per tooth
    assert 401 in codes(thin)
    thick = judge(HEAD.replace("F300", "F2000") + PASS, material=brass)  # 0.1 mm per tooth
    assert 402 in codes(thick)
    assert not codes(judge(HEAD.replace("F300", "F300") + PASS, material=brass)) & {401, 402}


def test_a_deep_slot() -> None:
    assert 403 in codes(judge(HEAD + PASS.replace("Z-1", "Z-4"), cutters=(Cutter("*", 3.0),)))
    assert 403 not in codes(judge(HEAD + PASS.replace("Z-1", "Z-2"), cutters=(Cutter("*", 3.0),)))


def test_what_is_not_known_is_told() -> None:
    found = judge("G21 G90\nM3\nG0 Z5\nG1 Z-1 F100\nG1 X10\n", cutters=(Cutter("*", 6.0),), stock=StockShape())
    assert {101, 102, 103, 104, 107} <= codes(found)
    told = judge("G21 G90\nM3\nG0 Z5\nG1 Z-1 F100\nG1 X10\n", speed=10_000.0, material=material_named("brass"))
    assert not codes(told) & {101, 102, 103, 104}
    assert 105 in codes(judge(HEAD + PASS, Machine(axes={"X": Axis("X", lash=Decimal("0.1"))})))
    assert 106 in codes(judge(HEAD + PASS + "G1 A90\n"))


def test_a_tool_without_a_diameter_is_asked_for() -> None:
    with pytest.raises(ValueError, match=r"line 6: nothing is known of tool T3.*--tool 3="):
        judge("G21 G90\nT3 M6\nM3 S1000\nF100\nG0 Z5\nG1 Z-1\n", cutters=(Cutter("1", 6.0),))
    assert judge("G21 G90\nT3 M6\nM3 S1000\nF100\nG0 Z5\nG1 Z-1\n", cutters=(Cutter("3", 6.0),)).feed_moves == 1
