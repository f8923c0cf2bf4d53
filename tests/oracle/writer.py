"""Writes moves as program text and keeps track of what was really written, digit by digit.

Positions are program coordinates in mm (degrees) as exact decimals, None where the program cannot know them.  Targets
are rounded to the digits of the present units, and the rounded value is what is remembered.
"""

from __future__ import annotations

import random
from decimal import Decimal

from tests.oracle.dialect import Dialect, code, join, line_end, spell

AXES = "XYZABC"
OFFSETS = "IJK"
INCH = Decimal("25.4")
PLANES = {17: (0, 1, 2), 18: (2, 0, 1), 19: (1, 2, 0)}


class Writer:
    """Modal state and text; ``style`` draws spellings only, so that the same moves may be spelled in several ways."""

    def __init__(self, style: random.Random, dialect: Dialect, *, inch: bool, decimals: int) -> None:
        self.style, self.dialect = style, dialect
        self.inch, self.decimals = inch, decimals
        self.incremental = False
        self.centre_absolute = False
        self.plane = 17
        self.motion: int | None = None
        self.each_feed: Decimal | None = None
        self.position: list[Decimal | None] = [None] * 6
        self.lines: list[bytes] = []
        self.number = 0

    # --- numbers ----------------------------------------------------------------------------------------------

    def unit(self, axis: int = 0) -> Decimal:
        """mm (degrees) per program unit."""
        return INCH if self.inch and axis < 3 else Decimal(1)

    def digit(self, axis: int = 0) -> Decimal:
        """mm (degrees) of one last digit."""
        return self.unit(axis).scaleb(-self.decimals)

    def round(self, value: Decimal, axis: int = 0) -> Decimal:
        """A length in mm as a program number with the present digits."""
        number: Decimal = (value / self.unit(axis)).quantize(Decimal(1).scaleb(-self.decimals))
        return number

    def spelled(self, letter: str, value: Decimal) -> str:
        """A word."""
        return letter + spell(value, self.decimals, self.dialect, self.style)

    def known(self, *axes: int) -> bool:
        """True if the program can know these positions."""
        return all(self.position[axis] is not None for axis in axes)

    def at(self, axis: int) -> Decimal:
        """Known position."""
        value = self.position[axis]
        assert value is not None
        return value

    # --- lines ----------------------------------------------------------------------------------------------------

    def line(self, *words: str, deletable: bool = False) -> None:
        """One block."""
        number = None
        if self.dialect.numbered:
            self.number += 10
            number = self.number
        self.raw(join(list(words), self.dialect, self.style, number, deletable))

    def raw(self, text: bytes) -> None:
        """A line as it is."""
        self.lines.append(text + line_end(self.dialect, self.style))

    def codes(self, *tenfold: int, words: tuple[str, ...] = ()) -> None:
        """A line of G codes and other words."""
        self.line(*(code("G", value, self.dialect) for value in tenfold), *words)

    def text(self, final_newline: bool = True) -> bytes:
        """The program."""
        data = b"".join(self.lines)
        return data if final_newline else data.rstrip(b"\r\n")

    def forget(self, *axes: int) -> None:
        """The program no longer knows where these axes are."""
        for axis in axes or range(6):
            self.position[axis] = None

    # --- motion ---------------------------------------------------------------------------------------------------

    def axis_words(self, targets: dict[int, Decimal], keep: bool = False) -> list[str]:
        """Words that bring the axes to ``targets``; unchanged ones may be left out unless ``keep``.

        All axes must be known in G91.
        """
        words = []
        for axis, target in targets.items():
            here = self.position[axis]
            if self.incremental:
                assert here is not None
                value = self.round(target - here, axis)
                there = here + value * self.unit(axis)
            else:
                value = self.round(target, axis)
                there = value * self.unit(axis)
            if keep or there != here or self.style.random() < self.dialect.repeat_axes:
                words.append(self.spelled(AXES[axis], value))
            self.position[axis] = there
        return words

    def motion_word(self, number: int) -> list[str]:
        """The G word, or nothing where it is modal and the hand leaves it out."""
        if number == self.motion and self.style.random() >= self.dialect.repeat_motion:
            return []
        self.motion = number
        return [code("G", number * 10, self.dialect)]

    def move(
        self, number: int, targets: dict[int, Decimal], feed: Decimal | None = None, deletable: bool = False
    ) -> None:
        """A straight move, G0 or G1; nothing is written if nothing would move and no word is repeated."""
        words = self.axis_words(targets)
        if not words:
            axis = self.style.choice(list(targets))
            words = self.axis_words({axis: targets[axis]}, keep=True)
        self.line(*self.motion_word(number), *words, *self.feed_word(feed, number), deletable=deletable)

    def feed_word(self, feed: Decimal | None, number: int) -> list[str]:
        """F in the present units; in G93 every feed block has its own."""
        if self.each_feed is not None:
            return [f"F{self.each_feed.normalize():f}"] if number else []
        return [] if feed is None else [f"F{(feed / self.unit()).normalize():f}"]

    def use_plane(self, plane: int) -> None:
        """Select a plane, on a line of its own."""
        if plane != self.plane:
            self.plane = plane
            self.codes(plane * 10)

    def arc(
        self,
        clockwise: bool,
        centre: tuple[Decimal, Decimal],
        end: tuple[Decimal, Decimal],
        *,
        radius: Decimal | None = None,
        rise: Decimal | None = None,
        turns: int = 1,
        feed: Decimal | None = None,
    ) -> None:
        """Arc in the present plane; ``centre`` and ``end`` from its start, mm; a signed ``radius`` asks for R."""
        p, q, normal = PLANES[self.plane]
        start = self.at(p), self.at(q)
        targets = {p: start[0] + end[0], q: start[1] + end[1]}
        if rise is not None:
            targets[normal] = self.at(normal) + rise
        full = not any(end)
        words = self.axis_words(dict(sorted(targets.items())), keep=full and self.style.random() < 0.8)
        if not full and not {w[0] for w in words} & {AXES[p], AXES[q]}:
            words += self.axis_words({p: targets[p]}, keep=True)
        if radius is not None:
            words.append(self.spelled("R", self.round(radius)))
        else:
            words += self._centre_words({p: (start[0], centre[0]), q: (start[1], centre[1])})
        if turns > 1:
            words.append(f"P{turns}")
        number = 2 if clockwise else 3
        self.line(*self.motion_word(number), *words, *self.feed_word(feed, number))

    def _centre_words(self, offsets: dict[int, tuple[Decimal, Decimal]]) -> list[str]:
        words = []
        for axis, (start, offset) in sorted(offsets.items()):
            if self.centre_absolute:
                words.append(self.spelled(OFFSETS[axis], self.round(start + offset)))
            elif offset or self.style.random() < 0.7:
                words.append(self.spelled(OFFSETS[axis], self.round(offset)))
        return words
