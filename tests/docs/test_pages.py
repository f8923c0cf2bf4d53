"""The pages: links, commands, outputs and generated regions are those of the product as it is today."""

from __future__ import annotations

import re
import shutil
import subprocess
from pathlib import Path

import pytest

from tests.docs.generated import MAKERS, commands
from tests.docs.pages import PAGES, ROOT, Workshop, anchors, fences, links, read, regions, runs

BY_NAME = {page.name: page for page in PAGES}
WITH_COMMANDS = [page.name for page in PAGES if list(runs(read(page)))]
# tests/measure/test_docs.py runs its commands and holds its options
RUN_ELSEWHERE = {"measuring.md"}

needs_shell = pytest.mark.skipif(shutil.which("bash") is None, reason="the pages are written for a shell")


@pytest.mark.parametrize("name", BY_NAME)
def test_links_lead_somewhere(name: str) -> None:
    page = BY_NAME[name]
    for link in links(read(page)):
        if re.match(r"https?:", link):
            continue
        path, _, anchor = link.partition("#")
        target = (page.parent / path).resolve() if path else page
        assert target.exists(), link
        assert not anchor or anchor in anchors(read(target)), link


def test_every_page_is_reached_from_the_readme() -> None:
    reached = {(ROOT / link.partition("#")[0]).resolve() for link in links(read(BY_NAME["README.md"]))}
    assert {page for page in PAGES if page.name != "README.md"} <= reached


@needs_shell
@pytest.mark.parametrize("name", sorted(set(WITH_COMMANDS) - RUN_ELSEWHERE))
def test_commands_run_and_print_what_is_shown(name: str, tmp_path: Path) -> None:
    workshop = Workshop(tmp_path)
    for fence, shown in runs(read(BY_NAME[name])):
        printed = workshop.run(fence.text)
        if shown is not None:
            assert shown.text == printed, "python -m tests.docs writes it anew"


@pytest.mark.parametrize("name", [page.name for page in PAGES if regions(read(page))])
def test_generated_regions_are_current(name: str) -> None:
    for region, text in regions(read(BY_NAME[name])).items():
        assert text == MAKERS[region](), "python -m tests.docs writes it anew"


def test_every_generated_region_stands_on_a_page() -> None:
    assert sorted(region for page in PAGES for region in regions(read(page))) == sorted(MAKERS)


def test_every_output_block_follows_a_command() -> None:
    for page in PAGES:
        text = read(page)
        shown = {output.start for _, output in runs(text) if output is not None}
        assert shown == {fence.start for fence in fences(text) if fence.is_output}, page.name


def test_every_command_is_shown_at_work() -> None:
    """A command that only the generated help page names is not documented."""
    told = "\n".join(read(page) for page in PAGES if page.name != "help.md")
    for name, command in commands():
        if not hasattr(command, "commands"):
            assert f"{name} " in told, name


# ---- the README's two commands -------------------------------------------------------------------------------------


def readme_steps(name: str) -> list[str]:
    """The steps of one of the README's commands; it is one line."""
    (block,) = [fence for fence in fences(read(BY_NAME["README.md"])) if fence.mark == f"<!-- command: {name} -->"]
    (line,) = block.text.splitlines()
    return line.split(" && ")


@pytest.mark.parametrize("name", ["demo", "tests"])
def test_a_readme_command_begins_from_nothing(name: str) -> None:
    make, install, *rest = readme_steps(name)
    assert make == "python3 -m venv .venv"
    assert install.startswith(".venv/bin/pip install ")
    assert rest


@needs_shell
def test_the_readme_demo_shows_the_result(tmp_path: Path) -> None:
    """All but making the environment, which ``.ci/run`` does on a fresh copy."""
    workshop = Workshop(tmp_path)
    steps = " && ".join(readme_steps("demo")[2:]).replace(".venv/bin/", "")
    for _ in range(2):  # it works again where its result is there already
        printed = workshop.run(steps)
        assert "proof: holds" in printed
        assert "G3 X20.0000 Y26.0900 I-6.000 J0.000 F240" in printed
    assert not list(workshop.folder.glob("*.nc"))


@pytest.mark.skipif(shutil.which("git") is None or not (ROOT / ".git").exists(), reason="no git")
def test_what_the_readme_commands_leave_behind_is_ignored() -> None:
    for left in (".venv/pyvenv.cfg", "build/plate-compensated.nc", "gcodetool.egg-info/PKG-INFO", ".pytest_cache/x"):
        assert subprocess.run(["git", "check-ignore", "-q", left], cwd=ROOT, check=False).returncode == 0, left


# ---- the contributors' guide ---------------------------------------------------------------------------------------


def test_files_that_the_guide_names_are_there() -> None:
    path_and_test = r"[ `]((?:gcodetool|tests|fixtures|docs|\.ci)/[\w./-]*)(?:::(\w+))?"
    named = re.findall(path_and_test, read(BY_NAME["DEVELOPERS.md"]))
    assert len(named) > 30
    for path, test in named:
        assert (ROOT / path).exists(), path
        assert not test or f"def {test}(" in read(ROOT / path), test


def test_modules_that_the_guide_starts_are_there() -> None:
    started = re.findall(r"python -m (tests[\w.]*)", read(BY_NAME["DEVELOPERS.md"]))
    assert "tests.docs" in started
    for module in started:
        path = ROOT / module.replace(".", "/")
        assert path.with_suffix(".py").is_file() or (path / "__main__.py").is_file(), module


def test_every_layer_is_in_the_guide() -> None:
    from tests.test_layers import ROWS

    text = read(BY_NAME["DEVELOPERS.md"])
    assert ", ".join(ROWS) in text
