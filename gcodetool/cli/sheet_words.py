"""What a machine sheet itself gives cause to say: how good its lash values are."""

from __future__ import annotations

import datetime

from gcodetool.inspection.lash_trend import sheet_cautions
from gcodetool.inspection.residual import residual_axis, residual_sentences
from gcodetool.machine import Machine


def sheet_lines(machine: Machine, from_sheet: bool) -> list[str]:
    """What the uncertainty of the lash leaves, and, for values from a sheet, cautions about their age and origin."""
    known = [found for axis in machine.axes.values() if axis.lash and (found := residual_axis(axis)) is not None]
    lines = [f"left by the uncertainty of the lash: {sentence}" for sentence in residual_sentences(known)]
    if from_sheet:
        today = datetime.date.today()
        lines += [f"caution: {text}" for text in sheet_cautions(machine.axes.values(), today)]
    return lines
