"""From the heat stages of a case to what the solver takes, and what that assumes."""

from collections.abc import Collection, Mapping
from dataclasses import dataclass

from midradius.fem.convection import Geometry
from midradius.fem.furnace import furnace_film, furnace_medium, rises
from midradius.fem.heatup import HeatingStage
from midradius.fem.media import ZERO_DEGC
from midradius.fem.surface import Film
from midradius.study.case import Case, Stage
from midradius.thermo.source import RangeNote, Source

MIDDLE = 0.5  # of a rising furnace, whose film stands for the whole piece


@dataclass(frozen=True)
class HeatSetup:
    """The furnace stages of a case, the soak last; none where it is hot throughout."""

    stages: tuple[HeatingStage, ...] = ()
    start_temp: float = 0.0
    notes: tuple[RangeNote, ...] = ()
    sources: tuple[Source, ...] = ()
    cautions: tuple[str, ...] = ()


def prepare_heating(
    case: Case,
    zones: tuple[str, ...],
    *,
    shut: Collection[str],
    length: float,
    geometry: Geometry,
) -> HeatSetup:
    """Everything the solver needs of a case up to the end of its soak.

    ``length`` [m] and ``geometry`` are what the part looks like to a gas. The zones
    ``shut`` see nothing of the furnace: those that every later stage insulates, such as
    a plugged bore or a plane of symmetry.
    """
    if not case.heating:
        return HeatSetup()
    notes: list[RangeNote] = []
    sources: list[Source] = []
    cautions: list[str] = []
    stages = []
    furnace = case.heating[0].start or 0.0
    using: Stage = case.heating[0]
    for number, stage in enumerate((*case.heating, case.soak)):
        using = stage if stage.medium is not None else using
        assert using.medium is not None, "a heat stage has a medium"
        medium = furnace_medium(using.medium.name or "")
        at = stage.at or 0.0
        # Without a ramp the part comes into a hot furnace; the soak is one that is set anew.
        pieces = rises(at, start=furnace, ramp=stage.ramp)
        films = []
        for piece in pieces:
            middle = piece.begin + MIDDLE * (piece.end - piece.begin)
            film, left = furnace_film(
                medium,
                furnace=middle,
                length=length,
                geometry=geometry,
                emissivity=case.section.emissivity,
            )
            films.append(_by_zone(zones, shut, film))
            notes += left
        stages.append(
            HeatingStage(
                kind=stage.kind,
                label=f"{medium.name}, {at - ZERO_DEGC:.4g} degC",
                number=number,
                rises=pieces,
                films=tuple(films),
                duration=stage.time,
                until_place=stage.until.position if stage.until else None,
                until_temp=stage.until.temp if stage.until else None,
            )
        )
        furnace = at
        sources.append(medium.source)
        cautions += medium.cautions
    return HeatSetup(
        stages=tuple(stages),
        start_temp=case.heating[0].start or 0.0,
        notes=tuple(dict.fromkeys(notes)),
        sources=tuple(dict.fromkeys(sources)),
        cautions=tuple(dict.fromkeys(cautions)),
    )


def _by_zone(zones: tuple[str, ...], shut: Collection[str], film: Film) -> Mapping[str, Film]:
    none = Film(film.temp, 0.0 * film.htc, film.name)
    return {zone: none if zone in shut else film for zone in zones}
