"""One block to one command: what the controller is asked to do, with nothing assumed about where the axes are.

This is the only reader of meaning.  The rewriter, the proof and the statistics all start from its commands, so that a
word cannot mean one thing to one of them and another thing to the next.
"""

from __future__ import annotations

from enum import Enum
from typing import NamedTuple

from gcodetool.errors import Refusal
from gcodetool.motion.dialect import FRAME_WORDS, M_CODES, PROBES, TAKES_AXIS_WORDS
from gcodetool.motion.modal import NO_G_WORDS, GWords, ModalState, code_word, g_words, is_cycle, step
from gcodetool.program.blocks import Block
from gcodetool.program.numbers import MM_DIGIT, exact, to_quanta
from gcodetool.program.words import NotWords, Shape, is_deletable, shape_of, split


class Kind(Enum):
    """What a block asks the axes to do."""

    NONE = "no motion"
    RAPID = "rapid"
    FEED = "feed"
    LINE = "straight line in the wake-up mode"
    ARC = "arc"
    HOME = "home"
    MACHINE = "machine coordinates"
    CYCLE = "cycle"
    PROBE = "probe"
    FRAME = "change of frame"


class Command(NamedTuple):
    """A block with its meaning: the kind of motion, the modal states before and after, the sorted G words.

    ``m`` are M words as the table spells them.  Numbers stay text inside ``pieces``; ``quanta`` reads one.
    """

    block: Block
    pieces: list[str]
    shape: Shape
    kind: Kind
    before: ModalState
    after: ModalState
    g: GWords
    m: tuple[str, ...]

    def has(self, letter: str) -> bool:
        """True where the block has a word with this letter."""
        return letter in self.shape.at

    def number(self, letter: str) -> str:
        """The number text of a word that is there."""
        return self.pieces[self.shape.at[letter]]

    def quanta(self, letter: str) -> int:
        """The length (angle for A B C) of a word that is there, in quanta."""
        digit = MM_DIGIT if letter in "ABC" else self.after.digit
        return to_quanta(self.pieces[self.shape.at[letter]], digit)

    @property
    def deletable(self) -> bool:
        """True where the block begins with the block delete slash."""
        return is_deletable(self.pieces)

    def refusal(self, words: str, reason: str, way_out: str) -> Refusal:
        """A refusal of this block."""
        return Refusal(self.block.number, words, reason, way_out)


_BY_MOTION = {"G0": Kind.RAPID, "G1": Kind.FEED, "": Kind.LINE}
_ARC_LETTERS = frozenset("IJKR")
_CYCLE_LETTERS = frozenset("RQPLIJK")


def read_block(block: Block, state: ModalState) -> Command:
    """Read one block in a modal state; raises Refusal for what no rule covers."""
    try:
        pieces = split(block.text)
    except NotWords as odd:
        raise _odd_text(block, str(odd.args[0])) from None
    shape = shape_of(pieces)
    g = g_words(tuple([pieces[i] for i in shape.g])) if shape.g else NO_G_WORDS
    if g.fault:
        raise Refusal(block.number, *g.fault)
    after = step(state, g)
    if shape.plain and not g.here and not g.length:
        kind = _BY_MOTION.get(after.motion) if shape.axes else Kind.NONE
        if kind is not None and after.units is not None and not shape.twice:
            return Command(block, pieces, shape, kind, state, after, g, ())
    m = tuple([code_word("M", pieces[i]) for i in shape.m])
    command = Command(block, pieces, shape, _kind(shape, g, after), state, after, g, m)
    _check(command)
    return command


def _kind(shape: Shape, g: GWords, after: ModalState) -> Kind:
    """The kind of a block that may be anything."""
    if "G28" in g.here or "G30" in g.here:
        return Kind.HOME
    if "G4" in g.here and not (g.motion and "P" in shape.at):
        return Kind.NONE
    if g.length == "G43.1":
        return Kind.NONE
    if not g.here.isdisjoint(FRAME_WORDS):
        return Kind.FRAME
    if after.motion in ("G2", "G3"):
        return Kind.ARC if shape.axes or not _ARC_LETTERS.isdisjoint(shape.at) else Kind.NONE
    if is_cycle(after.motion):
        return Kind.CYCLE if shape.axes or not _CYCLE_LETTERS.isdisjoint(shape.at) else Kind.NONE
    if not shape.axes:
        return Kind.NONE
    if "G53" in g.here:
        return Kind.MACHINE
    if after.motion in PROBES:
        return Kind.PROBE
    return _BY_MOTION.get(after.motion, Kind.NONE)


def _check(command: Command) -> None:
    """Refuse what a block may not hold, whatever it does."""
    shape, kind, g = command.shape, command.kind, command.g
    if shape.twice:
        raise command.refusal(shape.twice, "this letter stands twice in the block", "Remove one of the two words")
    for word in command.m:
        code = M_CODES.get(word)
        if code and code.reason:
            raise command.refusal(word, code.reason, code.way_out)
    _check_letters(command)
    if len(g.here & TAKES_AXIS_WORDS) > 1:
        both = " ".join(sorted(g.here & TAKES_AXIS_WORDS))
        raise command.refusal(
            both, "two words that both want the numbers of the block", "Put them on lines of their own"
        )
    if "G4" in g.here and shape.axes and command.has("P") and not g.motion:
        reason = "a dwell and an axis word, which may be a time or a target"
        raise command.refusal(_first_word(command), reason, "Put the dwell on a line of its own")
    if shape.axes and kind is Kind.FRAME and g.motion not in ("", "G0", "G1", "G80"):
        both = f"{g.motion} {' '.join(sorted(g.here))}"
        raise command.refusal(
            both, "two words that both want the numbers of the block", "Put them on lines of their own"
        )
    if shape.axes and kind is Kind.NONE and not (g.here & TAKES_AXIS_WORDS) and g.length != "G43.1":
        letter = shape.axes[0][0]
        reason = f"an axis word with no motion in force ({command.after.motion or 'none'})"
        raise command.refusal(letter + command.number(letter).strip(), reason, "Write G0 or G1 on the line")
    if kind not in (Kind.NONE, Kind.HOME) and command.after.units is None and command.shape.axes:
        reason = "motion before the program has said whether it is in mm or inches"
        raise command.refusal(
            _first_word(command), reason, "State it with --units mm or --units in, or in the machine sheet"
        )


def _check_letters(command: Command) -> None:
    at, kind = command.shape.at, command.kind
    for letter in "UVW":
        if letter in at and "G4" not in command.g.here:
            word = letter + command.number(letter).strip()
            raise command.refusal(word, "this axis is not followed", "Only X Y Z A B C can be rewritten")
    if "O" in at and set(at) - {"O", "N"}:
        word = "O" + command.number("O").strip()
        raise command.refusal(word, "a subprogram or a word that is not known", "Write the moves out in one program")
    if "E" in at:
        _check_exponent(command)
    if kind in (Kind.RAPID, Kind.FEED, Kind.LINE, Kind.MACHINE, Kind.PROBE):
        for letter in "IJKR":
            if letter in at:
                word = letter + command.number(letter).strip()
                raise command.refusal(word, "a straight move has no such word", "Remove it, or state G2 or G3")


def _check_exponent(command: Command) -> None:
    """Refuse ``X1E-5``: a reader of RS-274 numbers takes it for X1, the writer meant 0.00001."""
    index = command.shape.at["E"] - 1
    letter = command.pieces[index - 3].upper() if index > 3 else ""
    if letter == "F" or not (command.shape.axes or not _ARC_LETTERS.isdisjoint(command.shape.at)):
        return
    word = "".join(command.pieces[max(index - 3, 0) : index + 2]).strip()
    raise command.refusal(word, "a number with an exponent, or an axis E", "Write the number with a decimal point")


def _first_word(command: Command) -> str:
    letter = command.shape.axes[0][0] if command.shape.axes else next(iter(command.shape.at))
    return letter + command.number(letter).strip()


def _odd_text(block: Block, odd: str) -> Refusal:
    upper = block.text.upper()
    if any(mark in block.text for mark in "#[="):
        reason, way_out = "variables and expressions are not evaluated", "Write the numbers out"
    elif any(word in upper for word in ("IF", "WHILE", "GOTO", "SUB", "CALL", "END")):
        reason, way_out = "program flow is not followed", "Write the moves out, without loops or jumps"
    elif odd.startswith("("):
        reason, way_out = "a comment inside a comment", "Remove the inner brackets"
    elif odd.startswith("/"):
        reason, way_out = "block delete stands first on a line or not at all", "Move the slash to the start of the line"
    else:
        reason, way_out = "this is neither a word nor a comment", "Put it in brackets if it is a remark"
    return Refusal(block.number, odd[:40], reason, way_out)


def turns_of(command: Command) -> int:
    """The P word of an arc: whole turns begun, at least 1; raises Refusal for another number."""
    if not command.has("P"):
        return 1
    value, decimals = exact(command.number("P"))
    if value % 10**decimals or not 1 <= value // 10**decimals <= 10_000:
        raise command.refusal("P" + command.number("P").strip(), "turns are whole numbers from 1", "Mend the P word")
    return int(value // 10**decimals)
