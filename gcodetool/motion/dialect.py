"""The code table: what each G and M word is, as data.  The interpreter, the refusals and the docs page all read it.

Groups follow NISTIR 6556, table 4, with the words of ISO 6983-1 that real programs carry.  A code with a refusal
cannot be rewritten safely; the refusal says why and the way out.  A G code that is not in the table is refused as
unknown; an M code that is not in the table passes with a caution.
"""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Code:
    """One G or M code: its modal group, what it does to what is known, and why it is refused if it is."""

    word: str
    group: str
    effect: str
    reason: str = ""
    way_out: str = ""


AXES = "XYZABC"
LINEAR = "XYZ"
ROTARY = "ABC"
PLANE_AXES = {"G17": ("X", "Y", "Z"), "G18": ("Z", "X", "Y"), "G19": ("Y", "Z", "X")}
CENTRE_LETTER = {"X": "I", "Y": "J", "Z": "K"}
CYCLES = ("G73", "G81", "G82", "G83", "G84", "G85", "G86", "G87", "G88", "G89")

PROBES = ("G38.2", "G38.3", "G38.4", "G38.5")
FRAME_WORDS = frozenset({"G92", "G92.1", "G92.2", "G92.3", "G10", "G52"})

_OUT_CAM = "Let the CAM system write plain moves for it"
_OUT_EXPAND = "Write the moves out, without subprograms, loops or variables"


def _codes() -> list[Code]:
    table = [
        Code("G0", "motion", "rapid: the shift of each axis is folded into its target; an unknown side is settled"),
        Code("G1", "motion", "straight feed: one take-up block where an axis reverses, then the shifted block"),
        Code("G2", "motion", "clockwise arc: split where a plane axis reverses, take-up there, true arcs again"),
        Code("G3", "motion", "counter-clockwise arc: as G2"),
        Code("G80", "motion", "ends a cycle; together with G0 to G3 on one line it leaves that motion mode"),
        Code("G4", "one line", "dwell: passes; X and P on it are times"),
        Code("G17", "plane", "XY plane for arcs"),
        Code("G18", "plane", "ZX plane for arcs"),
        Code("G19", "plane", "YZ plane for arcs"),
        Code("G20", "units", "inches"),
        Code("G21", "units", "millimetres"),
        Code("G70", "units", "inches (ISO 6983-1)"),
        Code("G71", "units", "millimetres (ISO 6983-1)"),
        Code("G90", "distance", "absolute targets"),
        Code("G91", "distance", "incremental targets; a word changes by the change of shift"),
        Code("G90.1", "centre", "absolute arc centres: I, J, K are shifted with their axis"),
        Code("G91.1", "centre", "incremental arc centres (the default): I, J, K are left alone"),
        Code("G28", "one line", "to the home point: the via point is shifted; position and side unknown after it"),
        Code("G30", "one line", "to the second home point: as G28"),
        Code("G53", "one line", "machine coordinates: nothing is shifted; position and side unknown after it"),
        Code("G43", "length", "tool length: position of Z unknown after it; with Z it is a move"),
        Code("G43.1", "length", "tool length given in the block: Z is re-based where both lengths are known"),
        Code("G49", "length", "tool length off: position of Z unknown after it unless it was known to be off"),
        Code("G93", "feed mode", "inverse time: the shares of a split block add up to its time"),
        Code("G94", "feed mode", "feed per minute"),
        Code("G95", "feed mode", "feed per revolution: take-ups are made with G0"),
        Code("G98", "return", "cycles return to the level they began at"),
        Code("G99", "return", "cycles return to R"),
        Code("G40", "cutter", "cutter compensation off: passes"),
        Code("G61", "path", "path control: passes"),
        Code("G61.1", "path", "path control: passes"),
        Code("G64", "path", "path control: passes"),
        Code("G9", "one line", "exact stop for this block: passes"),
        Code("G15", "polar", "polar coordinates off: passes"),
        Code("G50", "scale", "scaling off: passes"),
        Code("G50.1", "mirror", "mirror image off: passes"),
        Code("G69", "rotation", "rotation off: passes"),
        Code("G97", "spindle", "constant spindle speed: passes"),
    ]
    table += [
        Code(
            "G92",
            "one line",
            "sets the position: each value gets the shift of its axis, so that zero stays at the tool",
        ),
        Code("G92.1", "one line", "cancels G92: position unknown unless what it cancels is known"),
        Code("G92.2", "one line", "suspends G92: as G92.1"),
        Code("G92.3", "one line", "restores G92: position unknown unless what it restores is known"),
        Code(
            "G10",
            "one line",
            "L2 sets an offset, L20 as G92, L1 a tool length; positions follow where both values are known",
        ),
        Code("G52", "one line", "local shift of the frame: positions follow"),
    ]
    kept = "kept as a cycle: X and Y as in a rapid, depth and R shifted so that the bottom is exact"
    table += [Code(w, "motion", kept) for w in CYCLES]
    probe = "probe: target unshifted; side known after it, position unknown until G92 or G10 L20"
    table += [Code(w, "motion", probe) for w in PROBES]
    offsets = [f"G{n}" for n in range(54, 60)] + ["G59.1", "G59.2", "G59.3"]
    frame = "work offset: positions unknown after a change of it, unless both offsets are known"
    return [*table, *(Code(word, "offset", frame) for word in offsets), *_refused()]


def _refused() -> list[Code]:
    comp = "cutter compensation bends the path inside the controller, so its reversals are not in the program"
    return [
        Code("G41", "cutter", "refused", comp, "Let the CAM system write the compensated path (wear offset zero)"),
        Code("G42", "cutter", "refused", comp, "Let the CAM system write the compensated path (wear offset zero)"),
        Code("G16", "polar", "refused", "polar coordinates are not read", _OUT_CAM),
        Code("G51", "scale", "refused", "scaling changes lengths inside the controller", _OUT_CAM),
        Code("G51.1", "mirror", "refused", "mirroring changes directions inside the controller", _OUT_CAM),
        Code("G68", "rotation", "refused", "rotation mixes the axes inside the controller", _OUT_CAM),
        Code("G65", "one line", "refused", "a macro call can move any axis", _OUT_EXPAND),
        Code("G66", "macro", "refused", "a macro call can move any axis", _OUT_EXPAND),
        Code(
            "G28.1", "one line", "refused", "it stores a home point that would be off by the lash", "Store it by hand"
        ),
        Code(
            "G30.1", "one line", "refused", "it stores a home point that would be off by the lash", "Store it by hand"
        ),
    ]


G_CODES = {code.word: code for code in _codes()}


def _m_codes() -> list[Code]:
    sub = "a subprogram can move any axis"
    table = [
        Code("M0", "stop", "stops: passes, with a caution that jogging spoils what is known"),
        Code("M1", "stop", "optional stop: as M0"),
        Code("M2", "end", "ends the program; the text after it passes through"),
        Code("M30", "end", "ends the program; the text after it passes through"),
        Code("M60", "stop", "stops: as M0"),
        Code("M6", "tool", "tool change: all sides and positions unknown after it"),
    ]
    table += [Code(f"M{n}", "pass", "spindle: passes") for n in (3, 4, 5, 19)]
    table += [Code(f"M{n}", "pass", "coolant: passes") for n in (7, 8, 9)]
    table += [Code(f"M{n}", "pass", "overrides: passes") for n in (48, 49)]
    table += [Code(f"M{n}", "sub", "refused", sub, _OUT_EXPAND) for n in (96, 97, 98, 99)]
    return table


M_CODES = {code.word: code for code in _m_codes()}

# axis words on a line with one of these are not targets
TAKES_AXIS_WORDS = frozenset({"G4", "G28", "G30", "G92", "G10", "G52", "G43.1"})
# M words that act after the motion of their line
ACTS_LAST = frozenset({"M0", "M1", "M2", "M30", "M60"})
