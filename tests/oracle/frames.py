"""What moves frames, tools and knowledge between the cuts of a random program."""

from __future__ import annotations

import random
from collections.abc import Callable
from decimal import Decimal

from tests.oracle.dialect import code
from tests.oracle.writer import Writer

X, Y, Z, A = 0, 1, 2, 3
FEEDS = tuple(Decimal(v) for v in ("254", "508", "127", "762"))


class Frames:
    """Draws moves with ``rng``; the writer's own generator draws spellings."""

    def __init__(self, rng: random.Random, writer: Writer, full: bool, refusable: float, deletes: bool) -> None:
        self.rng, self.out = rng, writer
        self.full, self.refusable, self.deletes = full, refusable, deletes
        self.tool = 0
        self.rotary = full and rng.random() < 0.3
        self.feed = rng.choice(FEEDS)

    def chance(self, share: float) -> bool:
        return self.rng.random() < share

    def coordinate(self, span: float = 40.0) -> Decimal:
        return Decimal(repr(round(self.rng.uniform(-span, span), 5)))

    def targets(self, *axes: int, span: float = 40.0) -> dict[int, Decimal]:
        return {axis: self.coordinate(span) for axis in axes}

    def recover(self) -> None:
        """Make every axis known again by rapids in G90."""
        if self.out.known(X, Y, Z) and (self.out.known(A) or not self.rotary):
            return
        self.absolute()
        order = self.rng.choice([((Z,), (X, Y)), ((X, Y), (Z,)), ((Z,), (X,), (Y,)), ((X, Y, Z),)])
        for axes in order:
            self.out.move(0, {a: Decimal(8) if a == Z else self.coordinate() for a in axes})
        if self.rotary and not self.out.known(A):
            self.out.move(0, {A: self.coordinate(90)})

    def absolute(self) -> None:
        if self.out.incremental:
            self.out.incremental = False
            self.out.codes(900)

    # --- what stands between cuts ---------------------------------------------------------------------------------

    def between(self) -> None:
        """Now and then a change of frame, tool, units or state of knowledge."""
        basic: list[Callable[[], None]] = [
            self.home, self.machine_move, self.system, self.length, self.tool_change, self.stop, self.optional,
            self.comment, self.home_everything,
        ]  # fmt: skip
        full: list[Callable[[], None]] = [self.set_position, self.local, self.set_system, self.probe, self.units]
        if self.chance(0.5):
            self.rng.choice(basic + full if self.full else basic)()

    def refuse(self) -> None:
        """Rarely cut at once where the side of an axis is unknown."""
        if self.chance(self.refusable):
            self.absolute()
            self.out.move(1, self.targets(self.rng.choice([X, Y])), self.feed)

    def home(self) -> None:
        axes = self.rng.choice([(Z,), (Z,), (X, Y), (Y,)])
        number = self.rng.choice([280, 280, 300])
        if self.out.incremental or self.chance(0.5):
            self.out.codes(910, number, words=tuple(self.out.spelled("XYZ"[a], Decimal(0)) for a in axes))
            self.out.incremental = True
        else:
            via = tuple(self.out.spelled("XYZ"[a], self.out.round(Decimal(20))) for a in axes)
            self.out.codes(number, words=via)
        self.out.forget(*axes)
        self.refuse()

    def home_everything(self) -> None:
        self.out.codes(self.rng.choice([280, 300]))
        self.out.forget()

    def machine_move(self) -> None:
        axes = self.rng.choice([(Z,), (X, Y)])
        words = tuple(self.out.spelled("XYZ"[a], self.out.round(self.coordinate(50))) for a in axes)
        self.out.codes(530, 0, words=words)
        self.out.motion = 0
        self.out.forget(*axes)
        self.refuse()

    def system(self) -> None:
        self.out.codes(self.rng.choice([540, 550, 560, 570, 580, 590, 591, 592, 593]))
        self.out.forget()
        self.refuse()

    def length(self) -> None:
        """G43 with H alone, or with a rapid on Z as posts write it; G43.1 and G49 at times."""
        self.out.forget(Z)
        draw = self.rng.random()
        if draw < 0.2:
            self.out.codes(490)
        elif draw < 0.3:
            self.out.codes(431, words=(self.out.spelled("Z", self.out.round(Decimal("12.5"))),))
        elif draw < 0.6:
            self.out.codes(430, words=(f"H{self.rng.randint(1, 20)}",))
        else:
            self.absolute()
            words = (*self.out.axis_words({Z: Decimal(15)}, keep=True), f"H{self.rng.randint(1, 20)}")
            self.out.codes(0, 430, words=words)
            self.out.motion = 0

    def tool_change(self) -> None:
        self.tool += 1
        if self.chance(0.5):
            self.out.line(f"T{self.tool}", "M6")
        else:
            self.out.line("M5")
            self.out.line("M6", f"T{self.tool}")
        self.out.line(f"S{self.rng.randint(2, 20)}000", "M3")
        self.out.forget()
        if self.chance(0.4):
            self.length()
        self.refuse()

    def stop(self) -> None:
        self.out.line(self.rng.choice(["M0", "M1", "M01"]))

    def optional(self) -> None:
        """A deletable rapid to a place; afterwards both positions are made known again."""
        if self.deletes:
            self.absolute()
            self.out.move(0, self.targets(X, Y), deletable=True)
            self.out.motion = None
            self.out.forget(X, Y)

    def comment(self) -> None:
        self.out.raw(self.rng.choice([b"(caf\xe9 X1)", b"; note G1 X5", b"", b"   ", b"()", b"(a) (b)"]))

    def units(self) -> None:
        self.out.inch = not self.out.inch
        self.out.decimals = 5 if self.out.inch else 4
        self.out.codes(200 if self.out.inch else 210)

    # --- set positions --------------------------------------------------------------------------------------------

    def set_position(self) -> None:
        """G92 on some axes, sometimes cancelled again at once."""
        axes = sorted(self.rng.sample([X, Y, Z], self.rng.randint(1, 2)))
        values = {a: Decimal(8) if a == Z else self.coordinate(10) for a in axes}
        self.out.codes(920, words=self.absolute_words(values))
        if self.chance(0.3):
            self.out.codes(self.rng.choice([921, 922]))
            self.out.forget()

    def absolute_words(self, values: dict[int, Decimal]) -> tuple[str, ...]:
        """Words of a code that sets values, whatever the distance mode."""
        held = self.out.incremental
        self.out.incremental = False
        words = tuple(self.out.axis_words(values, keep=True))
        self.out.incremental = held
        return words

    def local(self) -> None:
        axes = self.rng.choice([(X,), (X, Y), (X, Y, Z)])
        values = {a: self.rng.choice([Decimal(0), self.coordinate(10)]) for a in axes}
        self.out.codes(520, words=self.absolute_words(values))
        self.out.forget(*axes)

    def set_system(self) -> None:
        """G10 L2 and L20 on any system, on the present one as P0."""
        axes = self.rng.choice([(X, Y), (Z,), (X, Y, Z)])
        values = {a: Decimal(8) if a == Z else self.coordinate(30) for a in axes}
        words = self.absolute_words(values)
        kind, system = self.rng.choice(["L2", "L20"]), self.rng.choice([0, 1, 2, 5])
        self.out.line(code("G", 100, self.out.dialect), kind, f"P{system}", *words)
        if kind == "L2" or system:
            self.out.forget(*axes)

    def probe(self) -> None:
        """Probe down, set zero there, retract."""
        self.recover()
        self.absolute()
        down = self.out.axis_words({Z: Decimal(-20)}, keep=True)
        self.out.codes(382, words=(*down, *self.out.feed_word(self.feed, 1)))
        self.out.motion = None
        if self.chance(0.7):
            if self.chance(0.5):
                self.out.codes(920, words=self.absolute_words({Z: Decimal(0)}))
            else:
                self.out.line(code("G", 100, self.out.dialect), "L20", "P0", *self.absolute_words({Z: Decimal(0)}))
        else:
            self.out.forget(Z)
            self.absolute()
        self.out.move(0, {Z: Decimal(8)})
