"""Take-up in air: at the last place where the tool is out of the work, if nothing in between moves the axis."""

from __future__ import annotations

import pytest

from gcodetool.lash.outflow import Outflow, Slot
from gcodetool.lash.running import Settings
from gcodetool.motion.modal import ModalState
from gcodetool.program.words import split
from tests.lash.rewriting import assert_right, compensate, rewrite, sheet

LASH = {"x": "0.1", "y": "0.1"}
KNOWN = ["x=0-", "y=0-", "z=5-"]


def rewritten(program: str, lash: dict[str, str] = LASH, **options: object) -> str:
    """The rewritten lines after the head, from a known start; the oracle has agreed."""
    whole = f"G21 G90\n{program}"
    result = compensate(whole, lash, start=KNOWN, **options)
    assert_right(whole, result, lash, start=KNOWN)
    return result.partition("\n")[2]


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # before the plunge, not in the work
        ("G0 X-5\nG1 Z-1 F100\nX0", "G0 X-5\nG0 X-4.9000\nG1 Z-1 F100\nX0.1000"),
        # two axes needed at different times share the line
        (
            "G0 X-5 Y-5\nG1 Z-1 F100\nX0\nY0",
            "G0 X-5 Y-5\nG0 X-4.9000 Y-4.9000\nG1 Z-1 F100\nX0.1000\nY0.1000",
        ),
        # blocks without motion may stand in between
        (
            "G0 X-5\nM3 S100\nG4 P1\n(plunge)\n\nG1 Z-1 F100\nX0",
            "G0 X-5\nG0 X-4.9000\nM3 S100\nG4 P1\n(plunge)\n\nG1 Z-1 F100\nX0.1000",
        ),
        # after the last of several rapids
        ("G0 X-5\nG0 Z1\nG1 Z-1 F100\nX0", "G0 X-5\nG0 Z1\nG0 X-4.9000\nG1 Z-1 F100\nX0.1000"),
        # an arc may be what needs it
        ("G0 X-5\nG1 Z-1 F100\nG2 X-4 Y1 I1", "G0 X-5\nG0 X-4.9000 Y0.1000\nG1 Z-1 F100\nG2 X-3.9000 Y1.1000 I1"),
        # a rapid in steps: the take-up is a step too
        ("G91 G0 X-5\nG1 Z-6 F100\nX5", "G91 G0 X-5\nG0 X0.1000\nG1 Z-6 F100\nX5"),
        # and one that changes the mode behind the rapid does not matter to the place of the take-up
        ("G0 X-5\nG91 G1 Z-6 F100\nX5", "G0 X-5\nG0 X-4.9000\nG91 G1 Z-6 F100\nX5"),
        ("G0 X-5\nG20\nG1 Z-.1 F5\nX0", "G0 X-5\nG0 X-4.9000\nG20\nG1 Z-.1 F5\nX0.00394"),
    ],
)
def test_made_in_air(program: str, expected: str) -> None:
    assert rewritten(program) == expected


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # the axis has moved since the rapid
        ("G0 X-5\nG1 X-6 Z-1 F100\nX0", "G0 X-5\nG1 X-6 Z-1 F100\nG1 X-5.9000\nX0.1000"),
        # an arc has moved it, though it had no word of it
        (
            "G0 X0\nG1 Z-1 F100\nG3 Y-10 J-5\nG1 X5",
            "G0 X0\nG1 Z-1 F100\nG3 Y-5.0000 J-5 X-5.0000\n"
            "G1 X-4.9000\nG3 X0.1000 Y-10.0000 I5.0000 J0.0000\nG1 X5.1000",
        ),
        # no rapid at all
        ("G1 Z-1 F100\nX5", "G1 Z-1 F100\nG1 X0.1000\nX5.1000"),
        # a deletable block may be missing, so nothing is moved over it
        ("G0 X-5\n/M8\nG1 Z-1 F100\nX0", "G0 X-5\n/M8\nG1 Z-1 F100\nG1 X-4.9000\nX0.1000"),
        ("G0 X-5\nG1 Z-1 F100\nG92 Z0\nX0", "G0 X-5\nG1 Z-1 F100\nG92 Z0\nG1 X-4.9000\nX0.1000"),
    ],
)
def test_left_where_it_is_needed(program: str, expected: str) -> None:
    assert rewritten(program) == expected


@pytest.mark.parametrize(("look_ahead", "in_air"), [(0, False), (1, False), (2, False), (4, True), (32, True)])
def test_no_more_blocks_are_held_than_allowed(look_ahead: int, in_air: bool) -> None:
    program = "G0 X-5\nM8\nG4 P1\nG1 Z-1 F100\nX0"
    lines = rewritten(program, look_ahead=look_ahead).splitlines()
    assert (lines[1] == "G0 X-4.9000") is in_air
    assert len(lines) == 6


def test_held_blocks_do_not_wait_for_ever() -> None:
    """A line is held only while it may still be needed: with 8 blocks allowed, the ninth lets the first go."""
    from gcodetool.lash.compensate import Compensator
    from gcodetool.program.blocks import blocks_of

    out: list[str] = []
    stream = Compensator(sheet(LASH), Settings(look_ahead=8), out.append)
    for block in blocks_of(b"G21 G90\nG0 X0 Y0\n" + b"M8\n" * 30):
        stream.feed_block(block)
        waiting = "".join(out).count("M8")
        assert block.number - 2 - waiting <= 8
    stream.finish()
    assert "".join(out).count("M8") == 30


def test_tool_changes_and_homes_close_the_slot() -> None:
    for between in ("M6 T2", "G28 Z9", "G53 G0 Z9", "G38.2 Z-9 F9"):
        program = f"G21 G90\nG0 X0 Y0\n{between}\nG0 X5\nG1 Z-1 F100\nX0\nX9\n"
        result, tally = rewrite(program, sheet(LASH))
        before, _, after = result.decode().partition(between)
        assert before == "G21 G90\nG0 X0.6000 Y0.6000\nG0 X0.0000 Y0.0000\n"
        assert "\nG1 X0.1000\nX9.1000\n" in after
        assert tally.blocks_in_air + tally.blocks_in_cut == sum(tally.take_ups.values())


# ---- the outflow by itself -------------------------------------------------------------------------------------------


def slot() -> Slot:
    return Slot(ModalState(motion="G0", units="G21"), split("G0 X0"), " ", "\n")


def test_without_a_slot_text_goes_straight_out() -> None:
    out: list[str] = []
    flow = Outflow(out.append, 4)
    flow.put("a\n")
    assert out == ["a\n"] and not flow.takes("X")


def test_a_take_up_goes_before_what_was_held() -> None:
    out: list[str] = []
    flow = Outflow(out.append, 4)
    flow.open(slot(), ["X", "Y"])
    flow.put("G1 Z-1\n", ["Z"])
    assert flow.takes("X") and not out
    flow.take(("X", "1.0"))
    assert not flow.takes("X") and flow.takes("Y")
    flow.close()
    assert "".join(out) == "G0 X1.0\nG1 Z-1\n"


def test_a_slot_closes_when_no_axis_can_use_it() -> None:
    out: list[str] = []
    flow = Outflow(out.append, 4)
    flow.open(slot(), ["X"])
    flow.put("X5\n", ["X"])
    assert out == ["X5\n"] and flow.slot is None
    flow.open(slot(), [])
    assert flow.slot is None
