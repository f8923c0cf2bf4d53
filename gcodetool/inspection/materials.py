"""Cutting data of common materials: defaults to begin with, each with its source and its band.  All are estimates.

Published coefficients for one family of material differ by a factor of five (the table below has 244 to 1319 N/mm^2
for aluminium alloys), and a dull edge doubles them again.  So every force comes with a band, and a user who has
measured better numbers writes them into the job sheet.

Sources of the rows:

[A]  Review of milling force models for aluminium alloys, Chinese Journal of Mechanical Engineering, 2021, table 5,
     doi 10.1186/s10033-021-00536-9 (edge coefficients there are printed as N*mm; physically they are N/mm)
[B]  kc1.1 and mc by material group of VDI 3323; radial share 0.3 (band 0.15 to 0.6, the span of [A])
[C]  Palubicki, Materials 14 (2021) 2208: particleboard, mean specific principal force 32.0 to 37.6 N/mm^2
[D]  from memory, low confidence; only the order of magnitude counts
"""

from __future__ import annotations

import difflib
from collections.abc import Mapping

from gcodetool.errors import SheetError
from gcodetool.inspection.job_records import Material

_A = "review of milling force models for Al alloys, Chin. J. Mech. Eng. 2021, table 5, doi 10.1186/s10033-021-00536-9"
_B = "kc1.1 and mc by VDI 3323 group {}; radial share 0.3 (band 0.15 to 0.6)"
_C = "Palubicki, Materials 14 (2021) 2208, peripheral up-milling at 40 to 60 m/s"
_D = "from memory, low confidence, indicative only"


def _linear(name: str, kt: float, et: float, kr: float, er: float, ka: float = 0.0, ea: float = 0.0) -> Material:
    return Material(
        name, _A, kt=kt, et=et, kr=kr, er=er, ka=ka, ea=ea, low=0.4, high=2.5, least_chip=0.005, most_chip=0.03
    )


def _kienzle(name: str, group: str, kc11: float, mc: float, most_chip: float) -> Material:
    return Material(name, _B.format(group), kc11=kc11, mc=mc, kr=0.3, least_chip=0.005, most_chip=most_chip)


def _soft(name: str, source: str, kc: float, spread: float, most_chip: float, mc: float = 0.0) -> Material:
    """A material of which only the specific force at a chip of 0.1 mm is known."""
    return Material(
        name, source, kc11=kc * 0.1**mc, mc=mc, kr=0.3, et=2.0 if mc == 0.0 else 0.0,
        low=1.0 / spread, high=spread, least_chip=0.01, most_chip=most_chip,
    )  # fmt: skip


DEFAULTS: Mapping[str, Material] = {
    each.name: each
    for each in (
        _linear("aluminium-6082", 631.0, 13.0, 99.0, 10.0, 273.0, 2.8),
        _linear("aluminium-7075", 767.01, 27.7, 168.8, 26.6, 222.0, 0.7),
        _linear("aluminium-7075-hss", 951.365, 11.115, 262.597, 11.314, 323.33, 1.105),
        _linear("aluminium-6061", 243.77, 7.53, 113.5, 7.83),
        _kienzle("aluminium", "21, wrought, not hardenable", 700.0, 0.25, 0.03),
        _kienzle("aluminium-hard", "22, wrought, hardened", 800.0, 0.25, 0.03),
        _kienzle("aluminium-cast", "23 and 24, cast, up to 12 % Si", 700.0, 0.25, 0.03),
        _kienzle("brass", "27", 700.0, 0.27, 0.03),
        _kienzle("brass-free-cutting", "26", 700.0, 0.27, 0.03),
        _kienzle("copper", "28", 700.0, 0.27, 0.03),
        _kienzle("steel", "1, below 0.25 % C, annealed", 1350.0, 0.21, 0.02),
        _kienzle("steel-tempered", "3, quenched and tempered, 250 HB", 1675.0, 0.24, 0.02),
        _kienzle("stainless", "14, austenitic", 2150.0, 0.20, 0.02),
        _kienzle("cast-iron", "15, grey, soft", 1150.0, 0.20, 0.03),
        _soft("particleboard", _C, 34.8, 2.0, 0.4),
        _soft("softwood", _D, 17.0, 3.0, 0.3),
        _soft("hardwood", _D, 35.0, 3.0, 0.25),
        _soft("mdf", _D, 37.0, 3.0, 0.4),
        _soft("plywood", _D, 35.0, 3.0, 0.33),
        _soft("acetal", _D, 125.0, 3.0, 0.25, mc=0.2),
        _soft("acrylic", _D, 150.0, 3.0, 0.2, mc=0.2),
        _soft("polyethylene", _D, 90.0, 3.0, 0.25, mc=0.2),
    )
}


def material_named(name: str) -> Material:
    """One of the defaults.  Raises SheetError for a name that is not there, with the nearest one."""
    found = DEFAULTS.get(name.strip().lower())
    if found is None:
        near = difflib.get_close_matches(name.lower(), list(DEFAULTS), 1, 0.4)
        guess = f"did you mean {near[0]}? " if near else ""
        raise SheetError(
            f"material {name}: {guess}the materials are {', '.join(DEFAULTS)}; others go into the job sheet"
        )
    return found


def as_sheet(material: Material) -> str:
    """A material as a table of a job sheet, ready to be edited."""
    lines = ["[material]", f'name = "{material.name}"', f'source = "{material.source}"']
    for key in ("kc11", "mc", "kt", "kr", "ka", "et", "er", "ea", "low", "high", "least_chip", "most_chip"):
        value = getattr(material, key)
        if value is None or (key == "mc" and material.kc11 is None):
            continue
        lines.append(f"{key} = {value:.6g}")
    return "\n".join(lines)
