"""Rewrite a program as the command does, and have the result judged by the oracle; for tests in several folders.

Lash, datum and the other options are written as on the command line: ``{"x": "0.1"}`` stands for ``--lash x=0.1``.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from typing import Any

import numpy as np

from gcodetool.cli.stated import settings_from
from gcodetool.lash.compensate import MARK, Compensator
from gcodetool.lash.running import Settings
from gcodetool.lash.tally import Tally
from gcodetool.machine import Machine, machine_from_options
from gcodetool.motion.frames import OFFSET_WORDS
from gcodetool.program.blocks import blocks_of
from tests.oracle.compare import TOLERANCE, Report, deviation
from tests.oracle.machine import AXES
from tests.oracle.machine import Machine as Simulated
from tests.oracle.machines import random_machine, random_sides, worst_of

Text = str | bytes
STATED = ("start", "offset", "length", "block_delete", "look_ahead")


def as_bytes(program: Text) -> bytes:
    """A program as bytes."""
    return program.encode("latin-1") if isinstance(program, str) else program


def sheet(
    lash: Mapping[str, str], datum: Mapping[str, str] | None = None, units: str | None = "mm", **options: Any
) -> Machine:
    """The machine of these options; ``ripple`` is a mapping too."""
    ripple = options.pop("ripple", None) or {}
    return machine_from_options(
        lash=[f"{axis}={value}" for axis, value in lash.items()],
        datum=[f"{axis}={side}" for axis, side in (datum or {}).items()],
        ripple=[f"{axis}={value}" for axis, value in ripple.items()],
        units=units,
        **options,
    )


def stated(**options: Any) -> Settings:
    """What the operator states: ``start``, ``offset``, ``length`` (texts), ``block_delete``, ``look_ahead``."""
    values = {name: options.get(name) for name in STATED}
    values["look_ahead"] = 32 if values["look_ahead"] is None else values["look_ahead"]
    return settings_from(**values)  # type: ignore[arg-type]


def rewrite(
    program: Text, machine: Machine, settings: Settings | None = None, header: str = "", again: bool = False
) -> tuple[bytes, Tally]:
    """The rewritten program and what the rewriting did."""
    out: list[str] = []
    tally = Compensator(machine, settings or Settings(), out.append, header, again).rewrite(
        blocks_of(as_bytes(program))
    )
    return "".join(out).encode("latin-1"), tally


def compensate(program: Text, lash: Mapping[str, str], **options: Any) -> str:
    """The rewritten program as text; options as those of ``sheet`` and ``stated``."""
    settings = stated(**{name: options.pop(name) for name in STATED if name in options})
    return rewrite(program, sheet(lash, **options), settings)[0].decode("latin-1")


def judged(
    original: Text,
    result: Text,
    lash: Mapping[str, str],
    *,
    datum: Mapping[str, str] | None = None,
    units: str = "mm",
    start: Sequence[str] = (),
    offset: Sequence[str] = (),
    length: Sequence[str] = (),
    seeds: range = range(4),
    **options: Any,
) -> Report:
    """The oracle's worst report on a result.

    ``start``, ``offset`` and ``length`` hold what was stated, such as ``x=0-``; a start is meant in G54.
    """
    sizes = {axis: float(value) for axis, value in lash.items()}
    one, two = as_bytes(original), as_bytes(result)
    if not (start or offset or length):
        return worst_of(one, two, sizes, datum=datum, inch=units == "in", seeds=seeds, **options)
    report = Report()
    for seed in seeds:
        rng = np.random.default_rng(seed)
        simulated, sides, known = _simulated(rng, units, start, offset, length)
        found = deviation(one, two, sizes, simulated, datum=datum, sides=sides, known=known, disturb=seed, **options)
        report = report.merge(found)
    return report


def _simulated(
    rng: np.random.Generator, units: str, start: Sequence[str], offset: Sequence[str], length: Sequence[str]
) -> tuple[Simulated, list[float], str]:
    """A random machine that keeps to what was stated, its start sides, and the axes whose side was stated."""
    machine = random_machine(rng, inch=units == "in")
    work = [list(system) for system in machine.work]
    for text in offset:
        word, axis, value = re.fullmatch(r"(G[\d.]+):(\w)=(.+)", text, re.IGNORECASE).groups()  # type: ignore[union-attr]
        work[OFFSET_WORDS.index(word.upper())][AXES.index(axis.upper())] = float(value)
    lengths = machine.lengths | {int(h): float(value) for h, _, value in (text.partition("=") for text in length)}
    place, sides, known = list(machine.start), list(random_sides(rng)), ""
    for text in start:
        axis, position, side = re.fullmatch(r"(\w)=([-+]?[\d.]*)([-+]?)", text).groups()  # type: ignore[union-attr]
        k = AXES.index(axis.upper())
        place[k] = work[0][k] + float(position) if position else place[k]
        if side:
            sides[k], known = float(side == "+"), known + AXES[k]
    return replace(machine, start=tuple(place), work=tuple(map(tuple, work)), lengths=lengths), sides, known


def assert_right(original: Text, result: Text, lash: Mapping[str, str], **options: Any) -> Report:
    """Fail, with both programs, unless the oracle finds the result right."""
    report = judged(original, result, lash, **options)
    tolerance = options.get("tolerance", TOLERANCE)
    shown = "\n".join(
        ["", as_bytes(original).decode("latin-1"), "---- became", as_bytes(result).decode("latin-1"), str(report)]
    )
    assert report.ok(tolerance), shown
    return report


def without_header(result: str) -> str:
    """A result without the comment that states lash, datum and version."""
    return "".join(line for line in result.splitlines(keepends=True) if MARK not in line)
