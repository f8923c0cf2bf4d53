"""Drilling and boring cycles: the published move lists of NISTIR 6556, 3.5.16 and appendix C.3, and its rules."""

from __future__ import annotations

import pytest

from gcodetool.motion.moves import Move, Setup
from tests.motion.driving import Step, ends, mm, moves, place, refusal_of, steps

AT_123 = Setup(units="mm", start=place(X=1, Y=2, Z=3))


def shown(found: list[Step]) -> list[str]:
    """Moves as the standard prints them: T for a traverse, F for a feed."""
    return [("T" if s.rapid else "F") + "({:g},{:g},{:g})".format(*s.end) for s in found]


def holes(program: str, setup: Setup | None = None) -> list[tuple[str, str]]:
    """Each move of a program as (what it is to the hole, where it ends)."""

    def what(move: Move) -> str:
        return move.hole or ("T" if move.rapid else "F")

    found = [move for move in moves(program, setup) if move.start != move.end]
    return [(what(m), "({:g},{:g},{:g})".format(*mm(m.end))) for m in found]


# ---- published examples ----------------------------------------------------------------------------------------------


def test_example_1() -> None:
    """NISTIR 6556 3.5.16.2, first example, from (1,2,3); its move list, in which the tool returns to the old Z."""
    assert shown(steps("G21 G90 G81 G98 X4 Y5 Z1.5 R2.8", AT_123)) == [
        "T(4,5,3)",
        "T(4,5,2.8)",
        "F(4,5,1.5)",
        "T(4,5,3)",
    ]


def test_example_2() -> None:
    """NISTIR 6556 3.5.16.2, second example: three holes in G91, from (1,2,3)."""
    assert shown(steps("G21 G91 G81 G98 X4 Y5 Z-0.6 R1.8 L3", AT_123)) == [
        "T(1,2,4.8)",
        *("T(5,7,4.8)", "F(5,7,4.2)", "T(5,7,4.8)"),
        *("T(9,12,4.8)", "F(9,12,4.2)", "T(9,12,4.8)"),
        *("T(13,17,4.8)", "F(13,17,4.2)", "T(13,17,4.8)"),
    ]


def test_the_cycle_of_the_table_10_session() -> None:
    """NISTIR 6556 table 10: ``g91 g81 x3 y2 z-0.8 r1.5 l2`` from (30,1,-0.5)."""
    start = Setup(units="mm", start=place(X=30, Y=1, Z=-0.5))
    assert shown(steps("g91 g81 x3 y2 z-0.8 r1.5 l2", start)) == [
        "T(30,1,1)",
        *("T(33,3,1)", "F(33,3,0.2)", "T(33,3,1)"),
        *("T(36,5,1)", "F(36,5,0.2)", "T(36,5,1)"),
    ]


C3_START = Setup(units="mm", start=place(Z=-2))


def test_the_cycles_of_appendix_c3() -> None:
    """NISTIR 6556 appendix C.3, first lines; spelled from its derived moves: Z starts at -2, R 0.2, depth -1.1."""
    first = "G21 G90 G81 X3 Y4 Z-1.1 R0.2\n"
    assert shown(steps(first, C3_START)) == ["T(0,0,0.2)", "T(3,4,0.2)", "F(3,4,-1.1)", "T(3,4,0.2)"]
    second = first + "X1 Y0 R0 G91 L3 Z-1.1\n"
    assert shown(steps(second, C3_START))[4:] == [
        *("T(4,4,0.2)", "F(4,4,-0.9)", "T(4,4,0.2)"),
        *("T(5,4,0.2)", "F(5,4,-0.9)", "T(5,4,0.2)"),
        *("T(6,4,0.2)", "F(6,4,-0.9)", "T(6,4,0.2)"),
    ]
    third = second + "Y-2 R0.1\n"
    assert shown(steps(third, C3_START))[13:] == ["T(6,4,0.3)", "T(6,2,0.3)", "F(6,2,-0.8)", "T(6,2,0.3)"]


# ---- each cycle (table of NISTIR 6556 3.5.16.3 to 3.5.16.11) ---------------------------------------------------------

HIGH = Setup(units="mm", start=place(Z=10))


@pytest.mark.parametrize(
    ("word", "out"),
    [("G81", "T"), ("G82", "T"), ("G84", "out"), ("G85", "out"), ("G86", "T"), ("G88", "T"), ("G89", "out")],
)
def test_a_plain_cycle_goes_in_at_feed_and_out_as_the_standard_says(word: str, out: str) -> None:
    assert holes(f"G21 {word} X1 Y2 Z-3 R1 P0.5 F100", HIGH) == [
        ("T", "(1,2,10)"),
        ("T", "(1,2,1)"),
        ("in", "(1,2,-3)"),
        (out, "(1,2,10)"),
    ]


def test_deep_hole_drilling() -> None:
    """G83: feed by Q, out, back to just above the last depth (0.254 mm, from memory), the last peck to Z."""
    assert holes("G21 G99 G83 X1 Z-5 R1 Q2.5", HIGH) == [
        *(("T", "(1,0,10)"), ("T", "(1,0,1)")),
        *(("peck", "(1,0,-1.5)"), ("back", "(1,0,1)"), ("back", "(1,0,-1.246)")),
        *(("peck", "(1,0,-4)"), ("back", "(1,0,1)"), ("back", "(1,0,-3.746)")),
        *(("in", "(1,0,-5)"), ("T", "(1,0,1)")),
    ]


def test_chip_breaking() -> None:
    """G73 backs off a little and stays in the hole (not in NISTIR 6556; common practice, no source)."""
    assert holes("G21 G99 G73 X1 Z-3 R1 Q2.5", HIGH) == [
        *(("T", "(1,0,10)"), ("T", "(1,0,1)")),
        *(("peck", "(1,0,-1.5)"), ("back", "(1,0,-1.246)")),
        *(("in", "(1,0,-3)"), ("T", "(1,0,1)")),
    ]


def test_back_boring() -> None:
    """G87: aside, down, to the hole, up to K at feed and down again, aside, up, to the hole."""
    assert holes("G21 G99 G87 X1 Y2 Z-3 R1 I0.5 J-0.25 K-1", HIGH) == [
        *(("T", "(1.5,1.75,10)"), ("T", "(1.5,1.75,-3)"), ("T", "(1,2,-3)")),
        *(("in", "(1,2,-1)"), ("in", "(1,2,-3)")),
        *(("T", "(1.5,1.75,-3)"), ("T", "(1.5,1.75,1)"), ("T", "(1,2,1)")),
    ]


# ---- rules -----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # R is sticky, Z is while the same cycle goes on, X and Y are the present ones
        ("G90 G99 G81 X1 Z-1 R1\nY5", ["(1,0,10)", "(1,0,1)", "(1,0,-1)", "(1,0,1)", "(1,5,1)", "(1,5,-1)", "(1,5,1)"]),
        # Z changed on the way
        ("G99 G81 X1 Z-1 R1\nX2 Z-2", ["(1,0,10)", "(1,0,1)", "(1,0,-1)", "(1,0,1)", "(2,0,1)", "(2,0,-2)", "(2,0,1)"]),
        # L in G90: the same place again
        ("G99 G81 X1 Z-1 R1 L2", ["(1,0,10)", "(1,0,1)", "(1,0,-1)", "(1,0,1)", "(1,0,-1)", "(1,0,1)"]),
        # G80 ends it; a G1 line then moves as ever
        ("G99 G81 X1 Z-1 R1\nG80\nG1 X5", ["(1,0,10)", "(1,0,1)", "(1,0,-1)", "(1,0,1)", "(5,0,1)"]),
        # another motion word ends it too
        ("G99 G81 X1 Z-1 R1\nG0 X5", ["(1,0,10)", "(1,0,1)", "(1,0,-1)", "(1,0,1)", "(5,0,1)"]),
        # words alone make no hole; the next hole uses them
        (
            "G99 G81 X1 Z-1 R1\nR2\nX2",
            ["(1,0,10)", "(1,0,1)", "(1,0,-1)", "(1,0,1)", "(1,0,2)", "(2,0,2)", "(2,0,-1)", "(2,0,2)"],
        ),
    ],
)
def test_sticky_words_and_the_end_of_a_cycle(program: str, expected: list[str]) -> None:
    """NISTIR 6556 3.5.16.1."""
    assert [where for _, where in holes(f"G21 {program}", HIGH)] == expected


def test_r_outlives_the_cycle_and_depth_does_not() -> None:
    """NISTIR 6556 3.5.16.1: R is always sticky, the depth only while the same cycle continues."""
    again = "G21 G99 G81 X1 Z-1 R1\nG82 X2 Z-2 P1"
    assert holes(again, HIGH)[-1] == ("T", "(2,0,1)")
    refusal = refusal_of("G21 G99 G81 X1 Z-1 R1\nG82 X2 P1", HIGH)
    assert (refusal.line, refusal.words) == (2, "G82")


@pytest.mark.parametrize(("level", "clear"), [("G98", 10), ("G99", 1)])
def test_g98_returns_to_the_old_level_and_g99_to_r(level: str, clear: float) -> None:
    assert ends(f"G21 {level} G81 X1 Z-1 R1", HIGH)[-1] == (1, 0, clear)


def test_below_r_the_tool_first_rises_to_r() -> None:
    """NISTIR 6556 3.5.16.1: the preliminary motion; then G98 means R."""
    low = Setup(units="mm", start=place(Z=-5))
    assert shown(steps("G21 G98 G81 X1 Z-1 R1", low)) == ["T(0,0,1)", "T(1,0,1)", "F(1,0,-1)", "T(1,0,1)"]


@pytest.mark.parametrize(
    ("plane", "words", "expected"),
    [
        ("G17", "X1 Y2 Z-3 R1", ["T(1,2,0)", "F(1,2,-3)", "T(1,2,1)"]),
        ("G18", "X1 Z2 Y-3 R1", ["T(1,0,2)", "F(1,-3,2)", "T(1,1,2)"]),
        ("G19", "Y1 Z2 X-3 R1", ["T(0,1,2)", "F(-3,1,2)", "T(1,1,2)"]),
    ],
)
def test_the_other_planes_drill_along_their_own_normal_axis(plane: str, words: str, expected: list[str]) -> None:
    """NISTIR 6556 3.5.16.1: XYZ stand for the axes of the plane in force."""
    found = shown(steps(f"G21 {plane} G99 G81 {words}"))
    assert found[-2:] == expected[-2:]
    assert len(found) == 4 and found[0].startswith("T"), "first the rise to R"


def test_inch_cycles_back_off_by_the_same_length() -> None:
    """0.010 in and 0.254 mm are one length (from memory)."""
    found = holes("G20 G99 G83 X1 Z-0.2 R0.04 Q0.1", HIGH)
    assert found[2] == ("peck", "(25.4,0,-1.524)") and found[4] == ("back", "(25.4,0,-1.27)")
