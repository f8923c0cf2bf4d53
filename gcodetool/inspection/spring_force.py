"""Pulls on a spring scale -> friction and preload of an axis.

The table stands still, the drive holds, and the scale pulls until an indicator jumps.  Friction has to be overcome
first, so a plain nut lets go at the friction F, a spring-loaded nut, pulled against its spring, at preload + F.  Each
pull is taken on the safe side: the least that moved the axis.
"""

from __future__ import annotations

from collections.abc import Sequence
from decimal import Decimal

from gcodetool.errors import SheetError

# Newtons: standard gravity 9.80665 m/s^2 (exact by definition), pound 0.45359237 kg (exact by definition).
NEWTONS = {"N": Decimal(1), "kgf": Decimal("9.80665"), "lbf": Decimal("4.4482216152605")}


def in_newtons(pulls: Sequence[Decimal], unit: str) -> list[Decimal]:
    """Pulls in N, kgf or lbf as newtons; raises SheetError for another unit or a pull that is not above zero."""
    if unit not in NEWTONS:
        raise SheetError(f"unit {unit!r} of force: write {', '.join(NEWTONS)}.")
    if any(not pull.is_finite() or pull <= 0 for pull in pulls):
        raise SheetError("a pull must be more than 0.")
    return [pull * NEWTONS[unit] for pull in pulls]


def preload_and_friction(jumps: Sequence[Decimal], friction: Sequence[Decimal]) -> tuple[Decimal | None, Decimal]:
    """Preload and friction in newtons, to 0.1 N downwards; preload None where no ``jumps`` were measured.

    ``jumps`` are pulls against the spring at which the indicator jumped, ``friction`` pulls that moved the axis with
    its nut taken off, or across the lash of a plain nut.  Raises SheetError where friction is missing or exceeds a
    jump.
    """
    if not friction:
        raise SheetError("the friction is needed: it is part of every pull.")
    if not jumps:
        return None, _down(min(friction))
    preload = min(jumps) - max(friction)
    if preload < 0:
        raise SheetError(f"the indicator jumped at {min(jumps):.1f} N, less than the friction {max(friction):.1f} N.")
    return _down(preload), _down(min(friction))


def _down(force: Decimal) -> Decimal:
    return force.quantize(Decimal("0.1"), "ROUND_FLOOR")
