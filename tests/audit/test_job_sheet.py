"""The job sheet and the options that stand in for it."""

from __future__ import annotations

import math
import subprocess
import sys
import tomllib

import pytest

from gcodetool.errors import SheetError
from gcodetool.inspection.job_records import Cutter
from gcodetool.inspection.job_sheet import cutter_from_option, job_from_options, keep_out_from_option, parse_job
from gcodetool.inspection.materials import DEFAULTS, as_sheet, material_named
from gcodetool.inspection.outlines import box, disc, outline_of
from tests.audit.conftest import ROOT

GOOD = """
[job]
material = "brass"
speed = 18000
feed = 300
least_speed = 5000
most_speed = 24000
tolerance = 0.02

[stock]
disc = [10, 20, 60]
top = 1.5
bottom = -3

[tools.1]
diameter = 2.0
flutes = 3
most_speed = 30000

[tools.T02]
diameter = 6
shape = "ball"
hand = "left"

[tools.any]
diameter = 3.175
shape = "vee"
angle = 60
tip = 0.2

[keep_out.left-clamp]
polygon = [[0, 0], [10, 0], [0, 10]]
top = 12
"""


def test_a_good_sheet() -> None:
    job = parse_job(GOOD)
    assert job.cutters == (
        Cutter("1", 2.0, 3, most_speed=30000.0), Cutter("2", 6.0, shape="ball", hand=-1),
        Cutter("*", 3.175, shape="vee", angle=60.0, tip=0.2),
    )  # fmt: skip
    assert job.stock.outline == disc(10.0, 20.0, 30.0)
    assert (job.stock.top, job.stock.bottom) == (1.5, -3.0)
    assert job.keep_outs[0].outline == ((0.0, 0.0), (10.0, 0.0), (0.0, 10.0))
    assert job.material is not None
    assert (job.material.name, job.speed, job.feed, job.tolerance) == ("brass", 18000.0, 300.0, 0.02)


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        ("[stok]\nbox=[0,0,1,1]", "did you mean stock"),
        ("[job]\nspeed = 0", "job.speed: must be more than 0"),
        ("[job]\nsped = 1", "did you mean speed"),
        ("[job]\nmaterial = 'bras'", "did you mean brass"),
        ("[stock]\nbox=[0,0,1]", "two opposite corners"),
        ("[stock]\nbox=[0,0,0,1]", "no area"),
        ("[stock]\nbox=[0,0,1,1]\ndisc=[0,0,1]", "give one outline"),
        ("[stock]\ntop=0\nbottom=1", "below the top"),
        ("[tools.1]\nflutes=2", "diameter is missing"),
        ("[tools.1]\ndiameter=2\nshape='round'", "one of flat, ball, vee, drill"),
        ("[tools.1]\ndiameter='2'", "bare number"),
        ("[tools]\n1 = 2.0", "must be a table"),
        ("[keep_out.clamp]\nbox=[0,0,1,1]", "and top"),
        ("[material]\nname='x'", "give kt"),
        ("[material]\nkt=500", "kt needs kr"),
        ("speed = ", "not TOML"),
        ("[job]\ntolerance = inf", "bare number"),
    ],
)  # fmt: skip
def test_faults_are_told_with_their_cure(text: str, fault: str) -> None:
    with pytest.raises(SheetError, match=f"mine: .*{fault}"):
        parse_job(text, "mine")


def test_all_faults_are_told_at_once() -> None:
    with pytest.raises(SheetError) as caught:
        parse_job("[job]\nspeed=0\nfeed=-1\n[tools.1]\nflutes=1\n")
    assert len(str(caught.value).splitlines()) == 3


@pytest.mark.parametrize("material", DEFAULTS.values(), ids=DEFAULTS)
def test_a_printed_material_reads_back(material) -> None:
    back = parse_job(as_sheet(material)).material
    assert back is not None
    for key in ("name", "source", "kt", "kc11", "kr", "ka", "et", "low", "high", "least_chip", "most_chip"):
        ours, theirs = getattr(material, key), getattr(back, key)
        assert ours == theirs or math.isclose(ours, theirs, rel_tol=1e-5), key
    assert tomllib.loads(as_sheet(material))["material"]["source"] == material.source


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("1=3.175", Cutter("1", 3.175)), ("T02=6,ball,flutes=1", Cutter("2", 6.0, 1, "ball")),
        ("any=3", Cutter("*", 3.0)),
        ("*=3,hand=left", Cutter("*", 3.0, hand=-1)), ("4=1,drill", Cutter("4", 1.0, shape="drill", angle=118.0)),
        ("5=6,shape=vee,angle=60,tip=.1", Cutter("5", 6.0, shape="vee", angle=60.0, tip=0.1)),
    ],
)  # fmt: skip
def test_a_tool_as_an_option(text: str, expected: Cutter) -> None:
    assert cutter_from_option(text) == expected


@pytest.mark.parametrize(
    "text", ["1", "=3", "1=", "1=x", "1=3,round", "1=3,flutes", "1=-3", "1=3,flutes=1.5", "1=3,hand=up"]
)
def test_a_wrong_tool_option(text: str) -> None:
    with pytest.raises(SheetError, match="--tool"):
        cutter_from_option(text)


def test_options_are_laid_over_the_sheet() -> None:
    job = job_from_options(
        parse_job(GOOD),
        tools=["1=4"],
        stock="box:0,0,10,20",
        top=0.0,
        keep_outs=["disc:0,0,5@9"],
        material="steel",
        speed=9.0,
    )
    assert [(each.number, each.diameter) for each in job.cutters] == [("1", 4.0), ("2", 6.0), ("*", 3.175)]
    assert job.stock.outline == box(0.0, 0.0, 10.0, 20.0)
    assert (job.stock.top, job.stock.bottom, job.speed, job.feed) == (0.0, -3.0, 9.0, 300.0)
    assert len(job.keep_outs) == 2
    assert job.material == material_named("steel")


@pytest.mark.parametrize(
    ("values", "fault"),
    [
        ({"stock": "0,0,1,1"}, "write box:"), ({"stock": "box:0,0,1"}, "two opposite"),
        ({"stock": "box:a,0,1,1"}, "no number"),
        ({"top": -5.0, "bottom": 0.0}, "below the top"), ({"keep_outs": ["box:0,0,1,1"]}, "and the height"),
        ({"speed": -1.0}, "--speed"), ({"material": "unobtainium"}, "the materials are"),
    ],
)  # fmt: skip
def test_wrong_options(values: dict[str, object], fault: str) -> None:
    with pytest.raises(SheetError, match=fault):
        job_from_options(None, **values)  # type: ignore[arg-type]


def test_outlines() -> None:
    assert outline_of("box", [3.0, 4.0, 1.0, 2.0]) == ((1.0, 2.0), (3.0, 2.0), (3.0, 4.0), (1.0, 4.0))
    assert all(math.isclose(math.dist(point, (1.0, 2.0)), 5.0) for point in outline_of("disc", [1.0, 2.0, 10.0]))
    assert keep_out_from_option("polygon:0,0,4,0,0,4@2.5").top == 2.5
    for kind, numbers in (("polygon", [0.0, 0.0, 1.0, 1.0]), ("disc", [0.0, 0.0, 0.0]), ("disc", [0.0, math.nan, 1.0])):
        with pytest.raises(ValueError, match=r"polygon|area|numbers"):
            outline_of(kind, numbers)


def test_reading_a_job_loads_neither_numpy_nor_shapely() -> None:
    code = "import sys, gcodetool.inspection.job_sheet; print([n for n in ('numpy', 'shapely') if n in sys.modules])"
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, env={"PYTHONPATH": str(ROOT)}, check=True
    )
    assert done.stdout == "[]\n"
