"""What a case says of a load and of its tank. Frozen, in SI, checked by ``casetank``."""

from dataclasses import dataclass
from pathlib import Path
from typing import Literal

from midradius.thermo.steel import Steel

CoolantKind = Literal["water", "air"]
Arrangement = Literal["counterflow", "parallel", "crossflow"]


@dataclass(frozen=True)
class FixtureInput:
    """A basket or fixture: ``mass`` [kg] of bars or sheet of one ``thickness`` [m].

    ``steel`` None is the steel of the part.
    """

    name: str
    mass: float
    thickness: float
    steel: Steel | None = None


@dataclass(frozen=True)
class LoadInput:
    """What goes into the bath at once: pieces of the section, and what holds them.

    ``length`` [m] of a piece where the section is a cross-section, ``piece_mass`` [kg]
    instead of it or for a section that has none.
    """

    pieces: int = 1
    length: float | None = None
    piece_mass: float | None = None
    fixtures: tuple[FixtureInput, ...] = ()


@dataclass(frozen=True)
class CoolerInput:
    """A cooler: its duty [W] with the bath at its limit, or its exchanger.

    ``conductance`` is UA [W/K], flows in kg/s; ``coolant_in`` [K] is what enters. The
    thermostat opens from ``start`` [K] on; None is the bath temperature of the route.
    """

    power: float | None = None
    conductance: float | None = None
    bath_flow: float | None = None
    coolant: CoolantKind = "water"
    coolant_flow: float | None = None
    coolant_in: float | None = None
    arrangement: Arrangement = "counterflow"
    start: float | None = None


@dataclass(frozen=True)
class TankInput:
    """A quench tank; None is "not said", and the answer then names what it took.

    ``volume`` [m3] of fluid at ``filled_at`` [K]; inside ``length``, ``width`` and
    ``depth`` [m] to the lip. Limits on the bath [K], on the rise of one load [K], on
    the bath before the next load [K]. ``flow`` [m3/s] of propeller or pump,
    ``velocity`` [m/s] asked through ``passage`` [m2].
    """

    volume: float
    length: float | None = None
    width: float | None = None
    depth: float | None = None
    filled_at: float | None = None
    fluid_file: Path | None = None
    flash_point: float | None = None
    bath_limit: float | None = None
    rise_limit: float | None = None
    ready_at: float | None = None
    freeboard: float | None = None
    morning: float | None = None
    cooler: CoolerInput | None = None
    heater: float | None = None
    heater_set: float | None = None
    agitator: float | None = None
    flow: float | None = None
    velocity: float | None = None
    passage: float | None = None
    layers: int | None = None
    air: float | None = None
    lid: bool = False
    drag_out: float | None = None
    period: float | None = None
    coupled: bool = True


@dataclass(frozen=True)
class ShiftInput:
    """A load of the shift: at which time [s], how often and how many.

    Without ``case_file`` and ``mass`` it is the load of the case itself. A load by
    ``mass`` is steel of one ``thickness`` that enters the bath at ``start_temp`` [K]
    and stays for ``time`` [s].
    """

    at: float
    every: float | None = None
    count: int = 1
    case_file: Path | None = None
    mass: float | None = None
    start_temp: float | None = None
    thickness: float | None = None
    time: float | None = None

    @property
    def moments(self) -> tuple[float, ...]:
        """When this load goes in [s]."""
        return tuple(self.at + k * (self.every or 0.0) for k in range(self.count))
