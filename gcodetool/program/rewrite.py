"""Edits of one block and the text of new ones; leaves all else alone.

New lines copy the look of the block they belong to: blanks between words or none, upper or lower case, the block delete
slash.  Their line end is the one of that block.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from typing import NamedTuple

from gcodetool.program.words import check_sum, is_deletable

_CHECK = re.compile(r"\*[ \t]*\d+[ \t]*$")
Word = tuple[str, str]


class Look(NamedTuple):
    """How a block is written: what stands between words, lower case, deletable, with a line check."""

    between: str = " "
    lower: bool = False
    slash: bool = False
    check: bool = False


def look_of(pieces: Sequence[str], lower: bool, otherwise: str = " ") -> Look:
    """The look of a split block; ``otherwise`` is the blank to use where a lone word shows none."""
    inner = pieces[3:-1:3]
    between = otherwise if not inner else " " if any(gap[:1] in (" ", "\t") for gap in inner) else ""
    return Look(between, lower, is_deletable(list(pieces)), "*" in pieces[-1])


def new_line(words: Iterable[Word], look: Look) -> str:
    """The text of a new block from letters and numbers."""
    text = look.between.join(letter + number for letter, number in words)
    text = text.lower() if look.lower else text
    text = f"/{text}" if look.slash else text
    return with_check_sum(text) if look.check else text


def with_check_sum(text: str) -> str:
    """The text with its line check ``*nn`` made anew, or with one added."""
    body = _CHECK.sub("", text)
    return f"{body}*{check_sum(body)}"


def with_word(pieces: Sequence[str], word: Word, look: Look) -> list[str]:
    """The pieces with one more word after the last one, before what follows it (a comment, blanks)."""
    letter = word[0].lower() if look.lower else word[0]
    gap = look.between if len(pieces) > 1 else ""
    return [*pieces[:-1], gap, letter, word[1], pieces[-1]]


def with_leading_word(pieces: Sequence[str], word: Word, look: Look) -> list[str]:
    """The pieces with one more word before the first one that is no line number."""
    at = 3 if len(pieces) > 4 and pieces[1] in "Nn" else 0
    letter = word[0].lower() if look.lower else word[0]
    return [*pieces[:at], pieces[at], letter, word[1], look.between, *pieces[at + 1 :]]


def without_words(pieces: Sequence[str], indexes: Iterable[int]) -> list[str]:
    """The pieces without the words whose numbers stand at these indexes, and without the gap before each."""
    gone = set(indexes)
    kept: list[str] = []
    for index in range(2, len(pieces), 3):
        if index not in gone:
            kept += pieces[index - 2 : index + 1]
        elif pieces[index - 2].strip():
            # a comment or the slash before a removed word stays
            kept_gap = pieces[index - 2]
            if kept:
                kept[-1] += kept_gap
            else:
                kept = ["", "", kept_gap]
    return [*kept, pieces[-1]]


def join_words(pieces: Sequence[str]) -> str:
    """The text of edited pieces."""
    return "".join(pieces)


def lines(texts: Sequence[str], ending: str, usual: str) -> str:
    """Join the texts that replace one block; only the last of them may lack a line end, as the block did."""
    if len(texts) == 1:
        return texts[0] + ending
    return (ending or usual).join(texts) + ending
