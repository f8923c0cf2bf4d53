"""One block to words and back; knows letters and numbers, no meaning.

``split`` cuts a block into *pieces*: ``[gap, letter, number, gap, letter, number, ..., gap]``.  A gap is everything
that is not a word: blanks, comments in ( ) or after ;, the block delete slash, ``%``.  Joining the pieces gives the
text back.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

WORD = re.compile(r"([A-Za-z])([ \t]*[-+]?(?:\d+\.?\d*|\.\d+))")
_LOOSE_WORD = re.compile(r"([A-Za-z:])((?:[ \t]*[-+])?(?:[ \t]*[\d.])+)")
# no number has so many digits, and Python would not turn them into an integer
_LONG = 1000
_BLANKS = re.compile(r"[ \t]+")
_HEAD = re.compile(r"[ \t]*/[1-9]?")
_CHECK = re.compile(r"\*[ \t]*\d+[ \t]*$")
_ODD = re.compile(r"[^\s(;]+")


class NotWords(ValueError):
    """The text holds something that is neither a word nor a gap; ``args[0]`` is the odd text."""


@dataclass(frozen=True, slots=True)
class Shape:
    """Where the words of a block stand, shared by all blocks with the same letters in the same order.

    ``at`` gives for each upper-case letter the index of its number among the pieces (the last one where it is
    repeated), ``axes`` the same for the axis letters of ISO 841 in the order X Y Z A B C, ``g`` and ``m`` all indexes
    of G and M numbers, ``twice`` a letter other than G and M that is repeated, or "".  ``plain`` blocks hold N, G, F
    and axis words only, ``lower`` ones are written in lower case.
    """

    at: dict[str, int]
    axes: tuple[tuple[str, int], ...]
    g: tuple[int, ...]
    m: tuple[int, ...]
    twice: str
    plain: bool
    lower: bool


_shapes: dict[str, Shape] = {}


def split(text: str) -> list[str]:
    """Cut a block's text into pieces; raises NotWords for text that no rule covers."""
    pieces = WORD.split(text)
    gaps = "".join(pieces[::3])
    if gaps and not gaps.isspace():
        pieces = _split_slowly(text)
    if len(text) > _LONG:
        for number in pieces[2::3]:
            if len(number) > _LONG:
                raise NotWords(number.strip())
    return pieces


def join(pieces: list[str]) -> str:
    """The text that ``split`` was given."""
    return "".join(pieces)


def shape_of(pieces: list[str]) -> Shape:
    """The shape of a split block; cached, because a program has few different ones."""
    letters = "".join(pieces[1::3])
    shape = _shapes.get(letters)
    if shape is None:
        if len(_shapes) > 4096:
            _shapes.clear()
        shape = _shapes[letters] = _new_shape(letters)
    return shape


def _new_shape(letters: str) -> Shape:
    at: dict[str, int] = {}
    places: dict[str, list[int]] = {"G": [], "M": []}
    twice = ""
    for k, letter in enumerate(letters.upper().replace(":", "O")):
        index = 3 * k + 2
        if letter in places:
            places[letter].append(index)
        elif letter in at:
            twice = letter
        at[letter] = index
    return Shape(
        at=at,
        axes=tuple((letter, at[letter]) for letter in "XYZABC" if letter in at),
        g=tuple(places["G"]),
        m=tuple(places["M"]),
        twice=twice,
        plain=not set(at) - set("NGFXYZABC"),
        lower=letters.islower(),
    )


def _split_slowly(text: str) -> list[str]:
    """Split with comments, block delete, check sums and blanks inside numbers (NISTIR 6556, 3.3.1 to 3.3.4)."""
    pieces: list[str] = []
    gap = ""
    place = 0
    head = _HEAD.match(text)
    if head:
        gap, place = head.group(), head.end()
    while place < len(text):
        word = _LOOSE_WORD.match(text, place)
        if word and word.group(2).count(".") <= 1 and any(c.isdigit() for c in word.group(2)):
            pieces += [gap, word.group(1), word.group(2)]
            gap, place = "", word.end()
            continue
        end = _gap_end(text, place)
        gap += text[place:end]
        place = end
    return [*pieces, gap]


def _gap_end(text: str, place: int) -> int:
    """End of the gap that starts at ``place``."""
    char = text[place]
    if char in " \t":
        blanks = _BLANKS.match(text, place)
        assert blanks is not None
        return blanks.end()
    if char == ";":
        return len(text)
    if char == "(":
        return _comment_end(text, place)
    if char == "%" and not text[:place].strip():
        return len(text)
    check = _CHECK.match(text, place)
    if check:
        return check.end()
    if char.isspace() or (char in "\x00\x1a\x7f\xef\xbb\xbf" and not text[:place].strip("\xef\xbb\xbf\x00\x1a\x7f ")):
        # tape leaders, a stray end-of-file mark, a byte order mark: only ever at the start of a line
        return place + 1
    odd = _ODD.match(text, place)
    raise NotWords(odd.group() if odd else char)


def _comment_end(text: str, place: int) -> int:
    """End of a ( ) comment; one that is never closed runs to the end of the line.

    Comments do not nest in RS-274.  A comment with inner brackets is taken whole where no reading of it holds a word.
    """
    close = text.find(")", place)
    if close < 0:
        return len(text)
    if "(" not in text[place + 1 : close]:
        return close + 1
    depth = 0
    for index in range(place, len(text)):
        depth += {"(": 1, ")": -1}.get(text[index], 0)
        if depth == 0:
            if _LOOSE_WORD.search(text, close + 1, index):
                break
            return index + 1
    raise NotWords(text[place:])


def is_deletable(pieces: list[str]) -> bool:
    """True for a block that starts with the block delete slash."""
    return pieces[0].lstrip(" \t").startswith("/")


def check_sum(text: str) -> int:
    """Exclusive or of all characters before ``*``, the check of simple serial links (common practice, no source)."""
    total = 0
    for byte in text.encode("latin-1"):
        total ^= byte
    return total
