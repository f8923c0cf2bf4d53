"""Holes reached from the datum side with an overshoot: their place is right for every true lash up to the overshoot."""

from __future__ import annotations

import random
from decimal import Decimal

import pytest

from gcodetool.lash.running import Settings
from gcodetool.program.numbers import decimal_to_quanta
from tests.lash.rewriting import judged, rewrite, sheet

OVERSHOOT = "0.3"
TRUE = ["0", "0.04", "0.1", "0.17", "0.29", "0.3"]


def holes(seed: int, datum: dict[str, str]) -> tuple[bytes, bytes]:
    """A program that drills, by plunges and by cycles, and what a rewriter that believes in lash 0.1 makes of it."""
    rng = random.Random(seed)
    lines = ["G21 G90", "G0 Z10", "G0 X0 Y0"]
    for _ in range(8):
        place = f"X{rng.randint(-30, 30)} Y{rng.randint(-30, 30)}"
        kind = rng.randrange(3)
        if kind == 0:
            lines += [f"G0 {place}", "G1 Z-3 F100", "G0 Z5"]
        elif kind == 1:
            lines += [f"G0 {place}", "G0 Z1", "G1 Z-3 F100", "G0 Z5"]
        else:
            lines += [f"G99 G81 {place} Z-3 R2 F100", f"X{rng.randint(-30, 30)}", "G80", "G0 Z5"]
    program = ("\n".join(lines) + "\n").encode()
    machine = sheet({"x": "0.1", "y": "0.1"}, datum=datum)
    settings = Settings(hole_overshoot=decimal_to_quanta(Decimal(OVERSHOOT)))
    return program, rewrite(program, machine, settings)[0]


@pytest.mark.parametrize("datum", ["+", "-"])
@pytest.mark.parametrize("true", TRUE)
@pytest.mark.parametrize("seed", range(3))
def test_no_hole_is_off_whatever_the_true_lash(seed: int, true: str, datum: str) -> None:
    """The machine has another lash than the rewriter was told; the holes are right all the same."""
    datums = {"x": datum, "y": datum}
    program, result = holes(seed, datums)
    report = judged(program, result, {"x": true, "y": true}, datum=datums, approach=0.7, seeds=range(2))
    assert report.feed.value <= 0.0006, report
    assert not report.faults


def test_without_the_option_a_wrong_lash_moves_the_holes() -> None:
    program, _ = holes(0, {})
    result, _ = rewrite(program, sheet({"x": "0.1", "y": "0.1"}))
    report = judged(program, result, {"x": "0.17", "y": "0.17"}, approach=0.7, seeds=range(2))
    assert report.feed.value > 0.05


def test_a_lash_larger_than_the_overshoot_is_not_promised() -> None:
    program, result = holes(0, {})
    report = judged(program, result, {"x": "0.5", "y": "0.5"}, approach=0.9, seeds=range(2))
    assert report.feed.value > 0.05
