"""From a case to what the solver takes: section, stages with films, assumptions."""

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations

from midradius.fem import section as forms
from midradius.fem.convection import Geometry
from midradius.fem.cutting import AnySection
from midradius.fem.filmfile import provenance
from midradius.fem.media import ZERO_DEGC, medium
from midradius.fem.meshsection import MeshSection
from midradius.fem.route import CoolingStage, Surface
from midradius.fem.section import Section
from midradius.fem.surface import beyond, film, film_from_csv
from midradius.study.case import Case, MediumUse, PositionInput, SectionInput, Stage
from midradius.study.casemesh import mesh_of
from midradius.study.heatsetup import HeatSetup, prepare_heating
from midradius.thermo import heating
from midradius.thermo.errors import InputFault
from midradius.thermo.source import RangeNote, Source

PLATE_HEIGHT = 0.3  # m, of a slab standing in a gas; it changes free convection little


@dataclass(frozen=True)
class Setup:
    """What a case means to the solver."""

    section: Section | MeshSection
    stages: tuple[CoolingStage, ...]
    strongest_film: Mapping[str, float]
    notes: tuple[RangeNote, ...]
    sources: tuple[Source, ...]
    assumptions: tuple[str, ...]
    cautions: tuple[str, ...]
    furnace: HeatSetup = HeatSetup()


def section_of(given: SectionInput) -> Section | MeshSection:
    """The section of a case, not folded yet."""
    size = {
        name: getattr(given, name) or 0.0
        for name in ("thickness", "diameter", "outside", "bore", "width", "height")
    }
    match given.form:
        case "slab":
            return forms.slab(size["thickness"])
        case "round":
            return forms.round_bar(size["diameter"], given.length)
        case "tube":
            return forms.tube(size["outside"], size["bore"])
        case "ball":
            return forms.ball(size["diameter"])
        case "bar":
            return forms.bar(size["width"], size["height"])
        case "ring":
            return forms.ring(size["outside"], size["bore"], size["height"])
        case "mesh" | "outline":
            assert given.mesh is not None, "a mesh has its file"
            mesh = mesh_of(given.mesh)
            return MeshSection(mesh, mesh.zones)


def coordinates_of(section: AnySection, place: PositionInput) -> tuple[float, ...]:
    """Where a position of the case lies [m]."""
    if place.coordinates is not None:
        return place.coordinates
    return section.trade_place(place.kind, place.depth)


def prepare(case: Case) -> Setup:
    """Everything the solver needs of a case but the steel.

    Raises
    ------
    InputFault
        A film curve that cannot be read, a bath outside its medium's limits, a
        zone that no medium was given for.
    """
    section = section_of(case.section)
    uses = [uses_of(section, case.section, stage) for stage in case.cooling]
    same = {
        pair: all(use[pair[0]] == use[pair[1]] for use in uses)
        for pair in combinations(section.zones, 2)
    }
    section = section.folded(same)
    notes: list[RangeNote] = []
    sources: list[Source] = []
    cautions: list[str] = []
    stages = []
    strongest: dict[str, float] = dict.fromkeys(section.zones, 0.0)
    hottest = max(stage.at or 0.0 for stage in (*case.heating, case.soak))
    length, geometry = _size(section)
    shut = {zone for zone in section.zones if all(_insulated(use[zone]) for use in uses)}
    furnace = prepare_heating(case, section.zones, shut=shut, length=length, geometry=geometry)
    for stage, use in zip(case.cooling, uses, strict=True):
        surfaces = {}
        for zone, medium_use in use.items():
            surface, more, source, warned = _surface(medium_use, section, case.section.emissivity)
            surfaces[zone] = surface
            notes += more
            notes += beyond(surface.film, coldest=surface.ambient, hottest=hottest)
            sources += source
            cautions += warned
            strongest[zone] = max(strongest[zone], float(surface.film.htc.max()))
        stages.append(
            CoolingStage(
                kind=stage.kind,
                label=_label(surfaces),
                surfaces=surfaces,
                duration=stage.time,
                until_place=stage.until.position if stage.until else None,
                until_temp=stage.until.temp if stage.until else None,
            )
        )
    return Setup(
        section=section.cooled_by(strongest),
        stages=tuple(stages),
        strongest_film=strongest,
        notes=tuple(dict.fromkeys([*furnace.notes, *notes])),
        sources=tuple(dict.fromkeys([*furnace.sources, *sources])),
        assumptions=_assumptions(case, section),
        cautions=tuple(dict.fromkeys([*furnace.cautions, *cautions])),
        furnace=furnace,
    )


def uses_of(section: AnySection, given: SectionInput, stage: Stage) -> dict[str, MediumUse]:
    """What each zone of the section sees in a stage."""
    found = {}
    for zone in section.zones:
        use = stage.faces.get(zone)
        if use is None and zone == "bore" and given.bore_medium is not None:
            use = given.bore_medium
        use = use or stage.medium
        if use is None:
            raise InputFault(
                "medium", "missing", f'given for the zone "{zone}"', "Name a medium for the stage."
            )
        found[zone] = use
    return found


def _insulated(use: MediumUse) -> bool:
    return use.film_file is None and medium(use.name or "").name == "insulated"


_GEOMETRY: Mapping[str, Geometry] = {
    "slab": "vertical plate",
    "bar": "vertical plate",
    "ball": "sphere",
}


def _size(section: Section | MeshSection) -> tuple[float, Geometry]:
    """The length [m] and the shape that a gas sees."""
    if isinstance(section, MeshSection):
        return section.gas_size
    spans = section.spans
    length = 2.0 * spans[0].high
    if section.form == "slab":
        length = PLATE_HEIGHT
    elif section.form == "bar":
        length = spans[1].length
    return length, _GEOMETRY.get(section.form, "horizontal cylinder")


def _surface(
    use: MediumUse, section: Section | MeshSection, emissivity: float
) -> tuple[Surface, list[RangeNote], list[Source], tuple[str, ...]]:
    if use.film_file is not None:
        curve = film_from_csv(use.film_file)
        if use.bath is None:
            raise InputFault(
                "bath", "missing", "given beside a film curve", 'Write bath = "60 degC".'
            )
        told = provenance(use.film_file) or "the user's own"
        own = Source("film curve", use.film_file.name, told, "read")
        return Surface(f'film "{use.film_file.name}"', curve, use.bath), [], [own], ()
    found = medium(use.name or "")
    bath = use.bath if use.bath is not None else found.bath_default
    if bath is None:
        raise InputFault("bath", "missing", f'given for "{found.name}"', 'Write bath = "60 degC".')
    length, geometry = _size(section)
    curve, notes = film(
        found,
        bath=bath,
        length=length,
        geometry=geometry,
        emissivity=emissivity,
    )
    label = found.name if found.kind == "ideal" else f"{found.name}, {bath - ZERO_DEGC:.4g} degC"
    return Surface(label, curve, bath), list(notes), [found.source], found.cautions


def _label(surfaces: Mapping[str, Surface]) -> str:
    labels = dict.fromkeys(surface.label for surface in surfaces.values())
    if len(labels) == 1:
        return next(iter(labels))
    seen = [surface.label for surface in surfaces.values()]
    common = max(labels, key=seen.count)
    rest = [f"{zone}: {s.label}" for zone, s in surfaces.items() if s.label != common]
    return "; ".join([common, *rest])


def _assumptions(case: Case, section: Section | MeshSection) -> tuple[str, ...]:
    soaked = (
        "The whole section is at the soak temperature when cooling starts, and the soak time"
        " counts from there: heating up is not computed."
    )
    if case.heating:
        soaked = (
            "One part alone in the furnace, which keeps its temperature; every face sees it"
            " alike, but those that stay insulated from then on. The soak goes on in the"
            " furnace of the last heat stage, set to the soak temperature at once; its time"
            " counts from the end of that stage. The steel takes up its heat of transformation"
            " at equilibrium."
        )
        composition = case.steel.steel.composition
        if not heating.range_notes(composition):
            ac1, ac3 = (line(composition) - ZERO_DEGC for line in (heating.ac1, heating.ac3))
            soaked += f" Andrews gives Ac1 {ac1:.0f} and Ac3 {ac3:.0f} degC for heating faster."
    lines = [
        soaked,
        "One part alone in the bath; every zone has one film over all of it. Packed loads cool"
        " slower and less evenly.",
        "Density 7850 kg/m3 and the cold dimensions throughout.",
        "Phases and hardness are those at 20 degC: austenite left at the end of the route follows"
        " the martensite curve; temperatures, times and heat end with the route.",
    ]
    if case.tempers:
        lines.append(
            "Tempers act alike on the whole section, cooled to 20 degC before: their time counts"
            " from when the part is hot throughout; heating up and cooling after them add nothing."
            " Retained austenite that they decompose counts as bainite."
        )
    if isinstance(section, MeshSection):
        length, geometry = section.gas_size
        lines.append(f"In a gas the part counts as a {geometry} of {1e3 * length:.4g} mm.")
        if section.sense == "plane":
            lines.append("The part is long: its ends do not cool this section.")
        if case.section.mesh is not None and case.section.mesh.outline is not None:
            lines += case.section.mesh.outline.statements
        return tuple(lines)
    if section.form in ("tube", "ring") and case.section.bore_medium is None:
        lines.append("The bore sees the same medium as the outside, as freely.")
    if section.form == "slab":
        lines.append(f"In a gas the slab stands {PLATE_HEIGHT * 1e3:.0f} mm high.")
    if section.form in ("round", "tube", "bar") and len(section.spans) == (
        2 if section.form == "bar" else 1
    ):
        lines.append("The part is long: its ends do not cool this section.")
    return tuple(lines)
