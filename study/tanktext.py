"""The answer of ``midradius tank`` in lines of plain text."""

import math
from collections.abc import Iterator

import numpy as np

from midradius.study.tankanswer import ZERO_DEGC, TankAnswer
from midradius.study.tanksafety import Check

_VERDICTS = {
    "acceptable": "acceptable by the checks below, every one judged",
    "not acceptable": "NOT ACCEPTABLE",
    "not judged in full": "NOT JUDGED IN FULL, so no answer yet: see the checks marked ?",
}


def lines(found: TankAnswer) -> Iterator[str]:
    """Line by line; text from the case file is the caller's to make printable."""
    own, core = found.own, found.core
    mass = sum(body.mass for body in found.own_bodies)
    yield f"{found.case.title}: {_VERDICTS[found.verdict]}"
    for check in found.checks:
        yield f"  {_mark(check)} {_check(check)}"
    yield ""
    yield "Load"
    for body in found.own_bodies:
        yield f"  {body.name}: {body.mass:.4g} kg"
    yield (
        f"  heat to the bath {own.total / 1e6:.4g} MJ ({own.total / mass / 1e3:.4g} kJ/kg), "
        f"peak {_plain(own.peak / 1e3)} kW, in the bath {own.stay / 60.0:.3g} min"
    )
    (low, high), (slow, quick) = found.own_band
    yield (
        f"  with the film's uncertainty {low / 1e6:.4g} to {high / 1e6:.4g} MJ,"
        f" peak {_plain(slow / 1e3)} to {_plain(quick / 1e3)} kW"
    )
    yield (
        f"  before, to the air {own.before / 1e6:.4g} MJ; still in the load when it leaves "
        f"{own.left / 1e6:.4g} MJ"
    )
    yield f"  heat balance {found.balance:.1e}, {own.rounds} rounds of bath and load"
    yield (
        f"  core {core.uncoupled_hv:.0f} HV with the bath held, {core.first_hv:.0f} HV with its own"
        f" bath, {core.worst_hv:.0f} HV from {_degC(core.worst_start)} in the hottest load"
    )
    yield ""
    yield f"Bath, {found.fluid.name}"
    coldest, hottest = float(np.min(found.hottest)), float(np.max(found.hottest))
    yield (
        f"  hottest {_degC(float(found.hottest[0]))} ({_degC(coldest)} to {_degC(hottest)} with the"
        f" film coefficients {found.uncertainty_pct:.0f} % weaker or stronger)"
    )
    yield from _loads(found)
    if found.day.settled and found.day.days > 1:
        yield f"  the day repeats itself from day {found.day.days} on"
    if found.failure is not None:
        failed = found.failure
        after = failed.passes_limit_after
        said = "" if math.isnan(after) else f", past the limit {_plain(after / 60.0)} min after it"
        said = said if after > 0.0 or math.isnan(after) else ", already past the limit"
        low, high = failed.band
        yield (
            f"  cooler fails as a load goes in, at worst that of {failed.at / 3600.0:.4g} h: "
            f"{_degC(failed.hottest)} under that load ({_degC(low)} to {_degC(high)}); up to"
            f" {_degC(failed.hottest_if_loads_go_on)} if loads go on{said}"
        )
    water = float(found.day.steady.evaporated[-1, 0])
    if water > 0.0:
        yield f"  evaporates {water:.3g} kg in {found.day.period / 3600.0:.3g} h"
    if found.level is None:
        yield f"  fluid with load at most {float(found.level_volume.max()):.4g} m3"
    yield ""
    yield "Size (range: film coefficients weaker and stronger)"
    if not found.limit_is_safe:
        yield (
            "  none: the limit of the bath itself is too near to the flash point, to boiling or"
            " decay, or above the hottest bath whose film is known"
        )
    else:
        yield from _size(found)
    yield from _agitation(found)
    yield ""
    yield "Common practice beside it, no answer"
    for name, value, unit in found.rules:
        yield f"  {name}: {value:.3g} {unit}"
    yield ""
    for heading, texts in (
        ("Taken as", found.assumptions),
        ("Outside a model's range", tuple(str(note) for note in found.notes)),
        ("Cautions", found.cautions),
    ):
        if texts:
            yield heading
            yield from (f"  - {text}" for text in texts)


def _size(found: TankAnswer) -> Iterator[str]:
    sized = found.sizing
    duty = sized.per_kelvin_to_duty / 1e3
    cooler = "with the cooler of the case" if sized.cooler_given else "without a cooler"
    for least, factor, unit, what in (
        (sized.volume_least, 1.0, "m3", f"least volume {cooler}"),
        (sized.cooler_least, duty, "kW", "least cooler with the volume of the case"),
    ):
        yield f"  {what}: {_least(least, factor, unit)}"
    if not found.acceptable:
        yield "  these keep the limits on the bath only; checks above marked FAIL or ? remain"
    yield "  volume [m3] : least cooler [kW with the bath at its limit]"
    for k in range(0, len(sized.volume), 2):
        yield f"    {_plain(sized.volume[k]):>8} : {_least(sized.cooler[:, k], duty, 'kW')}"


def _loads(found: TankAnswer) -> Iterator[str]:
    for row in found.loads[:12]:
        back = float(row.recovered[0])
        said = "not back before the next" if math.isnan(back) else f"back in {back / 60.0:.3g} min"
        yield (
            f"  {row.time / 3600.0:6.2f} h  {row.name}: {_degC(float(row.before[0]))} to "
            f"{_degC(float(row.hottest[0]))} (+{row.rise[0]:.3g} K), {said}"
        )
    if len(found.loads) > 12:
        yield f"  and {len(found.loads) - 12} more loads in loads.csv"


def _agitation(found: TankAnswer) -> Iterator[str]:
    stirred = found.agitation
    if stirred is None:
        return
    text = (
        f"  agitation: {stirred.flow:.3g} m3/s, one turnover in {stirred.turnover:.3g} s; usual"
        f" power {stirred.usual_power:.2g} kW"
    )
    if stirred.propellers:
        text += (
            f"; as guidance {stirred.propellers} propeller(s) of {1e3 * stirred.diameter:.0f} mm,"
            f" {stirred.propeller_power:.3g} kW in all"
        )
    yield text


def _least(values: np.ndarray, factor: float, unit: str) -> str:
    nominal, low, high = (float(factor * f(values)) for f in (lambda v: v[0], np.min, np.max))
    if math.isnan(nominal):
        return "none that was tried does it"
    if high == 0.0:
        return "none needed"
    band = "not every one" if math.isnan(low) else f"{_plain(low)} to {_plain(high)}"
    return f"{_plain(nominal)} {unit} ({band})"


def _plain(value: float) -> str:
    """Three figures or all before the point, never an exponent."""
    return f"{value:.0f}" if abs(value) >= 1000.0 else f"{value:.3g}"


def _mark(check: Check) -> str:
    return {True: "ok  ", False: "FAIL", None: "?   "}[check.met]


def _check(check: Check) -> str:
    if check.value is None or check.limit is None:
        return f"{check.name}: {check.why}"
    return f"{check.name} {check.value:.4g} {check.unit}, at most {check.limit:.4g} ({check.why})"


def _degC(temp: float) -> str:
    return f"{temp - ZERO_DEGC:.1f} degC"
