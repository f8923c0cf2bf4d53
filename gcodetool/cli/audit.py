"""The ``audit`` verb: what a program will do on this machine, before metal is cut."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Annotated

import typer

from gcodetool.cli.exit_codes import ExitCode
from gcodetool.cli.job_options import (
    BottomOption,
    FeedOption,
    JobOption,
    KeepOutOption,
    MaterialOption,
    SpeedOption,
    StockOption,
    ToolOption,
    TopOption,
    job_from,
)
from gcodetool.cli.options import (
    DatumOption,
    LashOption,
    MachineOption,
    NameOption,
    ProgramArgument,
    SettleMarginOption,
    UnitsOption,
    machine_from,
)
from gcodetool.cli.stated import BlockDeleteOption, LengthOption, OffsetOption, settings_from
from gcodetool.cli.streams import open_source, standard_output
from gcodetool.cli.tables import show, show_table
from gcodetool.cli.terminal import watched
from gcodetool.errors import SheetError
from gcodetool.motion.moves import ORDER, Setup
from gcodetool.report import audit_tables as tables

if TYPE_CHECKING:
    from gcodetool.inspection.audit_records import Audit

SEVERITIES = ("note", "caution", "danger")


def command(
    program: ProgramArgument = "-",
    machine: MachineOption = None,
    lash: LashOption = None,
    datum: DatumOption = None,
    settle_margin: SettleMarginOption = None,
    job: JobOption = None,
    tool: ToolOption = None,
    stock: StockOption = None,
    stock_top: TopOption = None,
    stock_bottom: BottomOption = None,
    keep_out: KeepOutOption = None,
    material: MaterialOption = None,
    speed: SpeedOption = None,
    feed: FeedOption = None,
    tolerance: Annotated[
        float | None, typer.Option("--tolerance", metavar="MM", help="Size error that is worth a finding; 0.05.")
    ] = None,
    units: UnitsOption = None,
    offset: OffsetOption = None,
    length: LengthOption = None,
    block_delete: BlockDeleteOption = None,
    stop_at: Annotated[
        str,
        typer.Option("--stop-at", metavar="SEVERITY", help="Exit code 1 from here on: note, caution, danger."),
    ] = "danger",
    sizes: Annotated[int, typer.Option("--sizes", metavar="N", min=0, help="Features shown, worst first.")] = 20,
    listed: Annotated[bool, typer.Option("--list", help="Print every feed motion on a line of its own.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON object.")] = False,
    materials: Annotated[
        bool, typer.Option("--materials", help="Print the known materials, to edit.")
    ] = False,
    name: NameOption = None,
) -> None:
    """Tell where the cutter cuts climb or conventional, what the part will measure, and what could go wrong.

    Exit code 1 when a finding reaches the severity of --stop-at.  Forces and sizes are estimates.
    """
    if materials:
        _show_materials()
        return
    if stop_at not in SEVERITIES:
        raise SheetError(f"--stop-at {stop_at}: write one of {', '.join(SEVERITIES)}")
    sheet = machine_from(machine, lash=lash, datum=datum, units=units, settle_margin=settle_margin)
    work = job_from(
        job, tools=tool, stock=stock, top=stock_top, bottom=stock_bottom, keep_outs=keep_out, material=material,
        speed=speed, feed=feed, tolerance=tolerance,
    )  # fmt: skip
    stated = settings_from(None, offset, length, block_delete, 0)
    setup = Setup(
        units=sheet.units, offsets=stated.offsets, lengths=stated.lengths, unplaced=ORDER,
        skip_deletable=bool(stated.block_delete),
    )  # fmt: skip
    with open_source(program, name) as source:
        text, label = b"".join(watched(source.lines(), source.size, "reading")), source.label
    from gcodetool.inspection.audit import audit

    found = audit(text, work, sheet, setup, name=label, every_move=listed)
    if as_json:
        show(*json.dumps(tables.as_json(found), indent=2).split("\n"))
    elif listed:
        _list(found)
    else:
        _show(found, sizes, work.tolerance)
    if any(each.severity.rank >= SEVERITIES.index(stop_at) for each in found.findings):
        raise typer.Exit(ExitCode.FINDINGS)


def _show_materials() -> None:
    from gcodetool.inspection.materials import DEFAULTS, as_sheet

    show("# Estimates to begin with: copy one table into the job sheet and put in what you measured.")
    for each in DEFAULTS.values():
        show("", *as_sheet(each).split("\n"))


def _list(found: Audit) -> None:
    out = standard_output()
    remarks = (*tables.basis_lines(found), *found.cautions)
    lines = [*(f"# {line}" for line in remarks), "\t".join(tables.MOVE_COLUMNS)]
    out.writelines(f"{line}\n".encode() for line in lines)
    out.writelines(("\t".join(tables.move_row(row)) + "\n").encode() for row in found.rows)
    out.flush()


def _show(found: Audit, sizes: int, tolerance: float) -> None:
    show(f"{found.program}: {found.feed_moves} feed motions audited", "")
    if found.findings:
        show_table("Findings", tables.FINDING_COLUMNS, tables.finding_rows(found.findings))
        show("")
    if found.shares:
        show_table("How the cutter cuts", tables.SHARE_COLUMNS, tables.share_rows(found))
        show(*tables.flip_lines(found), "")
    if found.axes:
        show_table("The axes against the cut (mean force, estimate)", tables.AXIS_COLUMNS, tables.axis_rows(found))
        show("")
    if found.features and sizes:
        chosen = found.features[:sizes]
        title = (
            f"What the part will measure, mm, estimate; {len(chosen)} of {len(found.features)} shapes, worst first"
        )
        show_table(title, tables.SIZE_COLUMNS, tables.size_rows(chosen, 0.2 * tolerance))
        show("")
    if found.envelope:
        title = "Commanded positions, mm, take-ups and settles included"
        show_table(title, tables.ENVELOPE_COLUMNS, tables.envelope_rows(found))
        show("")
    show("Time, estimate", *(f"  {line}" for line in tables.time_lines(found)), "")
    show("What this rests on", *(f"  {line}" for line in tables.basis_lines(found)), "")
    show("Before you cut", *(f"  {line}" for line in found.cautions))
