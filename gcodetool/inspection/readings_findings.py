"""What a user must know about a set of readings before the lash in it is believed.

Codes 601 to 609.  Nothing is dropped or corrected here: a doubtful reading is named, and the user looks at it again.

Every threshold is a two-sided test at 5 % over the whole set of readings (Bonferroni: the 5 % is shared among the
comparisons made), so that about one good set in twenty draws a false word.
"""

from __future__ import annotations

import math
import statistics
from collections import defaultdict
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from itertools import combinations, pairwise

from gcodetool.inspection.measure_records import Evaluation, Finding, LashEstimate, Reading, ReadingSet, Target

OUTLIER, POSITION, NO_LASH, SWAPPED_ALL, SWAPPED_SOME, DRIFT, MISSING, FEW, EQUAL = range(601, 610)
DOUBTFUL = (OUTLIER, SWAPPED_ALL, SWAPPED_SOME, DRIFT)
"""Findings after which the readings should be looked at before their lash is used."""
RISK = 0.05

Cell = tuple[float, int]
Cells = dict[Cell, list[Reading]]


def findings(readings: ReadingSet, evaluation: Evaluation, lash: LashEstimate, resolution: float) -> list[Finding]:
    """All findings, by code.  ``resolution`` is the indicator's last digit in the unit of the readings."""
    found = [*_outliers(readings, resolution), *_position(readings, evaluation, resolution), *_no_lash(lash)]
    found += [*_swapped_all(lash), *_swapped_some(readings, lash, resolution), *_drift(readings, resolution)]
    return [*found, *_missing(readings, evaluation), *_few(evaluation), *_equal_steps(evaluation)]


@dataclass(frozen=True, slots=True)
class _Scatter:
    """Pooled variance of single readings about the mean of their cell, with its degrees of freedom."""

    variance: float
    freedom: int


def _cells(readings: ReadingSet) -> Cells:
    cells: Cells = defaultdict(list)
    for reading in readings.readings:
        cells[reading.target, reading.direction].append(reading)
    return cells


def _squares(values: Sequence[float]) -> float:
    """Sum of squares about the mean."""
    centre = statistics.fmean(values)
    return math.fsum((value - centre) ** 2 for value in values)


def _pooled(cells: Iterable[Sequence[float]], resolution: float) -> _Scatter:
    """Never below what reading to the last digit hides: a rectangle as wide as the digit, digit^2 / 12."""
    freedom, squares = 0, 0.0
    for values in cells:
        if len(values) > 1:
            freedom, squares = freedom + len(values) - 1, squares + _squares(values)
    return _Scatter(max(squares / freedom if freedom else 0.0, resolution**2 / 12), freedom)


def _outliers(readings: ReadingSet, resolution: float) -> list[Finding]:
    """Readings far from the others of their cell, by the externally studentised residual: scatter taken without it."""
    cells = [cell for cell in _cells(readings).values() if len(cell) > 1]
    tested = sum(len(cell) for cell in cells if len(cell) > 2)
    squares = math.fsum(_squares([reading.deviation for reading in cell]) for cell in cells)
    freedom = sum(len(cell) - 1 for cell in cells) - 1
    if not tested:
        return []
    limit, found = t_quantile(1 - RISK / tested / 2, freedom), []
    for cell in (cell for cell in cells if len(cell) > 2):
        total, share = math.fsum(reading.deviation for reading in cell), 1 / (len(cell) - 1)
        for reading in cell:
            off = reading.deviation - (total - reading.deviation) * share
            # Without the reading the sum of squares is less by off^2 (n - 1) / n.
            rest = max(0.0, squares - off**2 / (1 + share)) / freedom
            if abs(off) > limit * math.sqrt(max(rest, resolution**2 / 12) * (1 + share)):
                found.append(_outlier(reading, off, readings.unit))
    return found


def _outlier(reading: Reading, off: float, unit: str) -> Finding:
    text = (
        f"the reading on line {reading.line} ({_place(reading)}) is {off:+.4f} {unit} away from the others of its "
        "kind; it is kept: look at that reading again, and take it out by hand if it was a slip"
    )
    return Finding(OUTLIER, text, (reading.line,))


def _place(reading: Reading) -> str:
    return f"run {reading.run}, {'up' if reading.direction > 0 else 'down'}, target {reading.target:g}"


def _position(readings: ReadingSet, evaluation: Evaluation, resolution: float) -> list[Finding]:
    """Whether the lash differs from target to target by more than the scatter explains."""
    targets = [target for target in evaluation.targets if target.reversal is not None]
    scatter = _pooled(([r.deviation for r in cell] for cell in _cells(readings).values()), resolution)
    pairs = len(targets) * (len(targets) - 1) // 2
    if not pairs or not scatter.freedom:
        return []
    limit = t_quantile(1 - RISK / pairs / 2, scatter.freedom)
    # The digit's own error is the same in each run, so it is not averaged away.
    digit = resolution**2 / 6
    variances = {t.index: scatter.variance * (1 / t.n_up + 1 / t.n_down) + digit for t in targets}
    apart = [
        (abs(_size(a) - _size(b)) - limit * math.sqrt(variances[a.index] + variances[b.index]), a, b)
        for a, b in combinations(targets, 2)
    ]
    beyond, one, other = max(apart, key=lambda row: row[0])
    return [_position_finding(one, other, readings.unit)] if beyond > 0 else []


def _size(target: Target) -> float:
    """Lash at a target, signed so that play is positive."""
    return -(target.reversal or 0.0)


def _position_finding(one: Target, other: Target, unit: str) -> Finding:
    low, high = sorted((one, other), key=_size)
    text = (
        f"the lash changes along the travel: {_size(low):.4f} {unit} at {low.position:g} and {_size(high):.4f} {unit} "
        f"at {high.position:g}, more than the scatter explains; one number cannot be right everywhere: take it "
        "where you cut, or mend the screw"
    )
    return Finding(POSITION, text)


def _no_lash(lash: LashEstimate) -> list[Finding]:
    if lash.shown:
        return []
    text = (
        f"the readings show no lash: {abs(lash.signed):.4f} {lash.unit} is not more than its uncertainty "
        f"{lash.uncertainty:.4f} {lash.unit}"
    )
    return [Finding(NO_LASH, text)]


def _swapped_all(lash: LashEstimate) -> list[Finding]:
    if not lash.shown or lash.signed < 0:
        return []
    text = (
        "up and down look swapped: an axis with lash stops short, so its readings up lie below those down; or the dial "
        "falls as the axis moves towards plus (# sign = -), or the controller compensates more than the lash"
    )
    return [Finding(SWAPPED_ALL, text)]


def _swapped_some(readings: ReadingSet, lash: LashEstimate, resolution: float) -> list[Finding]:
    """Single pairs with the sign against all others and the same size: up and down written in each other's row."""
    pairs: dict[tuple[float, int], dict[int, Reading]] = defaultdict(dict)
    for reading in readings.readings:
        pairs[reading.target, reading.run][reading.direction] = reading
    whole = {key: pair for key, pair in pairs.items() if len(pair) == 2}
    steps = {key: pair[1].deviation - pair[-1].deviation for key, pair in whole.items()}
    if len(steps) < 3:
        return []
    centre = statistics.median(steps.values())
    noise = 1.4826 * statistics.median(abs(abs(step) - abs(centre)) for step in steps.values())
    # Below four times the noise a sign against the rule may be chance.
    clear = abs(centre) > 4 * max(noise, resolution / math.sqrt(6))
    swapped = [
        key for key, step in steps.items() if clear and step * centre < 0 and abs(step + centre) < abs(centre) / 2
    ]
    return [_swapped_finding(whole[key], lash.unit) for key in swapped]


def _swapped_finding(pair: dict[int, Reading], unit: str) -> Finding:
    up, down = pair[1], pair[-1]
    text = (
        f"run {up.run} at target {up.target:g}: up and down look swapped there (lines {up.line} and {down.line}, "
        f"difference {up.deviation - down.deviation:+.4f} {unit} against all others)"
    )
    return Finding(SWAPPED_SOME, text, (up.line, down.line))


def _drift(readings: ReadingSet, resolution: float) -> list[Finding]:
    """Whether all readings move from the first run to the last: the machine or the indicator is warming up."""
    cells = {key: cell for key, cell in _cells(readings).items() if len(cell) > 1}
    runs = sorted({reading.run for cell in cells.values() for reading in cell})
    if len(runs) < 3 or len(cells) < 2:
        return []
    # Slope of the residuals on the run number, and its scatter about that line.
    points = [
        (r.run, r.deviation - statistics.fmean(x.deviation for x in cell)) for cell in cells.values() for r in cell
    ]
    centre = statistics.fmean(run for run, _ in points)
    weight = math.fsum((run - centre) ** 2 for run, _ in points)
    slope = math.fsum((run - centre) * value for run, value in points) / weight
    freedom = len(points) - len(cells) - 1
    rest = math.fsum((value - slope * (run - centre)) ** 2 for run, value in points) / freedom if freedom > 0 else 0.0
    spread = math.sqrt(max(rest, resolution**2 / 12) / weight)
    if freedom < 1 or abs(slope) <= t_quantile(1 - RISK / 2, freedom) * spread:
        return []
    text = (
        f"the readings move by {slope * (runs[-1] - runs[0]):+.4f} {readings.unit} from the first run to the last: "
        "let the machine run warm, see that the indicator's stand holds, and measure again"
    )
    return [Finding(DRIFT, text)]


def _missing(readings: ReadingSet, evaluation: Evaluation) -> list[Finding]:
    found = []
    if readings.missing:
        found.append(Finding(MISSING, f"rows of the form left empty: {readings.missing}; the rest is evaluated"))
    single = [f"{target.position:g}" for target in evaluation.targets if target.reversal is None]
    if single:
        text = f"target {', '.join(single)}: read from one side only, so it says nothing about the lash"
        found.append(Finding(MISSING, text))
    return found


def _few(evaluation: Evaluation) -> list[Finding]:
    """Less than ISO 230-2 asks for an axis up to 2000 mm: five targets, five approaches from each side."""
    runs = min((min(target.n_up, target.n_down) for target in evaluation.targets), default=0)
    if len(evaluation.targets) >= 5 and runs >= 5:
        return []
    text = (
        f"targets: {len(evaluation.targets)}, approaches from each side: {runs} or more; ISO 230-2 asks for five of "
        "each on an axis up to 2000 mm, so this is a quick look and no acceptance test"
    )
    return [Finding(FEW, text)]


def _equal_steps(evaluation: Evaluation) -> list[Finding]:
    places = [target.position for target in evaluation.targets]
    steps = [high - low for low, high in pairwise(places)]
    if len(steps) < 3 or max(steps) - min(steps) > 1e-6 * max(steps):
        return []
    text = (
        f"the targets stand {steps[0]:g} {evaluation.unit} apart, all equally: an error that returns with every turn "
        "of the screw stays hidden; unequal steps show it"
    )
    return [Finding(EQUAL, text)]


def t_quantile(probability: float, freedom: float) -> float:
    """Quantile of Student's t distribution for 0.5 < ``probability`` < 1; infinite for no degree of freedom.

    By bisection of the distribution function, which is the regularised incomplete beta function (Abramowitz and
    Stegun 26.7.1 and 26.5.27, from memory; checked against scipy).
    """
    if freedom <= 0:
        return math.inf
    tail = 1 - probability
    return _bisect(lambda t: _beta_ratio(freedom / (freedom + t * t), freedom / 2) / 2 - tail)


def _bisect(falling: Callable[[float], float]) -> float:
    """Where a falling function of t >= 0 crosses zero."""
    low, high = 0.0, 1.0
    while falling(high) > 0:
        low, high = high, 2 * high
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if falling(middle) > 0 else (low, middle)
    return (low + high) / 2


def _beta_ratio(x: float, a: float) -> float:
    """Regularised incomplete beta function I_x(a, 1/2)."""
    b = 0.5
    front = math.exp(
        math.lgamma(a + b) - math.lgamma(a) - math.lgamma(b) + a * math.log(x) + (b * math.log1p(-x) if x < 1 else 0.0)
    )
    if x < (a + 1) / (a + b + 2):
        return front * _fraction(x, a, b) / a
    return 1 - front * _fraction(1 - x, b, a) / b


def _fraction(x: float, a: float, b: float) -> float:
    """Continued fraction of the incomplete beta function (Abramowitz and Stegun 26.5.8, from memory), Lentz's way."""
    tiny = 1e-300
    c, d = 1.0, 1 - (a + b) * x / (a + 1)
    d = 1 / (d if abs(d) > tiny else tiny)
    total = d
    for m in range(1, 300):
        for term in (
            m * (b - m) * x / ((a + 2 * m - 1) * (a + 2 * m)),
            -(a + m) * (a + b + m) * x / ((a + 2 * m) * (a + 2 * m + 1)),
        ):
            d = 1 + term * d
            c = 1 + term / c
            d, c = 1 / (d if abs(d) > tiny else tiny), c if abs(c) > tiny else tiny
            total *= d * c
        if abs(d * c - 1) < 1e-14:
            break
    return total
