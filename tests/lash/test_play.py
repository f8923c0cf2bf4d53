"""The play operator and its right inverse: the published rules, exact on integers, and a brute-force machine."""

from __future__ import annotations

import random
from itertools import accumulate, pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.interpolate import interp1d

from gcodetool.lash.play import advance, play, seated, shift

MM = 10**10
U = [0, 1, 2, 3, 2.95, 2.9, 2.8, 1, 0, 0.05, 0.1, 0.2, 3]
W = [-0.05, 0.95, 1.95, 2.95, 2.95, 2.95, 2.85, 1.05, 0.05, 0.05, 0.05, 0.15, 2.95]
"""Series of the play with half width 0.05, from w = -0.05 (derived from w' = max(u - r, min(u + r, w)))."""
DATUMS = pytest.mark.parametrize("datum", [-1, 1])


def followed(commands: list[int], actual: int, lash: int, datum: int) -> list[int]:
    """Actual position after each command."""
    found = []
    for command in commands:
        actual = play(actual, command, lash, datum)
        found.append(actual)
    return found


def walk(seed: int, count: int = 2000) -> list[int]:
    """A random walk in quanta, with holds."""
    rng = random.Random(seed)
    return list(accumulate(rng.choice([0, 1, 1, 1]) * rng.randint(-3 * MM, 3 * MM) for _ in range(count)))


def inverse(wanted: list[int], lash: int, datum: int, side: int) -> list[int]:
    """Commands that bring the axis to each wanted position: the position plus the shift of its side."""
    commands, before = [], wanted[0]
    for place in wanted:
        side = (place > before) - (place < before) or side
        commands.append(seated(place, side, lash, datum))
        before = place
    return commands


# ---- the operator ----------------------------------------------------------------------------------------------------


@DATUMS
def test_the_listed_series(datum: int) -> None:
    """The two-sided form and the two one-sided ones differ by half the lash (Tao and Kokotovic's c_l and c_r)."""
    half = MM // 20
    commands = [round(u * MM) for u in U]
    wanted = [round(w * MM) + datum * half for w in W]
    assert followed(commands, round(-0.05 * MM) + datum * half, 2 * half, datum) == wanted


@DATUMS
@pytest.mark.parametrize("lash", [0, 1, MM // 20, 7 * MM])
def test_the_actual_position_stays_inside_the_play_and_moves_only_when_pushed(datum: int, lash: int) -> None:
    """Krasnosel'skii and Pokrovskii 1989: abs(u - w) <= r always, and w moves only in contact."""
    commands = walk(1)
    before = commands[0]
    for command, actual in zip(commands, followed(commands, commands[0], lash, datum), strict=True):
        low, high = sorted((0, -datum * lash))
        assert low <= command - actual <= high
        if actual > before:
            assert command - actual == high
        if actual < before:
            assert command - actual == low
        before = actual


@DATUMS
def test_plays_in_a_row_add_up(datum: int) -> None:
    """Semigroup rule: play of r1 after play of r2 is the play of r1 + r2 (from memory, proved by numbers)."""
    commands = walk(2)
    one, two = 3 * MM // 10, 2 * MM // 10
    first = followed(commands, commands[0], one, datum)
    assert followed(first, commands[0], two, datum) == followed(commands, commands[0], one + two, datum)


@DATUMS
def test_a_monotone_piece_may_be_cut_anywhere(datum: int) -> None:
    """Rate independent: only the turning points of the command count."""
    commands = walk(3, 300)
    rng = random.Random(3)
    finer = [commands[0]]
    for begin, end in pairwise(commands):
        steps = sorted((rng.randint(*sorted((begin, end))) for _ in range(3)), reverse=end < begin)
        finer += [*steps, end]
    assert followed(finer, commands[0], MM // 5, datum)[::4] == followed(commands, commands[0], MM // 5, datum)


@DATUMS
def test_against_a_machine_simulated_in_small_steps_of_time(datum: int) -> None:
    """A carriage with friction between two walls of the nut, moved in 400 steps between the samples of the command."""
    commands = [value / MM for value in walk(4, 60)]
    lash, steps = 0.7, 400
    times = np.arange(len(commands))
    fine = interp1d(times, commands)(np.linspace(0, len(commands) - 1, steps * (len(commands) - 1) + 1))
    place, found = commands[0], [commands[0]]
    for k, drive in enumerate(fine[1:], 1):
        near, far = (drive, drive - lash) if datum < 0 else (drive + lash, drive)
        if place > near:
            place = near
        elif place < far:
            place = far
        if k % steps == 0:
            found.append(place)
    exact = list(_floats(commands, lash, datum))
    assert found == pytest.approx(exact, abs=1e-9)


def _floats(commands: list[float], lash: float, datum: int) -> list[float]:
    actual, found = commands[0], []
    for command in commands:
        actual = play(actual, command, lash, datum)
        found.append(actual)
    return found


# ---- the inverse -----------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("side", "datum", "expected"), [(-1, -1, 0), (1, -1, 5), (1, 1, 0), (-1, 1, -5)])
def test_the_shift_of_each_side(side: int, datum: int, expected: int) -> None:
    """Nothing on the datum side; the lash, away from it, on the other."""
    assert shift(side, 5, datum) == expected
    assert seated(100, side, 5, datum) == 100 + expected
    assert shift(side, 0, datum) == 0


@DATUMS
@pytest.mark.parametrize("side", [-1, 1])
@pytest.mark.parametrize("seed", range(4))
def test_play_undoes_the_inverse_exactly(datum: int, side: int, seed: int) -> None:
    """A random walk of 2000 points comes back to the last quantum (Tao and Kokotovic 1993: exact output tracking)."""
    wanted = walk(seed)
    lash = 873_000_000
    commands = inverse(wanted, lash, datum, side)
    assert followed(commands, wanted[0], lash, datum) == wanted


@DATUMS
def test_the_command_jumps_by_the_lash_at_a_reversal_and_nowhere_else(datum: int) -> None:
    wanted = walk(5)
    lash = MM // 10
    commands = inverse(wanted, lash, datum, -1)
    side, previous = -1, wanted[0]
    for step, (begin, end) in zip((b - a for a, b in pairwise(commands)), pairwise(wanted), strict=True):
        way = (end > begin) - (end < begin) or side
        assert step == end - begin + (way - side) // 2 * lash
        side, previous = way, end
    assert previous == wanted[-1]


def test_the_two_datums_give_the_same_part_at_another_place() -> None:
    """Another datum moves the whole path by the lash and never changes its size."""
    commands = walk(6)
    lash = MM // 10
    minus = followed(commands, commands[0] - lash, lash, -1)
    plus = followed(commands, commands[0], lash, 1)
    assert {b - a for a, b in zip(minus, plus, strict=True)} == {lash}


# ---- the detector of reversals ---------------------------------------------------------------------------------------


def turns(places: list[float], ripple: float) -> list[float]:
    """Extremes at which the side changes."""
    side, extreme, found = 0, places[0], []
    for place in places[1:]:
        new, next_extreme = advance(side, extreme, place, ripple)
        if side and new != side:
            found.append(extreme)
        side, extreme = new, next_extreme
    return found


FIGURE_6 = [-2.0, 1.0, -3.0, 5.0, -1.0, 3.0, -4.0, 4.0, -2.0]
"""Turning points of the rainflow example of ASTM E1049, figure 6 (from memory)."""


@pytest.mark.parametrize(
    ("ripple", "expected"),
    [
        (0.0, [1, -3, 5, -1, 3, -4, 4]),
        (3.5, [1, -3, 5, -1, 3, -4, 4]),
        (4.5, [5, -4, 4]),
        (8.5, [5]),
        (9.0, []),
    ],
)
def test_turning_points_that_a_deadband_keeps(ripple: float, expected: list[float]) -> None:
    """Derived: a reversal counts once the way back exceeds the deadband; the first motion decides the first side.

    At 4.5 the fall from 1 to -3 is too small, so -3 is no reversal; at 9.0 the fall from 5 to -4 is just not enough.
    """
    assert turns(FIGURE_6, ripple) == expected


@given(st.lists(st.integers(-1000, 1000), min_size=2, max_size=60), st.integers(0, 300))
def test_the_deadband_filter_is_a_play_of_that_width(places: list[int], ripple: int) -> None:
    """A hysteresis filter of width h is the play with half width h / 2 (derived): both turn at the same steps."""
    moves = [place for place, before in zip(places[1:], places, strict=False) if place != before]
    if not moves:
        return
    first = 1 if moves[0] > places[0] else -1
    actual = places[0] if first < 0 else places[0] - ripple  # in contact on the first side
    side, extreme = first, places[0]
    pushed = first
    for place in places[1:]:
        side, extreme = advance(side, extreme, place, ripple)
        then = play(actual, place, ripple, -1)
        pushed = (then > actual) - (then < actual) or pushed
        actual = then
        assert side == pushed


@given(st.lists(st.integers(-1000, 1000), min_size=2, max_size=60), st.integers(0, 300))
def test_what_is_passed_over_is_never_larger_than_the_ripple(places: list[int], ripple: int) -> None:
    side, extreme = 0, places[0]
    for place in places[1:]:
        side, extreme = advance(side, extreme, place, ripple)
        assert abs(extreme - place) <= ripple
        assert (extreme - place) * side >= 0
