"""Work offsets, set positions, local shifts, tool lengths, home and machine coordinates against NISTIR 6556, 3.5."""

from __future__ import annotations

import pytest

from gcodetool.motion.moves import Event, Move, Setup
from tests.motion.driving import ends, items, mm, moves, place, refusal_of

TABLE = Setup(
    units="mm",
    start=place(X=4, Y=0, Z=10),
    offsets={"G54": place(X=0, Y=0, Z=0), "G55": place(X=100, Y=50, Z=-20), "G59.3": place(X=-7)},
    lengths={1: 20 * 10**10, 2: 10**10},
    homes={"G28": place(X=-1, Y=-2, Z=50), "G30": place(X=9, Y=8, Z=77)},
)


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # the example of NISTIR 6556 3.5.17: X stands at 4; G92 X7 makes the offset -3, so program 7 is machine 4
        ("G92 X7\nG0 X7 Y1", [(4, 1, 10)]),
        ("G92 X7\nG0 X10", [(7, 0, 10)]),
        ("G92 X7\nG92 X9\nG0 X10", [(5, 0, 10)]),  # then -5 in all
        ("G92 X7\nG92.1\nG0 X10", [(10, 0, 10)]),
        ("G92 X7\nG92.2\nG0 X10\nG92.3\nG0 X10", [(10, 0, 10), (7, 0, 10)]),
        ("G92 X7\nG92.1\nG0 X10\nG92.3\nG0 X11", [(10, 0, 10), (11, 0, 10)]),  # G92.1 clears the parameters too
        # G10 L2 sets an origin in absolute coordinates, only for the words given (3.5.5)
        ("G10 L2 P1 X2\nG0 X0 Y1", [(2, 1, 10)]),
        ("G10 L2 P2 X2\nG0 X0\nG55 G0 X0 Y0", [(0, 0, 10), (2, 50, 10)]),
        # G92 offsets stay in force under G10 (3.5.5)
        ("G92 X7\nG10 L2 P1 X1\nG0 X10", [(8, 0, 10)]),
        # L20 gives the present position a value (common practice, no source)
        ("G10 L20 P1 X0\nG0 X1", [(5, 0, 10)]),
        ("G10 L20 P0 X0\nG0 X1", [(5, 0, 10)]),
        ("G10 L20 P2 X0\nG55 G0 X1 Y0", [(5, 50, 10)]),
        # work offsets (3.5.12): a change of system moves nothing by itself
        ("G55\nG0 X0", [(100, 0, 10)]),
        ("G55 G0 X0 Y0\nG54 X0", [(100, 50, 10), (0, 50, 10)]),
        ("G59.3 G0 X0", [(-7, 0, 10)]),
        # G52 shifts the frame in force (common practice, no source)
        ("G52 X10\nG0 X0\nG52 X0\nG0 X0", [(10, 0, 10), (0, 0, 10)]),
        # tool length (3.5.10): Z counts from the tip
        ("G43 H1\nG0 Z5", [(4, 0, 25)]),
        ("G43 H1 Z5", [(4, 0, 25)]),
        ("G43 H2\nG0 Z5\nG49\nG0 Z4", [(4, 0, 6), (4, 0, 4)]),
        ("G43.1 Z3\nG0 Z5", [(4, 0, 8)]),
        # units change the numbers, not the place (2.1.2.10)
        ("G0 X25.4\nG20 G0 Y1", [(25.4, 0, 10), (25.4, 25.4, 10)]),
        # G91 steps do not see any frame
        ("G55 G91 G0 X1 Y-1", [(5, -1, 10)]),
        ("G0 X1\nG91 X1\nX1\nG90 X0", [(1, 0, 10), (2, 0, 10), (3, 0, 10), (0, 0, 10)]),
    ],
)
def test_where_the_moves_of_a_program_end(program: str, expected: list[tuple[float, ...]]) -> None:
    assert ends(f"G21 G0\n{program}", TABLE) == expected


@pytest.mark.parametrize(
    ("program", "expected", "letters"),
    [
        # a traverse to the point, then one home (NISTIR 6556 3.5.8)
        ("G28 X1 Z20", [(1, 0, 20), (-1, 0, 50)], "XZ"),
        ("G91 G28 Z0", [(4, 0, 50)], "Z"),
        ("G91 G28 Z5", [(4, 0, 15), (4, 0, 50)], "Z"),
        ("G28", [(-1, -2, 50)], "XYZABC"),
        ("G30", [(9, 8, 77)], "XYZABC"),
        ("G30 Y3", [(4, 3, 10), (4, 8, 10)], "Y"),
        # machine coordinates, for this line only (3.5.11)
        ("G55 G53 G0 X3", [(3, 0, 10)], "X"),
    ],
)
def test_home_and_machine_coordinates(program: str, expected: list[tuple[float, ...]], letters: str) -> None:
    found = items(f"G21 {program}", TABLE)
    moved = [mm(item.end) for item in found if isinstance(item, Move) and item.start != item.end]
    assert moved == expected
    (event,) = (item for item in found if isinstance(item, Event))
    assert (event.what, sorted(event.letters)) == ("home", sorted(letters))


def test_g53_holds_for_its_line_only() -> None:
    assert ends("G21 G55 G53 G0 X3\nX3", TABLE) == [(3, 0, 10), (103, 0, 10)]


def test_order_of_execution_in_one_line() -> None:
    """NISTIR 6556 table 8: plane, units, length, offset and distance mode come before the motion."""
    assert ends("G0 X1 G91 G20", TABLE) == [(29.4, 0, 10)]
    assert ends("G21 G0 X0 Y0 G55", TABLE) == [(100, 50, 10)]


def test_a_probe_stops_where_it_touches_and_then_the_place_is_unknown() -> None:
    """NISTIR 6556 3.5.9."""
    touching = Setup(units="mm", start=place(Z=10), contacts=(place(Z=3),))
    found = items("G21 G38.2 Z-5 F50\nG92 Z0\nG1 Z1", touching)
    assert [mm(item.end) for item in found if isinstance(item, Move)] == [(0, 0, 3), (0, 0, 4)]
    assert [(item.what, item.letters) for item in found if isinstance(item, Event)] == [("probe", "Z")]


def test_a_tool_change_is_an_event_at_the_place_of_the_changer() -> None:
    setup = Setup(units="mm", tool_change=place(X=50, Z=80))
    found = items("G21 G0 X1 Z1\nT2 M6\nG0 Y5", setup)
    (event,) = (item for item in found if isinstance(item, Event))
    assert (event.what, event.line, mm(event.at)) == ("tool change", 2, (50, 0, 80))
    assert mm(found[-1].end) == (50, 5, 80)  # type: ignore[union-attr]


@pytest.mark.parametrize("end", ["M2", "M30", "M30 (done)", "%"])
def test_nothing_runs_after_the_end(end: str) -> None:
    """NISTIR 6556 3.2 and 3.6.1: lines after M2, M30 or the second tape mark are not executed."""
    program = f"%\nG21 G0 X1\n{end}\nG0 X99\n"
    assert ends(program) == [(1, 0, 0)]


def test_the_block_delete_switch() -> None:
    """NISTIR 6556 2.2.3: with the switch on, lines that begin with a slash are skipped."""
    program = "G21 G0 X1\n/G0 X2\nG0 Y1"
    assert ends(program) == [(1, 0, 0), (2, 0, 0), (2, 1, 0)]
    assert ends(program, Setup(units="mm", skip_deletable=True)) == [(1, 0, 0), (1, 1, 0)]


def test_wake_up_units_hold_until_the_program_states_its_own() -> None:
    assert ends("G0 X1\nG21 X2", Setup(units="in")) == [(25.4, 0, 0), (2, 0, 0)]


def test_an_axis_is_unplaced_until_an_absolute_word_places_it() -> None:
    found = moves("G21 G91 G0 X1\nG90 X5\nX6 Y1", Setup(units="mm", unplaced="XYZ"))
    assert [move.unplaced for move in found] == ["X", "X", "Y"]


def test_moves_carry_what_holds_beside_their_path() -> None:
    found = moves("G21 T3 M6 S1200 M3\nG1 X1 F100\nG93 X2 F4\nG94 M5 X3 F50")
    assert [(m.context.feed, m.context.feed_mode, m.context.spindle) for m in found] == [
        (100.0, "G94", "M3"),
        (4.0, "G93", "M3"),
        (50.0, "G94", "M5"),
    ]
    assert {(m.context.tool, m.context.speed) for m in found} == {("3", 1200.0)}


def test_a_feed_in_inches_is_known_in_mm() -> None:
    (move,) = moves("G20 G1 X1 F10")
    assert move.context.feed == pytest.approx(254)


@pytest.mark.parametrize("program", ["G21 G10 L2 P10 X1", "G21 G10 L20 P99 X1"])
def test_there_are_nine_work_offsets(program: str) -> None:
    """NISTIR 6556 3.5.5: P is 1 to 9."""
    assert refusal_of(program).way_out
