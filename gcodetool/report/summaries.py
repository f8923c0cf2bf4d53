"""Result records to lines of text for a person; no reading, no writing, no colour."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from gcodetool.inspection.verify import Verdict
    from gcodetool.lash.tally import Tally
    from gcodetool.machine import Machine

ORDER = "XYZABC"
CAUTIONS = (
    "This is a new program: compare it with the original, run it above the work with the spindle off first,",
    "hand on the stop, and cut the first part at reduced feed. It holds for the lash, units and datum stated only;",
    "targets move by up to the lash, and settles go past them: check limits and clamps. Never compensate twice.",
    "The machine's maker, local codes and trained people come before anything said here.",
)


def lash_line(machine: Machine) -> str:
    """Lash and datum of every axis with lash: ``X 0.12 datum -, Y 0.09 datum - (mm)``."""
    parts = [
        f"{axis.letter} {axis.lash}{' deg' if axis.rotary else ''} datum {'+' if axis.datum > 0 else '-'}"
        for axis in machine.axes.values()
        if axis.lash
    ]
    return ", ".join(parts) + " (mm)" if parts else "no lash"


def compensation_lines(
    tally: Tally, machine: Machine, verdict: Verdict | None, sheet_words: Sequence[str] = ()
) -> list[str]:
    """The summary of a rewriting; ``verdict`` is None where there was no proof, ``sheet_words`` speak of the sheet."""
    per_axis = ", ".join(f"{letter} {tally.take_ups[letter]}" for letter in ORDER if tally.take_ups[letter]) or "none"
    lines = [
        f"lash: {lash_line(machine)}",
        f"take-ups: {per_axis}; {tally.blocks_in_cut} blocks in the cut, {tally.blocks_in_air} in air",
    ]
    if tally.worst:
        worst = sorted(tally.worst, key=lambda made: (-made.seconds, made.line))
        places = ", ".join(f"line {m.line} ({m.axes}{_seconds(m.seconds)})" for m in worst)
        lines.append(f"longest stops in the cut: {places}")
    lines += [f"stops in the cut: line {made.line}: {made.axes}{_seconds(made.seconds)}" for made in tally.stops]
    if tally.seconds:
        lines.append(
            f"time added: about {tally.seconds:.1f} s, take-ups from stop to stop at the feeds and accelerations known"
        )
    if tally.approaches:
        lines.append(f"holes reached anew from the datum side: {tally.approaches} axis moves")
    lines.append(
        f"settled: {tally.settles} axes; arcs split: {tally.splits} times; "
        f"blocks changed: {tally.changed} of {tally.blocks}; path added: {tally.path_added:.2f} mm"
    )
    lines += proof_lines(verdict) if verdict is not None else ["proof: none was made, because the program is sent live"]
    lines += sheet_words
    lines += [f"caution: line {line}: {text}" for text, line in tally.cautions.items()]
    return [*lines, *CAUTIONS]


def _seconds(seconds: float) -> str:
    return f", {seconds:.2f} s" if seconds else ""


def proof_lines(verdict: Verdict) -> list[str]:
    """What a proof found, in a few lines."""
    if verdict.broken:
        return [f"proof: the two programs do not move alike: {verdict.broken}"]
    before, after = verdict.uncompensated, verdict.feed
    return [
        f"largest error before: {before.distance:.4f} mm at line {before.lines[0]} ({_by_axis(before.by_axis)})",
        f"largest error after:  {after.distance:.4f} mm"
        + (f" at line {after.lines[0]} of the original, {after.lines[1]} of the result" if after.distance else "")
        + f" ({_by_axis(after.by_axis)}); allowed {verdict.tolerance:.4f}",
        f"largest stray of a rapid: {verdict.stray.distance:.3f} mm at line {verdict.stray.lines[1]} of the result",
        f"proof: {'holds' if verdict.holds else 'FAILS'}, {verdict.corners} start sides, {verdict.runs} machines",
    ]


def _by_axis(values: Sequence[float]) -> str:
    shown = [f"{letter} {value:.4f}" for letter, value in zip(ORDER, values, strict=True) if value or letter in "XYZ"]
    return ", ".join(shown)
