"""The ``compensate`` verb: read, rewrite, prove, and only then let the result out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Annotated

import typer

from gcodetool import __version__
from gcodetool.cli.job_options import JobOption, StockOption, ToolOption, job_from
from gcodetool.cli.options import (
    DatumOption,
    DecimalsOption,
    ForceOption,
    LashOption,
    MachineOption,
    NameOption,
    OutputOption,
    ProgramArgument,
    RippleOption,
    SettleMarginOption,
    TakeUpFeedOption,
    UnitsOption,
    machine_from,
)
from gcodetool.cli.sheet_words import sheet_lines
from gcodetool.cli.stated import (
    BlockDeleteOption,
    ClearZOption,
    HoleOvershootOption,
    LengthOption,
    LookAheadOption,
    OffsetOption,
    StartOption,
    settings_from,
)
from gcodetool.cli.streams import ENCODING, Draft, OutputRefused, Source, draft, open_source, standard_output
from gcodetool.cli.terminal import say, watched
from gcodetool.errors import ProofError, SheetError
from gcodetool.inspection.job_records import Job
from gcodetool.lash.compensate import MARK, Compensator
from gcodetool.lash.reversals import statistics
from gcodetool.lash.running import Settings
from gcodetool.lash.tally import Tally
from gcodetool.machine import Machine
from gcodetool.motion.moves import ORDER, Setup
from gcodetool.program.blocks import blocks
from gcodetool.program.numbers import QUANTA_PER_MM, decimal_to_quanta
from gcodetool.report.summaries import CAUTIONS, compensation_lines, lash_line, proof_lines


def command(
    program: ProgramArgument = "-",
    output: OutputOption = "-",
    machine: MachineOption = None,
    lash: LashOption = None,
    datum: DatumOption = None,
    units: UnitsOption = None,
    start: StartOption = None,
    take_up_feed: TakeUpFeedOption = None,
    settle_margin: SettleMarginOption = None,
    ripple: RippleOption = None,
    decimals: DecimalsOption = None,
    offset: OffsetOption = None,
    length: LengthOption = None,
    block_delete: BlockDeleteOption = None,
    look_ahead: LookAheadOption = 32,
    clear_z: ClearZOption = None,
    hole_overshoot: HoleOvershootOption = None,
    stops: Annotated[
        bool, typer.Option("--stops", help="List every take-up that stops the tool inside the cut.")
    ] = False,
    label: Annotated[
        bool, typer.Option("--label", help="Write climb, conventional, slot or air as a comment where it changes.")
    ] = False,
    job: JobOption = None,
    tool: ToolOption = None,
    stock: StockOption = None,
    live: Annotated[
        bool, typer.Option("--live", help="Send each line as soon as it can be, without the proof; for a live link.")
    ] = False,
    again: Annotated[
        bool, typer.Option("--again", help="Rewrite a program that gcodetool has rewritten before.")
    ] = False,
    quiet: Annotated[
        bool, typer.Option("--quiet", "-q", help="Say nothing on standard error unless something is wrong.")
    ] = False,
    name: NameOption = None,
    force: ForceOption = False,
) -> None:
    """Rewrite a program so that a controller without lash compensation cuts the intended part.

    The whole program is read, rewritten and proved before any of the result appears.  The summary goes to standard
    error.
    """
    sheet = machine_from(
        machine, lash=lash, datum=datum, ripple=ripple, units=units, take_up_feed=take_up_feed,
        settle_margin=settle_margin, decimals=decimals, lash_needed=True,
    )  # fmt: skip
    settings = settings_from(start, offset, length, block_delete, look_ahead, hole_overshoot, clear_z)
    _check_overshoot(settings, sheet)
    tell = _hush if quiet else _say_lines
    sheet_words = sheet_lines(sheet, machine is not None)
    if live:
        if label:
            raise SheetError("--label needs the whole program, so it cannot go with --live")
        if output != "-":
            raise OutputRefused("a live program goes to standard output; leave -o out")
        with open_source(program, name, live=True) as source:
            tell(["live: lines go out unproved, as soon as they can"])
            tally = _live(source, sheet, settings, again)
        tell(compensation_lines(tally, sheet, None, sheet_words))
        return
    with draft(output, force=force, inputs=[program]) as result, open_source(program, name) as source:
        labels = _labels(source, sheet, settings, job_from(job, tools=tool, stock=stock)) if label else None
        _whole(source, result, sheet, settings, again, stops, labels, sheet_words, tell)


def _say_lines(lines: list[str]) -> None:
    say("\n".join(lines))


def _hush(_: list[str]) -> None:
    """Say nothing."""


def _check_overshoot(settings: Settings, machine: Machine) -> None:
    for letter in "XY":
        lash = machine.axis(letter).lash
        if settings.hole_overshoot and decimal_to_quanta(lash) > settings.hole_overshoot:
            raise SheetError(f"--hole-overshoot is less than the lash of {letter}, {lash} mm; it must be more")


def header(machine: Machine) -> str:
    """The comment that states lash, datum and version; nothing where nothing is changed."""
    if not any(axis.lash for axis in machine.axes.values()):
        return ""
    return f"{MARK} {__version__}: {lash_line(machine).replace('(mm)', 'mm')}"


def _labels(source: Source, machine: Machine, settings: Settings, job: Job) -> dict[int, str]:
    """The label of every line with feed motion, from the material that is really left."""
    from gcodetool.inspection.audit import labels_by_line

    setup = Setup(
        units=machine.units,
        offsets=settings.offsets,
        lengths=settings.lengths,
        skip_deletable=bool(settings.block_delete),
        unplaced=ORDER,
    )
    return labels_by_line(b"".join(source.lines()), job, setup)


def _whole(
    source: Source,
    result: Draft,
    machine: Machine,
    settings: Settings,
    again: bool,
    stops: bool,
    labels: Mapping[int, str] | None,
    sheet_words: list[str],
    tell: Callable[[list[str]], None],
) -> None:
    from gcodetool.inspection.verify import verify

    held: list[str] = []

    def write(text: str) -> None:
        held.append(text)
        if len(held) >= 2048:
            result.write("".join(held).encode(ENCODING))
            held.clear()

    rewriting = Compensator(machine, settings, write, header(machine), again)
    rewriting.tally.keep_stops = stops
    tally = rewriting.rewrite(blocks(watched(source.lines(), source.size, "rewriting")), labels)
    result.write("".join(held).encode(ENCODING))
    verdict = verify(
        lambda: blocks(watched(source.lines(), source.size, "proving")),
        lambda: blocks(result.lines()),
        machine,
        settings,
    )
    if not verdict.holds:
        found = "\n".join(proof_lines(verdict))
        raise ProofError(f"the rewritten program fails its own proof, so it is not let out\n{found}")
    lines = compensation_lines(tally, machine, verdict, sheet_words)
    if settings.hole_overshoot:
        lines[-len(CAUTIONS) : -len(CAUTIONS)] = [_prove_holes(source, result, machine, settings)]
    if any(axis.ripple for axis in machine.axes.values()):
        lines[-len(CAUTIONS) : -len(CAUTIONS)] = [_passed_over(source, machine)]
    result.release()
    tell(lines)


def _prove_holes(source: Source, result: Draft, machine: Machine, settings: Settings) -> str:
    """Show that the place of every hole holds for any lash up to the overshoot; raises ProofError where it does not."""
    from gcodetool.inspection.hole_places import worst_hole
    from gcodetool.inspection.verify import TOLERANCE_MM

    found = worst_hole(lambda: blocks(source.lines()), lambda: blocks(result.lines()), machine, settings)
    reach = settings.hole_overshoot / QUANTA_PER_MM
    if found.distance > TOLERANCE_MM:
        line = f"line {found.lines[0]} is off by {found.distance:.4f} mm for a lash between 0 and {reach:g} mm"
        raise ProofError(f"the hole at {line}, so the result is not let out")
    return (
        f"holes: {found.count} places, off by at most {found.distance:.4f} mm for any true lash from 0 to {reach:g} mm"
    )


def _passed_over(source: Source, machine: Machine) -> str:
    ripple = {letter: decimal_to_quanta(axis.ripple) for letter, axis in machine.axes.items() if axis.ripple}
    setup = Setup(units=machine.units, unplaced=ORDER)
    saved = {a.axis: a.suppressed for a in statistics(blocks(source.lines()), setup, ripple) if a.axis in ripple}
    counts = ", ".join(f"{letter} {count}" for letter, count in saved.items())
    return f"ripple: take-ups saved: {counts}; where it passed over one, the errors above leave out what it allows"


def _live(source: Source, machine: Machine, settings: Settings, again: bool) -> Tally:
    sink = standard_output()
    rewriting = Compensator(machine, settings, lambda text: sink.write(text.encode(ENCODING)), header(machine), again)
    for block in blocks(source.lines()):
        rewriting.feed_block(block)
        sink.flush()
    rewriting.finish()
    sink.flush()
    return rewriting.tally
