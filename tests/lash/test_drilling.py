"""Cycles and probes in the rewriter: places and bottoms exact or refused, zero set where the tool is."""

from __future__ import annotations

import random

import pytest

from gcodetool.errors import Refusal
from tests.lash.rewriting import assert_right, compensate

LASH = {"x": "0.1", "y": "0.1", "z": "0.1"}
HEAD = "G21 G90\nG0 X0 Y0 Z10\n"
SETTLED = "G21 G90\nG0 X0.6000 Y0.6000 Z10.6000\nG0 X0.0000 Y0.0000 Z10.0000\n"


def rewritten(program: str, datum: dict[str, str] | None = None, lash: dict[str, str] = LASH) -> str:
    """The lines after a settled start; the oracle has agreed."""
    result = compensate(HEAD + program, lash, datum=datum)
    assert_right(HEAD + program, result, lash, datum=datum)
    return result[len(SETTLED) :]


# ---- nothing to do ---------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "program",
    [
        "G81 X-5 Y-5 Z-3 R2 F100\nX-10\nG80",
        "G99 G83 X-5 Z-3 R2 Q1 F100\nY-5\nG80\nG1 Z1",  # after G99 Z stands 0.1 low at R, and goes down from there
        "G98 G82 X-1 Y0 Z-3 R2 P0.5 F100 (spot)\nX-2 L2\nX-3 K3\nG80",
        "G18 G81 X-5 Z-5 Y-3 R2 F100",
    ],
)
def test_cycles_reached_in_the_datum_direction_stay_as_they_are(program: str) -> None:
    assert rewritten(program) == program


# ---- changes ---------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("program", "expected"),
    [
        # places are folded like rapids, in bare lines too
        ("G81 X5 Y-5 Z-3 R2 F100\nX10\nY-1\nX3", "G81 X5.1000 Y-5 Z-3 R2 F100\nX10.1000\nY-0.9000\nX3"),
        # what moves Z next puts it right: a rapid by its shift, a feed down by nothing, a feed up by a line before it
        ("G99 G81 X-5 Z-3 R2 F100\nG80\nG0 Z5", "G99 G81 X-5 Z-3 R2 F100\nG80\nG0 Z5.1000"),
        ("G99 G81 X-5 Z-3 R2 F100\nG1 Z1 F50", "G99 G81 X-5 Z-3 R2 F100\nG1 Z1 F50"),
        # the cycle may be entered while Z stands on its + side
        ("G0 Z12\nG81 X-5 Z-3 R2 F100\nG80\nG0 Z12", "G0 Z12.1000\nG81 X-5 Z-3 R2 F100\nG80\nG0 Z12.1000"),
    ],
)
def test_cycles(program: str, expected: str) -> None:
    assert rewritten(program) == expected


@pytest.mark.parametrize(
    ("program", "reason"),
    [
        ("G81 X5 Z-3 R2 A5 F100", "rotary"),
        ("G81 X5 R2 F100", "no Z"),
        ("G81 X5 Z-3 F100", "no R"),
        ("G83 X5 Z-3 R2 F100", "Q above zero"),
        ("G81 X5 Z3 R2 F100", "below the bottom"),
        ("G81 X5 Z-3 R2 L0 F100", "whole numbers"),
        ("G93\nG81 X5 Z-3 R2 F1", ""),  # inverse time
    ],
)
def test_cycles_that_are_refused(program: str, reason: str) -> None:
    """NISTIR 6556 3.5.16.1 lists these as errors."""
    with pytest.raises(Refusal) as caught:
        compensate(HEAD + program + "\n", LASH)
    assert reason in caught.value.reason and caught.value.way_out


def test_a_hole_shallower_than_the_lash_is_refused_where_its_bottom_hangs_on_an_unknown_side() -> None:
    with pytest.raises(Refusal) as caught:
        compensate("G21 G90\nG0 X0 Y0\nG81 X5 Z-0.05 R0 F100\n", LASH)
    assert caught.value.line == 3


@pytest.mark.parametrize("seed", range(12))
def test_random_cycles_are_right(seed: int) -> None:
    """Every cycle of one feed, both return levels, repeats, changed words, all datums; the oracle judges."""
    rng = random.Random(seed)
    lash = {axis: rng.choice(["0", "0.05", "0.12"]) for axis in "xyz"}
    datum = {axis: rng.choice("+-") for axis in "xyz"}
    lines = []
    for _ in range(5):
        word = rng.choice(["G73", "G81", "G82", "G83", "G84", "G85", "G86", "G89"])
        extra = {"G73": " Q1.1", "G83": " Q0.7", "G82": " P0.1", "G86": " P0.1", "G89": " P0.1"}.get(word, "")
        place = f"X{rng.randint(-30, 30)} Y{rng.randint(-30, 30)}"
        lines.append(
            f"{rng.choice(['G98', 'G99'])} {word} {place} Z{-rng.randint(1, 8)} R{rng.randint(1, 9)}{extra} F100"
        )
        lines += [rng.choice(["X", "Y"]) + str(rng.randint(-30, 30)) for _ in range(rng.randint(0, 3))]
        lines.append(rng.choice(["G80", f"G0 Z{rng.randint(5, 12)}", "G80\nG0 X0 Y0 Z10"]))
        lines.append(f"G0 Z{rng.randint(9, 14)}")
    program = HEAD + "\n".join(lines) + "\n"
    result = compensate(program, lash, datum=datum)
    assert_right(program, result, lash, datum=datum)


# ---- probes ----------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("word", ["G38.2", "G38.3", "G38.4", "G38.5"])
@pytest.mark.parametrize("datum", ["+", "-"])
@pytest.mark.parametrize(("axis", "target"), [("X", "-20"), ("X", "20"), ("Y", "20"), ("Z", "-20")])
def test_zero_set_after_a_probe_is_where_the_tool_touches(word: str, datum: str, axis: str, target: str) -> None:
    """Both flanks, both datums; the way back and a cut after it are judged in the new frame."""
    away = "-" if not target.startswith("-") else ""
    program = f"{word} {axis}{target} F50\nG92 {axis}0\nG0 {axis}{away}2\nG1 {axis}{away}1 F100\n{axis}{away}3\n"
    datums = {"x": datum, "y": datum, "z": datum}
    result = compensate(HEAD + program, LASH, datum=datums)
    assert f"{word} {axis}{target} F50\n" in result, "the target of a probe stays"
    side = -1 if target.startswith("-") else 1
    shift = 0.0 if (side < 0) == (datum == "-") else (0.1 if datum == "-" else -0.1)
    (line,) = (line for line in result.splitlines() if line.startswith("G92"))
    assert float(line[5:]) == pytest.approx(shift)
    assert_right(HEAD + program, result, LASH, datum=datums)


def test_after_a_probe_the_position_is_unknown_until_it_is_set() -> None:
    with pytest.raises(Refusal) as caught:
        compensate(HEAD + "G38.2 Z-20 F50\nG1 X5 Z-1 F100\n", LASH)
    assert caught.value.line == 4
    assert rewritten("G38.2 Z-20 F50\nG0 Z5") == "G38.2 Z-20 F50\nG0 Z5.6000\nG0 Z5.0000"
    assert rewritten("G38.2 Z-20 F50\nG10 L20 P0 Z0\nG0 Z5") == "G38.2 Z-20 F50\nG10 L20 P0 Z0\nG0 Z5.1000"
