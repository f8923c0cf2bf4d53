"""Number text to exact integers and back; nothing here ever passes through a float.

A length is held as an integer count of *quanta*: one quantum is 1e-10 mm (1e-10 degree on a rotary axis).  Nine
decimals of an inch and ten of a millimetre are whole quanta, so sums of written words are exact whatever the units.
"""

from __future__ import annotations

from decimal import ROUND_HALF_EVEN, Decimal

QUANTA_PER_MM = 10**10
MM_PER_INCH_TENTHS = 254

_DEEPEST = 24
# quanta in one last digit of a word with d decimals; past the exact range the entry is 0 and parsing rounds
MM_DIGIT = tuple(10 ** (10 - d) if d <= 10 else 0 for d in range(_DEEPEST))
INCH_DIGIT = tuple(MM_PER_INCH_TENTHS * 10 ** (9 - d) if d <= 9 else 0 for d in range(_DEEPEST))


def exact(text: str) -> tuple[int, int]:
    """Read number text as ``(integer, decimals)``: ``"-1.50"`` gives ``(-150, 2)``.

    Blanks inside the text mean nothing (NISTIR 6556, 3.3.1).  Raises ValueError where there is no digit.
    """
    head, _, tail = text.partition(".")
    try:
        return int(head + tail), len(tail.lstrip(" \t"))
    except ValueError:
        head, _, tail = "".join(text.split()).partition(".")
        return int(head + tail), len(tail)


def to_quanta(text: str, digit: tuple[int, ...]) -> int:
    """Read number text as quanta; ``digit`` is MM_DIGIT or INCH_DIGIT by the units in force."""
    head, _, tail = text.partition(".")
    decimals = len(tail.lstrip(" \t"))
    try:
        value = int(head + tail)
    except ValueError:
        value, decimals = exact(text)
    if decimals < _DEEPEST and digit[decimals]:
        return value * digit[decimals]
    return divide_half_even(value * digit[0], 10**decimals)


def decimal_to_quanta(value: Decimal) -> int:
    """Millimetres (degrees) as a Decimal to quanta, rounded half to even past the last quantum."""
    return int((value * QUANTA_PER_MM).to_integral_value(ROUND_HALF_EVEN))


def divide_half_even(value: int, by: int) -> int:
    """``value / by`` rounded to the nearest integer, ties to even; ``by`` > 0."""
    quotient, rest = divmod(value, by)
    if 2 * rest > by or (2 * rest == by and quotient & 1):
        quotient += 1
    return quotient


def round_to_grid(quanta: int, digit: tuple[int, ...], decimals: int) -> int:
    """The multiple of the last of ``decimals`` digits that is nearest to ``quanta``."""
    step = digit[decimals] if decimals < _DEEPEST else 0
    return divide_half_even(quanta, step) * step if step > 1 else quanta


def digits(value: int, decimals: int, like: str = "0") -> str:
    """Write ``value / 10**decimals`` in the style of the number text ``like``.

    Kept from ``like``: a plus sign (on a value that is not negative), and a missing zero before the point.  There is
    never a minus zero.
    """
    text = str(abs(value))
    if decimals:
        text = text.rjust(decimals + 1, "0")
        whole = text[:-decimals]
        if whole == "0" and _drops_leading_zero(like):
            whole = ""
        text = f"{whole}.{text[-decimals:]}"
    if value < 0:
        return "-" + text
    return "+" + text if "+" in like else text


def _drops_leading_zero(like: str) -> bool:
    return like.lstrip(" \t+-").startswith(".")


def shifted(text: str, add: int, digit: tuple[int, ...], least: int) -> tuple[str, int]:
    """Add ``add`` quanta to the number ``text`` and keep its style; ``(new text, quanta really added)``.

    The result has as many decimals as the text and at least ``least``.  Where ``add`` is a whole number of last digits,
    which holds for a lash on the output grid, nothing is rounded and the second value equals ``add``.
    Leading blanks between letter and number are kept.
    """
    value, decimals = exact(text)
    if decimals < least:
        value *= 10 ** (least - decimals)
        decimals = least
    step = digit[decimals] if decimals < _DEEPEST else 0
    if step:
        steps = divide_half_even(add, step)
        added = steps * step
    else:
        unit = digit[0]
        steps = divide_half_even(add * 10**decimals, unit)
        added = add
    blanks = text[: len(text) - len(text.lstrip(" \t"))]
    return blanks + digits(value + steps, decimals, text), added


def write_quanta(quanta: int, digit: tuple[int, ...], decimals: int, like: str = "0") -> str:
    """Write quanta as number text with ``decimals`` decimals in the units of ``digit``, in the style of ``like``."""
    return digits(divide_half_even(quanta, digit[decimals]), decimals, like)


def decimals_of(text: str) -> int:
    """Digits after the point as written."""
    tail = text.partition(".")[2]
    return len(tail) if tail.isdigit() else len("".join(tail.split()))
