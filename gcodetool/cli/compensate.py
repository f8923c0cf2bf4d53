"""The ``compensate`` verb: read, rewrite, prove, and only then let the result out."""

from __future__ import annotations

from collections.abc import Callable
from typing import Annotated

import typer

from gcodetool import __version__
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
from gcodetool.cli.stated import (
    BlockDeleteOption,
    LengthOption,
    LookAheadOption,
    OffsetOption,
    StartOption,
    settings_from,
)
from gcodetool.cli.streams import ENCODING, Draft, OutputRefused, Source, draft, open_source, standard_output
from gcodetool.cli.terminal import say, watched
from gcodetool.errors import ProofError
from gcodetool.lash.compensate import MARK, Compensator
from gcodetool.lash.running import Settings
from gcodetool.lash.tally import Tally
from gcodetool.machine import Machine
from gcodetool.program.blocks import blocks
from gcodetool.report.summaries import compensation_lines, lash_line, proof_lines


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
    live: Annotated[
        bool, typer.Option("--live", help="Send each line as soon as it can be, without the proof; for a live link.")
    ] = False,
    again: Annotated[bool, typer.Option("--again", help="Rewrite a program that gcodetool has rewritten before.")] = False,
    quiet: Annotated[bool, typer.Option("--quiet", "-q", help="Say nothing on standard error unless something is wrong.")] = False,
    name: NameOption = None,
    force: ForceOption = False,
) -> None:
    """Rewrite a program so that a controller without lash compensation cuts the intended part.

    The whole program is read, rewritten and proved before any of the result appears.  The summary goes to standard error.
    """
    sheet = machine_from(
        machine, lash=lash, datum=datum, ripple=ripple, units=units, take_up_feed=take_up_feed,
        settle_margin=settle_margin, decimals=decimals, lash_needed=True,
    )  # fmt: skip
    settings = settings_from(start, offset, length, block_delete, look_ahead)
    tell = (lambda lines: None) if quiet else (lambda lines: say("\n".join(lines)))
    if live:
        if output != "-":
            raise OutputRefused("a live program goes to standard output; leave -o out")
        with open_source(program, name, live=True) as source:
            tally = _live(source, sheet, settings, again)
        tell(compensation_lines(tally, sheet, None))
        return
    with draft(output, force=force, inputs=[program]) as result, open_source(program, name) as source:
        _whole(source, result, sheet, settings, again, tell)


def header(machine: Machine) -> str:
    """The comment that states lash, datum and version; nothing where nothing is changed."""
    if not any(axis.lash for axis in machine.axes.values()):
        return ""
    return f"{MARK} {__version__}: {lash_line(machine).replace('(mm)', 'mm')}"


def _whole(
    source: Source, result: Draft, machine: Machine, settings: Settings, again: bool, tell: Callable[[list[str]], None]
) -> None:
    from gcodetool.inspection.verify import verify

    held: list[str] = []

    def write(text: str) -> None:
        held.append(text)
        if len(held) >= 2048:
            result.write("".join(held).encode(ENCODING))
            held.clear()

    rewriting = Compensator(machine, settings, write, header(machine), again)
    tally = rewriting.rewrite(blocks(watched(source.lines(), source.size, "rewriting")))
    result.write("".join(held).encode(ENCODING))
    verdict = verify(
        lambda: blocks(watched(source.lines(), source.size, "proving")), lambda: blocks(result.lines()), machine, settings
    )
    if not verdict.holds:
        found = "\n".join(proof_lines(verdict))
        raise ProofError(f"the rewritten program fails its own proof, so it is not let out\n{found}")
    result.release()
    tell(compensation_lines(tally, machine, verdict))


def _live(source: Source, machine: Machine, settings: Settings, again: bool) -> Tally:
    say("live: lines go out unproved, as soon as they can")
    sink = standard_output()
    rewriting = Compensator(machine, settings, lambda text: sink.write(text.encode(ENCODING)), header(machine), again)
    for block in blocks(source.lines()):
        rewriting.feed_block(block)
        sink.flush()
    rewriting.finish()
    sink.flush()
    return rewriting.tally
