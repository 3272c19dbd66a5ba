"""What one run hands back: frozen, with the unit in every name.

Arrays along nodes are those of the solved section (a quarter or a radius where
symmetry allows it); ``view`` draws the whole part from them.
"""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from midradius.fem.place import along
from midradius.thermo.arrays import Array, BoolArray, IntArray
from midradius.thermo.source import RangeNote, Source

if TYPE_CHECKING:
    from midradius.fem.histories import GivenMesh


@dataclass(frozen=True)
class SectionView:
    """A mesh that shows the part as a person would draw it.

    ``points_mm`` (n_point, 3); ``cells`` are blocks of one type each, (n, k) indices
    of points; ``node`` (n_point,) is the solved node that each point takes its values
    from. Of a mesh file, points and cells are the file's own in its order, with the
    data that it brought: ``point_data`` (n_point, ...), ``cell_data`` (n_cell, ...).
    """

    points_mm: Array
    cells: tuple[tuple[str, IntArray], ...]
    node: IntArray
    point_data: Mapping[str, NDArray[np.generic]] = field(default_factory=dict)
    cell_data: Mapping[str, NDArray[np.generic]] = field(default_factory=dict)

    def of_type(self, kind: str, n_corner: int) -> IntArray:
        """All cells of one type, (n, n_corner)."""
        blocks = [block for name, block in self.cells if name == kind]
        return np.concatenate([np.empty((0, n_corner), dtype=np.int64), *blocks])

    @property
    def quads(self) -> IntArray:
        """Quadrilaterals, (n_quad, 4)."""
        return self.of_type("quad", 4)

    @property
    def triangles(self) -> IntArray:
        """Triangles, (n_triangle, 3)."""
        return self.of_type("triangle", 3)


@dataclass(frozen=True)
class Position:
    """The answer at one named place of the drawing.

    ``hardness_hrc`` and ``hardness_hb`` are None where the conversion does not
    hold; times and rates are None where the place never crossed the range. Without a
    temper ``hardness_as_quenched_hv`` equals ``hardness_hv``; ``yield_mpa`` is None where
    its hardened part is outside 147 to 656 HV. Lengths are those as cooled, None where there
    is too little of the constituent; film and network of `thermo.network`, None for a steel
    that is not hypereutectoid; ``impact_transition_degC`` is None outside its relation.
    ``soak_degC`` is the hottest it was, the four after it what the soak left; the grain is
    None where nothing became austenite.
    ``depth_mm`` counts from the nearest cooled surface.
    """

    name: str
    depth_mm: float
    coordinates_mm: tuple[float, ...]
    hardness_hv: float
    hardness_hrc: float | None
    hardness_hb: float | None
    hardness_as_quenched_hv: float
    tensile_mpa: float | None
    yield_mpa: float | None
    phases: Mapping[str, float]
    time_800_500_s: float | None
    rate_700_K_per_s: float | None
    austenite_carbon_pct: float
    ferrite_grain_um: float | None
    pearlite_spacing_um: float | None
    cementite_film_um: float | None
    cementite_network: str | None
    impact_transition_degC: float | None
    soak_degC: float
    carbon_in_solution_pct: float
    undissolved_ferrite: float
    undissolved_cementite: float
    austenite_grain_astm: float | None
    austenite_grain_um: float | None
    hardness_time_error_hv: float
    hardness_grid_error_hv: float


@dataclass(frozen=True)
class Profile:
    """Surface to core along the drawing's line, or a path; (n_point,) each.

    On a mesh its points lie between nodes: ``node`` and ``share`` are (n_point, k).
    """

    depth_mm: Array
    node: IntArray
    label: str
    share: Array | None = None

    def of(self, values: NDArray[Any]) -> Array:
        """Values of nodes (..., n_node) along the profile, (..., n_point)."""
        return along(values, self.node, self.share)


@dataclass(frozen=True)
class StageRecord:
    """One stage of the route as it was run; heat [J] in the extent that the result names."""

    kind: str
    medium: str
    start_s: float
    end_s: float
    ended_by: str
    heat_to_bath_J: float


@dataclass(frozen=True)
class TemperRecord:
    """One temper of the cooled part; the time counts from when it is hot throughout."""

    at_degC: float
    time_s: float


@dataclass(frozen=True)
class SoakFields:
    """What the soak left at every node, (n_node,) each: the highest temperature, carbon in
    solution, undissolved fractions, austenite grain (number and mean intercept), which is
    nan where ``austenitised`` says that nothing became austenite."""

    hottest_degC: Array
    carbon_in_solution_pct: Array
    ferrite: Array
    cementite: Array
    grain_astm: Array
    grain_um: Array
    austenitised: BoolArray


@dataclass(frozen=True)
class HeatingRecord:
    """How the part came to its soak: stages that count from when it enters the furnace,
    heat given off negative; ``times_s`` (n_step,), ``temp_degC`` (n_step, n_position)."""

    stages: tuple[StageRecord, ...]
    times_s: Array
    temp_degC: Array
    heat_taken_J_per_kg: float
    heat_balance_relative: float


Outcome = Literal["holds", "fails", "too close to call"]


@dataclass(frozen=True)
class Verdict:
    """Whether one requirement of the drawing is met, by how much, and how sure that is.

    Numbers are in ``unit``: the one asked, or HV where the value has no conversion to it.
    ``margin`` to ``limit`` is positive on the good side; the uncertainties are those at
    90 %, of the model on the side of the limit. None: no model gives it.
    ``model_measured`` is False where ``model_basis`` is an estimate.
    """

    need: str
    position: str
    quantity: str
    unit: str
    value: float | None
    limit: float
    margin: float | None
    numerical_uncertainty: float | None
    model_uncertainty: float | None
    model_measured: bool
    model_basis: str
    outcome: Outcome
    note: str = ""


@dataclass(frozen=True)
class Resampling:
    """What the time between given samples costs.

    Errors of every node (n_node,): of the hardness after and before the tempers [HV], and
    the largest over the constituents [-]. ``halved_hv`` and ``cubic_hv``: how far hardness
    before the tempers moves at most without every second sample, and along a cubic.
    ``largest_fall_K`` is that between two samples while a node could transform.
    """

    hardness_error_hv: Array
    as_quenched_error_hv: Array
    phase_error: Array
    halved_hv: float
    cubic_hv: float
    worst_hardness: str
    worst_phase: str
    largest_fall_K: float
    n_sample: int


@dataclass(frozen=True)
class Result:
    """One run of the main job.

    Shapes: ``times_s`` (n_time,), ``temp_degC`` (n_time, n_node), ``phases``
    (n_phase, n_node) after all tempers, other fields (n_node,), ``history_times_s`` (n_step,),
    ``history_temp_degC`` (n_step, n_position). ``cementite_film_um`` is nan and
    ``cementite_network``, a code of `thermo.network.NAMES`, is 0 for a steel that is not
    hypereutectoid. ``temp_degC`` has no rows where a large run wrote them to a file as
    they came.
    """

    title: str
    steel: str
    composition_pct: Mapping[str, float]
    section: str
    sense: str
    points_mm: Array
    volume: Array
    view: SectionView
    times_s: Array
    temp_degC: Array
    phases: Array
    hardness_hv: Array
    hardness_as_quenched_hv: Array
    yield_mpa: Array
    time_800_500_s: Array
    rate_700_K_per_s: Array
    austenite_carbon_pct: Array
    pearlite_formed_at_degC: Array
    ferrite_grain_um: Array
    pearlite_spacing_um: Array
    cementite_film_um: Array
    cementite_network: IntArray
    impact_transition_degC: Array
    soaked: SoakFields
    history_times_s: Array
    history_temp_degC: Array
    positions: tuple[Position, ...]
    profile: Profile
    stages: tuple[StageRecord, ...]
    tempers: tuple[TemperRecord, ...]
    critical_degC: Mapping[str, float]
    soak: str
    heat_given_J_per_kg: float
    heat_extent: str
    heat_balance_relative: float
    time_error_K: float
    grid_error_K: float
    n_step: int
    n_node: int
    heating: HeatingRecord | None = None
    paths: tuple[Profile, ...] = ()
    verdicts: tuple[Verdict, ...] = ()
    notes: tuple[RangeNote, ...] = ()
    sources: tuple[Source, ...] = ()
    assumptions: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    inputs: Mapping[str, object] = field(default_factory=dict)
    case_text: str = ""
    resampling: Resampling | None = None
    mesh: "GivenMesh | None" = None
