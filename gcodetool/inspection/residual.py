"""What the uncertainty of the lash leaves on the part when a program is compensated by the value of the sheet.

With compensation Bc and true lash B every contour errs as if the lash were B - Bc: left uncrossed where B is larger,
and overshot at each take-up where it is smaller.  A circle comes out smaller or larger across that axis by as much; a
move that reverses two axes errs by both at right angles.
"""

from __future__ import annotations

from collections.abc import Iterable
from decimal import Decimal

from gcodetool.inspection.measure_records import ResidualAxis
from gcodetool.machine import Axis


def residual_axis(axis: Axis) -> ResidualAxis | None:
    """The residual error of one axis in mm (degrees for A B C); None where the sheet states no uncertainty.

    The true lash lies between lash - uncertainty, never below zero, and lash + uncertainty.  An axis of lash 0 is not
    compensated, so it can only be left with too little.
    """
    if axis.uncertainty is None:
        return None
    lowest = max(Decimal(0), axis.lash - axis.uncertainty)
    highest = axis.lash + axis.uncertainty
    return ResidualAxis(axis.letter, axis.lash, lowest, highest, highest - axis.lash, axis.lash - lowest)


def residual_part(axes: Iterable[ResidualAxis]) -> Decimal:
    """The largest distance in mm at which a point of the part can lie, all linear axes at their worst end at once.

    Rotary axes are left out: their degrees become mm only with a radius.  Zero for no axis.
    """
    squares = sum((axis.worst**2 for axis in axes if axis.axis in ("X", "Y", "Z")), Decimal(0))
    return squares.sqrt()


def residual_sentences(axes: Iterable[ResidualAxis]) -> list[str]:
    """One plain sentence per axis and one for the part; empty for no axis."""
    known = list(axes)
    sentences = [_sentence(axis) for axis in known]
    if len([axis for axis in known if axis.axis in ("X", "Y", "Z")]) > 1:
        sentences.append(f"part: within {residual_part(known):.4f} mm where all these axes turn at once")
    return sentences


def _sentence(axis: ResidualAxis) -> str:
    unit = "mm" if axis.axis in ("X", "Y", "Z") else "degrees"
    head = f"axis {axis.axis}: lash {axis.lash:f} {unit} is known to lie from {axis.lowest:f} to {axis.highest:f}; "
    if not axis.worst:
        return head + "nothing is left"
    return (
        head + f"{axis.too_little:f} {unit} may be left uncrossed, or {axis.too_much:f} {unit} overshot, at a reversal"
    )
