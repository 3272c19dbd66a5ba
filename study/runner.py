"""Run a case: solve, solve again coarser and finer in time, say how far to trust it."""

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from functools import partial

import numpy as np

from midradius.fem import section as forms
from midradius.fem.cutting import AnyCut
from midradius.fem.drawing import Drawing
from midradius.fem.media import ZERO_DEGC
from midradius.fem.place import Place
from midradius.fem.route import History, cool
from midradius.fem.section import Section
from midradius.study.basis import inputs_of, notes_of, sources_of
from midradius.study.begin import Begun, begin
from midradius.study.case import Case, PathInput
from midradius.study.fieldsink import FieldSink, Keeper, compared_moments
from midradius.study.findings import critical_degC, fields, here, position
from midradius.study.meshrun import first_level, mesh_notes, mesh_statements, with_grid
from midradius.study.needs import judge
from midradius.study.result import (
    Position,
    Profile,
    Result,
    SectionView,
    TemperRecord,
)
from midradius.study.setup import Setup, coordinates_of, prepare
from midradius.study.soaktext import (
    heating_record,
    hottest_kind,
    soak_text,
    soak_warnings,
    stage_record,
)
from midradius.study.tanksetup import in_bath
from midradius.study.worth import Worth, tempers_of, worth
from midradius.thermo import properties
from midradius.thermo.arrays import Array

# By dimension: error of one step against the asked accuracy of the run, and the
# grid error against it above which the run is repeated on twice the cells. In two
# dimensions that costs five times the time and gains little inside the part.
TOLERANCE_PER_ACCURACY = {1: 0.1, 2: 0.2, 3: 0.2}
REFINE_ABOVE = {1: 1.0, 2: 4.0, 3: 4.0}
TIGHTER = 1.0 / 8.0  # tolerance of the run that measures the time error
# The error of a second-order method goes with tolerance^(2/3): what the tighter
# run still has, and so what its difference from the looser one leaves out.
TIME_FACTOR = 1.0 / (1.0 - TIGHTER ** (2.0 / 3.0))
GRID_FACTOR = 1.0 / 3.0  # Richardson: (n/2)^-2 - n^-2 is three times n^-2
FACTORS = (TIME_FACTOR, GRID_FACTOR)
MOST_NODES = {1: 2049, 2: 12_000, 3: 30_000}
N_ERROR_TIMES = 200  # moments at which the errors are measured, stored or not
SHORTEST_FIELD = 1.0  # s, the first field time after the start

Tell = Callable[[float, float], None]
Keep = Callable[[Drawing], Keeper]


@dataclass(frozen=True)
class _Attempt:
    """One march from the furnace on, and what its structure is worth."""

    cut: AnyCut
    begun: Begun
    history: History
    worth: Worth


def _march(
    cut: AnyCut,
    case: Case,
    setup: Setup,
    places: Mapping[str, Place],
    times: Array,
    tolerance: float,
    tell: Callable[[float], None] | None = None,
    sink: FieldSink | None = None,
) -> _Attempt:
    watched = tuple(case.watched)
    begun = begin(case, setup.furnace, cut, places=places, watched=watched, tolerance=tolerance)
    history = cool(
        cut,
        begun.tables,
        setup.stages,
        density=properties.DENSITY,
        start_temp=begun.temp,
        state=begun.state,
        carbon_pct=case.steel.steel.composition.C,
        places=places,
        watched=watched,
        field_times=times,
        tolerance=tolerance,
        tell=tell,
        scale=begun.scale,
        first_number=len(case.heating) + 1,
        sink=sink,
    )
    return _Attempt(cut, begun, history, worth(case, begun.soaked, history))


def run(case: Case, *, tell: Tell | None = None, keep: Keep | None = None) -> Result:
    """Solve a case.

    Parameters
    ----------
    case
        From :func:`midradius.study.casefile.read`, or made in Python.
    tell
        Called with the simulated time [s] and the expected end [s] now and then.
    keep
        Opens what takes the asked fields as they come, from the drawing of the part; it
        is called anew when the run is repeated on a finer grid.

    Returns
    -------
    Result
        Frozen; arrays with units in their names.

    Raises
    ------
    InputFault
        The case asks for something that cannot be computed.
    SolverFault
        The solver gave up.
    """
    setup = in_bath(case, prepare(case))
    dim = setup.section.n_dim
    tolerance = TOLERANCE_PER_ACCURACY[dim] * case.grid.accuracy
    fine = _first(case, setup)
    while True:
        below = fine.coarser()
        coarse = below or fine
        march = partial(_march, case=case, setup=setup)
        at_fine, at_coarse = _places(case, fine), _places(case, coarse)
        scout = march(
            coarse, places=at_coarse, times=np.zeros(1), tolerance=4.0 * tolerance
        ).history
        asked = _field_times(case, scout)
        n_node = fine.body.n_node
        times = np.union1d(asked, _spread(scout, compared_moments(N_ERROR_TIMES, n_node)))
        end = float(scout.step_times[-1])
        below_fields = FieldSink(hold=True)
        if below is not None:
            rough = march(
                coarse, places=at_coarse, times=times, tolerance=tolerance, sink=below_fields
            )
        # In one dimension the finer grid is cheap enough to tell its own time error.
        itself = dim == 1 or below is None
        fields = FieldSink(
            asked,
            keeper=None if keep is None else keep(fine.drawing()),
            hold=itself,
            against=None if below is None else below_fields.held,
            share=fine.shared,
        )
        main = march(
            fine,
            places=at_fine,
            times=times,
            tolerance=tolerance,
            tell=None if tell is None else lambda now, end=end: tell(now, end),  # type: ignore[misc]
            sink=fields,
        )
        if below is None:
            rough, grid_error = main, float("nan")
            break
        grid_error = GRID_FACTOR * fields.worst
        good = grid_error <= REFINE_ABOVE[dim] * case.grid.accuracy
        finer = fine.finer(setup.strongest_film, MOST_NODES[dim])
        if case.grid.cells or good or finer is None:
            break
        fine = finer
    gap = FieldSink(against=fields.held if itself else below_fields.held)
    line = itself and below is not None  # the coarser run then measures no time error
    sharp = march(
        coarse,
        places=at_coarse,
        times=times,
        tolerance=TIGHTER * tolerance,
        sink=FieldSink() if line else gap,
    )
    if line:
        march(fine, places=at_fine, times=times, tolerance=TIGHTER * tolerance, sink=gap)
    time_error = TIME_FACTOR * gap.worst
    held = fields.wanted
    none = np.empty((0, main.cut.body.n_node))
    shown = replace(
        main, history=replace(main.history, times=asked, field=none if held is None else held)
    )
    return _result(
        case,
        setup,
        shown,
        rough,
        sharp,
        at_fine,
        at_coarse,
        time_error,
        grid_error,
        replace(main.history, times=asked, field=fields.extremes),
    )


def _even(cells: tuple[int, ...]) -> tuple[int, ...]:
    """Counts that halve twice, so that the coarser grid keeps every second node."""
    return tuple(4 * int(np.ceil(count / 4)) for count in cells)


def _first(case: Case, setup: Setup) -> AnyCut:
    """The section cut as the case asks, or as fine as its accuracy is likely to need."""
    section = setup.section
    if not isinstance(section, Section):
        return first_level(section)
    cells = case.grid.cells or forms.cells_for(section, case.grid.accuracy)
    return forms.cut(section, _even(cells), strongest_film=setup.strongest_film)


def _places(case: Case, cut: AnyCut) -> dict[str, Place]:
    named = dict(case.watched)
    for stage in (*case.heating, *case.cooling):
        if stage.until and stage.until.position not in named:
            named[stage.until.position] = case.position(stage.until.position)
    return {name: cut.place(coordinates_of(cut.section, place)) for name, place in named.items()}


def _field_times(case: Case, scout: History) -> Array:
    """The case's times, or a spread over all stages."""
    if case.outputs.field_times:
        return np.array(sorted(case.outputs.field_times))
    return _spread(scout, case.outputs.n_field)


def _spread(scout: History, count: int) -> Array:
    """Times [s] from start to end, even in the logarithm within every stage."""
    end = float(scout.step_times[-1])
    total = sum(stage.end - stage.start for stage in scout.stages)
    times = [0.0]
    for stage in scout.stages:
        span = stage.end - stage.start
        share = max(2, int(round(count * max(span / total, 1.0 / len(scout.stages)))))
        first = min(SHORTEST_FIELD, 0.25 * span)
        times += list(stage.start + np.geomspace(first, span, share))
    chosen = np.unique(np.round(times, 6))
    if len(chosen) > count:
        keep = np.unique(np.round(np.linspace(0, len(chosen) - 1, count)).astype(int))
        chosen = chosen[keep]
    chosen[-1] = end
    return chosen


def _result(
    case: Case,
    setup: Setup,
    main: _Attempt,
    rough: _Attempt,
    sharp: _Attempt,
    at_fine: Mapping[str, Place],
    at_coarse: Mapping[str, Place],
    time_error: float,
    grid_error: float,
    bounds: History,  # with the extremes of each field only
) -> Result:
    composition = case.steel.steel.composition
    history, cut = main.history, main.cut
    view, line = cut.drawing(), cut.profile()
    factor, extent = setup.section.whole
    mass = properties.DENSITY * float(cut.body.volume.sum())
    positions = tuple(
        _position(name, main, at_fine[name], rough, sharp, at_coarse[name]) for name in case.watched
    )
    left = hottest_kind(main.worth.soaked)
    return Result(
        title=case.title,
        steel=case.steel.steel.name,
        composition_pct={k: v for k, v in vars(composition).items() if v},
        section=setup.section.text,
        sense=setup.section.sense,
        points_mm=cut.body.points * 1e3,
        volume=cut.body.volume,
        view=SectionView(view.points * 1e3, view.cells, view.node, view.point_data, view.cell_data),
        times_s=history.times,
        temp_degC=history.field - ZERO_DEGC,
        **fields(history, main.worth),
        history_times_s=history.step_times,
        history_temp_degC=history.watch_temp - ZERO_DEGC,
        positions=positions,
        profile=Profile(line.depth * 1e3, line.node, line.label, line.share),
        paths=tuple(_along(cut, path) for path in case.outputs.paths),
        stages=tuple(
            stage_record(stage, went, factor, "below")
            for stage, went in zip(setup.stages, history.stages, strict=True)
        ),
        tempers=tuple(TemperRecord(t.temp - ZERO_DEGC, t.time) for t in tempers_of(case)),
        critical_degC=critical_degC(case, left),
        soak=soak_text(case, main.begun),
        heat_given_J_per_kg=history.heat_given / mass,
        heat_extent=extent,
        heat_balance_relative=history.balance,
        time_error_K=time_error,
        grid_error_K=grid_error,
        n_step=history.n_step,
        n_node=cut.body.n_node,
        heating=heating_record(setup.furnace, main.begun, factor, mass),
        verdicts=with_grid(
            judge(case, (main, at_fine), (rough, at_coarse), (sharp, at_coarse), FACTORS),
            measured=bool(np.isfinite(grid_error)),
        ),
        notes=notes_of(case, setup.notes, history, main.worth, seen=bounds.field, last=history.temp)
        + mesh_notes(cut, bounds, setup.stages, main.begun.temp),
        sources=sources_of(case, setup.sources),
        assumptions=setup.assumptions
        + mesh_statements(cut, grid_error)
        + (case.steel.kinetics.text,)
        + ((case.steel.calibration.text,) if case.steel.calibration else ()),
        cautions=soak_warnings(main.worth.soaked, case.soak.at or 0.0, cut.body.volume)
        + setup.cautions
        + main.worth.cautions,
        inputs=inputs_of(case),
        case_text=case.text,
    )


def _position(
    name: str, main: _Attempt, at: Place, rough: _Attempt, sharp: _Attempt, at_coarse: Place
) -> Position:
    hv, hv_rough, hv_sharp = (
        here(each.worth.hardness_hv, place)
        for each, place in ((main, at), (rough, at_coarse), (sharp, at_coarse))
    )
    return position(
        name,
        main.history,
        main.worth,
        at,
        time_error_hv=TIME_FACTOR * abs(hv_sharp - hv_rough),
        grid_error_hv=(
            GRID_FACTOR * abs(hv - hv_rough) if rough.cut is not main.cut else float("nan")
        ),
    )


def _along(cut: AnyCut, path: PathInput) -> Profile:
    """A path of the case: distance from its start, nodes and shares."""
    part = np.linspace(0.0, 1.0, path.n_point)
    start, end = np.array(path.start), np.array(path.end)
    places = [cut.place(tuple(float(x) for x in start + p * (end - start))) for p in part]
    return Profile(
        depth_mm=1e3 * float(np.linalg.norm(end - start)) * part,
        node=np.array([place.node for place in places]),
        label=path.name,
        share=np.array([place.share for place in places]),
    )
