"""Mean cutting force by the mechanistic model, and whether friction and preload hold an axis against it.

Model (Altintas, Manufacturing Automation, ch. 2; Budak, Altintas and Armarego, J. Eng. Ind. 118, 1996; both from
memory, the algebra is tested against direct integration): per tooth and slice of height dz, with chip h = fz
sin(phi), dFt = (Kt h + Ket) dz, dFr = (Kr h + Ker) dz, dFa = (Ka h + Kea) dz.  Force on the tool in the frame (along
the feed, to its left). Averages over a turn do not depend on the helix angle.  Forces in N, lengths in mm, angles in
radians.

The mean force decides whether lash is crossed: a tooth's pulse is far too short to move a carriage through it.
"""

from __future__ import annotations

import math

import numpy as np

from gcodetool.inspection.cutting_records import (
    Cut,
    Cutters,
    Flags,
    Floats,
    Forces,
    Hold,
    Holding,
    Ints,
    Label,
    Path,
    Samples,
    Slices,
)
from gcodetool.inspection.job_records import Material
from gcodetool.machine import Axis

TWO_PI = 2.0 * math.pi
# the ratio of force to threshold from which a verdict is no longer safe
DOUBT = 0.5
# a feed direction that moves an axis by less than this share counts as standing still
STILL = 1e-6
# the ratio shown where an axis has nothing that holds it
ENDLESS = 99.0
Coefficients = tuple[Floats, Floats, Floats, float, float, float]


def coefficients(material: Material, mean_chip: Floats) -> Coefficients:
    """Kt, Kr, Ka (N/mm^2, by chip) and the edge coefficients (N/mm).

    For Kienzle data Kt is the specific force at the mean chip, kc1.1 * h**-mc, and Kr and Ka are shares of it.
    """
    one = np.ones_like(mean_chip)
    if material.kt is not None:
        return material.kt * one, material.kr * one, material.ka * one, material.et, material.er, material.ea
    if material.kc11 is None:
        raise ValueError("the material has neither kt nor kc11")
    kt = material.kc11 * np.maximum(mean_chip, 1e-6) ** -material.mc
    return kt, material.kr * kt, material.ka * kt, material.et, material.er, material.ea


def mean_force(
    first: Floats, last: Floats, height: Floats, chip_load: Floats, flutes: Floats, k: Coefficients
) -> tuple[Floats, Floats, Floats, Floats]:
    """Mean force of a right-hand cutter over a turn: (along, left, axial, tangential) for engagements first..last.

    Axial is the size of the force along the spindle; tangential times cutting speed is the power.
    """
    kt, kr, ka, et, er, ea = k
    cut, edge = flutes * height * chip_load / (8.0 * math.pi), flutes * height / TWO_PI

    def terms(p: Floats) -> tuple[Floats, Floats, Floats, Floats]:
        c2, s2, c, s = np.cos(2.0 * p), np.sin(2.0 * p), np.cos(p), np.sin(p)
        along = cut * (kt * c2 - kr * (2.0 * p - s2)) + edge * (-et * s + er * c)
        left = cut * (kt * (2.0 * p - s2) + kr * c2) - edge * (et * c + er * s)
        axial = edge * (-ka * chip_load * c + ea * p)
        return along, left, axial, edge * (-kt * chip_load * c + et * p)

    begin, end = terms(first), terms(last)
    return end[0] - begin[0], end[1] - begin[1], end[2] - begin[2], end[3] - begin[3]


def chip_loads(path: Path, cutters: Cutters, move: Ints) -> Floats:
    """Feed per tooth, mm; nan where feed, speed or the number of flutes is not known."""
    rate = path.speed[move] * cutters.flutes[path.tool[move]]
    return _share(path.feed[move], rate)


def mean_chip(chip_load: Floats, first: Floats, last: Floats) -> Floats:
    """Mean chip thickness over an engagement: fz (cos first - cos last) / (last - first)."""
    found: Floats = chip_load * (np.cos(first) - np.cos(last)) / np.maximum(last - first, 1e-12)
    return found


def largest_sine(first: Floats, last: Floats) -> Floats:
    """The largest chip of an engagement as a share of the feed per tooth."""
    ahead = (first <= 0.5 * math.pi) & (last >= 0.5 * math.pi)
    return np.where(ahead, 1.0, np.maximum(np.sin(first), np.sin(last)))


def forces(
    path: Path, cutters: Cutters, samples: Samples, slices: Slices, cut: Cut, material: Material | None
) -> Forces:
    """Force and chip at every sample; nan for force without a material, for chips without feed and speed."""
    count = len(samples.move)
    load = chip_loads(path, cutters, samples.move)
    tool = path.tool[samples.move]
    load_here, tool_here = load[slices.sample], tool[slices.sample]
    hand = cutters.hand[tool_here]
    # a left-hand cutter is the mirror image of a right-hand one
    first = np.where(hand > 0.0, slices.first, math.pi - slices.last)
    last = np.where(hand > 0.0, slices.last, math.pi - slices.first)
    tall = slices.high - slices.low
    chip = mean_chip(load_here, first, last)
    weight = tall * (last - first)
    total = _sum(slices.sample, weight, count)
    average = _share(_sum(slices.sample, weight * chip, count), total)
    thick = np.zeros(count)
    np.fmax.at(thick, slices.sample, largest_sine(first, last))
    none = np.full(count, np.nan)
    thinning = np.divide(1.0, thick, out=none.copy(), where=thick > 0.0)
    if material is None:
        return Forces(none, none, none, none, none, none, none, load, average, thinning)
    k = coefficients(material, np.nan_to_num(chip, nan=1e-3))
    along, left, axial, tangential = (
        _sum(slices.sample, part, count)
        for part in mean_force(first, last, tall, load_here, cutters.flutes[tool_here], k)
    )
    left *= cutters.hand[tool]
    quiet = samples.vertical & (cut.area == 0.0)
    along, left, axial, tangential = (np.where(quiet, np.nan, part) for part in (along, left, axial, tangential))
    speed = math.pi * 2.0 * cutters.radius[tool] * path.speed[samples.move] / 60e3
    return Forces(
        fx=along * samples.fx - left * samples.fy,
        fy=along * samples.fy + left * samples.fx,
        fz=-axial if material.ka or material.ea else none,
        along=along,
        side=left,
        peak=_peak(material, average, load, thick, cut.depth),
        power=tangential * speed,
        chip_load=load,
        mean_chip=average,
        thinning=thinning,
    )


def _share(part: Floats, whole: Floats) -> Floats:
    """Part over whole, nan where there is no whole."""
    found = np.full(len(part), np.nan)
    np.divide(part, whole, out=found, where=whole > 0.0)
    return found


def _sum(sample: Ints, values: Floats, count: int) -> Floats:
    return np.bincount(sample, values, count).astype(np.float64)


def _peak(material: Material, average: Floats, load: Floats, thick: Floats, depth: Floats) -> Floats:
    """The largest force of one straight tooth in the plane."""
    kt, kr, _, et, er, _ = coefficients(material, np.nan_to_num(average, nan=1e-3))
    chip = load * thick
    found: Floats = np.where(depth > 0.0, depth * np.hypot(kt * chip + et, kr * chip + er), np.nan)
    return found


# ---- the axes -------------------------------------------------------------------------------------------------------


def hold(axis: Axis, force: Floats, way: Floats, cutting: Flags) -> Holding:
    """The verdict for one axis at each sample; ``way`` is the sign of its motion, 0 where it stands.

    Plain nut: it is dragged where the cut pushes along its motion by more than the friction; standing, by any push
    larger than that.  A spring-loaded nut opens away from its stiff side where the push exceeds the preload, friction
    helping or not. Without a stiff side both ways are taken as the springy one.
    """
    count = len(force)
    if not axis.lash:
        return Holding(axis.letter, np.full(count, Hold.HELD), np.zeros(count), np.zeros(count, np.int64))
    if axis.friction is None and not axis.preload:
        verdict = np.where(cutting, Hold.UNKNOWN, Hold.HELD)
        return Holding(axis.letter, verdict, np.full(count, np.nan), np.zeros(count, np.int64))
    friction, preload = float(axis.friction or 0), float(axis.preload or 0)
    ratio, push = _ratio(axis, force, way, friction, preload)
    known = np.isfinite(force)
    ratio = np.where(known, ratio, np.nan)
    verdict = np.where(ratio > 1.0, Hold.DRAGGED, np.where(ratio > DOUBT, Hold.DOUBTFUL, Hold.HELD))
    verdict = np.where(~known & cutting, Hold.UNKNOWN, verdict)
    dragged = verdict == Hold.DRAGGED
    return Holding(axis.letter, verdict.astype(np.int64), ratio, np.where(dragged, push, 0).astype(np.int64))


def _ratio(axis: Axis, force: Floats, way: Floats, friction: float, preload: float) -> tuple[Floats, Floats]:
    """Force over what holds the axis, and the way it is pushed."""
    moving = way != 0.0
    if not preload:
        pushed = np.where(moving, np.maximum(force * way, 0.0), np.abs(force))
        return _over(pushed, np.full(len(force), friction)), np.where(moving, way, np.sign(force))
    if axis.stiff_side is not None:
        soft = -float(axis.stiff_side)
        # friction helps where the axis moves to its soft side, or stands; it works with the cut where it moves away
        threshold = preload + friction * np.where(moving, way * soft, 1.0)
        return _over(np.maximum(force * soft, 0.0), threshold, moving), np.full(len(force), soft)
    ahead = _over(
        np.maximum(np.where(moving, force * way, np.abs(force)), 0.0), np.full(len(force), preload + friction)
    )
    return ahead, np.where(moving, way, np.sign(force))


def _over(pushed: Floats, threshold: Floats, moving: Flags | None = None) -> Floats:
    """Ratio; where nothing holds, endless for any push (and for none where a weak spring opens by friction alone)."""
    safe = np.where(threshold > 0.0, threshold, 1.0)
    bare = pushed > 0.0 if moving is None else (pushed > 0.0) | moving
    found: Floats = np.where(threshold > 0.0, pushed / safe, np.where(bare, ENDLESS, 0.0))
    return found


def ways(component: Floats) -> Floats:
    """The sign of the motion of an axis from its part of the feed direction."""
    return np.where(np.abs(component) < STILL, 0.0, np.sign(component))


def threshold_words(axis: Axis) -> str:
    """What holds an axis, as a sentence part."""
    if not axis.lash:
        return "no lash"
    if axis.friction is None and not axis.preload:
        return "friction not in the sheet"
    if not axis.preload:
        return f"friction {axis.friction} N"
    side = "" if axis.stiff_side is None else f", stiff side {'+' if axis.stiff_side > 0 else '-'}"
    return f"friction {axis.friction or 0} N, preload {axis.preload} N{side}"


def advice(label: Label, ratio: float) -> str:
    """What would help where an axis is dragged."""
    lighter = f"reduce depth, width or feed so that the force falls to {100.0 * DOUBT / max(ratio, 1.0):.0f} % of this"
    if label is Label.CLIMB:
        return f"cut conventional there, or {lighter}, or tighten the nut's spring"
    return f"{lighter[0].upper()}{lighter[1:]}, or tighten the nut's spring or the slide"
