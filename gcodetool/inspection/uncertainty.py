"""The lash of one axis and its uncertainty by JCGM 100:2008, from readings or from a coupon.

Every source of error becomes one row: kind A from scatter, kind B from knowledge, taken as a rectangle of half-width
a with standard uncertainty a / sqrt(3) (4.3.7).  Rows add as squares (5.1.2), and the expanded uncertainty is k = 2
times the sum (6.2.1).  The effective degrees of freedom (G.4.1) say how far k = 2 is from 95 %.
"""

from __future__ import annotations

import math
import statistics
from collections.abc import Iterable, Sequence
from dataclasses import replace
from decimal import ROUND_CEILING, ROUND_HALF_EVEN, Decimal

from gcodetool.errors import SheetError
from gcodetool.inspection.measure_records import Contribution, Evaluation, Instrument, LashEstimate, Target

COVERAGE = 2.0
GRID = Decimal("0.0001")
# JCGM 100:2008, table G.2, p = 95 % (from memory; checked against scipy): degrees of freedom, factor.
STUDENT = (
    (1, 12.71), (2, 4.30), (3, 3.18), (4, 2.78), (5, 2.57), (6, 2.45), (7, 2.36), (8, 2.31), (9, 2.26), (10, 2.23),
    (11, 2.20), (12, 2.18), (13, 2.16), (14, 2.14), (15, 2.13), (16, 2.12), (17, 2.11), (18, 2.10), (19, 2.09),
    (20, 2.09), (25, 2.06), (30, 2.04), (35, 2.03), (40, 2.02), (45, 2.01), (50, 2.01), (100, 1.984), (math.inf, 1.960),
)  # fmt: skip


def lash_from_readings(evaluation: Evaluation, instrument: Instrument, method: str) -> LashEstimate:
    """The lash as the mean over the targets that were read from both sides; raises SheetError where there is none.

    The uncertainty is that of the lash met at any one place of the travel, so the change along the travel counts in
    full.
    """
    targets = [target for target in evaluation.targets if target.reversal is not None]
    if not targets:
        raise SheetError(f"axis {evaluation.axis}: no target was read from both sides, so the readings tell no lash.")
    signed = statistics.fmean(target.reversal or 0.0 for target in targets)
    rows = [_scatter(targets), *_along(targets), *_indicator(instrument, abs(signed))]
    estimate = _estimate(evaluation.axis, evaluation.unit, signed, rows, method)
    return replace(estimate, notes=(*estimate.notes, *_unstated(targets, instrument)))


def lash_from_vernier(
    axis: str, lines: Sequence[float], step: float, method: str = "vernier coupon", unit: str = "mm"
) -> LashEstimate:
    """The lash from the numbers of the coinciding lines, one per coupon or per look; ``step`` is the lash of one line.

    A line to either side may be taken for the right one: a rectangle of half-width one step, never averaged away, since
    one pair of eyes errs the same way each time.
    """
    if not lines:
        raise SheetError("give the number of the line that coincides.")
    signed = -statistics.fmean(lines) * step
    rows = [
        *_repeats([line * step for line in lines]),
        Contribution("one line to either side", "B", step / 3**0.5, math.inf),
    ]
    return _coupon(axis, unit, signed, rows, method, step)


def lash_from_tongues(
    axis: str,
    *,
    wide: Sequence[float] = (),
    narrow: Sequence[float] = (),
    same: Sequence[float] = (),
    accuracy: float = 0.02,
    resolution: float = 0.01,
    method: str = "tongue coupon",
) -> LashEstimate:
    """The lash from the widths in mm of the tongues, any number of looks at each; two of the three kinds are enough.

    ``wide`` has its walls reached from outside (width + lash), ``same`` both walls from one side (width), ``narrow``
    from inside (width - lash).  Wide and narrow tell the lash twice over, so half their difference is taken; ``same``
    is then only a check.  ``accuracy`` is the limit of the caliper's error, ``resolution`` its last digit.
    """
    if not wide and not (same and narrow):
        raise SheetError("two kinds of tongues are needed: wide and narrow, or one of them and same.")
    if not narrow and not same:
        raise SheetError("the wide tongue alone says nothing: measure the narrow one or the same-side one too.")
    (high, low), share = ((wide, narrow), 0.5) if wide and narrow else ((wide, same) if wide else (same, narrow), 1.0)
    signed = -(statistics.fmean(high) - statistics.fmean(low)) * share
    scatter = [replace(row, u=row.u * share) for widths in (high, low) for row in _repeats(widths)]
    rows = [*scatter, _limit("caliper accuracy, both widths", accuracy * 2**0.5 * share)]
    rows.append(_limit("caliper last digit, both widths", resolution / 2 * 2**0.5 * share))
    estimate = _coupon(axis, "mm", signed, rows, method, 2 * combined(rows))
    return replace(estimate, notes=(*estimate.notes, *_closure(wide, same, narrow, accuracy)))


def combined(rows: Iterable[Contribution]) -> float:
    """Combined standard uncertainty of independent rows (JCGM 100, 5.1.2)."""
    return math.sqrt(math.fsum(row.u**2 for row in rows))


def _coupon(axis: str, unit: str, signed: float, rows: list[Contribution], method: str, slack: float) -> LashEstimate:
    """An estimate from a coupon, refused where it says that the lash is less than nothing."""
    estimate = _estimate(axis, unit, signed, rows, method)
    if signed > 2 * slack:
        reason = f"axis {axis}: the coupon reads {-signed:.3f} mm, and no axis has less than no lash"
        raise SheetError(f"{reason}: the two readings are swapped, or a cutting force dragged the axis.")
    return estimate if signed < 0 else replace(estimate, lash=0.0, shown=False)


def _estimate(axis: str, unit: str, signed: float, rows: list[Contribution], method: str) -> LashEstimate:
    """Combined and expanded uncertainty; a lash no larger than that counts as none."""
    rows = [row for row in rows if row.u > 0]
    u, freedom = combined(rows), _freedom(rows)
    factor, expanded = student_factor(freedom), COVERAGE * u
    shown = abs(signed) > expanded
    notes: tuple[str, ...] = ()
    if factor > 1.1 * COVERAGE:
        notes = (f"with so few readings 95 % would need k = {factor:.2f}, that is {factor * u:.4f} {unit}",)
    lash = abs(signed) if shown else 0.0
    return LashEstimate(axis, unit, signed, lash, expanded, shown, freedom, factor, tuple(rows), method, notes)


def _freedom(rows: Sequence[Contribution]) -> float:
    """Welch-Satterthwaite, JCGM 100 G.4.1: u^4 / sum(u_i^4 / nu_i); infinite where nothing scatters."""
    below = math.fsum(row.u**4 / row.freedom for row in rows)
    return combined(rows) ** 4 / below if below > 0 else math.inf


def student_factor(freedom: float) -> float:
    """Coverage factor for 95 % from table G.2, for the next lower degrees of freedom in it (G.4.1, note 1)."""
    if freedom < 1:
        return math.inf
    return next(factor for degrees, factor in reversed(STUDENT) if degrees <= freedom)


def _scatter(targets: Sequence[Target]) -> Contribution:
    """Scatter of the mean reversal value: the variances of all means, over the number of targets squared."""
    cells = [(t.s_up, t.n_up) for t in targets] + [(t.s_down, t.n_down) for t in targets]
    known = [(s * s / n, n - 1) for s, n in cells if s is not None]
    if not known:
        return Contribution("scatter of the readings (read once: unknown)", "A", 0.0, 0)
    # A cell that was read once scatters like the others: scale what is known up to all cells.
    share = len(cells) / len(known) / len(targets) ** 2
    variance = math.fsum(each for each, _ in known) * share
    below = math.fsum((each * share) ** 2 / freedom for each, freedom in known)
    return Contribution("scatter of the readings", "A", variance**0.5, variance**2 / below if below else math.inf)


def _along(targets: Sequence[Target]) -> list[Contribution]:
    """Change of the lash along the travel: what the scatter of the means leaves unexplained, one-way analysis."""
    if len(targets) < 2:
        return []
    reversals = [target.reversal or 0.0 for target in targets]
    explained = statistics.fmean(_mean_variance(target) for target in targets)
    excess = max(0.0, statistics.variance(reversals) - explained)
    return [Contribution("change along the travel", "A", excess**0.5, len(targets) - 1)]


def _mean_variance(target: Target) -> float:
    """Variance of one target's reversal value by the scatter of its readings; 0 where that is unknown."""
    up = target.s_up**2 / target.n_up if target.s_up is not None else 0.0
    return up + (target.s_down**2 / target.n_down if target.s_down is not None else 0.0)


def _indicator(instrument: Instrument, lash: float) -> list[Contribution]:
    """Rows of the indicator; each reversal value is a difference of two readings, hence the root of two."""
    cosine = lash * (1 - math.cos(math.radians(instrument.misalignment)))
    return [
        _limit("indicator last digit, two readings", instrument.resolution / 2 * 2**0.5),
        _limit("indicator accuracy, two readings", instrument.accuracy * 2**0.5),
        _limit("indicator hysteresis", instrument.hysteresis),
        _limit(f"cosine error, up to {instrument.misalignment:g} degrees", cosine),
    ]


def _limit(name: str, half_width: float) -> Contribution:
    return Contribution(name, "B", half_width / 3**0.5, math.inf)


def _repeats(values: Sequence[float]) -> list[Contribution]:
    """Scatter of the mean of repeated looks; none for a single one."""
    if len(values) < 2:
        return []
    u = statistics.stdev(values) / len(values) ** 0.5
    return [Contribution(f"scatter of {len(values)} looks", "A", u, len(values) - 1)]


def _unstated(targets: Sequence[Target], instrument: Instrument) -> tuple[str, ...]:
    """What the budget leaves out, in words."""
    notes = []
    if all(target.s_up is None and target.s_down is None for target in targets):
        notes.append("each place was read once: the scatter is unknown and counts as none")
    if len(targets) == 1:
        notes.append("read at one place only: the lash elsewhere on the travel may differ")
    if not instrument.accuracy > 0:
        notes.append("the accuracy of the indicator is not stated and counts as perfect; give it by --accuracy")
    return tuple(notes)


def _closure(wide: Sequence[float], same: Sequence[float], narrow: Sequence[float], accuracy: float) -> tuple[str, ...]:
    """Wide and narrow must lie evenly about same; if not, a force dragged the axis on one kind of tongue."""
    if not (wide and same and narrow):
        return ()
    off = statistics.fmean(wide) + statistics.fmean(narrow) - 2 * statistics.fmean(same)
    # Three widths, one of them twice: the limit of accuracy as rectangles, k = 2.
    if abs(off) <= COVERAGE * accuracy * math.sqrt((1 + 1 + 4) / 3):
        return ()
    return (
        f"the three tongues do not agree: wide and narrow lie {off:+.3f} mm unevenly about same; the cut may have "
        "dragged the axis across its lash: take a lighter finishing cut",
    )


def rounded(estimate: LashEstimate) -> tuple[Decimal, Decimal]:
    """Lash and uncertainty for the sheet: uncertainty rounded up to two figures (7.2.6), lash to the same place.

    Neither is finer than 0.0001, the grid on which lash is held.  Where no lash is shown the sheet says 0, and the
    uncertainty reaches as far as the true lash may be: what was read plus its uncertainty.
    """
    reach = estimate.uncertainty + (0.0 if estimate.shown else max(0.0, -estimate.signed))
    uncertainty = Decimal(repr(reach))
    place = max(GRID, Decimal(1).scaleb(uncertainty.adjusted() - 1)) if uncertainty > 0 else GRID
    lash = Decimal(repr(estimate.lash)).quantize(place, ROUND_HALF_EVEN)
    return lash, uncertainty.quantize(place, ROUND_CEILING)
