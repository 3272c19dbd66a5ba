"""The lever rule told both ways: one JSON document, and the same in lines of text."""

import math
from dataclasses import asdict
from typing import Any

from midradius.study import casekeys as keys
from midradius.study import levertext, steelgiven
from midradius.study.case import SteelInput
from midradius.study.summary import duration
from midradius.thermo import amounts, austenite, equilibrium, lever, pointcount, steel
from midradius.thermo.equilibrium import ZERO_DEGC, Equilibrium
from midradius.thermo.errors import InputFault
from midradius.thermo.pointcount import CountedFraction
from midradius.thermo.source import RangeNote, Source


def _head(named: SteelInput, *, with_carbon: bool = True) -> dict[str, Any]:
    steel = named.steel
    amounts = {k: v for k, v in steel.composition.as_dict().items() if v}
    if not with_carbon:
        del amounts["C"]
    return {
        "steel": steel.name,
        "standard": steel.standard,
        "status": steel.status,
        "composition_pct": amounts,
    }


def _critical(eq: Equilibrium) -> dict[str, float | None]:

    hyper = math.isfinite(eq.acm)
    return {
        "Ae1_degC": eq.ae1 - ZERO_DEGC,
        "Ae3_degC": None if hyper else eq.ae3 - ZERO_DEGC,
        "Acm_degC": eq.acm - ZERO_DEGC if hyper else None,
        "eutectoid_carbon_pct": eq.eutectoid_carbon_pct,
    }


def forward(named: SteelInput, at: str | None, soak: str | None) -> dict[str, Any]:

    composition = named.steel.composition
    eq = equilibrium.equilibrium(composition)
    notes = [
        *named.notes,
        *steel.range_notes(composition),
        *equilibrium.range_notes(composition),
    ]
    document: dict[str, Any] = {
        **_head(named),
        "equilibrium": _critical(eq),
        "slow_cooling": [
            {**asdict(item), "volume_fraction": _volume(item.name, item.mass_fraction, eq)}
            for item in amounts.structure(eq)
        ],
    }
    sources = [*amounts.SOURCES]
    if at is not None:
        within = (amounts.COLDEST, amounts.HOTTEST)
        temp = steelgiven.quantity("--at", at, "temperature", within)
        assert temp is not None, "it was given"
        document["at"] = {
            "temp_degC": round(temp - ZERO_DEGC, 6),
            "phases": [asdict(item) for item in amounts.at(eq, temp)],
        }
    if soak is not None:
        document["soak"], more, works = _soaked(named, soak)
        notes += more
        sources += works
    return {**document, **_trust(notes, sources)}


def _volume(name: str, mass: float, eq: Equilibrium) -> float:
    """Volume fraction at 20 degC, where a micrograph is taken."""

    if name == "pearlite":
        beside = [item for item in amounts.structure(eq) if item.name != "pearlite"]
        return 1.0 - sum(_volume(item.name, item.mass_fraction, eq) for item in beside)
    product: lever.Product = "ferrite" if name == "ferrite" else "cementite"
    pearlite = eq.eutectoid_carbon_pct
    return float(lever.volume_of_mass(mass, product=product, pearlite_pct=pearlite))


def _soaked(named: SteelInput, text: str) -> tuple[dict[str, Any], list[RangeNote], list[Source]]:

    at, comma, time = text.partition(",")
    if not comma:
        allowed = "a temperature and a time, as in 860 degC, 1 h"
        raise InputFault("--soak", f'"{text}"', allowed)
    temp = steelgiven.quantity("--soak", at.strip(), "temperature", keys.SOAK_RANGE)
    held = steelgiven.quantity("--soak", time.strip(), "duration", keys.STAGE_TIME_RANGE)
    assert temp is not None and held is not None, "both were given"
    left = austenite.soak(named.steel, temp, held, grain_astm=named.grain_astm)
    document = {
        "temp_degC": round(temp - ZERO_DEGC, 6),
        "time_s": held,
        "regime": left.regime,
        "austenite_carbon_pct": left.carbon_pct,
        "undissolved_ferrite_mass_fraction": left.ferrite,
        "undissolved_cementite_mass_fraction": left.cementite,
        "grain_astm": left.grain_astm,
    }
    return document, list(left.notes), list(austenite.SOURCES)


def inverse(
    named: SteelInput,
    ferrite: str | None,
    cementite: str | None,
    counted: str | None,
    basis: str,
    level: str,
) -> dict[str, Any]:

    product = "ferrite" if ferrite is not None else "cementite"
    text = ferrite if ferrite is not None else cementite or ""
    option = f"--{product}"
    by: lever.Basis = "mass" if basis == "mass" else "volume"
    measured = levertext.fraction(option, text, counted, level=levertext.level_of(level))
    if by == "mass" and measured.n_field is not None:
        raise InputFault("--basis", '"mass"', "volume for a point count")
    composition = named.steel.composition
    found = lever.estimate(measured, composition=composition, product=product, basis=by)
    return {
        **_head(named, with_carbon=False),
        "equilibrium": _critical_point(equilibrium.equilibrium(composition)),
        "measured": _measured(measured, product, by, found.mass_fraction),
        "carbon": {
            "carbon_pct": found.carbon_pct,
            "low_pct": found.low_pct,
            "high_pct": found.high_pct,
            "level": found.level,
            "relative_accuracy": _finite(found.relative_accuracy),
            "eutectoid_uncertainty_pct": found.invariants_pct,
        },
        **_trust([*named.notes, *found.notes], [*lever.SOURCES, *pointcount.SOURCES]),
    }


def _critical_point(eq: Equilibrium) -> dict[str, float | None]:
    """Ae1 and the eutectoid: what a steel has whatever its carbon."""
    found = _critical(eq)
    return {name: found[name] for name in ("Ae1_degC", "eutectoid_carbon_pct")}


def _measured(measured: CountedFraction, product: str, basis: str, mass: float) -> dict[str, Any]:
    return {
        "phase": product,
        "basis": basis,
        "fraction": measured.fraction,
        "low": measured.low,
        "high": measured.high,
        "level": measured.level,
        "relative_accuracy": _finite(measured.relative_accuracy),
        "n_field": measured.n_field,
        "n_point": _finite(measured.n_point),
        "interval_by": _method(measured),
        "mass_fraction": mass,
    }


def _method(measured: CountedFraction) -> str:
    if math.isnan(measured.n_point):
        return "stated"
    return "fields" if measured.method == "fields" else "totals"


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


def _trust(notes: list[RangeNote], sources: list[Source]) -> dict[str, Any]:
    return {
        "notes": list(dict.fromkeys(str(note) for note in notes)),
        "sources": [vars(source) for source in dict.fromkeys(sources)],
    }


def _title(document: dict[str, Any]) -> str:
    amounts = ", ".join(f"{k} {v:.4g}" for k, v in document["composition_pct"].items())
    listed = f" ({amounts}, mass %)" if amounts else ""
    return f"{document['steel']}{listed}"


def forward_lines(document: dict[str, Any]) -> list[str]:
    critical = document["equilibrium"]
    lines = [_title(document), "", "Equilibrium"]
    for name in ("Ae1", "Ae3", "Acm"):
        if critical[f"{name}_degC"] is not None:
            lines.append(f"  {name:12}{critical[f'{name}_degC']:7.1f} degC")
    lines.append(f"  eutectoid   {critical['eutectoid_carbon_pct']:7.3f} % C at Ae1")
    lines += ["", "Structure after slow cooling   % mass  % volume     % C"]
    for item in document["slow_cooling"]:
        share, volume = 100.0 * item["mass_fraction"], 100.0 * item["volume_fraction"]
        lines.append(f"  {item['name']:26}{share:9.1f}{volume:10.1f}{item['carbon_pct']:8.3f}")
    if "at" in document:
        here = document["at"]
        head = f"Phases at {here['temp_degC']:g} degC"
        lines += ["", f"{head:28}   % mass               % C"]
        for item in here["phases"]:
            share = 100.0 * item["mass_fraction"]
            lines.append(f"  {item['name']:26}{share:9.1f}{item['carbon_pct']:18.3f}")
    if "soak" in document:
        lines += ["", *_soak_lines(document["soak"])]
    return lines + _notes(document)


def _soak_lines(soak: dict[str, Any]) -> list[str]:

    lines = [
        f"After a soak at {soak['temp_degC']:g} degC for {duration(soak['time_s'])}",
        f"  regime      {soak['regime']}",
        f"  austenite   {soak['austenite_carbon_pct']:.3f} % C, "
        f"grain ASTM {soak['grain_astm']:.1f}",
    ]
    for name in ("ferrite", "cementite"):
        share = soak[f"undissolved_{name}_mass_fraction"]
        if share > 0.0:
            lines.append(f"  undissolved {100.0 * share:.1f} % {name} by mass")
    return lines


def carbon_lines(document: dict[str, Any]) -> list[str]:
    measured, carbon = document["measured"], document["carbon"]
    level = f"{100.0 * carbon['level']:g} %"
    share, low, high = (100.0 * measured[key] for key in ("fraction", "low", "high"))
    how = {
        "fields": f"from {measured['n_field']} fields, {measured['n_point'] or 0.0:g} points",
        "totals": f"from {measured['n_point'] or 0.0:g} points in all",
        "stated": "as stated",
    }[measured["interval_by"]]
    lines = [
        _title(document),
        "",
        f"Measured      {share:.1f} % {measured['phase']} by {measured['basis']} "
        f"({100.0 * measured['mass_fraction']:.1f} % by mass)",
        f"  interval    {low:.1f} to {high:.1f} % at {level}, {how}",
    ]
    if measured["relative_accuracy"] is not None:
        lines.append(f"  relative    +-{100.0 * measured['relative_accuracy']:.1f} %")
    lines += [
        "",
        f"Carbon        {carbon['carbon_pct']:.3f} %",
        f"  interval    {carbon['low_pct']:.3f} to {carbon['high_pct']:.3f} % at {level}, "
        "from the measurement alone",
        f"  eutectoid   +-{carbon['eutectoid_uncertainty_pct']:.3f} % more at worst: "
        f"it lies at {document['equilibrium']['eutectoid_carbon_pct']:.3f} % C",
        "  holds for steel cooled so slowly that pearlite formed near Ae1; faster "
        "cooling reads too high below the eutectoid, too low above it",
    ]
    return lines + _notes(document)


def _notes(document: dict[str, Any]) -> list[str]:
    lines = [f"- {note}" for note in document["notes"]]
    if lines:
        lines = ["", "Outside the range of a source", *lines]
    memory = [item["model"] for item in document["sources"] if item["status"] == "remembered"]
    return [*lines, "", f"From memory: {', '.join(memory)}."] if memory else lines
