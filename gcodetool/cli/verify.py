"""The ``verify`` verb: does a rewritten program cut what the original was meant to cut?"""

from __future__ import annotations

import json
from typing import Annotated, Any

import typer

from gcodetool.cli.exit_codes import ExitCode
from gcodetool.cli.options import (
    DatumOption,
    LashOption,
    MachineOption,
    NameOption,
    RippleOption,
    SettleMarginOption,
    UnitsOption,
    machine_from,
)
from gcodetool.cli.sheet_words import sheet_lines
from gcodetool.cli.stated import HoleOvershootOption, LengthOption, OffsetOption, StartOption, settings_from
from gcodetool.cli.streams import open_source
from gcodetool.cli.tables import show
from gcodetool.cli.terminal import watched
from gcodetool.program.blocks import blocks
from gcodetool.report.summaries import CAUTIONS, lash_line, proof_lines


def command(
    original: Annotated[str, typer.Argument(metavar="ORIGINAL", help="The program as meant; - for standard input.")],
    result: Annotated[str, typer.Argument(metavar="RESULT", help="The rewritten program; - for standard input.")],
    machine: MachineOption = None,
    lash: LashOption = None,
    datum: DatumOption = None,
    units: UnitsOption = None,
    ripple: RippleOption = None,
    settle_margin: SettleMarginOption = None,
    start: StartOption = None,
    offset: OffsetOption = None,
    length: LengthOption = None,
    hole_overshoot: HoleOvershootOption = None,
    tolerance: Annotated[
        float | None, typer.Option("--tolerance", metavar="MM", min=0.0, help="Largest error that is allowed; 0.0006.")
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print the result as JSON.")] = False,
    name: NameOption = None,
) -> None:
    """Drive both programs through the lash and compare the paths of the tool.

    Exit code 1 where they differ by more than is allowed.
    """
    from gcodetool.inspection.verify import verify

    sheet = machine_from(
        machine, lash=lash, datum=datum, ripple=ripple, units=units, settle_margin=settle_margin, lash_needed=True
    )
    settings = settings_from(start, offset, length, None, 0, hole_overshoot)
    with open_source(original, name) as first, open_source(result, name) as second:
        verdict = verify(
            lambda: blocks(watched(first.lines(), first.size, "proving")),
            lambda: blocks(second.lines()),
            sheet,
            settings,
            tolerance,
        )
    if as_json:
        show(*json.dumps(_plain(verdict), indent=2).splitlines())
    else:
        show(f"lash: {lash_line(sheet)}", *proof_lines(verdict), *sheet_lines(sheet, machine is not None), *CAUTIONS)
    if not verdict.holds:
        raise typer.Exit(ExitCode.FINDINGS)


def _plain(verdict: Any) -> dict[str, Any]:
    def gap(found: Any) -> dict[str, Any]:
        by_axis = dict(zip("XYZABC", found.by_axis, strict=True))
        return {
            "distance": found.distance,
            "by_axis": by_axis,
            "original_line": found.lines[0],
            "result_line": found.lines[1],
        }

    return {
        "holds": verdict.holds,
        "broken": verdict.broken,
        "tolerance": verdict.tolerance,
        "feed": gap(verdict.feed),
        "rapid_stray": gap(verdict.stray),
        "rapid_stray_allowed": verdict.stray_allowed,
        "uncompensated": gap(verdict.uncompensated),
        "corners": verdict.corners,
        "machines": verdict.runs,
    }
