"""Properties over random programs in the whole language; what the rewriter cannot know is drawn at random too.

A few dozen seeds by default, some hundreds with ``--long``.  The oracle shares nothing with the package.
"""

from __future__ import annotations

import io
import random
import re
from collections.abc import Callable
from decimal import Decimal
from typing import TypeVar

import pytest

from gcodetool.cli.streams import iter_lines
from gcodetool.errors import Refusal
from gcodetool.inspection.verify import verify
from gcodetool.lash.compensate import Compensator
from gcodetool.lash.running import Settings
from gcodetool.lash.tally import Tally
from gcodetool.machine import Axis, Machine
from gcodetool.program.blocks import blocks, blocks_of
from gcodetool.program.words import NotWords, join, split
from tests.lash.rewriting import assert_right, judged, rewrite, sheet
from tests.oracle.compare import Report
from tests.oracle.controller import run
from tests.oracle.equivalents import equivalents
from tests.oracle.machine import Machine as Simulated
from tests.oracle.machine import Motion
from tests.oracle.machines import worst_of
from tests.oracle.programs import random_program
from tests.oracle.reader import ControllerError

DEFAULT, LONG = 20, 300
LANGUAGES = ("basic", "full")
STATED_REASONS = (
    "unknown position",
    "unknown side",
    "hangs on a deletable block",
    "not known how far",
    "from an unknown",
)
"""Why a random program may be refused: what it does starts from a side or a place that nobody can know."""


Test = TypeVar("Test", bound=Callable[..., None])


def seeds(default: int = DEFAULT, long: int = LONG) -> Callable[[Test], Test]:
    """Run a test on so many programs of each language; ``long`` of them with ``--long``."""

    def mark(test: Test) -> Test:
        test.seed_counts = default, long  # type: ignore[attr-defined]
        return test

    return mark


def pytest_generate_tests(metafunc: pytest.Metafunc) -> None:
    """One test for each language and seed."""
    counts = getattr(metafunc.function, "seed_counts", None)
    if counts:
        count = counts[bool(metafunc.config.getoption("--long"))]
        values = [(language, seed) for language in LANGUAGES for seed in range(count)]
        metafunc.parametrize(("language", "seed"), values, ids=[f"{language}-{seed}" for language, seed in values])


class Draw:
    """A random program and a random machine for it."""

    def __init__(self, language: str, seed: int) -> None:
        rng = random.Random(f"{language} {seed}")
        self.program = random_program(rng, language)
        axes = "XYZA" if language == "full" else "XYZ"
        self.lash = {axis: rng.choice(["0", "0.05", "0.12", "0.0873", "0.3"]) for axis in axes}
        self.datum = {axis: rng.choice("+-") for axis in axes}
        self.take_up_feed = rng.choice([None, Decimal(250)])

    def machine(self, flip: bool = False) -> Machine:
        """The machine of the draw, or the same one with every datum on the other side."""
        axes = {a: Axis(a, Decimal(b), 1 if (self.datum[a] == "+") != flip else -1) for a, b in self.lash.items()}
        return Machine(axes=axes, take_up_feed=self.take_up_feed)

    def datums(self, flip: bool = False) -> dict[str, str]:
        """Datum side by axis."""
        return {a: "+" if (side == "+") != flip else "-" for a, side in self.datum.items()}

    def rewritten(self, flip: bool = False, **settings: int) -> tuple[bytes, Tally] | None:
        """The result and its tally; None where the program is refused for a stated reason."""
        out: list[str] = []
        stream = Compensator(self.machine(flip), Settings(**settings), out.append)  # type: ignore[arg-type]
        try:
            tally = stream.rewrite(blocks_of(self.program))
        except Refusal as refusal:
            assert any(reason in refusal.reason for reason in STATED_REASONS), refusal
            assert refusal.way_out and 1 <= refusal.line <= self.program.count(b"\n") + self.program.count(b"\r") + 1
            return None
        return "".join(out).encode("latin-1"), tally

    def report(self, result: bytes, flip: bool = False, machines: int = 2) -> Report:
        """The oracle's verdict on random machines, start states and both positions of the block delete switch."""
        lash = {axis: float(value) for axis, value in self.lash.items()}
        return worst_of(self.program, result, lash, datum=self.datums(flip), seeds=range(machines))

    def shown(self, result: bytes) -> str:
        """Everything needed to see a failure again."""
        texts = (self.program.decode("latin-1"), result.decode("latin-1"))
        return f"lash {self.lash} datum {self.datum}\n{texts[0]}\n---- became\n{texts[1]}"


# ---- text ------------------------------------------------------------------------------------------------------------


@seeds()
def test_zero_lash_gives_the_same_bytes(language: str, seed: int) -> None:
    program = Draw(language, seed).program
    out: list[str] = []
    Compensator(Machine(), Settings(), out.append).rewrite(blocks_of(program))
    assert "".join(out).encode("latin-1") == program


@seeds()
def test_joining_the_words_of_a_line_gives_the_line(language: str, seed: int) -> None:
    for block in blocks_of(Draw(language, seed).program):
        try:
            assert join(split(block.text)) == block.text
        except NotWords:
            assert block.text.lower().startswith("text after the end")


# ---- the promise -----------------------------------------------------------------------------------------------------


@seeds()
def test_the_compensated_path_is_the_intended_one(language: str, seed: int) -> None:
    """From random starts, offsets, lengths, homes, probe places and lash states that the rewriter does not know."""
    draw = Draw(language, seed)
    done = draw.rewritten()
    if done is None:
        return
    report = draw.report(done[0])
    assert report.ok(), f"{report}\n{draw.shown(done[0])}"


@seeds(14, 200)
def test_the_proof_agrees_with_the_oracle(language: str, seed: int) -> None:
    draw = Draw(language, seed)
    done = draw.rewritten()
    if done is None:
        return
    verdict = verify(lambda: blocks_of(draw.program), lambda: blocks_of(done[0]), draw.machine())
    assert verdict.holds is draw.report(done[0], machines=1).ok(), f"{verdict}\n{draw.shown(done[0])}"


@seeds(6, 200)
def test_the_proof_sees_what_the_oracle_sees_in_a_spoilt_result(language: str, seed: int) -> None:
    """A line is left out or a number nudged; the proof judges paths, so ends of rapids and feeds are left aside."""
    draw = Draw(language, seed)
    done = draw.rewritten()
    if done is None:
        return
    spoilt = _spoilt(done[0], random.Random(seed))
    try:
        report = draw.report(spoilt)
    except ControllerError:
        return
    try:
        holds = verify(lambda: blocks_of(draw.program), lambda: blocks_of(spoilt), draw.machine()).holds
    except Refusal:
        holds = False
    shown = f"{report}\n{draw.shown(spoilt)}"
    if report.ok():
        assert holds, shown
    if max(report.feed.value, report.dip.value) > 0.002:
        assert not holds, shown


def _spoilt(result: bytes, rng: random.Random) -> bytes:
    """One line less, or one number of a target 0.02 more or less."""
    lines = [block.text + block.ending for block in blocks_of(result)]
    number = re.compile(r"([xyzXYZ]) *(-?\d+\.\d{4,})")
    changed = [k for k, line in enumerate(lines) if number.search(line)]
    if rng.random() < 0.3 or not changed:
        del lines[rng.randrange(len(lines))]
    else:
        k = rng.choice(changed)
        step = rng.choice([-1, 1]) * Decimal("0.02")
        lines[k] = number.sub(lambda found: f"{found[1]}{Decimal(found[2]) + step}", lines[k], count=1)
    return "".join(lines).encode("latin-1")


@seeds(8, 100)
def test_datum_plus_and_minus_give_the_same_part(language: str, seed: int) -> None:
    draw = Draw(language, seed)
    for flip in (False, True):
        done = draw.rewritten(flip)
        if done is not None:
            assert draw.report(done[0], flip, machines=1).ok(), draw.shown(done[0])


@seeds(8, 100)
def test_a_live_stream_is_right_whatever_it_holds_back(language: str, seed: int) -> None:
    draw = Draw(language, seed)
    for look_ahead in (0, 1, 5, 1000):
        done = draw.rewritten(look_ahead=look_ahead)
        if done is not None:
            assert draw.report(done[0], machines=1).ok(), f"look-ahead {look_ahead}\n{draw.shown(done[0])}"


@seeds()
def test_no_more_lines_than_take_ups_settles_and_splits(language: str, seed: int) -> None:
    """Arcs stay arcs: nothing is cut into chords."""
    draw = Draw(language, seed)
    done = draw.rewritten()
    if done is None:
        return
    result, tally = done
    added = len(list(blocks_of(result))) - len(list(blocks_of(draw.program)))
    assert added <= tally.blocks_in_cut + tally.blocks_in_air + tally.settles + tally.splits
    assert added >= 0


@seeds()
def test_a_rewritten_program_asks_for_no_more_arcs_and_no_full_circle_of_its_own(language: str, seed: int) -> None:
    draw = Draw(language, seed)
    done = draw.rewritten()
    if done is None:
        return

    def arcs(program: bytes) -> list[Motion]:
        return [item for item in run(program, Simulated()) if isinstance(item, Motion) and item.arc]

    def closed(motion: Motion) -> bool:
        assert motion.arc is not None
        return all(abs(motion.start[k] - motion.end[k]) < 1e-7 for k in motion.arc.axes)

    wanted, found = arcs(draw.program), arcs(done[0])
    assert len(found) <= len(wanted) + done[1].splits
    assert sum(map(closed, found)) <= sum(map(closed, wanted))


def noisy(rng: random.Random) -> bytes:
    """A cut in X and Y with noise of a few micrometres on a coarse path, as a scanned or relaxed toolpath has it."""
    lines = ["G21 G90", "G0 X0 Y0 Z5", "G1 Z-1 F100"]
    x = y = 0.0
    for _ in range(60):
        x += rng.choice([0.0, rng.uniform(-0.006, 0.006), rng.uniform(-8, 8)])
        y += rng.choice([0.0, rng.uniform(-0.006, 0.006), rng.uniform(-8, 8)])
        lines.append(f"X{x:.4f} Y{y:.4f}")
    return "\n".join(lines).encode()


@pytest.mark.parametrize("seed", range(8))
def test_with_a_ripple_the_tool_errs_by_no_more_than_that(seed: int) -> None:
    """Smaller excursions are passed without a take-up: fewer of them, and an error of the ripple per axis at most."""
    program = noisy(random.Random(seed))
    lash, ripple = {"x": "0.1", "y": "0.07"}, {"x": "0.01", "y": "0.01"}
    result, tally = rewrite(program, sheet(lash, ripple=ripple))
    exact, every = rewrite(program, sheet(lash))
    assert sum(tally.take_ups.values()) < sum(every.take_ups.values())
    assert_right(program, exact, lash, seeds=range(1))
    report = judged(program, result, lash, seeds=range(2), tolerance=0.0006 + 0.01 * 2**0.5)
    assert report.feed.value <= 0.0006 + 0.01 * 2**0.5, report


@pytest.mark.parametrize("seed", range(8))
def test_with_a_ripple_the_proof_allows_it_and_no_more(seed: int) -> None:
    program = noisy(random.Random(seed))
    lash, ripple = {"x": "0.1", "y": "0.07"}, {"x": "0.01", "y": "0.01"}
    machine = sheet(lash, ripple=ripple)
    result, _ = rewrite(program, machine)
    assert verify(lambda: blocks_of(program), lambda: blocks_of(result), machine).holds
    assert not verify(lambda: blocks_of(program), lambda: blocks_of(result), sheet(lash)).holds


# ---- spellings -------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("seed", range(8))
def test_spellings_of_one_part_give_one_path(seed: int) -> None:
    """mm and inch, G90 and G91: each result is right, and right for the original in the other spellings too."""
    rng = random.Random(seed)
    programs = equivalents(rng, operations=3)
    lash = {axis: rng.choice(["0.05", "0.127", "0.254"]) for axis in "xyz"}
    machine = Machine(axes={a.upper(): Axis(a.upper(), Decimal(b)) for a, b in lash.items()})
    first = programs["mm-absolute"]
    for name, program in programs.items():
        out: list[str] = []
        Compensator(machine, Settings(), out.append).rewrite(blocks_of(program))
        result = "".join(out).encode("latin-1")
        assert_right(first, result, lash, seeds=range(1))
        assert len(list(blocks_of(result))) > len(list(blocks_of(program))), name


# ---- the stream ------------------------------------------------------------------------------------------------------


class Trickle(io.RawIOBase):
    """A pipe that hands out a few bytes at a time."""

    def __init__(self, data: bytes, most: int) -> None:
        super().__init__()
        self.data, self.most, self.place = data, most, 0

    def readable(self) -> bool:
        return True

    def read1(self, _size: int = -1) -> bytes:
        chunk = self.data[self.place : self.place + self.most]
        self.place += len(chunk)
        return chunk


@pytest.mark.parametrize("most", [1, 2, 3, 7, 64, 4096])
@seeds(6, 40)
def test_where_a_pipe_is_cut_does_not_matter(language: str, seed: int, most: int) -> None:
    draw = Draw(language, seed)
    found = list(blocks(iter_lines(Trickle(draw.program, most))))  # type: ignore[arg-type]
    assert found == list(blocks_of(draw.program))


@seeds()
def test_the_short_way_does_what_the_long_one_does(language: str, seed: int, monkeypatch: pytest.MonkeyPatch) -> None:
    """Common blocks take a quicker path through the rewriter; it must not show in the result."""
    draw = Draw(language, seed)
    quick = draw.rewritten()
    monkeypatch.setattr(Compensator, "_is_open", lambda self: False)
    slow = draw.rewritten()
    assert (quick and quick[0]) == (slow and slow[0])


@seeds()
def test_block_by_block_is_the_same_as_all_at_once(language: str, seed: int) -> None:
    draw = Draw(language, seed)
    whole = draw.rewritten()
    if whole is None:
        return
    out: list[str] = []
    stream = Compensator(draw.machine(), Settings(), out.append)
    for block in blocks_of(draw.program):
        stream.feed_block(block)
    stream.finish()
    assert "".join(out).encode("latin-1") == whole[0]


def test_most_random_programs_are_rewritten() -> None:
    """The properties above are about something: few of the programs are refused."""
    draws = [Draw(language, seed) for language in LANGUAGES for seed in range(DEFAULT)]
    results = [draw.rewritten() for draw in draws]
    done = [result for result in results if result is not None]
    assert len(done) > 0.75 * len(draws)
    changed = sum(result[0] != draw.program for draw, result in zip(draws, results, strict=True) if result)
    assert changed > 0.9 * len(done)
    assert sum(result[1].splits for result in done) > 50 and sum(result[1].settles for result in done) > 50


@seeds(6, 60)
def test_rewriting_is_the_same_every_time(language: str, seed: int) -> None:
    """Caches of shapes and modal steps carry nothing from one program to the next."""
    draw = Draw(language, seed)
    first = draw.rewritten()
    Draw(language, seed + 1).rewritten()
    again = draw.rewritten()
    assert (first and first[0]) == (again and again[0])
