"""G91: steps change by the change of the shift, and nothing that was rounded away is ever dropped."""

from __future__ import annotations

import random
from itertools import pairwise

import pytest

from gcodetool.lash.play import advance, shift
from gcodetool.machine import Machine
from gcodetool.motion.controller import Controller
from gcodetool.motion.moves import Move, Setup
from gcodetool.program.blocks import blocks_of
from gcodetool.program.numbers import QUANTA_PER_MM
from tests.lash.rewriting import assert_right, rewrite, sheet, stated

START = ["x=0-"]


def commands(program: bytes, units: str) -> list[int]:
    """X after every move, quanta."""
    items = Controller(Setup(units=units)).run(blocks_of(program))  # type: ignore[arg-type]
    return [item.end[0] for item in items if isinstance(item, Move)]


def steps_of(rng: random.Random, count: int, digits: int) -> list[int]:
    """Steps in last digits, some of them 0, none of a single digit (which would be noise, not motion)."""
    return [rng.choice([0, 1, 1, 1]) * rng.choice([-1, 1]) * rng.randint(2, 40 * 10**digits) for _ in range(count)]


def number(steps: int, digits: int) -> str:
    """A count of last digits as a number."""
    text = f"{abs(steps):0{digits + 1}d}"
    return ("-" if steps < 0 else "") + (f"{text[:-digits]}.{text[-digits:]}" if digits else text)


@pytest.mark.parametrize("digits", [0, 1, 3, 4])
@pytest.mark.parametrize("units", ["mm", "in"])
@pytest.mark.parametrize("seed", range(3))
def test_the_command_is_at_its_place_plus_the_shift_after_every_step(seed: int, units: str, digits: int) -> None:
    """After two hundred steps not one quantum is missing, whatever the decimals of the words."""
    rng = random.Random(seed)
    machine: Machine = sheet({"x": "0.12345"}, units=units)
    lines = [f"G1 X{number(step, digits)} F100\n" for step in steps_of(rng, 200, digits)]
    program = ("G91\n" + "".join(lines)).encode()
    result, _ = rewrite(program, machine, stated(start=START))
    wanted, got = commands(program, units), commands(result, units)
    lash = 1_234_000_000 if units == "mm" else round(0.12345 / 25.4 * 1e5) * 2_540_000
    side, extreme, expected = -1, 0, [0]
    for place in wanted:
        new, extreme = advance(side, extreme, place, QUANTA_PER_MM // 10_000)
        if new != side:
            expected.append(expected[-1] + shift(new, lash, -1) - shift(side, lash, -1))
        side = new
        expected.append(place + shift(side, lash, -1))
    assert got == expected[1:]


@pytest.mark.parametrize("seed", range(4))
def test_a_closed_path_in_steps_closes(seed: int) -> None:
    """Out and back over odd fractions a thousand times: the command is back at 0, to the last quantum."""
    rng = random.Random(seed)
    out = [rng.randint(-9999, 9999) for _ in range(500)]
    places = [sum(out[:k]) for k in range(501)]
    steps = [b - a for a, b in pairwise([*places, *reversed(places[:-1])])]
    program = ("G91\n" + "".join(f"G1 X{number(step, 3)} F100\n" for step in steps) + "G1 X-1\nX1\nX-1\n").encode()
    result, tally = rewrite(program, sheet({"x": "0.0873"}), stated(start=START))
    assert commands(result, "mm")[-1] == commands(program, "mm")[-1] == -QUANTA_PER_MM
    assert sum(tally.take_ups.values()) > 200
    assert_right(program, result, {"x": "0.0873"}, start=START, seeds=range(2))


@pytest.mark.parametrize("seed", range(4))
def test_g90_and_g91_give_the_same_commands(seed: int) -> None:
    rng = random.Random(seed)
    steps = steps_of(rng, 80, 3)
    places = [sum(steps[: k + 1]) for k in range(len(steps))]
    one = "G90\n" + "".join(f"G1 X{number(place, 3)} F100\n" for place in places)
    two = "G91\n" + "".join(f"G1 X{number(step, 3)} F100\n" for step in steps)
    results = [rewrite(text, sheet({"x": "0.0873"}), stated(start=START))[0] for text in (one, two)]
    assert commands(results[0], "mm") == commands(results[1], "mm")


def test_a_change_of_units_on_the_way_keeps_the_place() -> None:
    """0.1 mm is 0.00394 in; what the two grids differ by is put right at the next take-up, not added up."""
    program = b"G21 G91\nG1 X5 F100\nX-1\nG20\nX.1\nX-.1\nG21\nX3\nX-2\n" * 20
    result, _ = rewrite(program, sheet({"x": "0.1"}), stated(start=START))
    assert commands(result, "mm")[-1] == commands(program, "mm")[-1]
    assert_right(program, result, {"x": "0.1"}, start=START)
