"""Command line: ``python -m tests.oracle ORIGINAL RESULT --lash x=0.12``; exit code 1 when the result is wrong."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path

from tests.oracle.compare import TOLERANCE, Report
from tests.oracle.machines import worst_of
from tests.oracle.reader import ControllerError


def _pairs(texts: list[str]) -> dict[str, str]:
    return dict(text.split("=", 1) for text in texts)


def _arguments() -> argparse.Namespace:
    parser = argparse.ArgumentParser(prog="python -m tests.oracle", description=__doc__)
    parser.add_argument("original", type=Path)
    parser.add_argument("result", type=Path)
    parser.add_argument("--lash", action="append", default=[], metavar="AXIS=B", help="mm or degrees")
    parser.add_argument("--datum", action="append", default=[], metavar="AXIS=SIDE")
    parser.add_argument("--units", choices=("mm", "in"), default="mm", help="wake-up units of the machine")
    parser.add_argument("--block-delete", choices=("on", "off", "both"), default="both")
    parser.add_argument("--seeds", type=int, default=8, help="random machines to try")
    parser.add_argument("--seed", type=int, default=0, help="first of them")
    parser.add_argument("--settle", type=float, default=0.5, help="overshoot allowed beyond the lash, mm")
    parser.add_argument("--approach", type=float, default=0.0, help="overshoot allowed on every rapid, mm")
    parser.add_argument("--allow-mismatch", action="store_true", help="let off the original's radius mismatch")
    parser.add_argument("--tolerance", type=float, default=TOLERANCE)
    return parser.parse_args()


def _print(report: Report) -> None:
    for name in ("feed", "rapid_end", "stray", "stray_excess", "dip", "mismatch_growth"):
        found = getattr(report, name)
        print(f"{name:16} {found.value:9.5f}  original line {found.original_line}, result line {found.result_line}")
    print("feed per axis   ", " ".join(f"{a}={v:.5f}" for a, v in zip("XYZABC", report.per_axis, strict=True)))
    for fault in report.faults:
        print("fault:", fault)


def main() -> int:
    """Judge one result on random machines and print the worst of each error."""
    args = _arguments()
    try:
        report = worst_of(
            args.original.read_bytes(),
            args.result.read_bytes(),
            {axis: float(value) for axis, value in _pairs(args.lash).items()},
            datum=_pairs(args.datum),
            inch=args.units == "in",
            seeds=range(args.seed, args.seed + args.seeds),
            delete={"on": (True,), "off": (False,), "both": (False, True)}[args.block_delete],
            tolerance=args.tolerance,
            settle=args.settle,
            approach=args.approach,
            allow_mismatch=args.allow_mismatch,
        )
    except ControllerError as error:
        print("controller stops:", error)
        return 1
    _print(report)
    good = report.ok(args.tolerance)
    print("right" if good else "WRONG")
    return 0 if good else 1


if __name__ == "__main__":
    sys.exit(main())
