"""Options that several commands share, each defined once, and the machine that they add up to."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Annotated

import typer

from gcodetool.cli.streams import ReadFailed
from gcodetool.errors import SheetError
from gcodetool.machine import Machine, machine_from_options, read_sheet

ProgramArgument = Annotated[
    str, typer.Argument(metavar="[PROGRAM]", help="The G-code program; - or nothing for standard input.")
]
MachineOption = Annotated[
    Path | None, typer.Option("--machine", metavar="SHEET", help="Machine sheet (TOML) with the lash of each axis.")
]
LashOption = Annotated[
    list[str] | None,
    typer.Option("--lash", metavar="AXIS=B", help="Lash of an axis in mm (degrees for A B C), as x=0.12; repeatable."),
]
DatumOption = Annotated[
    list[str] | None,
    typer.Option("--datum", metavar="AXIS=SIDE", help="Side in contact when zero was set, + or - (default), as x=+."),
]
RippleOption = Annotated[
    list[str] | None,
    typer.Option("--ripple", metavar="AXIS=MM", help="Largest excursion that is no reversal, as x=0.002; repeatable."),
]
UnitsOption = Annotated[
    str | None, typer.Option("--units", metavar="mm|in", help="Units of a program that states none (G20, G21).")
]
TakeUpFeedOption = Annotated[
    str | None,
    typer.Option("--take-up-feed", metavar="F", help="Feed of take-up moves in mm/min; otherwise the program's own."),
]
SettleMarginOption = Annotated[
    str | None,
    typer.Option("--settle-margin", metavar="MM", help="Travel past the target, on top of the lash, to settle a side."),
]
DecimalsOption = Annotated[
    int | None,
    typer.Option("--decimals", metavar="N", help="Decimals of a changed word in mm, 4 to 8; inch has one more."),
]
NameOption = Annotated[
    str | None, typer.Option("--name", metavar="LABEL", help="What messages call standard input, as part.nc.")
]
OutputOption = Annotated[
    str, typer.Option("--output", "-o", metavar="FILE", help="Where the result goes; - for standard output.")
]
ForceOption = Annotated[bool, typer.Option("--force", help="Replace an existing output file.")]


def machine_from(
    sheet: Path | None = None,
    *,
    lash: Sequence[str] | None = None,
    datum: Sequence[str] | None = None,
    ripple: Sequence[str] | None = None,
    units: str | None = None,
    take_up_feed: str | None = None,
    settle_margin: str | None = None,
    decimals: int | None = None,
    lash_needed: bool = False,
) -> Machine:
    """The machine of a sheet with the options laid over it.

    With ``lash_needed`` there must be a sheet or a ``--lash``.  Raises SheetError with all faults, and ReadFailed.
    """
    if lash_needed and sheet is None and not lash:
        raise SheetError("no lash is given: name a machine sheet with --machine SHEET, or say --lash x=0.12")
    return machine_from_options(
        sheet=None if sheet is None else _read(sheet),
        lash=lash or (),
        datum=datum or (),
        ripple=ripple or (),
        units=units,
        decimals=decimals,
        take_up_feed=take_up_feed,
        settle_margin=settle_margin,
    )


def _read(sheet: Path) -> Machine:
    try:
        return read_sheet(sheet)
    except OSError as fault:
        raise ReadFailed(f"cannot read {sheet}: {fault.strerror or fault}") from fault
