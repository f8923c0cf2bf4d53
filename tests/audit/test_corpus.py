"""Real programs: nothing breaks, every feed line gets a label, shares add up."""

from __future__ import annotations

from decimal import Decimal
from pathlib import Path

import pytest

from gcodetool.errors import Refusal
from gcodetool.inspection.audit import audit
from gcodetool.inspection.job_records import Cutter, Job
from gcodetool.inspection.materials import material_named
from gcodetool.machine import Axis, Machine
from tests.audit.conftest import CORPUS, ROOT, SETUP

FILES = [
    *sorted((ROOT / "fixtures").glob("*.nc")),
    *sorted(path for path in CORPUS.glob("*.n*") if path.stat().st_size < 400_000),
]
SHEET = Machine(axes={letter: Axis(letter, lash=Decimal("0.1"), friction=Decimal(40)) for letter in "XYZ"})


@pytest.mark.parametrize("file", FILES, ids=lambda file: file.name)
def test_a_real_program(file: Path) -> None:
    diameter = 0.2 if "board" in file.name else 3.0
    job = Job(cutters=(Cutter("*", diameter),), material=material_named("plywood"), speed=10_000.0)
    try:
        found = audit(file.read_bytes(), job, SHEET, SETUP, every_move=True)
    except Refusal as refusal:
        assert file.name == "rail-full-circles.nc", refusal
        return
    assert sum(row.share_of_length for row in found.shares) == pytest.approx(1.0)
    assert {row.label for row in found.rows} <= {"climb", "conventional", "slot", "air", "plunge", "drill"}
    assert all(
        0.0 <= row.first_angle <= row.last_angle <= 180.0 for row in found.rows if row.first_angle == row.first_angle
    )
    assert all(row.removed >= 0.0 for row in found.rows)
    assert found.stock.outline
    for feature in found.features:
        for measure in feature.measures:
            # friction alone: no figure is off by more than the lash of both axes together
            assert abs(measure.error_before) < 0.3 or not measure.counts or feature.dragged
