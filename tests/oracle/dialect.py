"""Spelling of random programs: one program, one hand, as posts differ from each other.

A ``Dialect`` holds the habits of one post processor; ``join`` spells a block from its words.
"""

from __future__ import annotations

import random
from dataclasses import dataclass
from decimal import Decimal

NOTES = ("pocket", "Tür-Platte \xe9\xb5", "T1 D=3.0", "X1 Y2 is text too", "G1 X99 is text", "", "%", "M30")


@dataclass(frozen=True, slots=True)
class Dialect:
    """Habits: separator, line end (None: mixed), case, N words, number style, and shares of oddities."""

    gap: str
    line_end: bytes | None
    lower: bool
    numbered: bool
    wide_codes: bool
    fixed: bool
    bare_zero: bool
    plus: float
    spread: float
    comments: float
    semicolons: bool
    repeat_motion: float
    repeat_axes: float


def random_dialect(rng: random.Random) -> Dialect:
    """One set of habits; most are plain, each odd one turns up now and then."""
    return Dialect(
        gap=rng.choice(["", " ", " ", " ", "  ", "\t"]),
        line_end=rng.choice([b"\n", b"\n", b"\n", b"\r\n", b"\r\n", b"\r", None]),
        lower=rng.random() < 0.2,
        numbered=rng.random() < 0.3,
        wide_codes=rng.random() < 0.4,
        fixed=rng.random() < 0.5,
        bare_zero=rng.random() < 0.3,
        plus=rng.choice([0.0, 0.0, 0.3]),
        spread=rng.choice([0.0, 0.0, 0.0, 0.1]),
        comments=rng.choice([0.0, 0.05, 0.2]),
        semicolons=rng.random() < 0.3,
        repeat_motion=rng.choice([0.0, 0.3, 1.0]),
        repeat_axes=rng.choice([0.0, 0.2, 1.0]),
    )


def spell(value: Decimal, decimals: int, dialect: Dialect, rng: random.Random) -> str:
    """A coordinate: fixed decimals, or shortened to ``1``, ``1.``, ``1.5``; ``.5`` or ``0.5``; a plus sign at times."""
    text = f"{value:.{decimals}f}"
    if not dialect.fixed:
        text = text.rstrip("0") if "." in text else text
        text = text.rstrip(".") if rng.random() < 0.5 else text
    if text.rstrip("0.") in ("-", ""):
        text = text.lstrip("-")
    if dialect.bare_zero and "." in text and len(text.lstrip("-")) > 2:
        sign, digits = ("-", text[1:]) if text.startswith("-") else ("", text)
        text = sign + (digits[1:] if digits.startswith("0.") else digits)
    plus = "+" if value >= 0 and rng.random() < dialect.plus else ""
    return plus + (text or "0")


def code(letter: str, tenfold: int, dialect: Dialect) -> str:
    """``G1`` or ``G01`` or ``G59.1`` from ten times the number."""
    whole, part = divmod(tenfold, 10)
    text = f"{whole:02d}" if dialect.wide_codes else str(whole)
    return f"{letter}{text}.{part}" if part else f"{letter}{text}"


def join(words: list[str], dialect: Dialect, rng: random.Random, number: int | None, deletable: bool) -> bytes:
    """One line without its end: words in order, N word, block delete mark, comments here and there."""
    if number is not None:
        words = [f"N{number}", *words]
    if rng.random() < dialect.comments:
        note = rng.choice(NOTES).replace(")", "")
        words = list(words)
        words.insert(rng.randrange(len(words) + 1), f"({note})")
    # a comment mark in front of the slash would hide it from some controllers, so the slash always leads
    text = dialect.gap.join(_spread(word, dialect, rng) for word in words)
    if dialect.semicolons and rng.random() < dialect.comments:
        text += f" ;{rng.choice(NOTES)}"
    return ("/" + text if deletable else text).encode("latin-1")


def _spread(word: str, dialect: Dialect, rng: random.Random) -> str:
    if word.startswith("("):
        return word
    if dialect.lower:
        word = word.lower()
    if len(word) > 2 and rng.random() < dialect.spread:
        at = rng.randrange(1, len(word))
        word = word[:at] + rng.choice([" ", "\t", "  "]) + word[at:]
    return word


def line_end(dialect: Dialect, rng: random.Random) -> bytes:
    """The line end of one block."""
    return dialect.line_end or rng.choice([b"\n", b"\r\n", b"\r"])
