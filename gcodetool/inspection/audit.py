"""The audit: everything that can be said about a program before metal is cut."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from gcodetool.inspection import features, findings, force, labels, limits, sizes
from gcodetool.inspection.audit_records import Audit, AxisRow, Feature, Finding, MoveRow, ShareRow, StockTaken
from gcodetool.inspection.cutting_records import (
    Cut,
    Cutters,
    Engagement,
    Flags,
    Floats,
    Forces,
    Hold,
    Holding,
    Kind,
    Label,
    Labels,
    Path,
    Samples,
)
from gcodetool.inspection.durations import durations
from gcodetool.inspection.engagement import Remains, engage
from gcodetool.inspection.job_records import Job
from gcodetool.inspection.stock import take_stock
from gcodetool.inspection.toolpath import read_path
from gcodetool.machine import Machine
from gcodetool.motion.moves import Setup
from gcodetool.program.blocks import blocks_of

CAUTIONS = (
    "Compare, simulate, then run above the work with the spindle off; hand on the stop; first part at reduced feed.",
    "This audit does not know clamps it was not told of, the tool's length, its shank or its holder.",
    "Never exceed the speed marked on a cutter. Keep clear of the cutter; clamp the work; never clear chips by hand.",
)


def labels_by_line(program: bytes, job: Job, setup: Setup) -> dict[int, str]:
    """The label of each program line with feed motion: climb, conventional, slot, air, plunge or drill.

    ``setup`` says what the program does not (units, offsets, lengths).  Raises Refusal and SheetError.
    """
    path = read_path(blocks_of(program), job, setup)
    _, _, marks, _, _ = _label(path, job)
    return labels.words_by_line(path, marks)


def audit(
    program: bytes, job: Job, machine: Machine, setup: Setup, *, name: str = "", every_move: bool = False
) -> Audit:
    """Audit a program.  ``every_move`` asks for a row for each feed motion.  Raises Refusal and SheetError."""
    path = read_path(blocks_of(program), job, setup)
    stock, engagement, marks, cut, remains = _label(path, job)
    samples = engagement.samples
    power = force.forces(path, Cutters.of(job.cutters), samples, engagement.slices, cut, job.material)
    holdings = _holdings(machine, samples, power, cut)
    shapes = features.shapes(path, job.cutters, marks, remains.stands)
    sized = sizes.predict(shapes, sizes.Predictor(path, machine, samples, holdings)) if path.count else []
    times = durations(path, machine)
    envelope = tuple(limits.envelope(path, machine))
    found = [
        *findings.of_assumptions(path, job, machine, stock, power, cut, samples.move),
        *findings.of_sense(path, job, marks, engagement, cut),
        *_limit_findings(path, job, machine, stock, marks, engagement, cut),
        *findings.of_chip(path, job, marks, engagement, cut, power),
        *findings.of_holding(path, machine, marks, samples.move, holdings, force.advice),
        *findings.of_sizes(sized, job.tolerance),
    ]
    return Audit(
        program=name, moves=path.count, feed_moves=int((~path.rapid).sum()), stock=stock,
        tools=tuple(_tool_words(job, path)), material=job.material,
        rows=tuple(_rows(path, marks, engagement, cut, power, holdings)) if every_move else (),
        shares=tuple(_shares(path, job, marks, engagement, times.by_move)),
        flips=tuple((int(path.line[a]), int(path.line[b]), old.word, new.word) for a, b, old, new in marks.flips),
        axes=tuple(_axis_rows(path, machine, samples, holdings)),
        features=tuple(sized), envelope=envelope, durations=times, findings=findings.sorted_findings(found),
        assumptions=tuple(_assumptions(job, sized)), cautions=CAUTIONS,
    )  # fmt: skip


def _label(path: Path, job: Job) -> tuple[StockTaken, Engagement, Labels, Cut, Remains]:
    stock = take_stock(job, path)
    engagement, remains = engage(path, job, stock)
    cut = labels.figures(engagement.samples, engagement.slices)
    return stock, engagement, labels.label_moves(path, Cutters.of(job.cutters), engagement, cut), cut, remains


def _holdings(machine: Machine, samples: Samples, power: Forces, cut: Cut) -> list[Holding]:
    cutting: Flags = (cut.area > 0.0) & ~samples.vertical
    found = []
    for letter, component, push in (("X", samples.fx, power.fx), ("Y", samples.fy, power.fy), ("Z", None, power.fz)):
        way = np.zeros(len(cutting)) if component is None else force.ways(component)
        found.append(force.hold(machine.axis(letter), np.where(cutting, push, 0.0), way, cutting))
    return found


def _limit_findings(
    path: Path, job: Job, machine: Machine, stock: StockTaken, marks: Labels, engagement: Engagement, cut: Cut
) -> Iterator[Finding]:
    def line(move: int) -> int:
        return int(path.line[move])

    hits = limits.rapids_in_material(path, marks, engagement, cut.area)
    words = [f"a rapid meets material: {hit.value:.2f} mm2 of the cutter's face" for hit in hits]
    yield from findings.places(301, [line(hit.move) for hit in hits], words)
    envelope = limits.envelope(path, machine)
    low = next((limits.reserve_below(axis) for axis in envelope if axis.axis == "Z"), None)
    yield from findings.of_travel(envelope, [limits.beyond(axis) for axis in envelope], low)
    for hit in limits.keep_out_hits(path, job.cutters, job.keep_outs):
        yield findings.finding(304, line(hit.move), f"the cutter comes {hit.value:.3f} mm into {hit.name}")
    fast = limits.too_fast(path, machine)
    if fast:
        share = f"{100 * fast[0].value:.0f} % of its largest feed{findings.worst_of(len(fast))}"
        text = f"axis {fast[0].name} is asked for {share}"
        yield findings.finding(305, line(fast[0].move), text, count=len(fast))
    for hit in limits.speeds(path, job):
        code = 307 if hit.name.startswith("marked") else 306
        yield findings.finding(code, line(hit.move), f"S{hit.value:g}, {hit.name} rpm")
    for hit in limits.below_stock(path, stock):
        yield findings.finding(308, line(hit.move), f"{hit.value:.3f} mm below the bottom of the stock")


# ---- tables ----------------------------------------------------------------------------------------------------------


def _tool_words(job: Job, path: Path) -> Iterator[str]:
    for tool in np.unique(path.tool[~path.rapid]).tolist():
        cutter = job.cutters[tool]
        name = "tool" if cutter.number == "*" else f"T{cutter.number}"
        hand = ", left-hand" if cutter.hand < 0 else ""
        yield f"{name}: {cutter.shape} {cutter.diameter:g} mm, {cutter.flutes} flutes{hand}"


def _shares(path: Path, job: Job, marks: Labels, engagement: Engagement, time: Floats) -> Iterator[ShareRow]:
    """Length and time by label, for each tool and for all: vertical motion as plunge, rubbing as spring pass."""
    names = [*(label.word for label in Label), "spring pass", "plunge"]
    table = np.zeros((2, len(job.cutters), len(names)))
    samples = engagement.samples
    rate = np.divide(time, path.length, out=np.zeros(path.count), where=path.length > 0.0)
    kind = marks.by_sample.copy()
    kind[labels.rubbing(engagement, marks.by_sample) > 0.0] = len(Label)
    upright = (marks.kind == Kind.PLUNGE) | (marks.kind == Kind.DRILL)
    kind[upright[samples.move]] = len(Label) + 1
    feed = ~path.rapid[samples.move]
    tool, column, weight = path.tool[samples.move][feed], kind[feed], samples.weight[feed]
    np.add.at(table[0], (tool, column), weight)
    np.add.at(table[1], (tool, column), weight * rate[samples.move[feed]])
    seen = np.bincount(samples.move, samples.weight, path.count)
    rest = np.flatnonzero(~path.rapid & ~path.turning & (seen == 0.0))
    np.add.at(table[0], (path.tool[rest], np.zeros(len(rest), np.int64)), path.length[rest])
    np.add.at(table[1], (path.tool[rest], np.zeros(len(rest), np.int64)), time[rest])
    whole = table.sum(axis=(1, 2))
    for tool_index, cutter in enumerate(job.cutters):
        for column_index, name in enumerate(names):
            length, spent = table[:, tool_index, column_index]
            if length > 0.0:
                yield ShareRow(
                    cutter.number, name, float(length), float(spent), float(length / whole[0]),
                    float(spent / whole[1]) if whole[1] > 0.0 else 0.0,
                )  # fmt: skip


def _axis_rows(path: Path, machine: Machine, samples: Samples, holdings: list[Holding]) -> Iterator[AxisRow]:
    feed = ~path.rapid[samples.move]
    for holding in holdings:
        if not machine.axis(holding.axis).lash:
            continue
        length = [float(samples.weight[feed & (holding.verdict == verdict)].sum()) for verdict in Hold]
        ratio = np.where(feed, np.nan_to_num(holding.ratio), 0.0)
        worst = int(np.argmax(ratio)) if len(ratio) else -1
        line = int(path.line[samples.move[worst]]) if worst >= 0 and ratio[worst] > 0.0 else 0
        yield AxisRow(
            holding.axis, length[Hold.HELD], length[Hold.UNKNOWN], length[Hold.DOUBTFUL], length[Hold.DRAGGED],
            float(ratio[worst]) if worst >= 0 else 0.0, line, force.threshold_words(machine.axis(holding.axis)),
        )  # fmt: skip


def _rows(
    path: Path, marks: Labels, engagement: Engagement, cut: Cut, power: Forces, holdings: list[Holding]
) -> Iterator[MoveRow]:
    """One row for each feed motion: means over its cutting length, outermost angles, worst verdicts."""
    samples = engagement.samples
    starts = np.searchsorted(samples.move, np.arange(path.count + 1))
    for move in np.flatnonzero(~path.rapid & ~path.turning).tolist():
        part = slice(int(starts[move]), int(starts[move + 1]))
        weight = samples.weight[part] * (cut.area[part] > 0.0)
        first, last = cut.first[part], cut.last[part]
        engaged = bool(weight.sum() > 0.0)
        upright = marks.kind[move] in (Kind.PLUNGE, Kind.DRILL)
        yield MoveRow(
            line=int(path.line[move]), kind=Kind(int(marks.kind[move])).word, label=labels.word_of(marks, move),
            spring=bool(marks.spring[move]), length=float(path.length[move]),
            first_angle=float(np.degrees(np.nanmin(first))) if engaged else float("nan"),
            last_angle=float(np.degrees(np.nanmax(last))) if engaged else float("nan"),
            width=_mean(cut.width[part], weight), depth=_mean(cut.depth[part], weight),
            removed=float(engagement.volume[part].sum() if upright else (cut.area[part] * samples.weight[part]).sum()),
            chip_load=_mean(power.chip_load[part], weight), mean_chip=_mean(power.mean_chip[part], weight),
            along=_mean(power.along[part], weight), side=_mean(power.side[part], weight),
            force=(_mean(power.fx[part], weight), _mean(power.fy[part], weight), _mean(power.fz[part], weight)),
            holds={each.axis: Hold(int(each.verdict[part].max(initial=0))).word for each in holdings},
        )  # fmt: skip


def _mean(values: Floats, weight: Floats) -> float:
    whole = float(weight.sum())
    return float((np.where(weight > 0.0, values, 0.0) * weight).sum() / whole) if whole > 0.0 else float("nan")


FORCE = """\
Forces are estimates of the mean over a turn for {name} ({source}): expect {low:g} to {high:g} times the figures.
A sharp edge, no runout, no chatter and the programmed feed are assumed; a dull edge doubles them.
They are no proof that a cut is safe."""
LABELS = """\
Labels and engagement assume the stock and the cutter diameters stated here, a rigid cutter, and that all that was
cut is gone."""
SIZES = """\
Sizes are estimates of the lash model alone: the lash entered, friction holding the axes except where a drag is told,
no deflection, no thermal growth, cutter diameter as stated.
The range of a size covers the stated uncertainty of the lash and dragging, nothing else."""


def _assumptions(job: Job, sized: list[Feature]) -> Iterator[str]:
    """What belongs beside every force and size, one sentence after the other."""
    material = job.material
    if material is not None:
        yield _flowing(FORCE.format(name=material.name, source=material.source, low=material.low, high=material.high))
    yield _flowing(LABELS)
    if sized:
        yield _flowing(SIZES)


def _flowing(text: str) -> str:
    return text.replace("\n", " ")
