"""Play of one axis: commanded position to actual position, and the shift that inverts it.

lash (backlash, lost motion)  travel of the drive at a reversal that does not move the table
side                          the flank in contact: +1 after pushing in +, -1 after pushing in -, 0 unknown
datum side                    the side on which the operator set zero: there the actual position is the commanded one

The play operator is that of Krasnosel'skii and Pokrovskii, Systems with Hysteresis (1989); its right inverse adds a
shift that depends on the side only (Tao and Kokotovic, Automatica 29(2), 1993).
"""

from __future__ import annotations

from typing import TypeVar

Number = TypeVar("Number", int, float)


def play(actual: Number, command: Number, lash: Number, datum: int) -> Number:
    """Actual position after the command has moved monotonically to ``command``.

    Datum -1: ``command - lash <= actual <= command``; datum +1: ``command <= actual <= command + lash``.  All four in
    one unit; exact for a monotone piece of any length.
    """
    low = command - lash if datum < 0 else command
    return low if actual < low else min(actual, low + lash)


def shift(side: int, lash: Number, datum: int) -> Number:
    """What a command adds to the wanted position on a known side: 0 on the datum side, else the lash away from it."""
    return lash - lash if side == datum else -datum * lash


def seated(actual: Number, side: int, lash: Number, datum: int) -> Number:
    """The command at which pushing towards ``side`` first moves the axis: the actual position plus the shift."""
    return actual + shift(side, lash, datum)


def advance(side: int, extreme: Number, target: Number, ripple: Number) -> tuple[int, Number]:
    """One monotone move of the reversal detector: ``(side, extreme)`` after it.

    ``extreme`` is the farthest point reached on the present side.  The side changes once the axis has come back from
    it by more than ``ripple``; smaller excursions are passed over (the hysteresis step before cycle counting, ASTM
    E1049).  With side 0 any motion decides.
    """
    if side > 0:
        if target >= extreme:
            return side, target
        return (-1, target) if extreme - target > ripple else (side, extreme)
    if side < 0:
        if target <= extreme:
            return side, target
        return (1, target) if target - extreme > ripple else (side, extreme)
    return (target > extreme) - (target < extreme), target
