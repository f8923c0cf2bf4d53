"""Shared options add up to one machine."""

from __future__ import annotations

from decimal import Decimal
from pathlib import Path

import pytest

from gcodetool.cli.options import machine_from
from gcodetool.cli.streams import ReadFailed
from gcodetool.errors import SheetError
from gcodetool.machine import Axis, Machine


def test_a_sheet_with_options_laid_over_it(tmp_path: Path) -> None:
    path = tmp_path / "mill.toml"
    path.write_text('[machine]\nunits = "in"\n[axes.x]\nlash = 0.1\n[axes.y]\nlash = 0.2\n')
    machine = machine_from(path, lash=["x=0.3"], datum=["y=+"])
    x, y = Axis("X", Decimal("0.3")), Axis("Y", Decimal("0.2"), 1)
    assert machine == Machine(units="in", axes={"X": x, "Y": y})


def test_nothing_given_is_a_machine_without_lash_unless_lash_is_needed() -> None:
    assert machine_from() == Machine()
    assert machine_from(lash=["x=0"], lash_needed=True).axis("X").lash == 0
    with pytest.raises(SheetError, match="--machine SHEET"):
        machine_from(lash_needed=True, units="mm")


def test_a_missing_or_faulty_sheet_is_told_by_its_name(tmp_path: Path) -> None:
    path = tmp_path / "mill.toml"
    with pytest.raises(ReadFailed, match=r"cannot read .*mill\.toml: No such file"):
        machine_from(path)
    path.write_text("[axes.x]\nlash = -1\n")
    with pytest.raises(SheetError, match=r"mill\.toml: axes\.x\.lash: -1 is negative"):
        machine_from(path)
