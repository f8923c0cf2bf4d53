"""The ``machine`` verb: start a machine sheet, or say in words what is wrong with one."""

from __future__ import annotations

from decimal import Decimal
from typing import Annotated

import typer

from gcodetool.cli.exit_codes import ExitCode
from gcodetool.cli.options import ForceOption, OutputOption
from gcodetool.cli.streams import draft, open_source
from gcodetool.cli.tables import show, show_table
from gcodetool.errors import SheetError
from gcodetool.machine import Axis, Machine, check_sheet, decode_sheet, parse_sheet, sheet_template

app = typer.Typer(no_args_is_help=True, rich_markup_mode=None, help="Start a machine sheet, or check one.")


@app.command("new")
def new(output: OutputOption = "-", force: ForceOption = False) -> None:
    """Write a commented machine sheet to start from."""
    with draft(output, force=force) as sheet:
        sheet.write(sheet_template().encode())
        sheet.release()


@app.command("check")
def check(
    sheet: Annotated[str, typer.Argument(metavar="SHEET", help="The machine sheet; - for standard input.")],
) -> None:
    """Say in words what is wrong with a machine sheet, or show what it holds.

    Exit code 1 where there is anything wrong.
    """
    with open_source(sheet) as source:
        data, label = source.binary.read(), source.label
    try:
        text = decode_sheet(data)
        faults = check_sheet(text)
    except SheetError as fault:
        faults = [str(fault)]
    if faults:
        show(*(f"{label}: {fault}" for fault in faults))
        raise typer.Exit(ExitCode.FINDINGS)
    _show_machine(label, parse_sheet(text))


def _show_machine(label: str, machine: Machine) -> None:
    columns = ("axis", "lash", "datum", "ripple", "travel", "max feed")
    show_table(f"{machine.name or label}: the sheet is good.", columns, [_row(axis) for axis in machine.axes.values()])
    feed = "the program's own" if machine.take_up_feed is None else f"{machine.take_up_feed} mm/min"
    show(
        f"units of programs that state none: {machine.units or 'not said, such programs are refused'}",
        f"decimals of a changed word: {machine.decimals} (inch {machine.decimals + 1})",
        f"take-up feed: {feed}",
        f"settle margin: {machine.settle_margin} mm on top of the lash",
    )
    if not any(axis.lash for axis in machine.axes.values()):
        show("note: no axis has lash, so nothing would be changed.")


def _row(axis: Axis) -> tuple[str, ...]:
    unit = "deg" if axis.rotary else "mm"
    travel = "-" if axis.travel is None else f"{axis.travel[0]} to {axis.travel[1]} {unit}"
    return (
        axis.letter,
        f"{axis.lash} {unit}",
        "+" if axis.datum > 0 else "-",
        _or_dash(axis.ripple, unit),
        travel,
        _or_dash(axis.max_feed, f"{unit}/min"),
    )


def _or_dash(value: Decimal | None, unit: str) -> str:
    return "-" if value is None else f"{value} {unit}"
