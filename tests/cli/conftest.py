"""Commands run as a user runs them: in a process of their own, with real pipes."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

ROOT = Path(__file__).resolve().parents[2]
Run = Callable[..., "subprocess.CompletedProcess[bytes]"]

DRIVER = '''
import sys
import typer
from gcodetool.cli import app as application
from gcodetool.cli.streams import draft, iter_lines, open_source, standard_output
from gcodetool.cli.terminal import watched
from gcodetool.errors import Refusal

@application.app.command()
def copy(source: str, output: str = "-", force: bool = False, slow: bool = False):
    with draft(output, force=force, inputs=[source]) as out, open_source(source, live=slow) as program:
        for line in program.lines():
            out.write(line)
            if slow:
                out.flush()
                print("kept", file=sys.stderr, flush=True)
            if line.startswith(b"refuse"):
                raise Refusal(3, "refuse", "for the test", "Leave it out")
        out.release()

@application.app.command()
def twice(source: str):
    with draft() as out, open_source(source) as program:
        first = b"".join(program.lines())
        out.writelines(program.lines())
        if b"".join(out.lines()) == first == b"".join(program.lines()):
            out.release()

@application.app.command()
def live(source: str = "-"):
    out = standard_output()
    with open_source(source, live=True) as program:
        for line in program.lines():
            out.write(line)
            out.flush()

@application.app.command()
def memory(live: bool = False):
    with open_source("-", live=live) as program:
        count = sum(1 for line in program.lines())
    peak = next(line.split()[1] for line in open("/proc/self/status") if line.startswith("VmHWM"))
    print(count, peak)

@application.app.command()
def broken():
    raise ZeroDivisionError("broken for the test")

@application.app.command()
def bar():
    from gcodetool.cli import terminal
    terminal.PATIENCE = 0
    lines = [b"x"] * 20000
    print(sum(len(line) for line in watched(lines, 20000, "proving")))

application.main()
'''


@pytest.fixture
def environment() -> dict[str, str]:
    """The caller's environment without what hides buffering or changes colour."""
    hidden = ("PYTHONUNBUFFERED", "NO_COLOR", "FORCE_COLOR", "COLUMNS", "PYTHONIOENCODING", "PYTHONUTF8")
    return {**{key: value for key, value in os.environ.items() if key not in hidden}, "PYTHONPATH": str(ROOT)}


@pytest.fixture
def command() -> list[str]:
    """How the tool is started."""
    return [sys.executable, "-m", "gcodetool"]


@pytest.fixture
def driver(tmp_path_factory: pytest.TempPathFactory) -> list[str]:
    """The real command line with a few verbs that only move bytes."""
    path = tmp_path_factory.mktemp("driver") / "driver.py"
    path.write_text(DRIVER, encoding="utf-8")
    return [sys.executable, str(path)]


@pytest.fixture
def run(command: list[str], environment: dict[str, str]) -> Run:
    """Run the tool to its end; ``stdin`` is bytes."""
    return _runner(command, environment)


@pytest.fixture
def drive(driver: list[str], environment: dict[str, str]) -> Run:
    """Run the driver to its end."""
    return _runner(driver, environment)


def _runner(start: list[str], environment: dict[str, str]) -> Run:
    def run(*arguments: str | Path, stdin: bytes = b"", **options: Any) -> subprocess.CompletedProcess[bytes]:
        variables = {**environment, **options.pop("env", {})}
        whole = [*start, *map(str, arguments)]
        if "stdout" not in options:
            options["capture_output"] = True
        if "stdin_file" in options:
            options["stdin"] = options.pop("stdin_file")
        else:
            options["input"] = stdin
        return subprocess.run(whole, env=variables, timeout=120, check=False, **options)

    return run
