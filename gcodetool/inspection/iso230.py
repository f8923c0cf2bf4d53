"""Readings -> the figures of ISO 230-2, each with its clause in the 2006 edition.

The 2014 edition has the same arithmetic and says "error" where 2006 says "deviation"; both spread by two standard
deviations (the 1988 edition used three, so its figures are larger).  Sign: an axis with lash stops short, so its
reversal values are negative; a take-up needs their size.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

import numpy as np
from numpy.typing import NDArray

from gcodetool.inspection.measure_records import Evaluation, Figure, ReadingSet, Target

Cells = NDArray[np.float64]


def evaluate(readings: ReadingSet) -> Evaluation:
    """The figures of one axis, in the unit of the readings.

    Runs may be missing: each mean takes what is there.  A figure that needs two readings in a cell (s, R, A) is None
    where some target has fewer; one that compares targets (E, M, A) is None where the indicator was set anew at each.
    """
    positions, cells = table(readings)
    targets = tuple(_target(index, position, cells[index]) for index, position in enumerate(positions))
    return Evaluation(readings.axis, readings.unit, readings.common_zero, targets, _figures(readings, targets))


def table(readings: ReadingSet) -> tuple[list[float], Cells]:
    """Target positions in ascending order, and the deviations as an array (targets, runs, 2): [..., 0] is up, 1 down.

    A reading that is missing is NaN.
    """
    positions = sorted({reading.target for reading in readings.readings})
    runs = sorted({reading.run for reading in readings.readings})
    cells = np.full((len(positions), len(runs), 2), np.nan)
    for reading in readings.readings:
        row, column = positions.index(reading.target), runs.index(reading.run)
        cells[row, column, 0 if reading.direction > 0 else 1] = reading.deviation
    return positions, cells


def _target(index: int, position: float, cells: Cells) -> Target:
    """Clauses 2.10 to 2.17 for one target; ``cells`` has shape (runs, 2)."""
    up, down = cells[:, 0][~np.isnan(cells[:, 0])], cells[:, 1][~np.isnan(cells[:, 1])]
    mean_up, mean_down, s_up, s_down = _mean(up), _mean(down), _spread(up), _spread(down)
    mean = reversal = repeatability = None
    if mean_up is not None and mean_down is not None:
        mean, reversal = (mean_up + mean_down) / 2, mean_up - mean_down
    if reversal is not None and s_up is not None and s_down is not None:
        repeatability = max(2 * s_up + 2 * s_down + abs(reversal), 4 * s_up, 4 * s_down)
    return Target(
        index + 1, position, up.size, down.size, mean_up, mean_down, mean, reversal, s_up, s_down,
        None if s_up is None else 4 * s_up, None if s_down is None else 4 * s_down, repeatability,
    )  # fmt: skip


def _mean(values: Cells) -> float | None:
    return float(np.mean(values)) if values.size else None


def _spread(values: Cells) -> float | None:
    """Estimator of the standard deviation, n - 1 (clause 2.15)."""
    return float(np.std(values, ddof=1)) if values.size > 1 else None


Pick = Callable[[Target], float | None]


def _column(targets: Iterable[Target], *picks: Pick) -> list[float] | None:
    """All values of the picks over all targets; None where one is missing."""
    values = [pick(target) for pick in picks for target in targets]
    present = [value for value in values if value is not None]
    return present if len(present) == len(values) else None


def _largest(values: list[float] | None) -> float | None:
    return max(values) if values else None


def _range(high: list[float] | None, low: list[float] | None) -> float | None:
    return max(high) - min(low) if high and low else None


def _edge(mean: str, spread: str, sign: int) -> Pick:
    """Mean plus or minus two standard deviations of one direction."""

    def pick(target: Target) -> float | None:
        centre, s = getattr(target, mean), getattr(target, spread)
        return None if centre is None or s is None else centre + sign * 2 * s

    return pick


def _up(target: Target) -> float | None:
    return target.mean_up


def _down(target: Target) -> float | None:
    return target.mean_down


_UPPER = (_edge("mean_up", "s_up", 1), _edge("mean_down", "s_down", 1))
_LOWER = (_edge("mean_up", "s_up", -1), _edge("mean_down", "s_down", -1))


def _figures(readings: ReadingSet, targets: tuple[Target, ...]) -> tuple[Figure, ...]:
    """Clauses 2.13 to 2.24 for the axis."""
    # A target read from one side only says nothing about the lash, and is left out there.
    reversals = [target.reversal for target in targets if target.reversal is not None]
    figures = [
        Figure("B", "2.13", "reversal value of the axis", _largest([abs(value) for value in reversals])),
        Figure("B mean", "2.14", "mean reversal value, signed", sum(reversals) / len(reversals) if reversals else None),
        Figure("R up", "2.18", "repeatability, up", _largest(_column(targets, lambda t: t.repeatability_up))),
        Figure("R down", "2.18", "repeatability, down", _largest(_column(targets, lambda t: t.repeatability_down))),
        Figure("R", "2.19", "repeatability, both directions", _largest(_column(targets, lambda t: t.repeatability))),
    ]
    compared = targets if readings.common_zero else ()
    return (*figures, *_position_figures(compared))


def _position_figures(targets: tuple[Target, ...]) -> list[Figure]:
    """Clauses 2.20 to 2.24, which compare one target with another; all None for no targets."""
    ups, downs, both = _column(targets, _up), _column(targets, _down), _column(targets, _up, _down)
    means = _column(targets, lambda target: target.mean)
    spans = [_range(_column(targets, high), _column(targets, low)) for high, low in zip(_UPPER, _LOWER, strict=True)]
    accuracy = _range(_column(targets, *_UPPER), _column(targets, *_LOWER))
    return [
        Figure("E up", "2.20", "systematic deviation, up", _range(ups, ups)),
        Figure("E down", "2.20", "systematic deviation, down", _range(downs, downs)),
        Figure("E", "2.21", "systematic deviation, both directions", _range(both, both)),
        Figure("M", "2.22", "mean bidirectional deviation, range", _range(means, means)),
        Figure("A up", "2.23", "accuracy, up", spans[0]),
        Figure("A down", "2.23", "accuracy, down", spans[1]),
        Figure("A", "2.24", "accuracy, both directions", accuracy),
    ]
