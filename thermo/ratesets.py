"""From the choice of rates to numbers: the set that is named, the measured curves before it."""

from dataclasses import replace

from midradius.thermo import boron, diffusional, extension, kirkaldy, martensite, measuredrates
from midradius.thermo import kinetics as kin
from midradius.thermo.arrays import Array
from midradius.thermo.austenite import Austenite
from midradius.thermo.clocks import LI as LI_SHAPE
from midradius.thermo.clocks import Shape
from midradius.thermo.diffusional import Rates
from midradius.thermo.equilibrium import Equilibrium
from midradius.thermo.ratechoice import EXTENDED, KIRKALDY, Kinetics
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition

MODULES = {KIRKALDY: kirkaldy}
RATE_COLUMNS = {
    "ferrite": (kin.RATE_FERRITE, kin.EXPONENT_FERRITE),
    "pearlite": (kin.RATE_PEARLITE, kin.EXPONENT_PEARLITE),
    "bainite": (kin.RATE_BAINITE, kin.EXPONENT_BAINITE),
    "cementite": (kin.RATE_CEMENTITE, kin.EXPONENT_CEMENTITE),
}


def rates(kinetics: Kinetics, austenite: Austenite, temp: Array, soaked: Equilibrium) -> Rates:
    """Clock rates of the named set, (n_temp,) each, for an austenite with its own equilibrium."""
    found = _without_boron(kinetics, austenite, temp, soaked)
    slower = boron.time_factor(replace(austenite.composition, C=austenite.carbon_pct))
    if slower == 1.0:
        return found
    return Rates(found.ferrite / slower, found.pearlite / slower, found.bainite / slower)


def _without_boron(
    kinetics: Kinetics, austenite: Austenite, temp: Array, soaked: Equilibrium
) -> Rates:
    if kinetics.name == KIRKALDY:
        return kirkaldy.rates(
            replace(austenite.composition, C=austenite.carbon_pct),
            temp,
            grain_astm=austenite.grain_astm,
            ae3=soaked.ae3,
            ae1=soaked.ae1,
        )
    return diffusional.rates(
        austenite.composition,
        temp,
        carbon_pct=austenite.carbon_pct,
        grain_astm=austenite.grain_astm,
        ae3=soaked.ae3,
        ae1=soaked.ae1,
        extended=kinetics.name == EXTENDED,
    )


def shapes(kinetics: Kinetics, composition: Composition) -> tuple[Shape, ...]:
    """Clock shapes of ferrite, pearlite and bainite.

    They belong to the steel, not to one of its austenites: those of a section share them.
    """
    if kinetics.name == KIRKALDY:
        return kirkaldy.shapes(composition)
    pearlite = extension.PEARLITE_SHAPE if kinetics.name == EXTENDED else LI_SHAPE
    return LI_SHAPE, pearlite, LI_SHAPE


def put_measured(kinetics: Kinetics, temp: Array, value: Array) -> tuple[str, ...]:
    """Write measured rates over those of the set; the products that have some.

    ``value`` (n_temp, n_column) changes in place.
    """
    if kinetics.measured is None:
        return ()
    for one in kinetics.measured.products:
        rate, exponent = RATE_COLUMNS[one.product]
        value[:, rate], value[:, exponent] = measuredrates.clock(one, temp)
    return tuple(one.product for one in kinetics.measured.products)


def bainite_start(kinetics: Kinetics, composition: Composition) -> float:
    """Bainite start [K] that belongs to the set."""
    if kinetics.name == KIRKALDY:
        return kirkaldy.bainite_start(composition)
    return diffusional.bainite_start(composition)


def martensite_shift(kinetics: Kinetics, austenite: Austenite) -> tuple[float, float]:
    """What a measured start [K] and rate [1/K] add to those of the formulas."""
    measured = kinetics.measured
    if measured is None:
        return 0.0, 0.0
    ours, carbon = austenite.composition, austenite.carbon_pct
    start = rate = 0.0
    if measured.martensite_start is not None:
        start = measured.martensite_start - float(martensite.start(ours, carbon))
    if measured.martensite_rate is not None:
        rate = measured.martensite_rate - float(martensite.rate(ours, carbon))
    return start, rate


def martensite_start(kinetics: Kinetics, austenite: Austenite) -> float:
    """Martensite start [K] of an austenite: measured, else by the formula."""
    formula = float(martensite.start(austenite.composition, austenite.carbon_pct))
    return formula + martensite_shift(kinetics, austenite)[0]


def range_notes(
    kinetics: Kinetics, composition: Composition, carbon_pct: float, grain_astm: float
) -> list[RangeNote]:
    """Where the named set is used outside the range of its source."""
    of_boron = boron.range_notes(replace(composition, C=carbon_pct))
    if kinetics.name == KIRKALDY:
        return [*kirkaldy.range_notes(composition, carbon_pct), *of_boron]
    return [*diffusional.range_notes(composition, carbon_pct, grain_astm), *of_boron]


def sources(kinetics: Kinetics, composition: Composition) -> tuple[Source, ...]:
    """The works behind the choice, for a steel."""
    found = list(diffusional.SOURCES)
    if kinetics.name == EXTENDED:
        found += extension.SOURCES
    if kinetics.name == KIRKALDY:
        # the film of cementite is in no set: it stays
        found = [*kirkaldy.SOURCES, *diffusional.SOURCES[1:]]
    if boron.acts(composition):
        found += boron.SOURCES
    if kinetics.measured is not None:
        own = Source("measured transformation", kinetics.measured.name, "the user's own", "read")
        found = [own, *measuredrates.SOURCES, *found]
    return tuple(found)
