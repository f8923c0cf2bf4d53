"""The page about measuring: its commands run, and it names every command, option and finding."""

from __future__ import annotations

import re
import shlex
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
import typer.main

from gcodetool.cli import measure as verb
from gcodetool.inspection import readings_findings
from tests.measure.conftest import FIXTURES, ROOT, START

PAGE = ROOT / "docs" / "measuring.md"
TEXT = PAGE.read_text(encoding="utf-8")
COMMANDS = [line for block in re.findall(r"```sh\n(.*?)```", TEXT, re.DOTALL) for line in block.splitlines()]


def test_every_command_of_the_page_runs_in_order(tmp_path: Path) -> None:
    shutil.copytree(FIXTURES, tmp_path / "fixtures" / "measure")
    assert len(COMMANDS) > 8
    for line in COMMANDS:
        name, *words = shlex.split(line)
        assert name == "gcodetool"
        run = subprocess.run(
            [sys.executable, "-c", START, *words], capture_output=True, text=True, check=False, cwd=tmp_path,
            env={"PYTHONPATH": str(ROOT), "PATH": ""},
        )  # fmt: skip
        assert run.returncode == 0, (line, run.stderr)


def test_the_output_shown_is_the_output(measure) -> None:
    shown = re.search(r"evaluate fixtures/measure/step_x.csv --svg step.svg\n```\n\n```\n(.*?)```", TEXT, re.DOTALL)
    assert shown is not None
    output = measure("evaluate", FIXTURES / "step_x.csv").stdout
    for line in shown[1].splitlines():
        assert line == "..." or line in output.splitlines()


COMMAND_OPTIONS = [
    (name, option)
    for name, command in typer.main.get_command(verb.app).commands.items()  # type: ignore[attr-defined]
    for parameter in command.params
    for option in parameter.opts + parameter.secondary_opts
    if option.startswith("--") and option not in ("--help", "--output", "--machine")
]


@pytest.mark.parametrize(("command", "option"), COMMAND_OPTIONS)
def test_every_command_and_option_is_told(command: str, option: str) -> None:
    assert f"measure {command}" in TEXT
    assert re.search(rf"{option}\b", TEXT)


def test_every_finding_is_told() -> None:
    told = dict(re.findall(r"^\| (\d{3}) \|.*\| (\d) \|$", TEXT, re.MULTILINE))
    assert {int(code): code_told == "1" for code, code_told in told.items()} == {
        code: code in readings_findings.DOUBTFUL for code in range(601, 610)
    }


def test_the_sheet_shown_is_a_good_one() -> None:
    from gcodetool.machine import parse_sheet

    shown = re.search(r"```toml\n(.*?)```", TEXT, re.DOTALL)
    assert shown is not None
    assert parse_sheet(shown[1]).axes["X"].lash
