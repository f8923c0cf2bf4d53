"""Pages of reference: their tables name exactly what the product has."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator
from math import atan2, cos, hypot, radians, remainder, sin, tau
from typing import Any

import pytest
from typer.testing import CliRunner

from gcodetool.cli.app import app
from gcodetool.cli.exit_codes import ExitCode
from gcodetool.lash.play import play
from gcodetool.machine import parse_sheet, read_sheet, sheet_template
from gcodetool.sheet_keys import AXIS_KEYS, FORMER_KEYS, MACHINE_KEYS
from tests.docs.pages import ROOT, fences, read, table

DOCS = ROOT / "docs"
PLATE, SHEET = str(ROOT / "fixtures" / "plate-cycles.nc"), str(ROOT / "fixtures" / "router.toml")


def first_cells(page: str, heading: str) -> list[str]:
    """First cells of a table, without the marks of code."""
    return [row[0].strip("`") for row in table(read(DOCS / page), heading)]


# ---- exit codes ----------------------------------------------------------------------------------------------------


def test_every_exit_code_is_told_by_number_and_name() -> None:
    told = [(int(row[0]), row[1]) for row in table(read(DOCS / "exit-codes.md"), "Exit codes")]
    assert told == [(code.value, code.name.lower().replace("_", " ")) for code in ExitCode]


# ---- the machine sheet ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("heading", "keys"), [("The machine", MACHINE_KEYS), ("Each axis", AXIS_KEYS), ("History", FORMER_KEYS)]
)
def test_every_key_of_a_sheet_is_told(heading: str, keys: dict[str, Any]) -> None:
    assert sorted(first_cells("machine-sheet.md", heading)) == sorted(keys)


def test_the_sheet_shown_is_good_and_has_every_key() -> None:
    (shown,) = [fence.text for fence in fences(read(DOCS / "machine-sheet.md")) if fence.kind == "toml"]
    assert parse_sheet(shown).axes["A"].datum == 1
    found = set(re.findall(r"(\w+) = ", shown))
    assert found >= {*MACHINE_KEYS, *AXIS_KEYS, *FORMER_KEYS}


def test_defaults_told_are_those_of_a_bare_sheet() -> None:
    bare = parse_sheet("[axes.x]\n")
    told = {row[0].strip("`"): row[2] for heading in ("The machine", "Each axis")
            for row in table(read(DOCS / "machine-sheet.md"), heading)}  # fmt: skip
    assert told["decimals"] == str(bare.decimals)
    assert told["settle_margin"] == str(bare.settle_margin)
    assert told["lash"] == str(bare.axis("X").lash)
    assert told["datum"] == '`"-"`' and bare.axis("X").datum == -1
    assert told["units"] == "such programs are refused" and bare.units is None


def test_the_demo_machine_is_the_one_the_readme_speaks_of() -> None:
    axes = read_sheet(SHEET).axes
    assert [str(axes[letter].lash) for letter in "XYZ"] == ["0.12", "0.09", "0.04"]
    assert "0.12 mm in X, 0.09 in Y and 0.04 in Z" in read(ROOT / "README.md")
    assert parse_sheet(sheet_template()).axes


# ---- JSON ----------------------------------------------------------------------------------------------------------


def keys_of(value: Any, path: str = "") -> Iterator[str]:
    """Every key of a JSON value as a dotted path; ``*`` for axis letters, ``[]`` for entries of a list."""
    if isinstance(value, dict):
        for key, inner in value.items():
            name = "*" if key in list("XYZABC") else key
            yield from keys_of(inner, f"{path}.{name}".lstrip("."))
    elif isinstance(value, list) and all(isinstance(entry, dict) for entry in value):
        for entry in value:
            yield from keys_of(entry, f"{path}[]")
    else:
        yield path


@pytest.mark.parametrize(
    ("heading", "arguments", "code"),
    [
        ("reversals --json", ["reversals", PLATE, "--machine", SHEET, "--json"], 0),
        ("reversals --list --json", ["reversals", PLATE, "--list", "--json"], 0),
        ("verify --json", ["verify", PLATE, PLATE, "--machine", SHEET, "--json"], 1),
    ],
)
def test_every_key_of_json_is_told(heading: str, arguments: list[str], code: int) -> None:
    done = CliRunner().invoke(app, arguments)
    assert done.exit_code == code
    texts = done.stdout.splitlines() if "--list" in arguments else [done.stdout]
    found = {key for text in texts for key in keys_of(json.loads(text))}
    assert sorted(first_cells("json.md", heading)) == sorted(found)


# ---- circles -------------------------------------------------------------------------------------------------------


STEPS = 40_000


def circle(radius: float, lash: tuple[float, float]) -> list[tuple[float, float]]:
    """The second counter-clockwise round of a circle, driven through the play of two axes with datum -."""
    x, y, path = radius, 0.0, []
    for step in range(2 * STEPS + 1):
        angle = tau * step / STEPS
        x = play(x, radius * cos(angle), lash[0], -1)
        y = play(y, radius * sin(angle), lash[1], -1)
        if step >= STEPS:
            path.append((x + lash[0] / 2, y + lash[1] / 2))
    return path


def radius_at(path: list[tuple[float, float]], degrees: float) -> float:
    """Radius of a path in a direction."""
    x, y = min(path, key=lambda p: abs(remainder(atan2(p[1], p[0]) - radians(degrees), tau)))
    return hypot(x, y)


CIRCLES = [tuple(map(float, row)) for row in table(read(DOCS / "how-lash-spoils-a-part.md"), "What comes of it")]


@pytest.mark.parametrize(("radius", "lash", "extent", "flat", "diagonal"), CIRCLES)
def test_circles_on_the_page_are_those_of_a_machine_with_lash(
    radius: float, lash: float, extent: float, flat: float, diagonal: float
) -> None:
    path = circle(radius, (lash, lash))
    for axis in (0, 1):
        values = [point[axis] for point in path]
        assert max(values) - min(values) == pytest.approx(extent, abs=6e-4)
    highest = max(y for _, y in path)
    along = [x for x, y in path if y > highest - 1e-9]
    # it ends between two samples
    assert max(along) - min(along) == pytest.approx(flat, abs=tau * radius / STEPS + 6e-4)
    for degrees in (45, 135, 225, 315):
        assert radius_at(path, degrees) - radius == pytest.approx(diagonal, abs=1.5e-4)


def test_unequal_lash_on_the_page() -> None:
    text = read(DOCS / "how-lash-spoils-a-part.md")
    found = re.search(r"R 10, Bx 0.2, By 0: \+([\d.]+) and -([\d.]+)\.", text)
    assert found is not None
    path = circle(10.0, (0.2, 0.0))
    assert radius_at(path, 45) - 10 == pytest.approx(float(found[1]), abs=1.5e-4)
    assert 10 - radius_at(path, 135) == pytest.approx(float(found[2]), abs=1.5e-4)
