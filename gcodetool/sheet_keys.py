"""The keys of a machine sheet and what each of them may hold; a wrong value is told with what to write instead."""

from __future__ import annotations

import datetime
import re
from collections.abc import Callable, Mapping
from decimal import Decimal, InvalidOperation
from typing import Any


class WrongValue(Exception):
    """One thing wrong with one value, in words; turned into a sentence with its place by the caller."""


Reader = Callable[[Any], object]

# Factor to mm or degrees; only to tell the user which number to write instead.
_INCH, _MICROMETRE = Decimal("25.4"), Decimal("0.001")
_UNITS = {
    "mm": Decimal(1), "deg": Decimal(1), "\u00b0": Decimal(1), "in": _INCH, "inch": _INCH, '"': _INCH,
    "thou": _INCH / 1000, "um": _MICROMETRE, "\u00b5m": _MICROMETRE, "\u03bcm": _MICROMETRE,
}  # fmt: skip


def from_text(text: str) -> Decimal:
    """The exact decimal of an option's text; raises WrongValue, with the number to write instead where it can tell."""
    try:
        return Decimal(text.strip())
    except InvalidOperation:
        raise WrongValue(_why_no_number(text)) from None


def _why_no_number(text: str) -> str:
    found = re.fullmatch(r"\s*([-+]?\d*\.?\d+|[-+]?\d+\.)\s*(\S+)\s*", text)
    if found and (factor := _UNITS.get(found[2].lower())):
        return f"carries a unit; write the bare number, in mm or degrees: {(Decimal(found[1]) * factor).normalize():f}"
    if re.fullmatch(r"\s*[-+]?\d+,\d+\s*", text):
        return f"has a decimal comma; write {text.strip().replace(',', '.')}"
    return "is no number; write a bare number in mm or degrees, such as 0.12"


def _exact(value: Any) -> Decimal:
    if isinstance(value, str):
        raise WrongValue(f"stands in quotes; write it without: {from_text(value)}")
    if isinstance(value, bool) or not isinstance(value, int | Decimal):
        raise WrongValue("is no number; write a bare number in mm or degrees, such as 0.12")
    number = Decimal(value)
    if not number.is_finite() or int(number.as_tuple().exponent) < -12 or number.adjusted() >= 12:
        raise WrongValue("is out of reach: at most 12 places on either side of the point")
    return number


def _zero_or_more(value: Any) -> Decimal:
    number = _exact(value)
    if number < 0:
        raise WrongValue(f"is negative; it is a size: write {-number:f}, or 0 for none")
    return number


def _above_zero(value: Any) -> Decimal:
    number = _exact(value)
    if number <= 0:
        raise WrongValue("must be more than 0; leave the key out where it is not known")
    return number


def _at_most(largest: int, why: str) -> Reader:
    """A reader of numbers from 0 to ``largest``; ``why`` says what a larger one probably is."""

    def read(value: Any) -> Decimal:
        number = _zero_or_more(value)
        if number > largest:
            raise WrongValue(f"is more than {largest}, {why}")
        return number

    return read


_small = _at_most(2, "so probably micrometres, or degrees; write mm: 120 micrometres are 0.12")
_small_angle = _at_most(2, "so probably minutes or seconds of arc; write degrees: 3 minutes are 0.05")
_margin = _at_most(20, "and each settling goes that far past its target; write mm, such as 0.5")


def _decimals(value: Any) -> int:
    if isinstance(value, bool) or not isinstance(value, int) or not 4 <= value <= 8:
        raise WrongValue("must be a whole number from 4 to 8: with fewer a controller may refuse a shifted arc")
    return value


def _side(value: Any) -> int:
    if value not in ("+", "-"):
        raise WrongValue('is no side; write "+" or "-", in quotes')
    return 1 if value == "+" else -1


def _units(value: Any) -> str:
    if value in ("mm", "in"):
        return str(value)
    guess = str(value).strip().lower()
    meant = "in" if guess.startswith(("in", "im", "g20", '"')) else "mm"
    raise WrongValue(f'is not known; write "{meant}"' if isinstance(value, str) else 'must be "mm" or "in", in quotes')


def _text(value: Any) -> str:
    if not isinstance(value, str) or not value.isprintable():
        raise WrongValue("must be text in quotes, on one line")
    return value


def _date(value: Any) -> datetime.date:
    if type(value) is not datetime.date:
        raise WrongValue("must be a date without quotes, such as 2024-05-31")
    return value


def _travel(value: Any) -> tuple[Decimal, Decimal]:
    if not isinstance(value, list) or len(value) != 2:
        raise WrongValue("must be two numbers, the lowest and the highest position: [-200, 0]")
    low, high = _exact(value[0]), _exact(value[1])
    if low >= high:
        raise WrongValue(f"runs the wrong way; write the lower end first: [{min(low, high):f}, {max(low, high):f}]")
    return low, high


def _history(value: Any) -> list[dict[str, Any]]:
    if not isinstance(value, list) or not all(isinstance(entry, dict) and "lash" in entry for entry in value):
        raise WrongValue("must be a list of former values, each as { lash = 0.12, measured = 2024-05-31 }")
    for entry in value:
        for key, item in entry.items():
            if key not in FORMER_KEYS:
                raise WrongValue(f"has an entry with the key {key}; the keys of an entry are {', '.join(FORMER_KEYS)}")
            try:
                FORMER_KEYS[key](item)
            except WrongValue as fault:
                raise WrongValue(f"has an entry whose {key} {shown(item)} {fault}") from None
    return value


def shown(value: Any) -> str:
    """A value as the sheet has it, cut where it is long."""
    if isinstance(value, list):
        return f"[{', '.join(map(shown, value[:4]))}]"
    text = f'"{value}"' if isinstance(value, str) else str(value).lower() if isinstance(value, bool) else str(value)
    return text if len(text) <= 40 else text[:37] + "..."


FORMER_KEYS: Mapping[str, Reader] = {
    "lash": _zero_or_more, "uncertainty": _zero_or_more, "measured": _date, "method": _text,
}  # fmt: skip
MACHINE_KEYS: Mapping[str, Reader] = {
    "name": _text, "units": _units, "decimals": _decimals, "take_up_feed": _above_zero, "settle_margin": _margin,
}  # fmt: skip
AXIS_KEYS: Mapping[str, Reader] = {
    "lash": _small, "datum": _side, "ripple": _small, "travel": _travel, "acceleration": _above_zero,
    "max_feed": _above_zero, "uncertainty": _small, "measured": _date, "method": _text, "preload": _zero_or_more,
    "friction": _zero_or_more, "stiff_side": _side, "history": _history,
}  # fmt: skip
ROTARY_KEYS: Mapping[str, Reader] = {**AXIS_KEYS, **dict.fromkeys(("lash", "ripple", "uncertainty"), _small_angle)}
