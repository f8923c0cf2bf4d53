"""The ``measure`` verb: programs that make the lash visible; what is read off becomes an entry of the machine sheet.

Modules of ``inspection`` are imported where a command needs them, so that other verbs start without numpy.
"""

from __future__ import annotations

import datetime
import json
from dataclasses import dataclass
from typing import TYPE_CHECKING, Annotated

import typer

from gcodetool.cli import measure_programs
from gcodetool.cli.exit_codes import ExitCode
from gcodetool.cli.options import ForceOption
from gcodetool.cli.streams import draft, open_source
from gcodetool.cli.tables import show, show_table
from gcodetool.cli.terminal import say
from gcodetool.errors import SheetError
from gcodetool.machine import decode_sheet, parse_sheet
from gcodetool.report import measuring
from gcodetool.sheet_edit import FormerLash, Value, current_lash, lash_history, set_values, write_lash

if TYPE_CHECKING:
    from gcodetool.inspection.measure_records import Evaluation, Finding, LashEstimate, Trend

app = typer.Typer(
    no_args_is_help=True, rich_markup_mode=None, help="Measure the lash: programs, readings, coupons, trend."
)
app.command("indicator")(measure_programs.indicator)
app.command("vernier")(measure_programs.vernier)
app.command("tongues")(measure_programs.tongues)

AxisArgument = Annotated[str, typer.Argument(metavar="AXIS", help="The axis: x y z a b c.")]
JsonOption = Annotated[bool, typer.Option("--json", help="Print one JSON object instead of tables.")]
WriteOption = Annotated[
    str | None, typer.Option("--write", metavar="SHEET", help="Write the lash into this sheet; the old one is kept.")
]
DateOption = Annotated[
    str | None, typer.Option("--date", metavar="YYYY-MM-DD", help="When it was measured; today if not said.")
]
MethodOption = Annotated[str | None, typer.Option("--method", metavar="TEXT", help="How, in words, for the sheet.")]


@app.command("evaluate")
def evaluate(
    readings: Annotated[str, typer.Argument(metavar="READINGS", help="The form, filled in; - for standard input.")],
    axis: Annotated[str | None, typer.Option("--axis", help="The axis, where the form does not name it.")] = None,
    resolution: Annotated[float | None, typer.Option(help="Last digit of the indicator, in the form's unit.")] = None,
    accuracy: Annotated[float | None, typer.Option(help="Limit of its error, plus or minus, in that unit.")] = None,
    hysteresis: Annotated[float | None, typer.Option(help="Limit of its own reversal error, in that unit.")] = None,
    misalignment: Annotated[float | None, typer.Option(help="Largest angle to the axis in degrees; 5.")] = None,
    radius: Annotated[float | None, typer.Option(help="Rotary axis: distance of the indicator, mm.")] = None,
    write: WriteOption = None,
    accept: Annotated[bool, typer.Option("--accept", help="Write even where readings are doubtful.")] = False,
    date: DateOption = None,
    method: MethodOption = None,
    svg: Annotated[str | None, typer.Option("--svg", metavar="FILE", help="Draw the two directions.")] = None,
    force: ForceOption = False,
    as_json: JsonOption = False,
) -> None:
    """Evaluate indicator readings by ISO 230-2 and tell the lash with its uncertainty.

    Exit code 1 where readings are doubtful: then the sheet is only written with --accept.
    """
    from gcodetool.inspection import iso230, readings_findings, uncertainty
    from gcodetool.inspection.readings import instrument_of, read_readings

    data = read_readings(_text_of(readings), axis=axis, radius=radius)
    given = {"resolution": resolution, "accuracy": accuracy, "hysteresis": hysteresis, "misalignment": misalignment}
    _check_sizes(given)
    instrument = instrument_of(data, **given)
    result = iso230.evaluate(data)
    lash = uncertainty.lash_from_readings(result, instrument, method or _indicator_method(result))
    found = readings_findings.findings(data, result, lash, instrument.resolution)
    doubtful = any(finding.code in readings_findings.DOUBTFUL for finding in found)
    change = None if write is None or (doubtful and not accept) else _changed(write, lash, date)
    if svg is not None:
        _draw(result, svg, force)
    if as_json:
        show(json.dumps(measuring.evaluation_json(result, lash, found)))
    else:
        _show_evaluation(result, lash, found)
    if change is not None:
        change.write()
    elif write is not None:
        say(f"{write} was left as it was: look at the readings first, or say --accept")
    if doubtful:
        raise typer.Exit(ExitCode.FINDINGS)


@app.command("read")
def read(
    axis: AxisArgument,
    line: Annotated[
        list[float] | None, typer.Option("--line", metavar="K", help="Vernier: line that runs through; repeatable.")
    ] = None,
    step: Annotated[float, typer.Option("--step", help="Vernier: lash of one line, mm.")] = 0.02,
    wide: Annotated[list[float] | None, typer.Option("--wide", metavar="W", help="Tongue wide; repeatable.")] = None,
    same: Annotated[list[float] | None, typer.Option("--same", metavar="W", help="Tongue same; repeatable.")] = None,
    narrow: Annotated[
        list[float] | None, typer.Option("--narrow", metavar="W", help="Tongue narrow; repeatable.")
    ] = None,
    accuracy: Annotated[float | None, typer.Option(help="Limit of the caliper's error; 0.02 mm if not said.")] = None,
    resolution: Annotated[float | None, typer.Option(help="Last digit of the caliper; 0.01 mm if not said.")] = None,
    inch: Annotated[bool, typer.Option("--inch", help="Widths, accuracy and resolution are in inches.")] = False,
    write: WriteOption = None,
    date: DateOption = None,
    method: MethodOption = None,
    as_json: JsonOption = False,
) -> None:
    """Turn what a coupon shows into the lash with its uncertainty: --line for the vernier, else tongue widths."""
    from gcodetool.inspection import uncertainty

    letter = _coupon_axis(axis)
    if line and (wide or same or narrow):
        raise SheetError("give the line of a vernier or the widths of tongues, not both.")
    _check_sizes({"step": step, "accuracy": accuracy, "resolution": resolution})
    if not all(abs(each) < 1000 for each in (*(line or ()), *(wide or ()), *(same or ()), *(narrow or ()))):
        raise SheetError("a line or a width is out of reach: write bare numbers below 1000.")
    if line:
        lash = uncertainty.lash_from_vernier(letter, line, step, method or f"vernier coupon, step {step:g}")
    else:
        scale = 25.4 if inch else 1.0
        widths = {
            name: [scale * each for each in given or ()]
            for name, given in (("wide", wide), ("same", same), ("narrow", narrow))
        }
        lash = uncertainty.lash_from_tongues(
            letter,
            **widths,
            accuracy=0.02 if accuracy is None else accuracy * scale,
            resolution=0.01 if resolution is None else resolution * scale,
            method=method or "tongue coupon, caliper",
        )
    change = None if write is None else _changed(write, lash, date)
    if as_json:
        show(json.dumps(measuring.lash_json(lash)))
    else:
        _show_lash(lash)
    if change is not None:
        change.write()


@app.command("trend")
def trend(
    sheet: Annotated[str, typer.Argument(metavar="SHEET", help="The machine sheet; - for standard input.")],
    as_json: JsonOption = False,
) -> None:
    """Show how the lash of each axis went, from the history in the sheet."""
    text = _sheet_text(sheet)
    trends = [(_trend_of(text, letter), _undated(text, letter)) for letter in parse_sheet(text, sheet).axes]
    if as_json:
        show(json.dumps({"trends": [measuring.trend_json(each) for each, _ in trends]}))
        return
    for each, undated in trends:
        show_table(f"lash of {each.axis}", measuring.TREND_COLUMNS, measuring.trend_rows(each, undated))
        show(measuring.trend_sentence(each), "")


@app.command("force")
def force_of(
    axis: AxisArgument,
    sheet: Annotated[str, typer.Argument(metavar="SHEET", help="The machine sheet to write into.")],
    friction: Annotated[
        list[str] | None, typer.Option("--friction", metavar="F", help="Pull that moves the axis; repeatable.")
    ] = None,
    jump: Annotated[
        list[str] | None, typer.Option("--jump", metavar="F", help="Pull against the spring at which it jumps.")
    ] = None,
    stiff_side: Annotated[
        str | None, typer.Option("--stiff-side", metavar="+|-", help="Side on which the nut does not give way.")
    ] = None,
    unit: Annotated[str, typer.Option("--unit", help="Unit of the pulls: N, kgf, lbf.")] = "N",
) -> None:
    """Write friction and preload of an axis, measured with a spring scale, into the machine sheet."""
    from gcodetool.inspection.spring_force import in_newtons, preload_and_friction

    if stiff_side not in (None, "+", "-"):
        raise SheetError(f"--stiff-side {stiff_side}: write + or -.")
    if jump and stiff_side is None:
        raise SheetError("name the side on which the nut does not give way: --stiff-side + or -")
    pulls = [in_newtons([measure_programs.decimal(each) for each in given or ()], unit) for given in (jump, friction)]
    preload, drag = preload_and_friction(*pulls)
    changes: dict[str, Value | None] = {"friction": drag}
    if preload is not None:
        changes |= {"preload": preload, "stiff_side": stiff_side}
    _rewrite(sheet, set_values(_sheet_text(sheet), axis.upper(), changes))
    show(f"{axis.upper()}: friction {drag} N, preload {'not measured' if preload is None else f'{preload} N'}")


def _text_of(path: str) -> str:
    """The text of a form; one that is not UTF-8 was saved by an older program as latin-1."""
    with open_source(path) as source:
        data = source.binary.read()
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return data.decode("latin-1")


def _sheet_text(path: str) -> str:
    """The text of a sheet that is good; raises SheetError where it is not."""
    with open_source(path) as source:
        text = decode_sheet(source.binary.read())
    parse_sheet(text, path)
    return text


def _check_sizes(given: dict[str, float | None]) -> None:
    for name, value in given.items():
        if value is not None and not 0 <= value < 1000:
            raise SheetError(f"--{name} {value}: write a size of zero or more.")


def _coupon_axis(axis: str) -> str:
    letter = axis.upper()
    if letter not in ("X", "Y"):
        raise SheetError(f"axis {axis}: a coupon reads X and Y; for another axis use an indicator.")
    return letter


def _indicator_method(result: Evaluation) -> str:
    runs = max((min(target.n_up, target.n_down) for target in result.targets), default=0)
    return f"indicator, {len(result.targets)} targets, {runs} runs from each side"


def _draw(result: Evaluation, path: str, force: bool) -> None:
    from gcodetool.report.measuring_svg import chart_svg

    with draft(path, force=force) as drawing:
        drawing.write(chart_svg(result, f"Axis {result.axis}: deviations of the two directions").encode())
        drawing.release()


def _show_evaluation(result: Evaluation, lash: LashEstimate, found: list[Finding]) -> None:
    title = f"Axis {result.axis}, {result.unit}; clauses of ISO 230-2:2006"
    show_table(title, measuring.TARGET_COLUMNS, measuring.target_rows(result))
    show("", *measuring.chart(result), "")
    show_table("Figures of the axis", measuring.FIGURE_COLUMNS, measuring.figure_rows(result))
    if not result.common_zero:
        show("E, M and A are not stated: the indicator was set anew at each target.")
    show("")
    _show_lash(lash)
    show(*(f"{finding.code}: {finding.text}" for finding in found))


def _show_lash(lash: LashEstimate) -> None:
    title = f"Uncertainty of the lash, {lash.unit} (JCGM 100)"
    show_table(title, measuring.BUDGET_COLUMNS, measuring.budget_rows(lash))
    show(*measuring.lash_sentences(lash))


@dataclass(frozen=True, slots=True)
class _Change:
    """A sheet with a lash measured anew, not written yet."""

    path: str
    text: str
    axis: str

    def write(self) -> None:
        """Put it in place, and say so with the trend."""
        _rewrite(self.path, self.text)
        value = current_lash(self.text, self.axis)
        if value is not None:
            say(f"{self.path}: axis {self.axis} has lash {value.lash} +- {value.uncertainty}")
        if lash_history(self.text, self.axis):
            say(measuring.trend_sentence(_trend_of(self.text, self.axis)))


def _changed(path: str, lash: LashEstimate, date: str | None) -> _Change:
    """The sheet with that lash, the former one kept as history; every fault is told before anything is shown."""
    from gcodetool.inspection.uncertainty import rounded

    value, spread = rounded(lash)
    text = write_lash(_sheet_text(path), lash.axis, FormerLash(value, spread, _date(date), lash.method))
    parse_sheet(text, path)
    return _Change(path, text, lash.axis)


def _date(text: str | None) -> datetime.date:
    if text is None:
        return datetime.date.today()
    try:
        return datetime.date.fromisoformat(text)
    except ValueError:
        raise SheetError(f"--date {text}: write a date such as 2024-05-31.") from None


def _rewrite(path: str, text: str) -> None:
    """Put the sheet in place of the old one, whole or not at all; a byte order mark stays."""
    if path == "-":
        raise SheetError("a sheet is written into its own file: name the file.")
    with open_source(path) as source:
        mark = b"\xef\xbb\xbf" if source.binary.read(3) == b"\xef\xbb\xbf" else b""
    with draft(path, force=True) as sheet:
        sheet.write(mark + text.encode())
        sheet.release()


def _trend_of(text: str, letter: str) -> Trend:
    from gcodetool.inspection.lash_trend import trend as trend_of

    return trend_of(letter, _all_values(text, letter))


def _all_values(text: str, letter: str) -> list[FormerLash]:
    present = current_lash(text, letter)
    return [*lash_history(text, letter), *([] if present is None else [present])]


def _undated(text: str, letter: str) -> list[FormerLash]:
    return [value for value in _all_values(text, letter) if value.measured is None]
