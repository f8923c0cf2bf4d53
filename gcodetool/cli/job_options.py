"""Options that describe a job (stock, tools, clamps, material), each defined once, and the job that they add up to."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Annotated

import typer

from gcodetool.cli.streams import ReadFailed
from gcodetool.errors import SheetError
from gcodetool.inspection.job_records import Job
from gcodetool.inspection.job_sheet import job_from_options, parse_job

JobOption = Annotated[
    Path | None, typer.Option("--job", metavar="SHEET", help="Job sheet (TOML): stock, tools, clamps, material.")
]
ToolOption = Annotated[
    list[str] | None,
    typer.Option(
        "--tool",
        metavar="N=D",
        help="A tool's number and diameter in mm, as 1=3.175 or 2=6,ball,flutes=1 or any=3; repeatable.",
    ),
]
StockOption = Annotated[
    str | None,
    typer.Option("--stock", metavar="OUTLINE", help="box:x0,y0,x1,y1, disc:x,y,diameter or polygon:x,y,x,y,.. in mm."),
]
TopOption = Annotated[float | None, typer.Option("--stock-top", metavar="Z", help="Top of the stock, mm.")]
BottomOption = Annotated[float | None, typer.Option("--stock-bottom", metavar="Z", help="Bottom of the stock, mm.")]
KeepOutOption = Annotated[
    list[str] | None,
    typer.Option("--keep-out", metavar="OUTLINE@Z", help="A clamp and its height, as box:0,0,20,10@12; repeatable."),
]
MaterialOption = Annotated[
    str | None, typer.Option("--material", metavar="NAME", help="Work material, for forces and chips, as brass.")
]
SpeedOption = Annotated[
    float | None, typer.Option("--speed", metavar="RPM", help="Spindle speed where the program states no S.")
]
FeedOption = Annotated[float | None, typer.Option("--feed", metavar="F", help="Feed in mm/min where none is stated.")]


def job_from(
    sheet: Path | None,
    *,
    tools: Sequence[str] | None = None,
    stock: str | None = None,
    top: float | None = None,
    bottom: float | None = None,
    keep_outs: Sequence[str] | None = None,
    material: str | None = None,
    **numbers: float | None,
) -> Job:
    """The job of a sheet with the options laid over it.  Raises SheetError with all faults, and ReadFailed."""
    return job_from_options(
        None if sheet is None else _read(sheet), tools=tools or (), stock=stock, top=top, bottom=bottom,
        keep_outs=keep_outs or (), material=material, **numbers,
    )  # fmt: skip


def _read(sheet: Path) -> Job:
    try:
        return parse_job(sheet.read_bytes().decode("utf-8-sig"), str(sheet))
    except UnicodeDecodeError:
        raise SheetError(f"{sheet}: is not UTF-8 text; save it as UTF-8.") from None
    except OSError as fault:
        raise ReadFailed(f"cannot read {sheet}: {fault.strerror or fault}") from fault
