"""Programs that are refused for something other than a word of the code table: one for each rule a user may meet."""

from __future__ import annotations

_HEAD = "G21 G90\nG0 X0 Y0 Z5\n"

REFUSED = [
    ("units not stated", "G90\nG0 X1\n"),
    ("a G word that is not in the table", _HEAD + "G200 X1\n"),
    ("the first motion of an axis is a feed", "G21 G90\nG1 X5 F100\n"),
    ("an arc from a place that is not known", "G21 G90\nG2 X5 Y0 I2.5 F100\n"),
    ("a variable", _HEAD + "#1=5\n"),
    ("an expression", _HEAD + "G1 X[1+2] F100\n"),
    ("program flow", _HEAD + "o100 sub\n"),
    ("axes U, V, W", _HEAD + "G1 U5 F100\n"),
    ("a number with an exponent", _HEAD + "G1 X1E-5 F100\n"),
    ("a letter twice in a block", _HEAD + "G1 X1 X2 F100\n"),
    ("two words of one group", _HEAD + "G0 G1 X1\n"),
    ("two words that both want the numbers", _HEAD + "G92 G28 X0\n"),
    ("an axis word with no motion in force", _HEAD + "G80 X1\n"),
    ("an arc whose ends lie on two circles", _HEAD + "G2 X10 Y0 I3 J3 F100\n"),
    ("a centre or radius on a straight line", _HEAD + "G1 X1 I2 F100\n"),
    ("a feed in machine coordinates", _HEAD + "G53 G1 X0 F100\n"),
    ("zero set where the shift is not known", _HEAD + "G0 X1\nM6\nG92 X0\n"),
    ("an incremental move after a tool change", _HEAD + "G0 X10\nM6\nG91 G0 X1\n"),
    ("a rotated work offset", _HEAD + "G10 L2 P1 R30\n"),
    ("another form of G10", _HEAD + "G10 L10 P1 Z0\n"),
    ("a rotary axis inside a cycle", _HEAD + "G0 A0\nG81 X1 A90 Z-1 R1 F50\n"),
    ("a mode that hangs on a deletable block", _HEAD + "/G91\nG1 X1 F100\n"),
    ("block delete inside a block", _HEAD + "G0 X1 /Y1\n"),
    ("words behind a bracket inside a comment", _HEAD + "(deep (Z-3) X1 pocket)\n"),
    ("text that is neither a word nor a comment", _HEAD + "?\n"),
    ("a program that has been rewritten already", "(lash taken up by gcodetool 0.1.0: X 0.1 datum - mm)\nG21\n"),
]
