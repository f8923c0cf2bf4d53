"""The coupons cut on a machine with known lash: the line or width foretold is the one cut, and reads the lash back."""

from __future__ import annotations

from collections.abc import Iterable
from decimal import Decimal

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from gcodetool.errors import SheetError
from gcodetool.inspection.coupon_tongues import TonguesRequest, tongue_widths, tongues_plan
from gcodetool.inspection.coupon_vernier import SPARE, VernierRequest, coinciding_line, vernier_plan
from gcodetool.inspection.measure_gcode import plan_bounds, program_text
from gcodetool.inspection.uncertainty import lash_from_tongues, lash_from_vernier, rounded
from tests.measure.workshop import Event, Machine, cuts

D = Decimal
OTHER = {"X": "Y", "Y": "X"}
sides = st.sampled_from([-1, 1])


@st.composite
def machines(draw: st.DrawFn, largest: float) -> Machine:
    """Any lash up to ``largest`` on X and Y, any datum, any start and side of it."""
    lash = {axis: draw(st.floats(0, largest)) for axis in "XY"}
    datum = {axis: draw(sides) for axis in "XY"}
    start = {axis: draw(st.floats(-40, 40)) for axis in "XYZ"}
    return Machine({**lash, "Z": 0.2}, datum, start, {axis: draw(st.floats(0, 1)) for axis in "XY"})


verniers = st.sampled_from(
    [
        VernierRequest(),
        VernierRequest(step=D("0.01"), largest=D("0.2"), depth=D("0.05")),
        VernierRequest(step=D("0.05"), largest=D(2), x=D(-12), y=D("7.5")),
        VernierRequest(axes=("Y",), pitch=D(2)),
        VernierRequest(axes=("Y", "X"), numbers=False),
    ]
)


def scale(events: Iterable[Event], axis: str, name: str) -> list[Event]:
    return [event for event in events if event.note.startswith(f"{axis}: {name}")]


@settings(max_examples=60, deadline=None)
@given(verniers.flatmap(lambda request: st.tuples(st.just(request), machines(float(request.largest)))))
def test_the_vernier_reads_the_lash(case: tuple[VernierRequest, Machine]) -> None:
    request, machine = case
    strokes = cuts(program_text(vernier_plan(request)), machine)
    for axis in request.axes:
        lash, step = machine.lash[axis], float(request.step)
        main, vernier = scale(strokes, axis, "main"), scale(strokes, axis, "vernier")
        assert len(main) == len(vernier) == request.last + 2 * SPARE + 1
        apart = [m.after[axis] - v.after[axis] for m, v in zip(main, vernier, strict=True)]
        best = min(range(len(apart)), key=lambda place: abs(apart[place])) - SPARE
        foretold = float(coinciding_line(D(repr(lash)), request.step))
        assert abs(best - foretold) <= 0.5 + 1e-6
        assert abs(apart[best + SPARE]) <= step / 2 + 1e-9
        reading = lash_from_vernier(axis, [best], step)
        assert abs(-reading.signed - lash) <= step / 2 + 1e-9
        value, spread = (float(number) for number in rounded(reading))
        assert value - spread <= lash <= value + spread


@settings(max_examples=30, deadline=None)
@given(verniers.flatmap(lambda request: st.tuples(st.just(request), machines(float(request.largest)))))
def test_only_the_lash_of_the_one_axis_differs(case: tuple[VernierRequest, Machine]) -> None:
    """Along the other axis all lines are cut towards plus, whole, and the scales meet without a gap or an overlap."""
    request, machine = case
    strokes = cuts(program_text(vernier_plan(request)), machine)
    for axis in request.axes:
        other = OTHER[axis]
        main, vernier = scale(strokes, axis, "main"), scale(strokes, axis, "vernier")
        for stroke in main + vernier:
            assert stroke.after[axis] == stroke.before[axis]
            assert stroke.after[other] > stroke.before[other]
        lengths = [round(stroke.after[other] - stroke.before[other], 9) for stroke in main]
        assert lengths[SPARE::5][:2] == [6.0, 4.5]
        assert {round(m.after[other] - v.before[other], 9) for m, v in zip(main, vernier, strict=True)} == {0.0}


def test_two_lines_never_coincide_for_one_lash() -> None:
    """Over the whole coupon the distance of partners changes by less than one pitch."""
    request = VernierRequest()
    lines = request.last + 2 * SPARE + 1
    assert lines * request.step < request.spacing


def test_patterns_and_numbers_do_not_touch() -> None:
    strokes = cuts(program_text(vernier_plan(VernierRequest())), Machine({}))
    x_end = max(event.after["X"] for event in strokes if event.note.startswith("X:"))
    y_start = min(event.after["X"] for event in strokes if event.note.startswith("Y:"))
    assert y_start - x_end > 2
    numbers = scale(strokes, "X", "numbers")
    assert min(min(e.before["Y"], e.after["Y"]) for e in numbers) > max(
        e.after["Y"] for e in scale(strokes, "X", "vernier")
    )


@pytest.mark.parametrize(
    ("changes", "word"),
    [
        ({"axes": ("Z",)}, "indicator"),
        ({"axes": ()}, "indicator"),
        ({"axes": ("X", "X")}, "X and Y"),
        ({"step": D(0)}, "step"),
        ({"step": D("0.001")}, "by eye"),
        ({"largest": D(5)}, "too many"),
        ({"pitch": D("0.5")}, "two lines"),
        ({"angle": D(175)}, "angle"),
        ({"depth": D(-1)}, "depth"),
        ({"pitch": D(1), "depth": D(1)}, "run together"),
    ],
)
def test_a_vernier_that_cannot_be_read_is_refused(changes: dict[str, object], word: str) -> None:
    with pytest.raises(SheetError, match=word):
        vernier_plan(VernierRequest(**changes))  # type: ignore[arg-type]


tongues = st.sampled_from(
    [
        TonguesRequest(),
        TonguesRequest(cutter=D("3.175"), depth=D("1.2"), stepdown=D("0.4"), x=D(-20), y=D(3)),
        TonguesRequest(axes=("Y",), cutter=D(2), slot=D(12), largest=D("0.3")),
        TonguesRequest(cutter=D(6), slot=D("6.7"), width=D("4"), axes=("X",)),
    ]
)


def tongue_left(strokes: list[Event], axis: str, cutter: float, depth: float) -> list[float]:
    """Widths of what is left standing between the slots of one row, at the full depth."""
    places = [e.after[axis] for e in strokes if e.note.startswith(f"{axis}:") and e.after["Z"] <= -depth + 0.3]
    edges = sorted((place - cutter / 2, place + cutter / 2) for place in places)
    left, end = [], edges[0][1]
    for low, high in edges[1:]:
        if low > end:
            left.append(low - end)
        end = max(end, high)
    return left


@settings(max_examples=60, deadline=None)
@given(tongues.flatmap(lambda r: st.tuples(st.just(r), machines(float(r.largest)))), st.floats(-0.15, 0.1))
def test_the_tongues_tell_the_lash_whatever_the_cutter(case: tuple[TonguesRequest, Machine], error: float) -> None:
    """The cutter is ``error`` larger than stated: every width is less by that, and no difference changes."""
    request, machine = case
    strokes = cuts(program_text(tongues_plan(request)), machine)
    for axis in request.axes:
        lash = machine.lash[axis]
        left = tongue_left(strokes, axis, float(request.cutter) + error, float(request.depth))
        foretold = tongue_widths(request.width, D(repr(lash)))
        expected = [float(foretold[name]) - error for name in ("wide", "same", "narrow")]
        assert left == pytest.approx(expected, abs=1e-6)
        reading = lash_from_tongues(axis, wide=left[:1], same=left[1:2], narrow=left[2:])
        assert -reading.signed == pytest.approx(lash, abs=1e-6)
        assert reading.notes == ()


@settings(max_examples=20, deadline=None)
@given(tongues.flatmap(lambda r: st.tuples(st.just(r), machines(float(r.largest)))))
def test_walls_are_cut_along_the_other_axis_always_in_one_direction(case: tuple[TonguesRequest, Machine]) -> None:
    request, machine = case
    for stroke in cuts(program_text(tongues_plan(request)), machine):
        axis = stroke.note[0]
        assert stroke.after[axis] == stroke.before[axis]
        assert stroke.after[OTHER[axis]] - stroke.before[OTHER[axis]] == pytest.approx(
            float(request.length + request.cutter)
        )


def test_each_wall_is_finished_by_a_light_cut_after_all_roughing() -> None:
    request = TonguesRequest(axes=("X",))
    strokes = cuts(program_text(tongues_plan(request)), Machine({}))
    order = [stroke.note.split()[1] for stroke in strokes]
    assert order == sorted(order, key=["rough", "clear", "finish"].index)
    rough = {e.note.split(" ", 2)[2]: e.after["X"] for e in strokes if e.note.split()[1] == "rough"}
    finish = {e.note.split(" ", 2)[2]: e.after["X"] for e in strokes if e.note.split()[1] == "finish"}
    assert [abs(rough[name] - finish[name]) for name in finish] == pytest.approx([0.2] * 6)


def test_the_two_rows_do_not_touch() -> None:
    strokes = cuts(program_text(tongues_plan(TonguesRequest())), Machine({}))
    x_end = max(event.after["X"] for event in strokes if event.note.startswith("X:"))
    y_start = min(event.after["X"] for event in strokes if event.note.startswith("Y:"))
    assert y_start - x_end > 3 + 2


@pytest.mark.parametrize(
    ("changes", "word"),
    [
        ({"axes": ("A",)}, "indicator"),
        ({"cutter": D(6)}, "too narrow"),
        ({"width": D(2)}, "vanish"),
        ({"stepdown": D("0.01")}, "passes"),
        ({"feed": D(0)}, "feed"),
        ({"cutter": D(2), "slot": D(6), "largest": D("1.9"), "width": D(9)}, "touch the walls"),
    ],
)
def test_tongues_that_cannot_be_cut_are_refused(changes: dict[str, object], word: str) -> None:
    with pytest.raises(SheetError, match=word):
        tongues_plan(TonguesRequest(**changes))  # type: ignore[arg-type]


def test_the_coupons_stay_where_they_are_put() -> None:
    """The lowest line stands at the corner given; only the overrun in the air goes beyond it."""
    for plan, overrun in (
        (vernier_plan(VernierRequest(x=D(50), y=D(20))), D("1.5")),
        (tongues_plan(TonguesRequest(x=D(50), y=D(20))), D("1.5")),
    ):
        bounds = plan_bounds(plan)
        assert bounds["X"][0] >= 50 - overrun
        assert bounds["Y"][0] >= 20 - overrun
