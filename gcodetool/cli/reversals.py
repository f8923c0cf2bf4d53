"""The ``reversals`` verb: where each axis turns round, and what that would cost."""

from __future__ import annotations

import json
from collections.abc import Callable, Iterator
from typing import Annotated

import typer

from gcodetool.cli.options import (
    LashOption,
    MachineOption,
    NameOption,
    ProgramArgument,
    RippleOption,
    UnitsOption,
    machine_from,
)
from gcodetool.cli.streams import Source, open_source, standard_output
from gcodetool.cli.tables import show, show_table
from gcodetool.cli.terminal import watched
from gcodetool.lash.cost import stop_to_stop
from gcodetool.lash.reversals import Reversal, reversals, statistics
from gcodetool.machine import Machine
from gcodetool.motion.moves import ORDER, Setup
from gcodetool.program.blocks import Block, blocks
from gcodetool.program.numbers import decimal_to_quanta
from gcodetool.report import reversal_tables as tables

SCHEMA = 1


def command(
    program: ProgramArgument = "-",
    machine: MachineOption = None,
    lash: LashOption = None,
    ripple: RippleOption = None,
    units: UnitsOption = None,
    listed: Annotated[bool, typer.Option("--list", help="Print every reversal on a line of its own.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print JSON; with --list one object a line.")] = False,
    name: NameOption = None,
) -> None:
    """Print per-axis statistics of direction reversals, or list them all."""
    sheet = machine_from(machine, lash=lash, ripple=ripple, units=units)
    setup = Setup(units=sheet.units, unplaced=ORDER)
    passed = {letter: decimal_to_quanta(axis.ripple) for letter, axis in sheet.axes.items() if axis.ripple}
    with open_source(program, name) as source:
        if listed:
            _list(reversals(_blocks(source), setup, passed), as_json)
        else:
            _statistics(source, setup, passed, sheet, as_json)


def _blocks(source: Source) -> Iterator[Block]:
    return blocks(watched(source.lines(), source.size, "reading"))


def _list(found: Iterator[Reversal], as_json: bool) -> None:
    out = standard_output()
    if not as_json:
        out.write(("\t".join(tables.LIST_COLUMNS) + "\n").encode())
    for reversal in found:
        line = json.dumps(tables.reversal_json(reversal)) if as_json else "\t".join(tables.list_row(reversal))
        out.write(f"{line}\n".encode())
    out.flush()


def _cost(machine: Machine) -> Callable[[str, float], float]:
    """Seconds of one take-up of an axis at a feed in mm/min."""

    def seconds(letter: str, feed: float) -> float:
        axis = machine.axis(letter)
        return stop_to_stop(float(axis.lash), feed / 60.0, float(axis.acceleration or 0))

    return seconds


def _statistics(source: Source, setup: Setup, ripple: dict[str, int], machine: Machine, as_json: bool) -> None:
    axes = statistics(_blocks(source), setup, ripple, cost=_cost(machine))
    if as_json:
        show(*json.dumps({"schema": SCHEMA, "units": "mm", "axes": tables.as_json(axes)}, indent=2).splitlines())
        return
    if not axes:
        show("no axis moves")
        return
    show_table(f"{source.label}: reversals per axis, mm", tables.COLUMNS, tables.rows(axes))
    show(*tables.busiest_lines(axes))
    lashed = [axis.letter for axis in machine.axes.values() if axis.lash]
    if lashed:
        needed = ", ".join(f"{axis.axis} {axis.take_ups}" for axis in axes if axis.axis in lashed)
        show(f"take-ups needed on the axes with lash: {needed or 'none'}")
        seconds = sum(axis.seconds for axis in axes)
        show(f"time they would add: about {seconds:.1f} s, each from stop to stop at the feeds and accelerations known")
