"""One axis as the short way of ``quick`` sees it: floats to judge by, digits to write with."""

from __future__ import annotations

import math

from gcodetool.lash.knowledge import AxisKnowledge
from gcodetool.program.numbers import INCH_DIGIT, MM_DIGIT, QUANTA_PER_MM, decimals_of, digits, to_quanta

ANY_SIDE = 2
_QUANTA_PER_INCH = 254 * 10**9
_POWER = tuple(10**k for k in range(32))
_ZERO = 1e-9


class Track:
    """Position, farthest place and side of an axis in program units, and its shift in last digits.

    ``side`` is 2 on an axis without lash, whose every target passes, and 0 where a turn cannot be judged.  ``last``
    is the last target word that went the short way, "" where none has since the ordinary way was used.
    """

    __slots__ = ("at", "axis", "far", "last", "placed", "places", "ripple", "side", "step", "steps")

    def __init__(self, axis: AxisKnowledge) -> None:
        """Nothing is taken over before ``read``."""
        self.axis = axis
        self.last = ""
        self.at = self.far = self.ripple = 0.0
        self.side = self.step = self.places = 0
        self.placed = False
        self.steps = (0, 0, 0)

    def read(self, inch: bool, decimals: int) -> None:
        """Take over what is known of the axis."""
        axis = self.axis
        in_inches = inch and not axis.rotary
        unit = _QUANTA_PER_INCH if in_inches else QUANTA_PER_MM
        self.placed = axis.framed
        self.at = axis.position / unit
        self.places = decimals + in_inches
        if not axis.mm_lash:
            self.side = ANY_SIDE
            return
        self.side = axis.side if axis.framed else 0
        self.far = axis.extreme / unit
        # a float may miss the ripple by a rounding: leave what is that near to the ordinary way
        self.ripple = axis.ripple / unit * 1.000001
        last = (INCH_DIGIT if in_inches else MM_DIGIT)[self.places]
        none, plus, minus = axis.shifts[in_inches]
        self.steps = (none, plus // last, minus // last)
        self.step = self.steps[axis.side]

    def turn(self, side: int) -> None:
        """Go to another side."""
        self.side = side
        self.step = self.steps[side]

    def tell(self, inch: bool) -> None:
        """Hand over what went the short way."""
        axis = self.axis
        in_inches = inch and not axis.rotary
        if self.side != ANY_SIDE:
            axis.side = self.side
        if not self.last:
            return
        axis.position = axis.extreme = to_quanta(self.last, INCH_DIGIT if in_inches else MM_DIGIT)
        axis.decimals = decimals_of(self.last)
        axis.shift = axis.shifts[in_inches][axis.side]
        axis.framed = True
        self.last = ""

    def index_in(self, pieces: list[str]) -> int:
        """Index of the number of this axis in a split block."""
        upper, lower = self.axis.letter, self.axis.letter.lower()
        return next(i + 1 for i in range(1, len(pieces), 3) if pieces[i] in (upper, lower))


def in_one_quadrant(
    u: tuple[float, float], v: tuple[float, float], counter: bool, least: float
) -> tuple[int, int] | None:
    """The way of each plane axis on an arc from ``u`` to ``v`` about the origin; None unless in one quadrant.

    An end that misses a quadrant point by so little that the other axis moves less than ``least`` beyond it counts as
    being there.
    """
    small = max(_ZERO, math.sqrt(2.0 * math.hypot(*u) * least))
    signs = []
    for k in (0, 1):
        begin = 0.0 if abs(u[k]) < small else u[k]
        end = 0.0 if abs(v[k]) < small else v[k]
        if begin * end < 0.0 or begin == end:
            return None
        signs.append(1 if begin + end > 0.0 else -1)
    cross = u[0] * v[1] - u[1] * v[0]
    if cross == 0.0 or (cross > 0.0) != counter:
        return None
    return (-signs[1], signs[0]) if counter else (signs[1], -signs[0])


def shifted_text(text: str, step: int, places: int) -> str:
    """A number text with ``step`` last digits of ``places`` decimals more, in its own style, all decimals kept."""
    head, _, tail = text.partition(".")
    decimals = len(tail)
    if decimals <= places:
        value = int(head + tail) * _POWER[places - decimals] + step
    else:
        value = int(head + tail) + step * _POWER[decimals - places]
        places = decimals
    first = text[0]
    if value >= 0 and first.isdigit() and len(shown := str(value)) > places:
        return f"{shown[:-places]}.{shown[-places:]}"
    if value < 0 and first == "-" and text[1] != "." and len(shown := str(value)) > places + 1:
        return f"{shown[:-places]}.{shown[-places:]}"
    return text[: len(text) - len(text.lstrip(" \t"))] + digits(value, places, text)
