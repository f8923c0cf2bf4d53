"""Modal state and the one step from a block's G words to the next state.

The state holds the code words themselves (``"G17"``), so that what is printed, compared and restored is what was read.
Steps are cached: a program uses few combinations of G words.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from gcodetool.motion.dialect import CYCLES, G_CODES, Code
from gcodetool.program.numbers import INCH_DIGIT, MM_DIGIT, exact

_FIELD = {
    "motion": "motion",
    "plane": "plane",
    "units": "units",
    "distance": "distance",
    "centre": "centre",
    "offset": "offset",
    "feed mode": "feed_mode",
    "return": "retract",
}
_SAME = {"G70": "G20", "G71": "G21"}


@dataclass(frozen=True, slots=True)
class ModalState:
    """What holds from block to block.

    ``motion`` "" is the controller's wake-up mode (a straight line of unknown speed); ``units`` None and ``offset``
    None mean that the program has not said yet.
    """

    motion: str = ""
    plane: str = "G17"
    units: str | None = None
    distance: str = "G90"
    centre: str = "G91.1"
    offset: str | None = None
    feed_mode: str = "G94"
    retract: str = "G98"

    @property
    def digit(self) -> tuple[int, ...]:
        """Quanta of the last digit by number of decimals, for length words in the units in force."""
        return INCH_DIGIT if self.units == "G20" else MM_DIGIT


@dataclass(frozen=True, slots=True)
class GWords:
    """The G words of one block, sorted: what they set, what acts on this block alone, what is wrong with them."""

    sets: tuple[tuple[str, str], ...] = ()
    motion: str = ""
    here: frozenset[str] = frozenset()
    length: str = ""
    fault: tuple[str, str, str] | None = None


_sorted: dict[tuple[str, ...], GWords] = {}
# keyed by identity, which is safe because each entry keeps both objects alive, and much cheaper than hashing them
_states: dict[ModalState, ModalState] = {}
_steps: dict[tuple[int, int], tuple[ModalState, GWords, ModalState]] = {}
NO_G_WORDS = GWords()


def code_word(letter: str, number: str) -> str:
    """The code as the table spells it: ``("G", "01")`` gives ``"G1"``, ``("G", "59.10")`` gives ``"G59.1"``."""
    value, decimals = exact(number)
    whole, part = divmod(value, 10**decimals)
    tail = str(part).rjust(decimals, "0").rstrip("0") if part else ""
    return f"{letter}{whole}.{tail}" if tail else f"{letter}{whole}"


def g_words(numbers: tuple[str, ...]) -> GWords:
    """Sort the G numbers of a block; cached by their text."""
    found = _sorted.get(numbers)
    if found is None:
        if len(_sorted) > 4096:
            _sorted.clear()
        found = _sorted[numbers] = _sort([code_word("G", number) for number in numbers])
    return found


def _sort(words: list[str]) -> GWords:
    by_group: dict[str, list[str]] = {}
    for word in dict.fromkeys(words):
        code = G_CODES.get(word)
        if code is None:
            return GWords(fault=(word, "this G word is not known", "Remove it if it does nothing on your machine"))
        if code.reason:
            return GWords(fault=(word, code.reason, code.way_out))
        by_group.setdefault(code.group, []).append(word)
    return _checked(by_group)


def _checked(by_group: dict[str, list[str]]) -> GWords:
    motions = by_group.get("motion", [])
    if len(motions) == 2 and "G80" in motions:
        motions = [word for word in motions if word != "G80"]
        by_group["motion"] = motions
    for group, words in by_group.items():
        if len({_SAME.get(word, word) for word in words}) > 1 and group != "one line":
            both = " ".join(words)
            return GWords(fault=(both, "two words of one modal group in a block", "Put them on lines of their own"))
    sets = tuple((_FIELD[group], _SAME.get(words[0], words[0])) for group, words in by_group.items() if group in _FIELD)
    return GWords(
        sets=sets,
        motion=motions[0] if motions else "",
        here=frozenset(by_group.get("one line", [])),
        length=by_group.get("length", [""])[0],
    )


def step(state: ModalState, words: GWords) -> ModalState:
    """The state after a block with these G words; the same object where nothing changes."""
    if not words.sets:
        return state
    key = (id(state), id(words))
    known = _steps.get(key)
    if known is not None:
        return known[2]
    if len(_steps) > 4096:
        _steps.clear()
    after = replace(state, **dict(words.sets))
    # equal states are one object, or a program that goes to and fro would never meet a cached step
    after = state if after == state else _states.setdefault(after, after)
    _steps[key] = (state, words, after)
    return after


def is_cycle(motion: str) -> bool:
    """True for the drilling and boring cycles."""
    return motion in CYCLES


def code_of(word: str) -> Code | None:
    """The table row of a G word."""
    return G_CODES.get(word)
