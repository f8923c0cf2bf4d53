"""Climb, conventional, slot or air: labels from the engaged angles, and where a contour flips.

With a right-hand cutter (M3) the part of the engagement left of the feed direction is cut conventional: there the
chip begins with no thickness.  The part right of it is cut climb: there it ends with none (Altintas, Manufacturing
Automation, ch. 2, from memory).  A left-hand cutter (M4) exchanges the two.  A cut that lies on both sides about
equally is a slot and has no class.
"""

from __future__ import annotations

import numpy as np

from gcodetool.inspection.cutting_records import (
    Cut,
    Cutters,
    Engagement,
    Flags,
    Floats,
    Ints,
    Kind,
    Label,
    Labels,
    Path,
    Samples,
    Slices,
)

# a cut is a slot where the smaller side has at least this share of the larger: 0.83 D of radial width or more
BOTH_SIDES = 2.0 / 3.0
# a layer thinner than this along the axis is rubbed off rather than cut, mm
FILM = 0.01
# a move that cuts on less than this share of its length is labelled air
MOSTLY = 0.05
# a stretch shorter than this share of the cutter's radius is no change of label
SHORT = 0.5
HALF_PI = 0.5 * np.pi


def figures(samples: Samples, slices: Slices) -> Cut:
    """Width, depth, area and outermost angles of the engagement at each sample."""
    count = len(samples.move)
    tall = slices.high - slices.low
    left = _sum(slices, tall * slices.radius * _side(slices.first, slices.last, 0.0, HALF_PI), count)
    right = _sum(slices, tall * slices.radius * _side(slices.first, slices.last, HALF_PI, 2.0 * HALF_PI), count)
    # several intervals at one height are one slice
    new = np.ones(len(tall), np.bool_)
    new[1:] = (slices.sample[1:] != slices.sample[:-1]) | (slices.low[1:] != slices.low[:-1])
    depth = _sum(slices, np.where(new, tall, 0.0), count)
    first, last = np.full(count, np.nan), np.full(count, np.nan)
    np.fmin.at(first, slices.sample, slices.first)
    np.fmax.at(last, slices.sample, slices.last)
    area = left + right
    width = np.divide(area, depth, out=np.full(count, np.nan), where=depth > 0.0)
    return Cut(left, right, area, depth, width, first, last)


def _side(first: Floats, last: Floats, low: float, high: float) -> Floats:
    """Width across the feed, in radii, of the part of an interval that lies in low..high."""
    width: Floats = np.cos(np.clip(first, low, high)) - np.cos(np.clip(last, low, high))
    return width


def _sum(slices: Slices, values: Floats, count: int) -> Floats:
    return np.bincount(slices.sample, values, count).astype(float)


def label_samples(cut: Cut, hand: Floats) -> Ints:
    """The label of each sample; ``hand`` is +1 where the cutter at the sample is right-hand, -1 where left-hand."""
    climb = np.where(hand >= 0.0, cut.right, cut.left)
    conventional = np.where(hand >= 0.0, cut.left, cut.right)
    label = np.where(climb > conventional, Label.CLIMB, Label.CONVENTIONAL)
    smaller, larger = np.minimum(climb, conventional), np.maximum(climb, conventional)
    label = np.where(smaller >= BOTH_SIDES * larger, Label.SLOT, label)
    found: Ints = np.where((cut.area > 0.0) & (cut.depth >= FILM), label, Label.AIR).astype(np.int64)
    return found


def label_moves(path: Path, cutters: Cutters, engagement: Engagement, cut: Cut) -> Labels:
    """Labels and kinds of everything."""
    samples = engagement.samples
    by_sample = label_samples(cut, cutters.hand[path.tool[samples.move]])
    length = np.zeros((path.count, len(Label)))
    np.add.at(length, (samples.move, by_sample), samples.weight)
    cutting = length[:, 1:].sum(axis=1)
    by_move = np.where(cutting > MOSTLY * path.length, 1 + np.argmax(length[:, 1:], axis=1), Label.AIR)
    rubbed = np.bincount(samples.move, samples.weight * rubbing(engagement, by_sample), path.count)
    spring = (by_move == Label.AIR) & (rubbed > 0.5 * path.length) & ~path.rapid
    kind = kinds(path)
    upright = (kind == Kind.PLUNGE) | (kind == Kind.DRILL)
    return Labels(
        by_sample=by_sample,
        by_move=np.where(upright | path.rapid, Label.AIR, by_move).astype(np.int64),
        kind=kind,
        spring=spring & ~upright,
        air_share=np.where(path.length > 0.0, 1.0 - cutting / np.maximum(path.length, 1e-12), 1.0),
        flips=tuple(flips(path, cutters, samples, by_sample)),
    )


def rubbing(engagement: Engagement, by_sample: Ints) -> Floats:
    """1 where a sample removes nothing to speak of but rubs along what is there, else 0."""
    film = np.zeros(len(by_sample), np.bool_)
    film[engagement.slices.sample] = True
    found: Flags = (engagement.touching | film) & (by_sample == Label.AIR) & ~engagement.samples.vertical
    return found.astype(float)


def kinds(path: Path) -> Ints:
    """What each motion is, beside its label."""
    fall = path.start[:, 2] - path.end[:, 2]
    upright = _upright(path)
    kind = np.where(fall > 1e-9, Kind.RAMP, np.where(fall < -1e-9, Kind.RISE, Kind.LEVEL))
    kind = np.where((path.plane == 1) & (fall > 1e-9), Kind.HELIX, kind)
    kind = np.where(upright & (fall > 0.0), Kind.PLUNGE, kind)
    # a plunge is a hole where nothing else is cut before the next rapid
    lateral = np.zeros(int(path.chain.max(initial=0)) + 1, np.bool_)
    lateral[path.chain[~upright & ~path.rapid]] = True
    kind = np.where((kind == Kind.PLUNGE) & ~lateral[path.chain], Kind.DRILL, kind)
    kind = np.where(path.turning, Kind.OTHER, kind)
    return np.where(path.rapid, Kind.RAPID, kind).astype(np.int64)


def _upright(path: Path) -> Flags:
    flat = np.all(np.abs(path.end[:, :2] - path.start[:, :2]) < 1e-9, axis=1)
    found: Flags = flat & (path.plane == 0)
    return found


def flips(path: Path, cutters: Cutters, samples: Samples, by_sample: Ints) -> list[tuple[int, int, Label, Label]]:
    """Where a contour changes between climb and conventional: moves and labels before and after.

    Slots and air between the two do not count unless they are longer than the cutter is wide; stretches of one label
    that are shorter than half the cutter's radius are passed over.
    """
    radius = cutters.radius[path.tool[samples.move]]
    one_sided = (by_sample == Label.CLIMB) | (by_sample == Label.CONVENTIONAL)
    keep = np.flatnonzero(one_sided & ~path.rapid[samples.move])
    travelled = np.cumsum(samples.weight)
    for _ in range(2):
        keep = keep[_run_lengths(path, samples, by_sample, keep) >= SHORT * radius[keep]]
    before, after = keep[:-1], keep[1:]
    same = path.chain[samples.move[before]] == path.chain[samples.move[after]]
    near = travelled[after] - samples.weight[after] - travelled[before] < 2.0 * radius[before]
    place = np.flatnonzero(same & near & (by_sample[before] != by_sample[after]))
    return [
        (int(samples.move[a]), int(samples.move[b]), Label(int(by_sample[a])), Label(int(by_sample[b])))
        for a, b in zip(before[place], after[place], strict=True)
    ]


def _run_lengths(path: Path, samples: Samples, by_sample: Ints, keep: Ints) -> Floats:
    """For each of these samples the length of the stretch of one label in one contour to which it belongs."""
    if not len(keep):
        return np.empty(0)
    chain, label = path.chain[samples.move[keep]], by_sample[keep]
    change = (label[1:] != label[:-1]) | (chain[1:] != chain[:-1])
    run = np.cumsum(np.concatenate([[True], change])) - 1
    found: Floats = np.bincount(run, samples.weight[keep])[run]
    return found


def word_of(labels: Labels, move: int) -> str:
    """The label of a move as it is written: climb, conventional, slot, air, plunge, drill, or empty for a rapid."""
    kind = Kind(int(labels.kind[move]))
    if kind is Kind.RAPID or kind is Kind.OTHER:
        return ""
    if kind in (Kind.PLUNGE, Kind.DRILL):
        return kind.word
    return Label(int(labels.by_move[move])).word


def words_by_line(path: Path, labels: Labels) -> dict[int, str]:
    """The label of each program line with feed motion; where a line makes several moves, that of the longest."""
    best: dict[int, tuple[float, str]] = {}
    for move in np.flatnonzero(~path.rapid):
        word, length = word_of(labels, int(move)), float(path.length[move])
        line = int(path.line[move])
        if word and length > best.get(line, (-1.0, ""))[0]:
            best[line] = (length, word)
    return {line: word for line, (_, word) in best.items()}
