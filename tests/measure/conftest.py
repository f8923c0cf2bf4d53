"""Published readings, and the measure verb run in a process of its own."""

from __future__ import annotations

import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest

from gcodetool.inspection.measure_records import ReadingSet
from gcodetool.inspection.readings import read_readings

ROOT = Path(__file__).resolve().parents[2]
FIXTURES = ROOT / "fixtures" / "measure"

# The verb as the command line mounts it, whatever else is mounted beside it.
START = """
import sys, typer
from gcodetool.cli import app as application, measure
if "measure" not in [group.name for group in application.app.registered_groups]:
    application.app.add_typer(measure.app, name="measure")
application.main()
"""


def published(name: str) -> ReadingSet:
    return read_readings((FIXTURES / f"published_{name}.csv").read_text(encoding="utf-8"), axis="x")


@pytest.fixture
def measure(tmp_path: Path) -> Callable[..., subprocess.CompletedProcess[str]]:
    def run(*arguments: str | Path, stdin: str = "") -> subprocess.CompletedProcess[str]:
        command = [sys.executable, "-c", START, "measure", *map(str, arguments)]
        return subprocess.run(
            command, input=stdin, capture_output=True, text=True, check=False, timeout=60, cwd=tmp_path,
            env={"PYTHONPATH": str(ROOT), "PATH": ""},
        )  # fmt: skip

    return run
