"""Feeds around take-ups: their own feed and the program's back after them, shares of time in G93, rapids in G95."""

from __future__ import annotations

import itertools
import re

import pytest

from tests.lash.rewriting import assert_right, compensate
from tests.oracle.controller import run
from tests.oracle.machine import Machine, Motion

LASH = {"x": "0.1", "y": "0.1"}
KNOWN = ["x=0-", "y=0-"]


def rewritten(program: str, lash: dict[str, str] = LASH, head: str = "G21 G90", **options: object) -> str:
    """The rewritten lines after the head, from a known start; the oracle, which compares feeds too, has agreed."""
    whole = f"{head}\n{program}"
    result = compensate(whole, lash, start=KNOWN, **options)
    assert_right(whole, result, lash, start=KNOWN)
    return result.partition("\n")[2]


# ---- feed per minute -------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # a feed of its own, then the program's
        ("G1 X5 F100", "G1 X0.1000 F50\nG1 X5.1000 F100"),
        (
            "G1 X5 F100\nX2\nX3",
            "G1 X0.1000 F50\nG1 X5.1000 F100\nG1 X5.0000 F50\nX2 F100\nG1 X2.1000 F50\nX3.1000 F100",
        ),
        # said once for take-ups in a row is enough, and a block of the same feed needs no word
        ("G1 X5 F50\nX2", "G1 X0.1000 F50\nG1 X5.1000 F50\nG1 X5.0000\nX2"),
        # a word on a line of its own
        ("F100\nG1 X5\nF80\nX2\nY-1", "F100\nG1 X0.1000 F50\nG1 X5.1000 F100\nF80\nG1 X5.0000 F50\nX2 F80\nY-1"),
        # arcs
        (
            "G2 X20 Y0 I10 F100",
            "G1 X0.1000 Y0.1000 F50\nG2 X10.1000 Y10.1000 I10 F100\n"
            "G1 Y10.0000 F50\nG2 X20.1000 Y0.0000 I0.0000 J-10.0000 F100",
        ),
        # rapids in between do not ask for a feed
        ("G1 X5 F100\nX2\nG0 Y-1\nG1 Y-2", "G1 X0.1000 F50\nG1 X5.1000 F100\nG1 X5.0000 F50\nX2 F100\nG0 Y-1\nG1 Y-2"),
        # in air no feed is needed at all
        ("G0 Y-1\nG1 X5 F100", "G0 Y-1\nG0 X0.1000\nG1 X5.1000 F100"),
    ],
)
def test_take_ups_with_a_feed_of_their_own(program: str, expected: str) -> None:
    assert rewritten(program, take_up_feed="50") == expected


def test_the_feed_of_take_ups_is_said_in_the_units_in_force() -> None:
    """254 mm/min are 10 in/min."""
    assert rewritten("G1 X5 F3", head="G20 G90", take_up_feed="254") == "G1 X0.00394 F10\nG1 X5.00394 F3"


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # without one, a take-up has the feed of the program
        ("G1 X5 F100\nX2", "G1 X0.1000 F100\nG1 X5.1000 F100\nG1 X5.0000\nX2"),
        ("G1 X5 F100\nX2 F80\nX3", "G1 X0.1000 F100\nG1 X5.1000 F100\nG1 X5.0000 F80\nX2 F80\nG1 X2.1000\nX3.1000"),
    ],
)
def test_take_ups_at_the_feed_of_the_program(program: str, expected: str) -> None:
    assert rewritten(program) == expected


# ---- inverse time ----------------------------------------------------------------------------------------------------


def minutes(program: str) -> float:
    """Time asked for by the feeds that move something, NISTIR 6556 3.5.19: F is 1 / minutes."""
    items = run(program.encode(), Machine())
    return sum(item.minutes for item in items if isinstance(item, Motion) and item.kind == "feed")


@pytest.mark.parametrize(
    "block",
    [
        "G2 X20 Y0 I10 F2",
        "G2 X0 Y0 I10 F0.5",
        "G2 X10 Y-10 R-10 F4",
        "G3 X-16 Y8 I-6 J8 F3.25",
        "G2 X0 Y0 I10 P3 Z-1 F1",
    ],
)
def test_shares_of_a_split_block_add_up_to_its_time(block: str) -> None:
    original = f"G21 G90 G0 X0 Y0 Z5\nG93\n{block}\nG94\n"
    result = compensate(original, LASH)
    assert_right(original, result, LASH)
    assert minutes(result) == pytest.approx(minutes(original), rel=1e-6)
    pieces = [line for line in result.splitlines() if re.match(r"G[23] ", line)]
    assert len(pieces) > 1 and all("F" in piece for piece in pieces)


def test_take_ups_in_inverse_time_are_rapids_without_a_time_of_their_own() -> None:
    result = rewritten("G93\nG1 X5 F2\nX3 F1\nX4 F7\nG94")
    assert result == "G93\nG0 X0.1000\nG1 X5.1000 F2\nG0 X5.0000\nG1 X3 F1\nG0 X3.1000\nG1 X4.1000 F7\nG94"


def test_every_feed_block_in_inverse_time_has_its_own_f() -> None:
    """NISTIR 6556 3.5.19: an error where one has none."""
    result = compensate("G21 G90\nG0 X0 Y0\nG93\nG2 X10 Y0 I5 F2\nG2 X0 Y0 I-5 F3\nG1 X5 F9\nG94", LASH)
    feeds = [line for line in result.splitlines() if re.match(r"G[123] ", line)]
    assert all("F" in line for line in feeds)
    run(result.encode(), Machine())  # raises where one is missing


# ---- feed per revolution ---------------------------------------------------------------------------------------------


def test_take_ups_in_feed_per_revolution_are_rapids() -> None:
    result = rewritten("G95\nG1 X5 F0.1\nX3\nG2 X23 Y0 I10\nG94 F100\nG1 X25", take_up_feed="50")
    takes = [line for line in result.splitlines() if re.fullmatch(r"G0( [XY][\d.-]+)+", line)]
    assert len(takes) == 4
    assert "F50" not in result.partition("G94")[0]
    lines = result.splitlines()
    assert all(re.match(r"G[123]", after) for line, after in itertools.pairwise(lines) if line in takes)
