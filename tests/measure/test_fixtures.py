"""The shipped readings are what their README says."""

from __future__ import annotations

import numpy as np
import pytest

from gcodetool.inspection import readings_findings, uncertainty
from gcodetool.inspection.iso230 import evaluate
from gcodetool.inspection.readings import instrument_of, read_readings
from tests.measure.conftest import FIXTURES, published
from tests.measure.workshop import Machine, run


def test_the_simulated_form_is_the_program_run_with_lash_and_scatter(measure) -> None:
    """Lash 0.12 mm, each reading off by a normal scatter of 0.004 mm, read to 0.01 mm; numpy's generator, seed 4."""
    program = measure("indicator", "x", "--cycle", "step", "--from", "0", "--to", "300").stdout
    stops = [e for e in run(program, Machine({"X": 0.12})) if e.kind == "stop" and e.message.startswith("Read ")]
    found = read_readings((FIXTURES / "step_x.csv").read_text(encoding="utf-8"))
    scatter = 0.004 * np.random.default_rng(4).standard_normal(len(stops))
    # The dial stood at 0.20 on the first place of each target, up.
    shown = [0.2 + e.after["X"] - r.target + 0.12 for e, r in zip(stops, found.readings, strict=True)]
    assert [r.deviation for r in found.readings] == pytest.approx(np.round(shown + scatter, 2), abs=1e-9)


def test_the_simulated_form_gives_its_lash_back() -> None:
    data = read_readings((FIXTURES / "step_x.csv").read_text(encoding="utf-8"))
    lash = uncertainty.lash_from_readings(evaluate(data), instrument_of(data), "test")
    assert abs(lash.lash - 0.12) < lash.uncertainty < 0.021
    assert lash.shown


def test_the_form_in_thousandths_of_an_inch() -> None:
    """Invented: about 3.5 thou of lash, a row left empty, and one slip that must be named."""
    data = read_readings((FIXTURES / "quick_y_thou.csv").read_text(encoding="utf-8"))
    result = evaluate(data)
    lash = uncertainty.lash_from_readings(result, instrument_of(data), "test")
    assert lash.lash == pytest.approx(3.5 * 0.0254, abs=0.015)
    found = {f.code: f.lines for f in readings_findings.findings(data, result, lash, data.resolution)}
    assert readings_findings.MISSING in found
    assert len(found[readings_findings.OUTLIER]) == 1


@pytest.mark.parametrize(("name", "targets"), [("a", 5), ("b", 8)])
def test_the_published_sets_are_whole_and_name_their_source(name: str, targets: int) -> None:
    text = (FIXTURES / f"published_{name}.csv").read_text(encoding="utf-8")
    assert text.startswith("# READ: github anderssandstrom/ecmccomgui")
    assert len(published(name).readings) == targets * 5 * 2
    assert all(abs(reading.deviation) < 0.02 for reading in published(name).readings)
    assert evaluate(published(name)).common_zero
