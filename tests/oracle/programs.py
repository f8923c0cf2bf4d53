"""Seeded random programs over the whole language.

``random_program`` draws a program as a post might write it: head, rapids that start every axis, cuts of lines and arcs,
retracts, and between them what moves frames and tools.  With a small probability it holds what a rewriter must refuse
(a feed on an axis whose side nobody can know).  Every program is valid for ``controller.run`` with the units it states.
"""

from __future__ import annotations

import math
import random
from dataclasses import replace
from decimal import Decimal

from tests.oracle.dialect import Dialect, random_dialect
from tests.oracle.equivalents import equivalents
from tests.oracle.frames import FEEDS, A, Frames, X, Y, Z
from tests.oracle.writer import Writer

__all__ = ["equivalents", "plain", "random_program"]

NEAR = (0, 0, 1, -1, 2, -2, 10, -10)
"""Last digits by which an arc may begin or end beside a quadrant point."""


def random_program(
    rng: random.Random,
    language: str = "basic",
    *,
    operations: int = 6,
    inch: bool | None = None,
    state_units: bool = True,
    refusable: float = 0.05,
    deletes: bool = True,
    dialect: Dialect | None = None,
) -> bytes:
    """A program in the ``basic`` (G0 to G3, frames, tools) or ``full`` language (also cycles, set positions, rotary).

    ``inch``: units, drawn if None.  ``state_units``: write G20 or G21 first.  ``refusable``: chance of each thing that
    must be refused.  ``deletes``: allow block delete lines (their moves make the path depend on a switch).
    """
    if language not in ("basic", "full"):
        raise ValueError("language is basic or full")
    inches = rng.random() < 0.3 if inch is None else inch
    decimals = rng.choice([4, 5]) if inches else rng.choice([3, 3, 4, 4, 5])
    hand = dialect or random_dialect(rng)
    writer = Writer(random.Random(rng.random()), hand, inch=inches, decimals=decimals)
    session = _Session(rng, writer, language == "full", refusable, deletes)
    return session.program(operations, state_units)


class _Session(Frames):
    """Draws one program."""

    # --- the frame of a program -----------------------------------------------------------------------------------

    def program(self, operations: int, state_units: bool) -> bytes:
        taped = self.chance(0.3)
        if taped:
            self.out.raw(b"%")
        if self.chance(0.3):
            self.out.raw(self.rng.choice([b"O1001", b":0042", b"O0007 (plate)"]))
        self.head(state_units)
        self.start()
        for _ in range(operations):
            self.operation()
            self.between()
        if self.chance(0.8):
            self.out.line(self.rng.choice(["M30", "M2", "M02"]))
            if self.chance(0.2):
                self.out.raw(b"text after the end X1 Y2")
        if taped:
            self.out.raw(b"%")
        return self.out.text(final_newline=self.chance(0.9))

    def head(self, state_units: bool) -> None:
        self.out.raw(b"(made by a random hand)")
        if state_units:
            self.out.codes(self.rng.choice([200, 700] if self.out.inch else [210, 710]))
        safe = [900, 170, 400, 490, 800, 940, 540, 640]
        codes = [c for c in safe if self.chance(0.6)]
        if codes:
            self.out.codes(*codes)
            self.out.motion = None
        self.out.line(f"S{self.rng.randint(2, 20)}000", "M3")

    def start(self) -> None:
        """Rapids on every axis, now and then Z on a feed, rarely what must be refused."""
        self.feed = self.rng.choice(FEEDS)
        if self.chance(self.refusable):
            self.out.move(1, {self.rng.choice([X, Y]): self.coordinate()}, self.feed)
        if self.chance(0.15):
            self.out.move(0, self.targets(X, Y))
            self.out.move(1, {Z: Decimal(5)}, self.feed)
        else:
            self.recover()

    # --- cutting --------------------------------------------------------------------------------------------------

    def operation(self) -> None:
        """Rapid to a place, plunge, cut, retract; or holes."""
        self.recover()
        if not self.out.incremental and self.chance(0.25):
            self.out.incremental = True
            self.out.codes(910)
        elif self.chance(0.4):
            self.absolute()
        self.out.move(0, self.targets(X, Y))
        if self.full and self.chance(0.3):
            self.cycle()
            return
        self.out.move(0, {Z: Decimal(2)})
        self.feed = self.rng.choice(FEEDS)
        self.out.move(1, {Z: self.coordinate(3) - 4}, self.feed)
        mode = self.feed_mode()
        for _ in range(self.rng.randint(1, 10)):
            self.cut()
        if mode:
            self.out.codes(940)
            self.out.each_feed = None
            self.feed = self.rng.choice(FEEDS)
            self.out.move(1, {Z: Decimal(3)}, self.feed)
        self.out.move(0, {Z: Decimal(self.rng.choice([5, 8, 20]))})

    def feed_mode(self) -> bool:
        """Now and then cut in G93 or G95; True if so."""
        if not self.full or self.chance(0.75):
            return False
        if self.chance(0.5):
            self.out.codes(930)
            self.out.each_feed = Decimal(self.rng.randint(2, 60))
        else:
            self.out.codes(950, words=(f"F0.0{self.rng.randint(1, 9)}",))
        return True

    def cut(self) -> None:
        draw = self.rng.random()
        if draw < 0.45:
            self.line()
        elif draw < 0.55:
            self.tremble()
        else:
            self.arc()
        if self.chance(0.05):
            self.out.line(f"G4 P{self.rng.randint(1, 3)}")
        if self.deletes and self.chance(0.02):
            self.out.line("M8", deletable=True)

    def maybe_feed(self) -> Decimal | None:
        return self.rng.choice(FEEDS) if self.chance(0.1) else None

    def line(self) -> None:
        axes = sorted(self.rng.sample([X, Y, Z], self.rng.choice([1, 1, 2, 2, 3])))
        if self.rotary and self.chance(0.3):
            axes.append(A)
        span = self.rng.choice([0.02, 0.3, 5.0, 20.0])
        self.out.move(1, {a: self.out.at(a) + self.coordinate(span) for a in axes}, self.maybe_feed())

    def tremble(self) -> None:
        """A line whose second axis goes back by one or two last digits, as rounded tool paths do."""
        p, q = self.rng.sample([X, Y], 2)
        for _ in range(self.rng.randint(1, 4)):
            shake = self.out.digit(q) * self.rng.choice([-2, -1, 1, 2])
            way = {p: self.out.at(p) + self.coordinate(2), q: self.out.at(q) + shake}
            self.out.move(1, dict(sorted(way.items())))

    def ring(self, radius: float) -> tuple[int, int]:
        """A point of a circle in last digits: anywhere, or within a few digits of a quadrant point."""
        if self.chance(0.55):
            angle = self.rng.uniform(0, math.tau)
            return round(radius * math.cos(angle)), round(radius * math.sin(angle))
        near = self.rng.choice(NEAR)
        far = round(math.sqrt(max(radius * radius - near * near, 1.0))) * self.rng.choice([-1, 1])
        return (near, far) if self.chance(0.5) else (far, near)

    def arc(self) -> None:
        """An arc about a centre on the digit grid, its end rounded to the last digit."""
        self.out.use_plane(self.rng.choice([17, 17, 17, 18, 19]))
        if self.chance(0.05):
            self.out.centre_absolute = not self.out.centre_absolute
            self.out.codes(901 if self.out.centre_absolute else 911)
        digit = self.out.digit()
        size = self.rng.choice([0.3, 1.0, 4.0, 10.0, 25.0]) * self.rng.uniform(0.7, 1.3)
        begin = self.ring(size / float(digit))
        radius = math.hypot(*begin)
        full = self.chance(0.15)
        end = begin if full else self.ring(radius)
        clockwise = self.chance(0.5)
        if not full and end == begin:
            return
        way = (end[0] - begin[0]) * digit, (end[1] - begin[1]) * digit
        rise = self.coordinate(2) if self.chance(0.2) else None
        centre = -begin[0] * digit, -begin[1] * digit
        given = None if full or self.chance(0.65) else self.signed_radius(begin, end, clockwise)
        turns = self.rng.choice([2, 3]) if given is None and self.chance(0.1) else 1
        self.out.arc(clockwise, centre, way, radius=given, rise=rise, turns=turns, feed=self.maybe_feed())

    def signed_radius(self, begin: tuple[int, int], end: tuple[int, int], clockwise: bool) -> Decimal | None:
        """R in mm, negative above half a circle, and never shorter than half the chord; None for a hair's chord."""
        cross = begin[0] * end[1] - begin[1] * end[0]
        chord = math.hypot(end[0] - begin[0], end[1] - begin[1])
        if chord < 3:
            return None
        digits = max(round(math.hypot(*begin)), math.ceil(chord / 2))
        short = cross == 0 or (cross > 0) != clockwise
        return self.out.digit() * (digits if short else -digits)

    # --- cycles ---------------------------------------------------------------------------------------------------

    def cycle(self) -> None:
        """A row of holes in the present distance mode, left by G80 or by G0."""
        self.out.use_plane(17)
        number = self.rng.choice([81, 81, 82, 83, 73, 85, 86, 89, 84])
        depth, retract = self.coordinate(3) - 5, Decimal(self.rng.choice([1, 2]))
        level = self.rng.choice([98, 99])
        digits = self.out.round
        if self.out.incremental:
            z_word, r_word = digits(depth - retract), digits(retract - self.out.at(Z))
        else:
            z_word, r_word = digits(depth), digits(retract)
        words = [self.out.spelled("Z", z_word), self.out.spelled("R", r_word)]
        if number in (82, 86, 89):
            words.append("P0.5")
        if number in (83, 73):
            words.append(self.out.spelled("Q", digits(Decimal("1.5"))))
        self.out.codes(level * 10, number * 10, words=(*self.place(), *words, *self.out.feed_word(self.feed, 1)))
        for _ in range(self.rng.randint(0, 4)):
            extra = (f"L{self.rng.randint(2, 3)}",) if self.out.incremental and self.chance(0.3) else ()
            self.out.line(*(self.place(repeated=bool(extra))), *extra)
        self.out.motion = None
        self.out.forget(X, Y, Z)
        if self.chance(0.7):
            self.out.codes(800)
        self.absolute()
        self.out.move(0, {Z: Decimal(8)})

    def place(self, repeated: bool = False) -> list[str]:
        span = 5.0 if repeated else 20.0
        return self.out.axis_words(self.targets(*self.rng.choice([(X,), (Y,), (X, Y)]), span=span), keep=True)


def plain(dialect: Dialect) -> Dialect:
    """The same hand without oddities, for programs that a person must read."""
    return replace(dialect, gap=" ", line_end=b"\n", lower=False, plus=0.0, spread=0.0, comments=0.0, bare_zero=False)
