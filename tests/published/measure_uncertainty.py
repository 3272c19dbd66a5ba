"""Measure the model's error by class of steel and write ``study/uncertainty.csv``.

``python tests/published/measure_uncertainty.py`` after every change of a model, with a
line in the changelog. Readings: every row of ``bars.csv`` and ``mass_effect.csv`` (the
value itself), of ``end_quench_bands.csv`` and ``more_bands.csv`` (the middle of the band,
which the aim composition need not meet: the scatter of the heats is in the figure).
Rockwell C where value and result have one; in percent of the result's HV for every
hardness; likewise tensile strength.
Yield strength: every row of ``normalised_yield.csv``. Tempered: every row of
``tempered_bars.csv``. Where a row's source states none, the time is two hours, the bar
that of a tensile piece (25 mm) and the route that of ``bars.csv``.
"""

import csv
import datetime
import sys
from collections import defaultdict
from functools import cache
from pathlib import Path

import numpy as np

from midradius.study import uncertainty
from midradius.study.case import (
    Case,
    MediumUse,
    Outputs,
    PositionInput,
    SectionInput,
    Stage,
    SteelInput,
    Until,
)
from midradius.study.endquench import piece
from midradius.study.result import Result
from midradius.study.runner import run
from midradius.thermo.austenitizing import austenitizing
from midradius.thermo.conversion import hb_to_hv, hrc_to_hv, hv_to_hrc
from midradius.thermo.grades import grade

HERE = Path(__file__).parent
TABLE = HERE.parents[1] / "study" / "uncertainty.csv"
ZERO = 273.15
BARS = "handbook bars"
END_QUENCH = "end-quench bands"
TEMPERED_BARS = "tempered bars"
HOW = {
    BARS: "whole job against readings of tests/published/bars.csv, mass_effect.csv and"
    " normalised_yield.csv (rounds of 13 to 100 mm)",
    END_QUENCH: "whole job at the aim composition against the middle of each band of"
    " tests/published/end_quench_bands.csv and more_bands.csv",
    TEMPERED_BARS: "whole job with its temper against readings of tests/published/"
    "tempered_bars.csv (rounds of 10 to 100 mm)",
}
Key = tuple[str, str, str, str]


def errors() -> dict[Key, list[float]]:
    """Signed errors by class, quantity, unit and data set."""
    if str(HERE) not in sys.path:
        sys.path.insert(0, str(HERE))
    import endquench
    import test_bars

    found: dict[Key, list[float]] = defaultdict(list)
    # rows of the wider table state no unit but HRC
    for row in [*endquench.rows("bars"), *endquench.rows("mass_effect")]:
        kind = uncertainty.steel_class(grade(row["steel"]).composition)
        result = test_bars.cooled(
            row["steel"], float(row["soak_degC"]), row["route"], float(row["diameter_mm"])
        )
        place = result.positions[test_bars.PLACES.index(row["position"])]
        value = float(row["value"])
        if row["unit"] == "MPa":
            assert place.tensile_mpa is not None
            found[kind, "tensile", "%", BARS].append(_percent(place.tensile_mpa, value))
            continue
        if row["unit"] == "HRC" and place.hardness_hrc is not None:
            found[kind, "hardness", "HRC", BARS].append(place.hardness_hrc - value)
        hv = _vickers(value) if row["unit"] == "HRC" else float(hb_to_hv(value))
        found[kind, "hardness", "%", BARS].append(_percent(place.hardness_hv, hv))
    for row in [*endquench.rows("end_quench_bands"), *endquench.rows("more_bands")]:
        if row["low"] == row["high"] or "reading" in row["band"]:
            continue
        kind = uncertainty.steel_class(grade(row["grade"]).composition)
        hv = end_quenched(row["grade"])[f"{float(row['distance_mm']):g} mm"]
        middle = 0.5 * (float(row["low"]) + float(row["high"]))
        of_middle = _percent(hv, float(hrc_to_hv(middle)))
        found[kind, "hardness", "%", END_QUENCH].append(of_middle)
        found[kind, "hardness", "HRC", END_QUENCH].append(rockwell(hv) - middle)
    for row in endquench.rows("normalised_yield"):
        kind = uncertainty.steel_class(grade(row["steel"]).composition)
        result = test_bars.cooled(
            row["steel"], float(row["soak_degC"]), "air", float(row["diameter_mm"])
        )
        strong = result.positions[test_bars.PLACES.index("mid-radius")].yield_mpa
        assert strong is not None
        found[kind, "yield", "%", BARS].append(_percent(strong, float(row["value"])))
    for row in endquench.rows("tempered_bars"):
        kind = uncertainty.steel_class(grade(row["steel"]).composition)
        place = _tempered(row).positions[0]
        value = float(row["value"])
        if row["unit"] == "MPa":
            assert place.tensile_mpa is not None
            found[kind, "tensile", "%", TEMPERED_BARS].append(_percent(place.tensile_mpa, value))
            continue
        hv = float(hb_to_hv(value))
        found[kind, "hardness", "%", TEMPERED_BARS].append(_percent(place.hardness_hv, hv))
        if place.hardness_hrc is not None and hv >= 238.0:
            error = place.hardness_hrc - float(hv_to_hrc(hv))
            found[kind, "hardness", "HRC", TEMPERED_BARS].append(error)
    return dict(found)


@cache
def end_quenched(name: str) -> dict[str, float]:
    """Hardness [HV] by place of the test piece of a grade."""
    import endquench

    if name in endquench.SOAK_DEGC:
        return {p.name: p.hardness_hv for p in endquench.quenched(name).positions}
    given = SteelInput(grade(name), 7.0)
    asked = piece(given, temp=austenitizing(given.steel).temp, time=1800.0)
    return {p.name: p.hardness_hv for p in run(asked).positions}


def _tempered(row: dict[str, str]) -> Result:
    """A round quenched in oil and tempered, read at mid-radius."""
    import test_bars

    medium, bath_degC = test_bars.MEDIA["oil"]
    stages = (
        Stage("soak", at=float(row["soak_degC"]) + ZERO, time=3600.0),
        Stage(
            "quench",
            medium=MediumUse(medium, bath=bath_degC + ZERO),
            until=Until("core", 80.0 + ZERO),
        ),
        Stage("temper", at=float(row["temper_degC"]) + ZERO, time=3600.0 * float(row["temper_h"])),
    )
    return run(
        Case(
            title=f"{row['steel']} tempered",
            steel=SteelInput(grade(row["steel"]), test_bars.GRAIN_ASTM),
            section=SectionInput("round", diameter=1e-3 * float(row["diameter_mm"])),
            route=stages,
            outputs=Outputs((PositionInput("mid-radius", "mid-radius"),), n_field=4),
        )
    )


def _percent(ours: float, read: float) -> float:
    """How far the result is above the reading, in percent of the result."""
    return 100.0 * (1.0 - read / ours)


def _vickers(hrc: float) -> float:
    """The inverse of `rockwell`."""
    return float(hrc_to_hv(hrc)) if hrc >= 20.0 else 238.0 - 4.0 * (20.0 - hrc)


def rockwell(hv: float) -> float:
    """Below the end of the scale by the bracketed row of SAE J417, 18 for 230 HV (memory)."""
    return float(hv_to_hrc(hv)) if hv >= 238.0 else 20.0 - 2.0 * (238.0 - hv) / 8.0


def rows() -> list[dict[str, object]]:
    """The rows of the table."""
    today = datetime.date.today().isoformat()
    table: list[dict[str, object]] = []
    for (kind, quantity, unit, data), signed in sorted(errors().items()):
        p90 = uncertainty.percentile_90(signed)
        table.append(
            {
                "steel_class": kind,
                "quantity": quantity,
                "unit": unit,
                "n": len(signed),
                "median": f"{np.median(np.abs(signed)):.2f}",
                "p90": "" if p90 is None else f"{p90:.2f}",
                "worst": f"{max(abs(error) for error in signed):.2f}",
                "condition": uncertainty.TEMPERED
                if data == TEMPERED_BARS
                else uncertainty.AS_COOLED,
                "data": data,
                "how": HOW[data],
                "measured_on": today,
                "status": "derived from readings of which part are from memory",
            }
        )
    return table


def main() -> None:
    """Write the table."""
    table = rows()
    with TABLE.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, list(table[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(table)


if __name__ == "__main__":
    main()
