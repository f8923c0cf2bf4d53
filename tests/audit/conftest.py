"""Small programs, and what the audit finds in them."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path as FilePath

import numpy as np
import pytest

from gcodetool.inspection.audit_records import StockTaken
from gcodetool.inspection.cutting_records import Cut, Cutters, Engagement, Labels, Path
from gcodetool.inspection.engagement import Remains, engage
from gcodetool.inspection.job_records import Cutter, Job, StockShape
from gcodetool.inspection.labels import figures, label_moves, words_by_line
from gcodetool.inspection.outlines import Outline, box
from gcodetool.inspection.stock import take_stock
from gcodetool.inspection.toolpath import read_path
from gcodetool.motion.moves import ORDER, Setup
from gcodetool.program.blocks import blocks_of

ROOT = FilePath(__file__).resolve().parents[2]
CORPUS = ROOT.parent / "shared" / "corpus"
SETUP = Setup(units="mm", unplaced=ORDER)
HEAD = "G21 G90 G17\nS10000 M3\nF300\n"
BIG = box(-200.0, -200.0, 200.0, 200.0)


@dataclass
class Seen:
    """A program and all that was found in it."""

    path: Path
    stock: StockTaken
    engagement: Engagement
    remains: Remains
    cut: Cut
    labels: Labels

    def at(self, line: int, share: float = 0.5) -> int:
        """The sample of a line that is nearest to a share of its move."""
        rows = np.flatnonzero(self.path.line[self.engagement.samples.move] == line)
        return int(rows[np.argmin(np.abs(self.engagement.samples.share[rows] - share))])

    def angles(self, line: int, share: float = 0.5) -> tuple[float, float]:
        """The outermost engaged angles there, degrees."""
        k = self.at(line, share)
        return float(np.degrees(self.cut.first[k])), float(np.degrees(self.cut.last[k]))

    def words(self) -> dict[int, str]:
        """The label of each line."""
        return words_by_line(self.path, self.labels)


def look(
    program: str, diameter: float = 10.0, outline: Outline | None = BIG, top: float | None = 0.0, **cutter: object
) -> Seen:
    """Everything about a program; tool ``any`` unless ``number`` says otherwise."""
    tool = Cutter(str(cutter.pop("number", "*")), diameter, **cutter)  # type: ignore[arg-type]
    job = Job(cutters=(tool,), stock=StockShape(outline, top))
    return look_at(program, job)


def look_at(program: str, job: Job) -> Seen:
    path = read_path(blocks_of(program.encode("latin-1")), job, SETUP)
    stock = take_stock(job, path)
    engagement, remains = engage(path, job, stock)
    cut = figures(engagement.samples, engagement.slices)
    return Seen(path, stock, engagement, remains, cut, label_moves(path, Cutters.of(job.cutters), engagement, cut))


def volume(seen: Seen) -> float:
    """All that feed motion removes, mm^3: sides, end faces of ramps, plunges."""
    samples, path = seen.engagement.samples, seen.path
    move = samples.move
    feed = ~path.rapid[move]
    fall = np.maximum(path.start[move, 2] - path.end[move, 2], 0.0) / path.length[move]
    radius = np.array([0.5 * 3.0])  # of the cutter that the callers use
    face = np.where(samples.vertical, 0.0, seen.engagement.buried * fall * np.pi * radius**2)
    plan = np.sqrt(1.0 - np.minimum((path.end[move, 2] - path.start[move, 2]) ** 2 / path.length[move] ** 2, 1.0))
    sides = seen.cut.area * np.where(samples.vertical, 0.0, plan)
    return float(((sides + face) * samples.weight * feed).sum() + seen.engagement.volume[feed].sum())


# The verb as the command line mounts it, whatever else is mounted beside it.
START = """
import sys
from gcodetool.cli import app as application, audit
if "audit" not in [each.name for each in application.app.registered_commands]:
    application.app.command("audit")(audit.command)
application.main()
"""


@pytest.fixture
def run(tmp_path: FilePath) -> Callable[..., subprocess.CompletedProcess[str]]:
    """Run the audit verb in a process of its own; ``stdin`` is text."""

    def start(*arguments: str | FilePath, stdin: str = "") -> subprocess.CompletedProcess[str]:
        command = [sys.executable, "-c", START, "audit", *map(str, arguments)]
        return subprocess.run(
            command, input=stdin, capture_output=True, text=True, check=False, timeout=120, cwd=tmp_path,
            env={"PYTHONPATH": str(ROOT), "PATH": ""},
        )  # fmt: skip

    return start
