"""Deletable blocks: both positions of the switch must give the intended part, or the program is refused."""

from __future__ import annotations

import pytest

from gcodetool.errors import Refusal
from tests.lash.rewriting import assert_right, compensate

LASH = {"x": "0.1", "y": "0.1", "z": "0.1"}


def rewritten(program: str, **options: object) -> str:
    """The lines after the head and a settled start; the oracle has agreed for both positions of the switch."""
    whole = f"G21 G90\nG0 X0 Y0 Z5\n{program}"
    result = compensate(whole, LASH, **options)
    switch = options.get("block_delete")
    assert_right(whole, result, LASH, **({"delete": (switch == "on",)} if switch else {}))
    lines = result.split("\n")
    assert lines[:3] == ["G21 G90", "G0 X0.6000 Y0.6000 Z5.6000", "G0 X0.0000 Y0.0000 Z5.0000"]
    return "\n".join(lines[3:])


@pytest.mark.parametrize(
    "program",
    ["/G1 X-1 F100", "/M8\n/(note)\n/G4 P1", "/G0 X-5\nM5", "/", "/N5\n/ (X1)", "G0 X-1\n/M0\nG0 X-2"],
)
def test_deletable_blocks_that_need_no_change(program: str) -> None:
    assert rewritten(program) == program


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # a line that is added to a deletable block is deletable
        ("/G1 X5 F100", "/G1 X0.1000 F100\n/G1 X5.1000 F100"),
        # X is at 0 or at 5 after it: its next rapid is settled
        ("/G0 X5\nG0 X9", "/G0 X5.1000\nG0 X9.6000\nG0 X9.0000"),
        # Y does not hang on it
        ("/G0 X5\nG0 Y9", "/G0 X5.1000\nG0 Y9.1000"),
        # a deletable block that leaves an axis where and as it was leaves it known
        ("G0 X-2\n/G0 X-2\nG0 X5", "G0 X-2\n/G0 X-2\nG0 X5.1000"),
        # modes are in doubt until they are stated again
        ("/G91\nG90 G0 X5", "/G91\nG90 G0 X5.1000"),
        ("/G1\nG0 X5", "/G1\nG0 X5.1000"),
        ("/F50\nG1 X-5 F100", "/F50\nG1 X-5 F100"),
        # a deletable tool change
        ("/M6 T2\nG0 X5", "/M6 T2\nG0 X5.6000\nG0 X5.0000"),
        ("/G55\nG54\nG0 X5", "/G55\nG54\nG0 X5.6000\nG0 X5.0000"),
    ],
)
def test_what_both_positions_agree_on_stays_known(program: str, expected: str) -> None:
    assert rewritten(program) == expected


@pytest.mark.parametrize(
    ("program", "words"),
    [
        ("/G91\nG0 X5", "G0 X5"),
        ("/G20\nG0 X5", "G0 X5"),
        ("/G1\nX5", "X5"),
        ("/G18\nG2 X5 Y5 I5", "G2 X5 Y5 I5"),
        ("/G93\nG1 X5 F1", "G1 X5 F1"),
        ("/G0 X5\nG1 X9 F100", "X9"),
    ],
)
def test_what_hangs_on_the_switch_is_refused(program: str, words: str) -> None:
    with pytest.raises(Refusal) as caught:
        compensate(f"G21 G90\nG0 X0 Y0 Z5\n{program}", LASH)
    assert caught.value.words == words
    assert caught.value.line == 3 + program.count("\n")


@pytest.mark.parametrize(
    ("switch", "program", "expected"),
    [
        ("on", "/G91\nG0 X5", "/G91\nG0 X5.1000"),
        ("on", "/G1 X99 F100\nG0 X5", "/G1 X99 F100\nG0 X5.1000"),
        ("off", "/G91\nG0 X5", "/G91\nG0 X5.1000"),
        ("off", "/G1 X9 F100\n/X5\nX2", "/G1 X0.1000 F100\n/G1 X9.1000 F100\n/G1 X9.0000\n/X5\nX2"),
    ],
)
def test_a_stated_switch_leaves_no_doubt(switch: str, program: str, expected: str) -> None:
    result = rewritten(program, block_delete=switch)
    # what is made in air before a deletable block may stand before it, without the slash
    assert [line.lstrip("/").replace("G0 X0.1000", "G1 X0.1000 F100") for line in result.split("\n")] == [
        line.lstrip("/") for line in expected.split("\n")
    ]
