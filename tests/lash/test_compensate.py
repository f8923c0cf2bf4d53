"""The stream as a whole: header, marks, ends, tool changes, frames, cautions, tally."""

from __future__ import annotations

import pytest

from gcodetool.errors import Refusal
from gcodetool.lash.compensate import MARK, Compensator
from gcodetool.lash.running import Settings
from gcodetool.program.blocks import blocks_of
from tests.lash.rewriting import assert_right, compensate, rewrite, sheet, stated

LASH = {"x": "0.1", "y": "0.1", "z": "0.1"}
HEADER = f"{MARK} 9.9"


def headed(program: str) -> str:
    """The rewritten program with its header comment."""
    return rewrite(program, sheet({"x": "0.1"}), header=HEADER)[0].decode("latin-1")


# ---- the comment near the top ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        ("G21\n", f"({HEADER})\nG21\n"),
        ("%\nG21\n", f"%\n({HEADER})\nG21\n"),
        ("%\nO100\nG21\n", f"%\nO100\n({HEADER})\nG21\n"),
        ("%\nN1 O0001\nG21\n", f"%\nN1 O0001\n({HEADER})\nG21\n"),
        ("%\r\n\r\nG21\r\n", f"%\r\n\r\n({HEADER})\r\nG21\r\n"),
        ("(part 7)\nG21\n", f"({HEADER})\n(part 7)\nG21\n"),
        ("; part 7\nG21\n", f"; {HEADER}\n; part 7\nG21\n"),
        ("G21", f"({HEADER})\nG21"),
        ("", ""),
    ],
)
def test_the_header_stands_near_the_top_where_it_harms_nothing(program: str, expected: str) -> None:
    assert headed(program) == expected


def test_what_has_been_rewritten_is_not_rewritten_again() -> None:
    once = headed("%\nO5\nG21 G90\nG0 X1\n")
    with pytest.raises(Refusal) as caught:
        compensate(once, LASH)
    assert caught.value.line == 3 and "already" in caught.value.reason
    twice, _ = rewrite(once, sheet({"x": "0.1"}), header=HEADER, again=True)
    assert twice.decode().count(MARK) == 2


# ---- ends ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "tail", ["M30\nG0 X99\n#1=5\n", "M2\r\nO2 G41\r\n", "%\nG41 text after the tape\n", "M30 (end)\n%\n"]
)
def test_what_follows_the_end_passes_untouched(tail: str) -> None:
    program = "G21 G90\nG0 Y-1\n" + tail
    assert compensate(program, {"x": "0.1"}) == program


def test_a_second_program_after_the_end_mark_is_not_touched() -> None:
    program = "%\nG21 G90 G0 X1\nM30\n%\nG0 X5\nM30\n%\n"
    assert compensate(program, {"x": "0.1"}).endswith("M30\n%\nG0 X5\nM30\n%\n")


@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_new_lines_end_like_their_block(ending: str) -> None:
    program = ending.join(["G21 G90", "G0 X0", "G1 Y1 F9", "G1 X5", "X0"])
    result = compensate(program, {"x": "0.1"})
    assert result.count(ending) == result.count("\n" if ending == "\n" else "\r") == 7
    assert not result.endswith(ending)


def test_mixed_ends_stay_mixed() -> None:
    result = compensate("G21 G90\nG0 X0\r\nG0 X5\rG0 X3", {"x": "0.1"})
    assert result == "G21 G90\nG0 X0.6000\r\nG0 X0.0000\r\nG0 X5.1000\rG0 X3"


# ---- tool changes and frames -----------------------------------------------------------------------------------------


@pytest.mark.parametrize("change", ["M6 T1", "T1 M6", "T1\nM6", "M6", "M06 T01", "N5 T1 M6 (3 mm)", "T1 M6 S1000 M3"])
def test_after_a_tool_change_everything_is_settled_again(change: str) -> None:
    program = f"G21 G90\nG0 X0 Y0 Z5\n{change}\nG0 X5\nG0 Y5 Z1\n"
    result = compensate(program, LASH)
    assert result.endswith(f"{change}\nG0 X5.6000\nG0 X5.0000\nG0 Y5.6000 Z1.6000\nG0 Y5.0000 Z1.0000\n")
    assert_right(program, result, LASH)


def test_a_move_on_the_line_of_a_tool_change_is_settled_too() -> None:
    program = "G21 G90\nG0 X0\nM6 T1 G0 X5\n"
    result = compensate(program, {"x": "0.1"})
    assert_right(program, result, {"x": "0.1"})


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        ("G54\nG0 X5", "G54\nG0 X5.6000\nG0 X5.0000"),
        ("G0 X-5\nG52 X1\nG0 X-7", "G0 X-5\nG52 X1\nG0 X-7"),
        ("G0 X5\nG10 L2 P5 X50\nG0 X7", "G0 X5.1000\nG10 L2 P5 X50\nG0 X7.6000\nG0 X7.0000"),
        ("G0 X5\nG92 X100 Y1\nG0 X99", "G0 X5.1000\nG92 X100.1000 Y1\nG0 X99"),
        ("G0 X5\nG92 Z0\nG0 X7", "G0 X5.1000\nG92 Z0\nG0 X7.1000"),
        ("G0 X5\nG49\nG0 X7", "G0 X5.1000\nG49\nG0 X7.1000"),
    ],
)
def test_frames(program: str, expected: str) -> None:
    whole = f"G21 G90\nG0 X0 Y0 Z5\n{program}"
    result = compensate(whole, LASH)
    assert_right(whole, result, LASH)
    assert "\n".join(result.split("\n")[3:]) == expected


def test_a_feed_may_follow_a_change_of_frame_whose_values_are_stated() -> None:
    program = "G21 G90 G54\nG0 X0 Y0\nG55\nG1 X-30 F100\n"
    with pytest.raises(Refusal):
        compensate(program, {"x": "0.1"})
    offsets = ["G54:x=5", "G55:x=8"]
    result = compensate(program, {"x": "0.1"}, offset=offsets)
    assert result.endswith("G55\nG1 X-30 F100\n")
    assert_right(program, result, {"x": "0.1"}, offset=offsets)


# ---- what it tells ---------------------------------------------------------------------------------------------------


def test_the_tally_counts_what_was_done() -> None:
    program = "G21 G90\nG0 X0 Y0\nG1 Z-1 F100\nG1 X10\nG3 X10 Y0 I-5\nX0\nM5\n"
    program = program.replace("\nX0\n", "\nG1 X0\n")
    _, tally = rewrite(program, sheet({"x": "0.1", "y": "0.1"}))
    assert tally.blocks == 7
    assert tally.settles == 2
    assert tally.splits == 3
    # X at the start in air, at the circle's start, left end; then at its right end; Y in air, top, bottom
    assert dict(tally.take_ups) == {"X": 4, "Y": 3}
    assert tally.blocks_in_air == 2 and tally.blocks_in_cut == 5
    assert tally.path_added == pytest.approx(7 * 0.1 + 2 * 2 * 0.6)


def test_the_worst_take_ups_are_those_that_stand_longest_in_the_cut() -> None:
    program = "G21 G90\nG0 X0 Y0\n" + "".join(f"G1 X{5 + k % 2} F{10 * (k + 1)}\n" for k in range(10))
    _, tally = rewrite(program, sheet({"x": "0.1"}))
    worst = sorted(tally.worst, reverse=True)
    assert [made.line for made in worst] == [5, 6, 7, 8, 9]
    assert worst[0].seconds == pytest.approx(60 * 0.1 / 30)


@pytest.mark.parametrize(("word", "text"), [("M0", "jog"), ("M1", "jog"), ("M60", "jog"), ("M77", "M77")])
def test_cautions_name_the_line(word: str, text: str) -> None:
    _, tally = rewrite(f"G21 G90\nG0 X0\n{word}\n{word}\nG0 X5\n", sheet({"x": "0.1"}))
    ((caution, line),) = tally.cautions.items()
    assert text in caution and line == 3


def test_stops_leave_what_is_known_as_it_is() -> None:
    assert compensate("G21 G90\nG0 X0\nM0\nG0 X5\n", {"x": "0.1"}).endswith("M0\nG0 X5.1000\n")


# ---- block by block --------------------------------------------------------------------------------------------------


def test_a_refusal_comes_at_its_block_and_nothing_after_it() -> None:
    out: list[str] = []
    stream = Compensator(sheet({"x": "0.1"}), Settings(), out.append)
    good, bad = blocks_of(b"G21 G90\nG41\n")
    stream.feed_block(good)
    with pytest.raises(Refusal):
        stream.feed_block(bad)
    assert "G41" not in "".join(out)


@pytest.mark.parametrize("header", ["", HEADER])
def test_text_that_changes_nothing_is_passed_line_by_line(header: str) -> None:
    program = "\n\n(a)\n;b\n\x00\nM3\n%\n"
    result, tally = rewrite(program, sheet({"x": "0.1"}), stated(), header)
    assert result.decode("latin-1").replace(f"({header})\n", "") == program
    assert tally.changed == 0
