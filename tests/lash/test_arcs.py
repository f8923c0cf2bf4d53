"""Arcs: where they are cut, how the pieces are written, radius arcs near half a turn, helices, turns."""

from __future__ import annotations

import math
import random
from decimal import Decimal

import pytest

from gcodetool.program.words import split
from tests.lash.rewriting import assert_right, compensate

BOTH = {"x": "0.1", "y": "0.1"}
KNOWN = ["x=0-", "y=0-", "z=0-"]


def rewritten(program: str, lash: dict[str, str] = BOTH, head: str = "G21 G90", **options: object) -> str:
    """The rewritten lines after the head, from a known start; the oracle has agreed."""
    whole = f"{head}\n{program}"
    start = options.pop("start", KNOWN)
    result = compensate(whole, lash, start=start, **options)
    assert_right(whole, result, lash, start=start)
    return result.partition("\n")[2]


def word(line: str, letter: str) -> Decimal | None:
    """The number of a word."""
    pieces = split(line)
    values = dict(zip(pieces[1::3], pieces[2::3], strict=True))
    return Decimal(values[letter]) if letter in values else None


# ---- no cut ----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # a quarter from one quadrant point to the next needs no cut: the block with its take-up
        ("G2 X10 Y10 I10 F100", "G1 X0.1000 Y0.1000 F100\nG2 X10.1000 Y10.1000 I10 F100"),
        ("G3 X10 Y10 J10 F100", "G1 X0.1000 Y0.1000 F100\nG3 X10.1000 Y10.1000 J10 F100"),
        ("G3 X-10 Y-10 J-10 F100", "G3 X-10 Y-10 J-10 F100"),
        # R is left alone where the arc is not cut
        ("G2 X10 Y10 R10 F100", "G1 X0.1000 Y0.1000 F100\nG2 X10.1000 Y10.1000 R10 F100"),
        # Z along the arc
        ("G2 X10 Y10 Z-3 I10 F100", "G1 X0.1000 Y0.1000 F100\nG2 X10.1000 Y10.1000 Z-3 I10 F100"),
        # a word that is left out because it does not change
        (
            "G1 X-5 F100\nG3 Y-10 J-5",
            "G1 X-5 F100\nG3 Y-5.0000 J-5 X-10.0000\nG1 X-9.9000\nG3 X-4.9000 Y-10.0000 I5.0000 J0.0000",
        ),
    ],
)
def test_arcs_that_are_not_cut(program: str, expected: str) -> None:
    assert rewritten(program) == expected


# ---- cuts ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "lash", "expected"),
    [
        # the block keeps its comment, F and N; further pieces follow it
        (
            "N5 G2 X20 Y0 I10 F100 (half)",
            BOTH,
            "G1 X0.1000 Y0.1000 F100\n"
            "N5 G2 X10.1000 Y10.1000 I10 F100 (half)\n"
            "G1 Y10.0000\n"
            "G2 X20.1000 Y0.0000 I0.0000 J-10.0000",
        ),
        # only the axes with lash cut
        ("G2 X20 Y0 I10 F100", {"x": "0.1"}, "G1 X0.1000 F100\nG2 X20.1000 Y0 I10 F100"),
        # a stop at the end of the block belongs to the last piece
        (
            "G2 X20 Y0 I10 F100 M0",
            {"y": "0.1"},
            "G1 Y0.1000 F100\nG2 X10.0000 Y10.1000 I10 F100\nG1 Y10.0000\nG2 X20.0000 Y0.0000 I0.0000 J-10.0000 M0",
        ),
        # a helix: Z falls by its share of the sweep
        (
            "G2 X20 Y0 Z-4 I10 F100",
            {"y": "0.1"},
            "G1 Y0.1000 F100\n"
            "G2 X10.0000 Y10.1000 Z-2.0000 I10 F100\n"
            "G1 Y10.0000\n"
            "G2 X20.0000 Y0.0000 Z-4.0000 I0.0000 J-10.0000",
        ),
    ],
)
def test_arcs_that_are_cut(program: str, lash: dict[str, str], expected: str) -> None:
    assert rewritten(program, lash) == expected


def test_a_cut_in_g91_is_written_in_steps() -> None:
    result = rewritten("G91\nG2 X20 I10 F100", {"y": "0.1"})
    assert result == (
        "G91\nG1 Y0.1000 F100\nG2 X10.0000 I10 F100 Y10.0000\nG1 Y-0.1000\nG2 X10.0000 Y-10.0000 I0.0000 J-10.0000"
    )


def test_absolute_centres_are_shifted_with_their_axes() -> None:
    result = rewritten("G2 X20 Y0 I10 J0 F100", head="G21 G90 G90.1")
    assert result == (
        "G1 X0.1000 Y0.1000 F100\nG2 X10.1000 Y10.1000 I10.1000 J0.1000 F100\n"
        "G1 Y10.0000\nG2 X20.1000 Y0.0000 I10.1000 J0.0000"
    )


@pytest.mark.parametrize(("turns", "pieces"), [(1, 3), (2, 5), (5, 11)])
def test_turns_are_unrolled_where_an_axis_turns(turns: int, pieces: int) -> None:
    """From the left-hand point X turns twice a lap, after each half."""
    result = rewritten(f"G2 X0 Y0 Z-9 I10 P{turns} F100", {"x": "0.1"})
    assert sum(line.startswith("G2") for line in result.splitlines()) == pieces - 1
    assert " P" not in result


def test_lines_of_a_cut_block_are_bounded() -> None:
    """Per quadrant point inside at most a take-up and a piece more."""
    result = rewritten("G2 X0 Y0 I10 F100")
    assert result.count("\n") + 1 <= 1 + 1 + 2 * 3


# ---- arcs by radius --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("digits", [0, 1, 2, 5, 20])
@pytest.mark.parametrize("way", ["G2", "G3"])
@pytest.mark.parametrize("radius", ["10", "9.9999", "10.0005"])
def test_an_uncut_radius_arc_near_half_a_turn_keeps_its_chord_exactly(digits: int, way: str, radius: str) -> None:
    """The centre hangs on the last digit of the chord: both ends move by the same whole lash.

    From bottom to top Y does not turn on at most half a turn, so with lash on Y alone the arc is not cut.
    """
    top = Decimal(20) - Decimal(digits) / 1000
    result = rewritten(f"G1 Y0.0001 F100\n{way} X0 Y{top} R{radius}\n", {"y": "0.0873"}).splitlines()
    heights = [value for line in result if (value := word(line, "Y")) is not None]
    assert sum(line.startswith(way) for line in result) == 1
    assert heights[-1] - heights[-2] == top - Decimal("0.0001")
    assert word(result[-1], "R") == Decimal(radius)


@pytest.mark.parametrize("sign", ["", "-"])
@pytest.mark.parametrize("way", ["G2", "G3"])
@pytest.mark.parametrize("digits", [1, 2, 5, 20])
def test_a_cut_radius_arc_near_half_a_turn_holds(digits: int, way: str, sign: str) -> None:
    """From left to right Y turns in the middle; the long way round X turns too."""
    right = Decimal(20) - Decimal(digits) / 1000
    result = rewritten(f"{way} X{right} Y0 R{sign}10 F100\n")
    assert sum(line.startswith(way) for line in result.splitlines()) >= 2


@pytest.mark.parametrize("seed", range(5))
def test_radius_arcs_of_any_sweep(seed: int) -> None:
    """Chords from a hundredth of the radius to twice the radius less a digit, short and long way, in a row."""
    rng = random.Random(seed)
    lines = []
    for _ in range(12):
        radius = Decimal(rng.randint(500, 30_000)) / 1000
        chord = 2 * float(radius) * rng.choice([0.01, 0.3, 0.7, 0.95, 0.999, 0.9999]) - 0.002
        angle = rng.choice([0.0, 90.0, 180.0, 270.0, rng.uniform(0, 360)])
        across, up = chord * math.cos(math.radians(angle)), chord * math.sin(math.radians(angle))
        lines.append(f"{rng.choice(['G2', 'G3'])} X{across:.3f} Y{up:.3f} R{rng.choice(['', '-'])}{radius} F100\n")
    rewritten("G0 X0 Y0 Z0\nG91\n" + "".join(lines), {"x": "0.12", "y": "0.07"})


def test_a_long_radius_arc_is_cut_into_short_ones() -> None:
    """Three quarters of a turn become pieces well below half a turn, each with a positive R."""
    result = rewritten("G3 X0 Y-10 R-10 F100\n", BOTH, start=["x=10-", "y=0-"], head="G21 G90")
    radii = [word(line, "R") for line in result.splitlines() if line.startswith("G3")]
    assert radii == [Decimal(10)] * 3
