"""What the soak left, in the result's own units and in words."""

import numpy as np

from midradius.fem.heatup import HeatingStage
from midradius.fem.media import ZERO_DEGC
from midradius.fem.route import CoolingStage, StageEnd
from midradius.study.begin import Begun
from midradius.study.case import Asked
from midradius.study.heatsetup import HeatSetup
from midradius.study.result import HeatingRecord, SoakFields, StageRecord
from midradius.study.summary import duration
from midradius.thermo.arrays import Array
from midradius.thermo.austenite import REGIMES, Austenite
from midradius.thermo.soaked import Soaked
from midradius.thermo.units import show

# A grain coarser than this is coarser than heat treaters accept of a fine-grain steel
# (ASTM 5 to 8 fine, 1 to 5 coarse: ASTM A255 and McQuaid-Ehn practice, remembered).
COARSE_ASTM = 5.0
EVEN_K = 5.0  # an evenness of temperature that furnace surveys ask for [estimate]


def soak_fields(soaked: Soaked) -> SoakFields:
    """The soak of every node in the units of a result."""
    return SoakFields(
        hottest_degC=soaked.hottest - ZERO_DEGC,
        carbon_in_solution_pct=soaked.carbon_pct,
        ferrite=soaked.ferrite,
        cementite=soaked.cementite,
        grain_astm=soaked.grain_astm,
        grain_um=1e6 * soaked.grain_mean_intercept,
        austenitised=soaked.austenitised,
    )


def hottest_kind(soaked: Soaked) -> Austenite:
    """The austenite of the hottest node."""
    return soaked.kinds[int(soaked.kind[int(np.argmax(soaked.hottest))])]


def stage_record(
    stage: HeatingStage | CoolingStage, went: StageEnd, factor: float, sense: str
) -> StageRecord:
    """One stage as it went; ``factor`` turns its heat into that of the result's extent."""
    limit = (stage.until_temp or 0.0) - ZERO_DEGC
    return StageRecord(
        kind=stage.kind,
        medium=stage.label,
        start_s=went.start,
        end_s=went.end,
        ended_by="time"
        if went.ended_by == "time"
        else f"{stage.until_place} {sense} {limit:.4g} degC",
        heat_to_bath_J=factor * went.heat_given,
    )


def heating_record(
    furnace: HeatSetup, begun: Begun, factor: float, mass: float
) -> HeatingRecord | None:
    """The heating of a part of ``mass`` [kg per extent], None where it was not computed."""
    heating = begun.heating
    if heating is None:
        return None
    return HeatingRecord(
        stages=tuple(
            stage_record(stage, went, factor, "above")
            for stage, went in zip(furnace.stages, heating.stages, strict=True)
        ),
        times_s=heating.step_times,
        temp_degC=heating.watch_temp - ZERO_DEGC,
        heat_taken_J_per_kg=heating.heat_taken / mass,
        heat_balance_relative=heating.balance,
    )


def soak_text(case: Asked, begun: Begun) -> str:
    """One line: how it was soaked, and what that left."""
    soaked = begun.soaked
    at = (case.soak.at or 0.0) - ZERO_DEGC
    text = f"{at:.0f} degC, {show(case.soak.time or 0.0, 'duration')}"
    if begun.heating is None:
        left = soaked.kinds[0]
        text += f": {left.regime} austenite with {left.carbon_pct:.3f} % C, "
        text += f"grain ASTM {left.grain_astm:.1f}"
    else:
        heated = duration(begun.heating.stages[-2].end)
        text += f" after {heated} of heating: reached {_span(soaked.hottest - ZERO_DEGC, 0)} degC; "
        if not soaked.austenitised.any():
            return text + "not austenitised, ferrite and pearlite as before"
        text += f"{' and '.join(_regimes(soaked))} with {_span(soaked.carbon_pct, 3)} % C"
        text += f", grain ASTM {_span(soaked.grain_astm, 1)}"
    for name, part in (("ferrite", soaked.ferrite), ("cementite", soaked.cementite)):
        if part.max() > 0.0:
            text += f", {_span(100.0 * part, 1)} % {name} left"
    return text


def soak_warnings(soaked: Soaked, at: float, volume: Array) -> tuple[str, ...]:
    """What a heat treater must hear of a soak set to ``at`` [K]; empty for a sound one.

    ``volume`` (n_node,) are the control volumes.
    """
    lines = []
    cold = 1.0 - float(volume[soaked.austenitised].sum() / volume.sum())
    lag = at - float(soaked.hottest.min())
    if cold > 0.0:
        lines.append(
            f"Underheated: {100.0 * cold:.0f} % of the section never passed Ae1 and was not"
            " austenitised. It keeps ferrite and pearlite and cannot harden: soak longer or"
            " hotter."
        )
    elif lag > EVEN_K:
        lines.append(
            f"Unevenly soaked: the coldest node reached {at - lag - ZERO_DEGC:.0f} degC,"
            f" {lag:.0f} K below the soak. Grain, and near Ae3 or Acm the carbon in"
            " solution, differ through the section."
        )
    partly = soaked.austenitised & (soaked.ferrite > 0.0)
    if partly.any():
        lines.append(
            f"Ferrite left by the soak, {100.0 * soaked.ferrite[partly].max():.0f} % where most:"
            " it stays soft through the quench."
        )
    grain = soaked.grain_astm[soaked.austenitised]
    if grain.size and grain.min() < COARSE_ASTM:
        lines.append(
            f"Coarse austenite grain, ASTM {grain.min():.1f} at the coarsest (5 or finer is"
            " usual): toughness falls, quench cracking becomes likelier."
        )
    return tuple(lines)


def _regimes(soaked: Soaked) -> list[str]:
    seen = sorted({int(code) for code in soaked.regime})
    return ["not austenitised" if k < 0 else f"{REGIMES[k]} austenite" for k in seen]


def _span(values: Array, digits: int) -> str:
    """One number where all are alike in the digits shown, else the range."""
    low, high = (f"{end:.{digits}f}" for end in (np.nanmin(values), np.nanmax(values)))
    return low if low == high else f"{low} to {high}"
