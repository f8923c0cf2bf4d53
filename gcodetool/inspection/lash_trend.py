"""The history of the lash of an axis: how it grows with wear, and when a sheet is too old to be trusted."""

from __future__ import annotations

import datetime
import math
from collections.abc import Iterable
from itertools import pairwise

from gcodetool.inspection.measure_records import Trend
from gcodetool.machine import Axis
from gcodetool.sheet_edit import FormerLash

DAYS_PER_YEAR = 365.25


def trend(axis: str, values: Iterable[FormerLash]) -> Trend:
    """The trend of all dated values, the present one among them; those without a date are left out.

    The slope is the least-squares line through the dates, its uncertainty from the stated uncertainties (k = 2 each);
    it is called growth or decrease only where it exceeds twice that.
    """
    points = tuple(sorted((value for value in values if value.measured), key=_day))
    if len({value.measured for value in points}) < 2:
        return Trend(axis, points, None, None, "one date tells no trend")
    years = [_day(value) / DAYS_PER_YEAR for value in points]
    centre = math.fsum(years) / len(years)
    weight = math.fsum((year - centre) ** 2 for year in years)
    slope = math.fsum((year - centre) * float(value.lash) for year, value in zip(years, points, strict=True)) / weight
    u = _slope_uncertainty(points, years, centre, weight)
    return Trend(axis, points, slope, u, _verdict(slope, u, points))


def _day(value: FormerLash) -> int:
    return value.measured.toordinal() if value.measured else 0


def _slope_uncertainty(
    points: tuple[FormerLash, ...], years: list[float], centre: float, weight: float
) -> float | None:
    """Standard uncertainty of the slope; None where a value has no uncertainty."""
    if any(value.uncertainty is None for value in points):
        return None
    parts = [
        ((year - centre) * float(value.uncertainty or 0) / 2) ** 2 for year, value in zip(years, points, strict=True)
    ]
    return math.sqrt(math.fsum(parts)) / weight


def _verdict(slope: float, u: float | None, points: tuple[FormerLash, ...]) -> str:
    if u is None:
        return "no uncertainty is stated for some value, so whether this is more than scatter is unknown"
    if abs(slope) <= 2 * u:
        return "no change beyond the uncertainty of the values"
    if slope > 0:
        return "the lash grows: the nut or its bearings wear; measure again soon"
    fell = max(pairwise(points), key=lambda pair: pair[0].lash - pair[1].lash)[1]
    return f"the lash became less: an adjustment or a new nut, by {fell.measured}"


def sheet_cautions(axes: Iterable[Axis], today: datetime.date, most_days: int = 180) -> list[str]:
    """Cautions for every axis with lash whose value is old, undated, from the future, or without an uncertainty.

    The default age of half a year is common practice, no source.  Empty where all is well.
    """
    return [caution for axis in axes if axis.lash for caution in _cautions(axis, today, most_days)]


def _cautions(axis: Axis, today: datetime.date, most_days: int) -> list[str]:
    found = []
    if axis.measured is None:
        found.append(
            f"axis {axis.letter}: nobody says when or how its lash was measured; measure it before you trust it"
        )
    elif axis.measured > today:
        found.append(
            f"axis {axis.letter}: its lash was measured on {axis.measured}, which is yet to come; look at the date"
        )
    elif (today - axis.measured).days > most_days:
        days = (today - axis.measured).days
        found.append(
            f"axis {axis.letter}: its lash was measured {days} days ago; lash grows with wear: measure it again"
        )
    if axis.uncertainty is None:
        found.append(
            f"axis {axis.letter}: the uncertainty of its lash is not stated, so what is left on the part is unknown"
        )
    elif axis.uncertainty >= axis.lash:
        found.append(
            f"axis {axis.letter}: its lash is not larger than its uncertainty; compensating it may do more harm"
        )
    return found
