"""The oracle's controller against published examples (NISTIR 6556) and strictness."""

from __future__ import annotations

import math

import pytest

from tests.oracle.arcs import sample_arc
from tests.oracle.controller import run
from tests.oracle.machine import Event, Machine, Motion
from tests.oracle.reader import ControllerError, read_blocks

PLAIN = Machine()


def motions(program: str, machine: Machine = PLAIN) -> list[Motion]:
    return [item for item in run(program.encode("latin-1"), machine) if isinstance(item, Motion)]


def ends(program: str, start: tuple[float, ...] = (0, 0, 0)) -> list[tuple[object, ...]]:
    """Kind and X Y Z of each move that moves."""
    machine = Machine(start=(*map(float, start), 0.0, 0.0, 0.0))
    moved = [m for m in motions(program, machine) if m.start != m.end]
    return [(m.kind[0].upper(), *(round(v, 4) for v in m.end[:3])) for m in moved]


# --- text -----------------------------------------------------------------------------------------------------------


def test_blanks_inside_numbers() -> None:
    """NISTIR 6556 3.3: ``g0x +0. 12 34y 7`` is ``g0 x+0.1234 y7``."""
    (block,) = read_blocks(b"g0x +0. 12 34y 7")
    assert block.gcodes == (0,) and block.words == {"X": 0.1234, "Y": 7.0}


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("(a)G1 X1", {"X": 1.0}),
        ("G1 X1(X2)Y3", {"X": 1.0, "Y": 3.0}),
        ("G1 X1;Y3", {"X": 1.0}),
        ("G1X.5Y-.25Z+1.", {"X": 0.5, "Y": -0.25, "Z": 1.0}),
        ("O12 (part)\nG1 X1", {"X": 1.0}),
        ("%\nG1 X1\n%\nX2", {"X": 1.0}),
        ("/N5 G1 X1", {"X": 1.0, "N": 5.0}),
        ("N3 T0*57", {"T": 0.0, "N": 3.0}),  # a common example, from memory; 57 by hand
    ],
)
def test_live_words(text: str, words: dict[str, float]) -> None:
    (block,) = read_blocks(text.encode())
    assert block.words == words


@pytest.mark.parametrize(
    "text",
    ["G1 X", "G1 X1 X2", "G1 X1 U2", "G7 X1", "G1 X[1]", "#1=2", "G1 X1 (open", "G90 G91", "G41 D1", "G1 X1*99",
     "M98 P1", "G0 G1 X1", "G1.05 X1", "O100 sub"],
)  # fmt: skip
def test_strict_errors(text: str) -> None:
    with pytest.raises(ControllerError, match="line 1"):
        run(text.encode(), PLAIN)


# --- arcs -----------------------------------------------------------------------------------------------------------


def test_arc_example() -> None:
    """NISTIR 6556 3.5.3.2: from (7, 7), centre (10, 11), radius 5; sweep recomputed, 143.130 degrees clockwise."""
    arc = motions("G0 X7 Y7\nG17 G2 x10 y16 i3 j4 z9")[1].arc
    assert arc is not None and arc.centre == (10.0, 11.0) and arc.start_radius == 5.0
    assert math.degrees(arc.sweep) == pytest.approx(-143.130, abs=5e-4)
    move = motions("G0 X7 Y7\nG17 G2 x10 y16 i3 j4 z9")[1]
    assert sample_arc(arc, move.start, move.end)[:, 0].min() == pytest.approx(5.0, abs=1e-9)


def test_radius_arc_example() -> None:
    """NISTIR 6556 table 10: centre (1.5, 7.8476); sweep 24.7114 degrees and helix length 3.06444 recomputed."""
    arc = motions("g1 x3 y1 f20.0\ng2 x0 r 7.01 z0.5")[1].arc
    assert arc is not None and arc.sweep < 0
    assert arc.centre == pytest.approx((1.5, 7.84763), abs=5e-6)
    assert math.degrees(-arc.sweep) == pytest.approx(24.7114, abs=5e-5)
    assert math.hypot(7.01 * arc.sweep, 0.5) == pytest.approx(3.06444, abs=5e-6)


@pytest.mark.parametrize(
    ("text", "degrees"),
    [
        ("G0 X10\nG2 X10 Y0 I-10", -360),
        ("G0 X10\nG3 I-10", 360),
        ("G0 X10\nG3 X10 I-10 P3", 1080),
        ("G0 X10\nG3 X0 Y10 I-10 P2", 450),
        ("G0 X10\nG3 X0 Y10 R10", 90),
        ("G0 X10\nG3 X0 Y10 R-10", 270),
        ("G0 X10\nG2 X0 Y10 R10", -90),
        ("G0 X10\nG90.1 G3 X0 Y10 I0 J0", 90),
        ("G0 X10\nG91 G3 X-10 Y10 I-10 J0", 90),
        # seen from +Y, from Z towards X is counter-clockwise (G18 is the Z X plane); seen from +X, from Y towards Z
        ("G0 Z10\nG18 G3 X10 Z0 K-10", 90),
        ("G0 Y10\nG19 G3 Y0 Z10 J-10", 90),
    ],
)
def test_sweeps(text: str, degrees: float) -> None:
    arc = motions(text)[-1].arc
    assert arc is not None and math.degrees(arc.sweep) == pytest.approx(degrees, abs=1e-9)


def test_a_sliver_behind_its_start_goes_round() -> None:
    """One last digit on the wrong side of the start is a circle all but complete, on it a whole one."""
    for back in ("-0.0001", "0"):
        arc = motions(f"G0 X10\nG3 X10 Y{back} I-10")[1].arc
        assert arc is not None and arc.sweep == pytest.approx(math.tau, abs=1e-4)


@pytest.mark.parametrize(
    "text",
    ["G2 X5 Y5", "G2 X0 Y0 R5", "G2 X10 R4.99", "G2 X10 I5.1", "G2 X10 I5 R5", "G2 X10 K5", "G90.1 G2 X10 I5",
     "G2 X10 I5 P1.5", "G18 G2 X5 J3"],
)  # fmt: skip
def test_arc_errors(text: str) -> None:
    with pytest.raises(ControllerError):
        run(text.encode(), PLAIN)


def test_mismatch_is_a_field() -> None:
    """A mismatch of rounding is told, not refused."""
    arc = motions("G0 X10\nG3 X0 Y10.002 I-10")[1].arc
    assert arc is not None and arc.mismatch == pytest.approx(0.002)


# --- modes and frames -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("text", "kinds"),
    [
        ("X1\nG0 X2\nX3", "frr"),
        ("G1 X1\nG0 G80\nX2", "fr"),
        ("G80 G0\nX2", "r"),
        ("G0 X1\nG4 X5\nX2", "rr"),
        ("G0 X1\nM30\nX2", "r"),
    ],
)
def test_motion_modes(text: str, kinds: str) -> None:
    assert "".join(m.kind[0] for m in motions(text)) == kinds


def test_frames() -> None:
    """Inch, work offset, tool length (table 10: command Z 0.5 with length 1.0 is -0.5 in program terms), G53, G28."""
    machine = Machine(
        work=((1.0,) * 6, (2.0,) * 6, *((0.0,) * 6,) * 7), lengths={2: 10.0}, home28=(100.0, 200.0, 300.0, 0, 0, 0)
    )
    text = "G20 G0 X1\nG21 G55 X0\nG43 H2 Z0\nG49 Z0\nG53 X7\nG28 Z5\nG91 G28 Y0\nG30"
    assert [m.end[:3] for m in motions(text, machine)] == [
        (26.4, 0, 0), (2, 0, 0), (2, 0, 12), (2, 0, 2), (7, 0, 2), (7, 0, 7), (7, 0, 300), (7, 0, 300), (7, 200, 300),
        (0, 0, 0),
    ]  # fmt: skip
    assert [m.machine_frame for m in motions(text, machine)] == [False] * 4 + [True, False, True, False, True, True]


def test_set_position_example() -> None:
    """NISTIR 6556 3.5.18: at X 4, G92 x7 makes the offset -3, then G92 x9 makes it -5."""
    assert ends("G0 X4\nG92 X7\nX0\nG92 X0\nG92.1 X0") == [("R", 4, 0, 0), ("R", -3, 0, 0), ("R", 0, 0, 0)]
    assert ends("G0 X4\nG92 X7\nG92 X9\nX0") == [("R", 4, 0, 0), ("R", -5, 0, 0)]
    assert ends("G0 X4\nG92 X7\nG92.2\nX0\nG92.3\nX0") == [("R", 4, 0, 0), ("R", 0, 0, 0), ("R", -3, 0, 0)]


def test_offsets_in_the_program() -> None:
    assert ends("G10 L2 P1 X10\nG0 X1\nG10 L20 P0 X0\nX1\nG52 X5\nX1\nG52 X0\nX1") == [
        ("R", 11, 0, 0), ("R", 12, 0, 0), ("R", 17, 0, 0), ("R", 12, 0, 0),
    ]  # fmt: skip


def test_probe_stops_where_the_tool_touches() -> None:
    machine = Machine(probes={2: (-9.9, -3.0)}, play={2: (0.0, 0.2)})
    assert [m.end[2] for m in motions("G0 Z1\nG38.2 Z-10 F50\nG92 Z0\nG0 Z5", machine)] == [1, -3, 2]
    up = Machine(start=(0, 0, -9.0, 0, 0, 0), probes={2: (-9.9, -3.0)}, play={2: (0.0, 0.2)})
    assert motions("G38.3 Z0 F50", up)[0].end[2] == pytest.approx(-2.8)


def test_inverse_time_needs_its_own_feed() -> None:
    assert [m.minutes for m in motions("G93 G1 X1 F4\nX2 F2")] == [0.25, 0.5]
    with pytest.raises(ControllerError):
        motions("G93 G1 X1 F4\nX2")


def test_block_delete_and_tool_change() -> None:
    machine = Machine(delete_blocks=True, tool_change={2: 50.0})
    deleted, change, event, move = run(b"/G0 X1\nT1 M6\nG0 X2", machine)
    assert deleted == Event("frame", 1)
    assert isinstance(change, Motion)
    assert change.machine_frame
    assert change.end[2] == 50
    assert event == Event("tool change", 2, 1)
    assert isinstance(move, Motion)
    assert move.context[4] == 1


# --- cycles -----------------------------------------------------------------------------------------------------------


def test_cycle_example_1() -> None:
    """NISTIR 6556 3.5.16.2, first example, move list."""
    assert ends("G90 G81 G98 X4 Y5 Z1.5 R2.8", (1, 2, 3)) == [
        ("R", 4, 5, 3), ("R", 4, 5, 2.8), ("F", 4, 5, 1.5), ("R", 4, 5, 3),
    ]  # fmt: skip


def test_cycle_example_2() -> None:
    """NISTIR 6556 3.5.16.2, second example, move list."""
    assert ends("G91 G81 G98 X4 Y5 Z-0.6 R1.8 L3", (1, 2, 3)) == [
        ("R", 1, 2, 4.8),
        ("R", 5, 7, 4.8), ("F", 5, 7, 4.2), ("R", 5, 7, 4.8),
        ("R", 9, 12, 4.8), ("F", 9, 12, 4.2), ("R", 9, 12, 4.8),
        ("R", 13, 17, 4.8), ("F", 13, 17, 4.2), ("R", 13, 17, 4.8),
    ]  # fmt: skip


def test_cycle_of_the_sample_session() -> None:
    """NISTIR 6556 table 10, from (30, 1, -0.5)."""
    assert ends("g91 g81 x3 y2 z-0.8 r1.5 l2", (30, 1, -0.5)) == [
        ("R", 30, 1, 1), ("R", 33, 3, 1), ("F", 33, 3, 0.2), ("R", 33, 3, 1), ("R", 36, 5, 1), ("F", 36, 5, 0.2),
        ("R", 36, 5, 1),
    ]  # fmt: skip


def test_sticky_cycle_words() -> None:
    """NISTIR 6556 appendix C.3, first lines; the moves are derived from the rules, not printed there."""
    text = "G90 G81 X3 Y4 R0.2 Z-1.1\nx1 y0 r0 g91 l3\ny-2 r0.1"
    found = ends(text, (0, 0, -2))
    assert found[:4] == [("R", 0, 0, 0.2), ("R", 3, 4, 0.2), ("F", 3, 4, -1.1), ("R", 3, 4, 0.2)]
    assert [f for f in found[4:13] if f[0] == "F"] == [("F", 4, 4, -0.9), ("F", 5, 4, -0.9), ("F", 6, 4, -0.9)]
    assert found[13:] == [("R", 6, 4, 0.3), ("R", 6, 2, 0.3), ("F", 6, 2, -0.8), ("R", 6, 2, 0.3)]


def test_cycle_kinds() -> None:
    """NISTIR 6556 3.5.16: G85 and G89 feed out, G83 clears to R; its back-off 0.254 mm is from memory."""
    assert [f[0] for f in ends("G85 X1 Z-1 R1")] == ["R", "R", "F", "F"]
    assert [f[3] for f in ends("G83 X1 Z-2 R1 Q2")] == [1, 1, -1, 1, -0.746, -2, 1]
    assert [f[3] for f in ends("G73 X1 Z-2 R1 Q2")] == [1, 1, -1, -0.746, -2, 1]
    assert [f[1:] for f in ends("G18 G99 G81 X1 Z2 Y-3 R1")] == [(0, 1, 0), (1, 1, 2), (1, -3, 2), (1, 1, 2)]


@pytest.mark.parametrize(
    "text",
    ["G81 X1 R1", "G81 X1 Z1 R0", "G81 Z-1 R1 L0", "G81 X1 A1 Z-1 R1", "G81 R1", "G83 X1 Z-1 R1",
     "G93 G81 X1 Z-1 R1 F1", "G80 X1"],
)  # fmt: skip
def test_cycle_errors(text: str) -> None:
    with pytest.raises(ControllerError):
        run(text.encode(), PLAIN)
