"""Time grows with the length of a program, and memory stays bounded.  The full measurement is tests/benchmarks."""

from __future__ import annotations

import pytest

from tests.benchmarks.bench_engagement import HABITS, in_a_process

# twice the moves may cost this much; more would mean that time grows faster than the program
GROWTH = 2.3


@pytest.mark.parametrize("habit", ["adaptive", "contours"])
def test_doubling_a_small_program(habit: str) -> None:
    half, whole = in_a_process(habit, 12_000), in_a_process(habit, 24_000)
    assert whole[1] / half[1] * (2.0 * half[0] / whole[0]) < GROWTH


@pytest.mark.long
@pytest.mark.parametrize("habit", HABITS)
def test_a_hundred_thousand_moves_take_about_a_minute_and_less_than_a_gigabyte(habit: str) -> None:
    half, whole = in_a_process(habit, 50_000), in_a_process(habit, 100_000)
    assert whole[0] >= 100_000
    assert whole[1] < 70.0
    assert whole[2] < 1000.0
    assert whole[1] / half[1] * (2.0 * half[0] / whole[0]) < GROWTH
