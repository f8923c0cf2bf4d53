"""The findings of an audit: what each code means, and how results become findings.

Ranges: 1xx what had to be assumed, 2xx spindle and sense of the cut, 3xx limits and collisions, 4xx the chip, 5xx
lash and force, 7xx sizes.  A code never changes its meaning.  docs/audit.md explains each; a test holds that page and
this table together.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from gcodetool.inspection.audit_records import AxisEnvelope, Feature, Finding, Severity, StockTaken
from gcodetool.inspection.cutting_records import (
    Cut,
    Engagement,
    Flags,
    Floats,
    Forces,
    Hold,
    Holding,
    Ints,
    Label,
    Labels,
    Path,
)
from gcodetool.inspection.job_records import Job
from gcodetool.machine import Machine

NOTE, CAUTION, DANGER = Severity.NOTE, Severity.CAUTION, Severity.DANGER
# as many places of one code are told one by one; the rest is counted
MOST_PLACES = 10
# a slot deeper than this many diameters is told
DEEP_SLOT = 1.0
# travel left below the deepest point from which on nothing is said, mm
RESERVE = 2.0


@dataclass(frozen=True, slots=True)
class Code:
    """One code: what it is about, and what to do."""

    number: int
    severity: Severity
    title: str
    action: str


CODES = {
    code.number: code
    for code in (
        Code(101, NOTE, "the top of the stock was guessed", "State it: --stock-top Z, or top in the job sheet"),
        Code(
            102, NOTE, "the outline of the stock was guessed", "State it: --stock, or the stock table of the job sheet"
        ),
        Code(
            103, NOTE, "no material was given, so no force is estimated", "State it: --material NAME, or the job sheet"
        ),
        Code(
            104,
            NOTE,
            "chip and force need feed, speed and flutes",
            "Write F and S into the program, or give --speed and --feed",
        ),
        Code(
            105, NOTE, "friction is not in the machine sheet", "Measure it with a spring scale and put it in the sheet"
        ),
        Code(
            106,
            CAUTION,
            "motion of a rotary axis is not followed",
            "Judge this motion yourself; nothing here includes it",
        ),
        Code(
            107,
            NOTE,
            "no lash was given, so sizes come out as intended",
            "Name the machine sheet, or give --lash x=0.12",
        ),
        Code(108, CAUTION, "work offsets of unknown place are used", "State each: --offset G54:x=.. --offset G55:x=.."),
        Code(201, DANGER, "the spindle does not turn in a cut", "Start it with S and M3 before the first cut"),
        Code(
            202,
            DANGER,
            "the cutter turns the wrong way for its hand",
            "Use M3 with a right-hand cutter, M4 with a left-hand one",
        ),
        Code(
            203,
            CAUTION,
            "climb and conventional change inside a contour",
            "Expect a step in the wall; cut the contour one way",
        ),
        Code(204, NOTE, "a pass removes nothing and only rubs", "Keep it if it is meant as a spring pass"),
        Code(301, DANGER, "a rapid meets material", "Lift the cutter before this move, or make it a feed motion"),
        Code(302, DANGER, "an axis leaves its travel", "Move the work zero, or use another machine"),
        Code(
            303,
            DANGER,
            "the program is larger than the travel of an axis",
            "Cut it in two settings, or on another machine",
        ),
        Code(304, DANGER, "the cutter enters a keep-out area", "Move the clamp, or lift the cutter over it"),
        Code(305, CAUTION, "a feed is above the limit of an axis", "Reduce F; the machine will not reach it"),
        Code(306, CAUTION, "a spindle speed is outside the machine's range", "Choose S within the range"),
        Code(307, DANGER, "a spindle speed is above what is marked on the cutter", "Reduce S below the mark"),
        Code(308, CAUTION, "the cut goes below the stock", "Check the depth; a backing board must lie below"),
        Code(309, NOTE, "machine positions are not known", "State the work offset: --offset G54:x=-150"),
        Code(
            310, CAUTION, "little Z travel is left below the deepest point", "Raise the work or hold the cutter longer"
        ),
        Code(401, CAUTION, "the chip is so thin that the edge rubs", "Raise F, reduce S, or take a wider cut"),
        Code(402, CAUTION, "the chip is thick for a light machine", "Reduce F, or raise S"),
        Code(403, CAUTION, "a slot is deeper than the cutter is wide", "Cut it in several depths"),
        Code(501, DANGER, "the cut drags an axis across its lash", "See the text of the finding"),
        Code(502, CAUTION, "the cut comes near to dragging an axis", "Cut lighter there, or tighten spring or slide"),
        Code(701, CAUTION, "a size will be wrong without compensation", "Run compensate on the program"),
        Code(
            702,
            CAUTION,
            "a size may be wrong even with compensation",
            "Measure the lash better, or keep the cut from dragging",
        ),
    )
}


def finding(code: int, line: int, text: str, action: str = "", count: int = 1) -> Finding:
    """A finding of a code of the table."""
    entry = CODES[code]
    return Finding(code, entry.severity, line, text, action or entry.action, count)


def worst_of(count: int) -> str:
    """The remark that a finding stands for more than one move."""
    return f" (worst of {count} moves)" if count > 1 else ""


def sorted_findings(found: Iterable[Finding]) -> tuple[Finding, ...]:
    """Worst severity first, then by line."""
    return tuple(sorted(found, key=lambda each: (-each.severity.rank, each.code, each.line)))


def places(code: int, lines: Sequence[int], texts: Sequence[str], action: str = "") -> Iterator[Finding]:
    """One finding for each place, the rest as one with their number."""
    for line, text in list(zip(lines, texts, strict=True))[:MOST_PLACES]:
        yield finding(code, line, text, action)
    rest = len(lines) - MOST_PLACES
    if rest > 0:
        yield finding(
            code, lines[MOST_PLACES], f"{CODES[code].title}: {rest} more places, the first of them here", action, rest
        )


def of_assumptions(
    path: Path, job: Job, machine: Machine, stock: StockTaken, forces: Forces, cut: Cut, moves: Ints
) -> Iterator[Finding]:
    """1xx: what had to be assumed or left out."""
    for code, said in zip((101, 102) if job.stock.top is None else (102,), stock.said, strict=False):
        yield finding(code, 0, said)
    engaged = cut.area > 0.0
    if job.material is None:
        yield finding(103, 0, CODES[103].title)
    if engaged.any() and np.isnan(forces.chip_load[engaged]).any():
        where = moves[engaged & np.isnan(forces.chip_load)]
        yield finding(
            104, int(path.line[where[0]]), "feed or spindle speed is not known here", count=len(np.unique(where))
        )
    if len(path.systems) > 1 and not path.placed:
        words = " ".join(path.systems)
        yield finding(108, 0, f"{words} are taken to be at one place, so what is cut in one counts as cut in all")
    turning = np.flatnonzero(path.turning)
    if len(turning):
        yield finding(106, int(path.line[turning[0]]), "a rotary axis moves: left out", count=len(turning))
    lashed = [letter for letter in "XYZ" if machine.axis(letter).lash]
    if not lashed:
        yield finding(107, 0, CODES[107].title)
    for letter in lashed:
        axis = machine.axis(letter)
        if axis.friction is None and not axis.preload:
            yield finding(
                105, 0, f"axis {letter}: neither friction nor preload is known, so nobody can say whether it holds"
            )


def of_sense(path: Path, job: Job, labels: Labels, engagement: Engagement, cut: Cut) -> Iterator[Finding]:
    """2xx: spindle, hand, flips, spring passes."""
    cutting = np.zeros(path.count, np.bool_)
    cutting[engagement.samples.move[(cut.area > 0.0) | (engagement.buried > 0.0)]] = True
    cutting &= ~path.rapid
    still = np.flatnonzero(cutting & (path.sense == 0))
    if len(still):
        yield finding(201, int(path.line[still[0]]), "the cutter meets material before M3 or M4", count=len(still))
    hands = np.array([cutter.hand for cutter in job.cutters] or [1])[path.tool]
    wrong = np.flatnonzero(cutting & (path.sense != 0) & (path.sense != hands))
    if len(wrong):
        word = "M4" if path.sense[wrong[0]] < 0 else "M3"
        hand = "right" if hands[wrong[0]] > 0 else "left"
        text = f"{word} with a {hand}-hand cutter: it does not cut. Labels are those of the right sense"
        yield finding(202, int(path.line[wrong[0]]), text, count=len(wrong))
    words = [
        f"the contour changes: {before.word} before, {after.word} from here" for _, _, before, after in labels.flips
    ]
    yield from places(203, [int(path.line[b]) for _, b, _, _ in labels.flips], words)
    rubbing = np.flatnonzero(labels.spring)
    if len(rubbing):
        text = f"{len(rubbing)} moves run along a face that was cut before and remove nothing"
        yield finding(204, int(path.line[rubbing[0]]), text, count=len(rubbing))


def of_travel(envelope: Sequence[AxisEnvelope], beyond: Sequence[float], reserve: float | None) -> Iterator[Finding]:
    """302, 303, 309, 310: positions against the travel of the sheet."""
    for axis, over in zip(envelope, beyond, strict=True):
        if over > 1e-9 and axis.travel is not None:
            code = 302 if axis.placed else 303
            span = f"{axis.low:.3f} to {axis.high:.3f}" if axis.placed else f"a span of {axis.high - axis.low:.3f} mm"
            limit = f"travel {axis.travel[0]:g} to {axis.travel[1]:g}"
            yield finding(code, 0, f"axis {axis.axis}: {span}, take-ups and settles included; {limit}")
    open_ = [axis.axis for axis in envelope if axis.travel is not None and not axis.placed]
    if open_:
        yield finding(
            309, 0, f"axes {' '.join(open_)}: only the size of the program was compared with the travel, not its place"
        )
    if reserve is not None and 0.0 <= reserve < RESERVE:
        yield finding(310, 0, f"{reserve:.3f} mm of Z travel are left below the deepest point")


def of_chip(
    path: Path, job: Job, labels: Labels, engagement: Engagement, cut: Cut, forces: Forces
) -> Iterator[Finding]:
    """4xx: chips too thin or too thick, deep slots."""
    moves, material = engagement.samples.move, job.material
    cutting = ~path.rapid[moves] & (labels.by_sample != Label.AIR)
    if material is not None:
        largest = np.nan_to_num(forces.chip_load / forces.thinning, nan=np.inf)
        least, most = material.least_chip, material.most_chip or np.inf
        thin = cutting & (largest < least)
        words = f"um at its thickest, less than {1000 * least:g} um"
        yield from _worst(401, path, moves, thin, -largest, lambda k: f"the chip is {1000 * largest[k]:.1f} {words}")
        thick = cutting & (forces.chip_load > most)
        load = forces.chip_load
        yield from _worst(402, path, moves, thick, load, lambda k: f"{load[k]:.4f} mm per tooth, more than {most:g} mm")
    wide = 2.0 * np.array([cutter.radius for cutter in job.cutters] or [0.0])[path.tool[moves]]
    deep = cutting & (labels.by_sample == Label.SLOT) & (cut.depth > DEEP_SLOT * wide)
    yield from _worst(403, path, moves, deep, cut.depth, lambda k: f"{cut.depth[k]:.3f} mm deep, cutter {wide[k]:g} mm")


def _worst(
    code: int, path: Path, moves: Ints, mark: Flags, size: Floats, words: Callable[[int], str]
) -> Iterator[Finding]:
    """One finding at the worst of the marked samples, with the number of moves."""
    rows = np.flatnonzero(mark)
    if len(rows):
        k = int(rows[np.argmax(size[rows])])
        count = len(np.unique(moves[rows]))
        yield finding(code, int(path.line[moves[k]]), f"{words(k)}{worst_of(count)}", count=count)


def of_holding(
    path: Path,
    machine: Machine,
    labels: Labels,
    moves: Ints,
    holdings: Sequence[Holding],
    advice: Callable[[Label, float], str],
) -> Iterator[Finding]:
    """5xx: axes that the cut drags, or nearly; one finding for each axis, verdict and label, at its worst place."""
    for holding in holdings:
        lash = machine.axis(holding.axis).lash
        for code, verdict in ((501, Hold.DRAGGED), (502, Hold.DOUBTFUL)):
            for label in Label:
                mark = (holding.verdict == verdict) & (labels.by_sample == label) & ~path.rapid[moves]
                rows = np.flatnonzero(mark)
                if not len(rows):
                    continue
                k = int(rows[np.argmax(holding.ratio[rows])])
                count = len(np.unique(moves[rows]))
                share = f"{100.0 * min(holding.ratio[k], 99.0):.0f} % of what holds it"
                text = f"axis {holding.axis}, {label.word}: the mean force reaches {share}{worst_of(count)}"
                if verdict == Hold.DRAGGED:
                    text += f"; a compensated move is then wrong by up to {lash} mm"
                action = advice(label, float(holding.ratio[k])) if verdict == Hold.DRAGGED else ""
                yield finding(code, int(path.line[moves[k]]), text, action, count)


def of_sizes(features: Sequence[Feature], tolerance: float) -> Iterator[Finding]:
    """7xx: sizes outside the tolerance."""
    wrong = [feature for feature in features if feature.worst > tolerance]
    yield from places(701, [each.lines[0] for each in wrong], [_size_words(each) for each in wrong])
    left = sorted((each for each in features if each.worst_after > tolerance), key=lambda each: -each.worst_after)
    yield from places(702, [each.lines[0] for each in left], [_size_words(each, after=True) for each in left])


def _size_words(feature: Feature, after: bool = False) -> str:
    rows = [each for each in feature.measures if each.counts]
    worst = max(rows, key=lambda each: abs(each.error_after if after else each.error_before))
    error = worst.error_after if after else worst.error_before
    return f"{feature.name}: {worst.name} off by {error:+.3f} mm"
