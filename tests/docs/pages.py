"""The pages of the documentation as data: commands, outputs, marked regions, links.

A page is plain Markdown.  Three marks in comments tell what is held against the product:

``<!-- command: NAME -->``    before a fenced block: one of the README's commands for a fresh machine
``<!-- output -->``           before a fenced block: what the commands of the ``sh`` block above it print, both streams
``<!-- generated: NAME -->``  begins a region that is written by ``python -m tests.docs``; ``<!-- end -->`` ends it

Each line of an ``sh`` block runs and ends with code 0, or with the code in a remark at its end: ``# exit code 65``.
"""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]
PAGES = [ROOT / "README.md", ROOT / "DEVELOPERS.md", *sorted((ROOT / "docs").glob("*.md"))]

_BLOCK = re.compile(r"(?P<mark><!-- (?:output|command: \w+) -->\n)?^```(?P<kind>\w*)\n(?P<text>.*?)^```$", re.M | re.S)
_REGION = re.compile(r"(<!-- generated: (?P<name>[\w -]+) -->\n)(?P<text>.*?)(<!-- end -->)", re.S)
_HEADING = re.compile(r"^#+ (.*)$", re.M)
_LINK = re.compile(r"(?<!!)\[[^\]]*\]\(([^)\s]+)\)")
_CODE = re.compile(r"# exit code (\d+)$")


@dataclass(frozen=True, slots=True)
class Fence:
    """A fenced block: the mark before it ("" without one), its kind, its text, where the text begins in the page."""

    mark: str
    kind: str
    text: str
    start: int

    @property
    def is_output(self) -> bool:
        """True where it shows what the block before it prints."""
        return self.mark == "<!-- output -->"


def read(page: Path) -> str:
    """The text of a page."""
    return page.read_text(encoding="utf-8")


def fences(text: str) -> list[Fence]:
    """All fenced blocks of a page, in order."""
    return [
        Fence((found["mark"] or "").strip(), found["kind"], found["text"], found.start("text"))
        for found in _BLOCK.finditer(text)
    ]


def runs(text: str) -> Iterator[tuple[Fence, Fence | None]]:
    """Each ``sh`` block of a page that is to be run, with the block that shows its output, if there is one."""
    found = fences(text)
    for index, fence in enumerate(found):
        if fence.kind == "sh" and not fence.mark:
            after = found[index + 1] if index + 1 < len(found) else None
            yield fence, after if after is not None and after.is_output else None


def outside_fences(text: str) -> str:
    """A page without its fenced blocks."""
    return _BLOCK.sub("", text)


def links(text: str) -> list[str]:
    """Targets of all links outside of fenced blocks."""
    return _LINK.findall(outside_fences(text))


def anchors(text: str) -> set[str]:
    """The anchors that the headings of a page make."""
    marks = re.compile(r"[^\w\- ]")
    return {marks.sub("", heading.lower()).replace(" ", "-") for heading in _HEADING.findall(outside_fences(text))}


def regions(text: str) -> dict[str, str]:
    """Generated regions by name."""
    return {found["name"]: found["text"] for found in _REGION.finditer(text)}


def with_regions(text: str, made: dict[str, str]) -> str:
    """A page with its generated regions exchanged."""
    return _REGION.sub(lambda found: f"{found[1]}{made[found['name']]}{found[4]}", text)


def table(text: str, heading: str) -> list[list[str]]:
    """The rows, without head, of the first table below a heading."""
    below = re.split(rf"^#+ {re.escape(heading)}$", text, maxsplit=1, flags=re.M)[1]
    rows = re.search(r"^\|.*\|\n\|[-| :]+\|\n((?:\|.*\|\n)+)", below, re.M)
    assert rows is not None, heading
    return [[cell.strip() for cell in line.strip("|").split(" | ")] for line in rows[1].splitlines()]


class Workshop:
    """A copy of the project's shipped files in which commands run as a reader would run them."""

    def __init__(self, folder: Path) -> None:
        """Lay out fixtures and docs, and a command ``gcodetool`` that is this source tree."""
        self.folder = folder / "project"
        for name in ("fixtures", "docs"):
            shutil.copytree(ROOT / name, self.folder / name)
        commands = folder / "commands"
        commands.mkdir()
        start = commands / "gcodetool"
        start.write_text(f'#!/bin/sh\nexec "{sys.executable}" -m gcodetool "$@"\n', encoding="utf-8")
        start.chmod(0o755)
        hidden = ("PYTHONUNBUFFERED", "NO_COLOR", "FORCE_COLOR", "PYTHONIOENCODING", "PYTHONUTF8")
        kept = {key: value for key, value in os.environ.items() if key not in hidden}
        self.environment = kept | {
            "PATH": f"{commands}{os.pathsep}{os.environ['PATH']}",
            "PYTHONPATH": str(ROOT),
            "PYTHONIOENCODING": "utf-8",
            "HOME": str(folder),
            "COLUMNS": "100",
        }

    def run(self, block: str) -> str:
        """Run the lines of one block in order; what they print.  AssertionError for another code than is stated."""
        printed = []
        for line in filter(None, block.splitlines()):
            stated = _CODE.search(line)
            done = subprocess.run(
                ["bash", "-o", "pipefail", "-c", line], cwd=self.folder, env=self.environment, stdin=subprocess.DEVNULL,
                stdout=subprocess.PIPE, stderr=subprocess.STDOUT, timeout=120, check=False,
            )  # fmt: skip
            text = done.stdout.decode("utf-8")
            assert done.returncode == (int(stated[1]) if stated else 0), f"{line}\ncode {done.returncode}\n{text}"
            printed.append(text)
        return "".join(printed)
