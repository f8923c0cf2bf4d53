"""What a block asks for: kinds of motion, words that look like motion and are not, and blocks that are refused."""

from __future__ import annotations

import pytest

from gcodetool.errors import Refusal
from gcodetool.motion.command import Kind, read_block, turns_of
from gcodetool.motion.modal import ModalState
from gcodetool.program.blocks import Block
from tests.motion.driving import command_of, refusal_of

FEEDING = ModalState(motion="G1", units="G21")
ARC = ModalState(motion="G3", units="G21")
CYCLE = ModalState(motion="G81", units="G21")
WAKE_UP = ModalState(units="G21")
AFTER_G80 = ModalState(motion="G80", units="G21")


@pytest.mark.parametrize(
    ("text", "state", "kind"),
    [
        ("G0 X1", FEEDING, Kind.RAPID),
        ("X1", FEEDING, Kind.FEED),
        ("X1", WAKE_UP, Kind.LINE),  # axis words before any G0 or G1
        ("X1 I5", ARC, Kind.ARC),  # a modal arc has no G word
        ("I5", ARC, Kind.ARC),  # a full circle of one word
        ("G2 X1 R5", FEEDING, Kind.ARC),
        ("X1", CYCLE, Kind.CYCLE),  # a bare position in a cycle is a hole
        ("G81 X1 Z-1 R1", FEEDING, Kind.CYCLE),
        ("G38.2 Z-5", FEEDING, Kind.PROBE),
        ("G28 X0", FEEDING, Kind.HOME),
        ("G28", FEEDING, Kind.HOME),
        ("G91 G28 Z0", FEEDING, Kind.HOME),
        ("G53 G0 X0", FEEDING, Kind.MACHINE),
        ("G53 X0", FEEDING, Kind.MACHINE),
        ("G43 H1 Z5", FEEDING, Kind.FEED),  # G43 with Z is a move
        ("G43 H1", FEEDING, Kind.NONE),
        ("G92 X0", FEEDING, Kind.FRAME),
        ("G10 L2 P1 X0", FEEDING, Kind.FRAME),
        ("G52 X5", FEEDING, Kind.FRAME),
        ("G92.1", FEEDING, Kind.FRAME),
        ("G4 P1", FEEDING, Kind.NONE),
        ("G4 X1", FEEDING, Kind.NONE),  # X is a time here
        ("G4 X1.5 ", CYCLE, Kind.NONE),
        ("G43.1 Z50", FEEDING, Kind.NONE),  # Z is a length here
        ("F600E41", FEEDING, Kind.NONE),
        ("G1 X5 F600E41", FEEDING, Kind.FEED),  # E behind a feed is no exponent
        ("M3 S1000", FEEDING, Kind.NONE),
        ("G80", FEEDING, Kind.NONE),
        ("G0 G80 X1", CYCLE, Kind.RAPID),  # leaves G0
        ("G80 G0 X1", CYCLE, Kind.RAPID),
        ("G17 G90", FEEDING, Kind.NONE),
        ("N10", FEEDING, Kind.NONE),
        ("O100", FEEDING, Kind.NONE),
        ("T1 M6", FEEDING, Kind.NONE),
        ("G1 () X5", FEEDING, Kind.FEED),  # code behind a comment is live
        ("(X5)", FEEDING, Kind.NONE),
        ("; X5", FEEDING, Kind.NONE),
        ("G54", FEEDING, Kind.NONE),
        ("G61 X1", FEEDING, Kind.FEED),
    ],
)
def test_kind_of_a_block(text: str, state: ModalState, kind: Kind) -> None:
    assert command_of(text, state).kind is kind


def test_numbers_are_exact_and_in_the_units_of_the_block() -> None:
    """G20 and G21 act before the motion of their line (NISTIR 6556, table 8)."""
    assert command_of("G20 X1", FEEDING).quanta("X") == 254_000_000_000
    assert command_of("G21 X1", ModalState(motion="G1", units="G20")).quanta("X") == 10_000_000_000
    assert command_of("G20 A90", FEEDING).quanta("A") == 900_000_000_000, "degrees are never scaled"


@pytest.mark.parametrize(("text", "turns"), [("G2 X1 I1", 1), ("G2 X1 I1 P1", 1), ("G3 I1 P8", 8), ("G3 I1 P2.", 2)])
def test_turns_of_an_arc(text: str, turns: int) -> None:
    assert turns_of(command_of(text)) == turns


@pytest.mark.parametrize("text", ["G2 I1 P0", "G2 I1 P1.5", "G2 I1 P-1"])
def test_turns_are_whole(text: str) -> None:
    with pytest.raises(Refusal):
        turns_of(command_of(text))


REFUSED = [
    ("G21\nG1 X#1", 2, "X#1", "variables"),
    ("G21\nG1 X[1+2]", 2, "X[1+2]", "expressions"),
    ("#1=5", 1, "#1=5", "variables"),
    ("G21\n\nWHILE [#1 LT 5] DO1", 3, "WHILE", "variables"),
    ("G21\nIF X1 GOTO 5", 2, "IF", "flow"),
    ("O100 SUB", 1, "SUB", "flow"),
    ("O100 CALL", 1, "CALL", "flow"),
    ("O100 G1 X1", 1, "O100", "subprogram"),
    ("G21 G1 X1 X2", 1, "X", "twice"),
    ("G21 G1 F1 F2", 1, "F", "twice"),
    ("G21 G1 U1", 1, "U1", "not followed"),
    ("G21 G1 W-2", 1, "W-2", "not followed"),
    ("G21 G1 X1E-5", 1, "X1E-5", "exponent"),
    ("G1 X1", 1, "X1", "mm or inches"),
    ("G0 Z5", 1, "Z5", "mm or inches"),
    ("G21 G80\nX5", 2, "X5", "no motion"),
    ("G21 G1 X1 I5", 1, "I5", "straight move"),
    ("G21 G0 X1 R5", 1, "R5", "straight move"),
    ("G21 M98 P100", 1, "M98", "subprogram"),
    ("G21\nM97", 2, "M97", "subprogram"),
    ("G21 G65 P9810 X1", 1, "G65", "macro"),
    ("G21\nG41 D1", 2, "G41", "compensation"),
    ("G21 G68 R30", 1, "G68", "rotation"),
    ("G21 G51 X2", 1, "G51", "scaling"),
    ("G21 G16", 1, "G16", "polar"),
    ("G21 G0 X1\nG17 G18", 2, "G17 G18", "one modal group"),
    ("G21 G1 X1 ?", 1, "?", "neither a word nor a comment"),
    ("G21 G1 / X1", 1, "/", "block delete"),
    ("G21 G1 X1 (a (b) X2 (c)", 1, "(a (b) X2 (c)", "comment"),
    ("G21\nG2 X1 Y1", 2, "G2 X1 Y1", "without a centre or a radius"),
    ("G21\nG2 X1 Y1 R1 I1", 2, "G2 X1 Y1 R1 I1", "both a radius and a centre"),
    ("G21\nG2 X0 Y0 R5", 2, "G2 X0 Y0 R5", "cannot end where it starts"),
    ("G21\nG2 X20 R5", 2, "G2 X20 R5", "farther away"),
    ("G21\nG2 X10 I4", 2, "G2 X10 I4", "from the centre"),
    ("G21\nG2 X10 I5 K1", 2, "G2 X10 I5 K1", "no centre word"),
    ("G21\nG90.1 G2 X10 I5", 2, "G90.1 G2 X10 I5", "both of its words"),
    ("G21 G81 X1 R1", 1, "G81", "no Z"),
    ("G21 G81 X1 Z-1", 1, "G81", "no R"),
    ("G21\nG81 Z1 R-1", 2, "G81 Z1 R-1", "below the bottom"),
    ("G21 G83 Z-5 R1", 1, "G83", "Q above zero"),
    ("G21 G81 Z-5 R1 L0", 1, "L0", "whole numbers"),
    ("G21 G10 L2 P11 X1", 1, "P11", "no such work offset"),
]


@pytest.mark.parametrize(
    ("program", "line", "words", "reason"), REFUSED, ids=[row[0].replace("\n", "|") for row in REFUSED]
)
def test_what_is_refused_is_named_with_line_word_reason_and_way_out(
    program: str, line: int, words: str, reason: str
) -> None:
    refusal = refusal_of(program) if "mm or inches" not in reason else _without_units(program)
    assert (refusal.line, refusal.words) == (line, words)
    assert reason in refusal.reason
    assert refusal.way_out and refusal.way_out[0].isupper()


def _without_units(program: str) -> Refusal:
    with pytest.raises(Refusal) as caught:
        command_of(program, ModalState())
    return caught.value


@pytest.mark.parametrize("text", ["M3 S1", "G90 G17", "G4 P1", "T1 M6", "G28", "G40 G49 G80", "F100"])
def test_a_block_without_axis_words_needs_no_units(text: str) -> None:
    assert command_of(text, ModalState()).kind in (Kind.NONE, Kind.HOME)


def test_a_blank_inside_a_g_word_is_not_taken_for_two_words() -> None:
    """``G0 3`` is G3, whatever other blocks have been read before (NISTIR 6556, 3.3.1: blanks mean nothing)."""
    with pytest.raises(Refusal):
        read_block(Block(1, "G0 G3 X1 I1", ""), ModalState(units="G21"))
    assert read_block(Block(2, "G0 3 X1 I1", ""), ModalState(units="G21")).kind is Kind.ARC
