"""A result in words: for the terminal, and as one JSON document.

`terminal` prints (on a console that the caller gives); `document` returns plain
dictionaries. Both state the answer first, then how far to trust it, then what
the calculation does not cover.
"""

import math
from collections.abc import Mapping, Sequence
from dataclasses import asdict
from importlib import metadata
from typing import TYPE_CHECKING, Any, Literal

from midradius.study import casekeys as keys
from midradius.study.lengthtable import lengths, remark
from midradius.study.needscales import shown
from midradius.study.result import Position, Result, StageRecord, Verdict
from midradius.study.seriestext import resampling_document, resampling_rows
from midradius.study.soaktable import soaks, uneven
from midradius.thermo.phases import PHASE_NAMES

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

SCHEMA_VERSION = 1
_LAST_BIT = 1e-14

_ALWAYS = (
    "Cracking, distortion and residual stress are not computed: a hard quench can crack a part"
    " whose hardness looks right.",
    "A calculation decides nothing about safety: local codes and licensed practice rule.",
)
# General practice of quenching, in our words; a word in the name of the medium
# selects the line. What concerns the film curve itself comes with the medium.
_BY_MEDIUM = (
    (
        ("oil",),
        "Hot oil burns: immerse fast and fully, never stop a load half in, give the bath an"
        " over-temperature cut-out of its own, keep every drop of water out.",
    ),
    (
        ("water", "brine"),
        "Water and brine quench hard: sharp corners, bores and higher carbon crack first; keep"
        " people clear of steam and splash.",
    ),
    (
        ("salt",),
        "Molten nitrate salt scalds and feeds fire: dry parts only, no oil, grease or cyanide"
        " salt near it, and a cut-out against overheating.",
    ),
    (
        ("nitrogen", "helium", "argon"),
        "Pressurised inert gas suffocates: vent and test the vessel before anybody enters.",
    ),
)


def cautions(result: Result) -> tuple[str, ...]:
    """Cautions of the run itself, those of its media, and the two that always hold."""
    media = " ".join(stage.medium.lower() for stage in result.stages)
    chosen = [text for words, text in _BY_MEDIUM if any(word in media for word in words)]
    return tuple(dict.fromkeys([*result.cautions, *chosen, *_ALWAYS]))


def jsonable(value: object) -> Any:
    """Plain Python for JSON: arrays to lists, numpy numbers to numbers, nan and inf to None."""
    if isinstance(value, Mapping):
        return {str(key): jsonable(item) for key, item in value.items()}
    if isinstance(value, str | bool | int) or value is None:
        return value
    if isinstance(value, float):
        return float(value) if math.isfinite(value) else None
    if hasattr(value, "tolist"):
        return jsonable(value.tolist())
    if isinstance(value, list | tuple | set | frozenset):
        return [jsonable(item) for item in value]
    return str(value)


def document(result: Result) -> dict[str, Any]:
    """The result as a JSON document of schema ``SCHEMA_VERSION``.

    Units are in the names; what is not available is None. ``json.dumps`` with
    ``allow_nan=False`` accepts it.
    """
    content = {
        "schema_version": SCHEMA_VERSION,
        "program": "midradius",
        "version": _version(),
        "title": result.title,
        "steel": result.steel,
        "composition_pct": result.composition_pct,
        "critical_degC": result.critical_degC,
        "section": result.section,
        "sense": result.sense,
        "soak": result.soak,
        "heating": _heating(result),
        "n_node": result.n_node,
        "n_step": result.n_step,
        "heat_given_J_per_kg": result.heat_given_J_per_kg,
        "heat_extent": result.heat_extent,
        "heat_balance_relative": result.heat_balance_relative,
        "time_error_K": result.time_error_K,
        "grid_error_K": result.grid_error_K,
        "resampling": resampling_document(result.resampling),
        "needs": [asdict(verdict) for verdict in result.verdicts],
        "positions": [_position(p) for p in result.positions],
        "stages": [asdict(stage) for stage in result.stages],
        "tempers": [asdict(temper) for temper in result.tempers],
        "notes": [{**asdict(note), "text": str(note)} for note in result.notes],
        "assumptions": result.assumptions,
        "cautions": cautions(result),
        "sources": [asdict(source) for source in result.sources],
    }
    plain: dict[str, Any] = jsonable(content)
    return plain


def _heating(result: Result) -> dict[str, object] | None:
    """The heating without its curves."""
    if result.heating is None:
        return None
    return {
        "stages": [asdict(stage) for stage in result.heating.stages],
        "heat_taken_J_per_kg": result.heating.heat_taken_J_per_kg,
        "heat_balance_relative": result.heating.heat_balance_relative,
    }


def _position(p: Position) -> dict[str, object]:
    return {
        **asdict(p),
        "phases": {name: p.phases.get(name, 0.0) for name in PHASE_NAMES},
    }


def _version() -> str:
    try:
        return metadata.version("midradius")
    except metadata.PackageNotFoundError:
        return "not installed"


def terminal(result: Result, console: "Console") -> None:
    """Print the summary; text from the case file is never read as markup."""
    from rich.text import Text

    console.print(_text(result.title or "untitled case", "bold"))
    _needs(result, console)
    console.print(_pairs(_head(result)))
    heads, sizes = lengths(result)
    for heading, table in (
        *([("In the furnace", _stages(result.heating.stages))] if result.heating else []),
        *([("After the soak", _table(*soaks(result), left={0}))] if uneven(result) else []),
        ("Route", _route(result)),
        *([("As quenched", _as_quenched(result))] if result.tempers else []),
        ("Result, tempered" if result.tempers else "Result", _properties(result)),
        ("Microstructure, % by mass", _phases(result)),
        *([("Lengths as cooled", _table(["position", *heads], sizes, left={0}))] if heads else []),
    ):
        console.print(Text(f"\n{heading}", "bold"))
        console.print(table)
    console.print(Text("\nHow far to trust it", "bold"))
    console.print(_pairs(_honesty(result)))
    outside = dict.fromkeys(str(note) for note in result.notes)
    _bullets(console, "Models used outside the range of their source", outside)
    _bullets(console, "Assumed", result.assumptions)
    _bullets(console, "Caution", cautions(result))


_OUTCOME_STYLES = {"holds": "bold green", "fails": "bold red", "too close to call": "bold yellow"}


def _needs(result: Result, console: "Console") -> None:
    """The verdicts on what the drawing asks for, before everything else."""
    if not result.verdicts:
        return
    table = _table(
        ["requirement", "computed", "margin", "+- numbers", "+- model", ""], [], left={0, 5}
    )
    for v in result.verdicts:
        sure = (v.margin, v.numerical_uncertainty, v.model_uncertainty)
        cells = [shown(v.value, v.unit), *(shown(x, v.unit, bare=True) for x in sure)]
        outcome = _text(v.outcome, _OUTCOME_STYLES[v.outcome])
        table.add_row(_text(v.need), *(_text(cell) for cell in cells), outcome)
    console.print(_text("\nRequirements", "bold"))
    console.print(table)
    console.print(_pairs([("-", line) for line in _remarks(result.verdicts)]))
    console.print()


def _remarks(verdicts: Sequence[Verdict]) -> list[str]:
    """What a reader of the verdicts must know: the close ones, remedies, and the bases."""
    close = sum(v.outcome == "too close to call" for v in verdicts)
    told = [v for v in verdicts if v.note and (v.outcome != "holds" or v.quantity == keys.DEPTH)]
    lines = [f"{v.need}: {v.note}" for v in told]
    if close:
        lines.insert(0, f"{close} of {len(verdicts)} too close to call: not shown to be met")
    of: dict[str, dict[str, None]] = {}
    for v in verdicts:
        of.setdefault(v.model_basis, {})[v.quantity] = None
    lines += [f"model error of {', '.join(known)}: {basis}" for basis, known in of.items()]
    return lines


def _head(result: Result) -> list[tuple[str, str]]:
    mass = ", ".join(f"{k} {v:.3g}" for k, v in result.composition_pct.items() if v)
    critical = ", ".join(
        f"{k} {v:.0f}" for k, v in result.critical_degC.items() if math.isfinite(v)
    )
    rows = [
        ("steel", f"{result.steel} ({mass} % by mass)" if mass else result.steel),
        ("critical", f"{critical} degC" if critical else ""),
        ("section", result.section),
        ("soak", result.soak),
        ("grid", f"{result.n_node} nodes, {result.n_step} time steps"),
    ]
    if result.resampling:
        rows[-3] = ("taken from", result.section)
        rows[-1] = ("nodes", f"{result.n_node}, {result.resampling.n_sample} samples each")
    return [(key, value) for key, value in rows if value]


def _route(result: Result) -> "Table":
    return _stages(
        result.stages,
        [
            ["temper", f"{t.at_degC:.0f} degC throughout", "-", duration(t.time_s), "time"]
            for t in result.tempers
        ],
    )


def _stages(stages: Sequence[StageRecord], more: Sequence[Sequence[str]] = ()) -> "Table":
    rows = [[s.kind, s.medium, duration(s.start_s), duration(s.end_s), s.ended_by] for s in stages]
    heads = ["stage", "medium", "from", "to", "ended by"]
    return _table(heads, [*rows, *more], left={0, 1, 4})


def _properties(result: Result) -> "Table":
    """The answer; with tempers, what belongs to the cooling has a table of its own."""
    rows = [
        [
            p.name,
            _number(p.depth_mm, 1),
            f"{p.hardness_hv:.0f}",
            _number(p.hardness_hrc, 1),
            _number(p.hardness_hb, 0),
            _number(p.tensile_mpa, 0),
            _number(p.yield_mpa, 0),
            *([] if result.tempers else _cooling(p)),
        ]
        for p in result.positions
    ]
    heads = ["position", "depth\nmm", "\nHV", "\nHRC", "\nHB", "tensile\nMPa", "yield\nMPa"]
    return _table(heads + ([] if result.tempers else _COOLING), rows, left={0})


def _as_quenched(result: Result) -> "Table":
    rows = [[p.name, f"{p.hardness_as_quenched_hv:.0f}", *_cooling(p)] for p in result.positions]
    return _table(["position", "\nHV", *_COOLING], rows, left={0})


_COOLING = ["800-500\ndegC, s", "at 700\ndegC, K/s"]


def _cooling(p: Position) -> list[str]:
    return [_significant(p.time_800_500_s), _significant(p.rate_700_K_per_s)]


def _phases(result: Result) -> "Table":
    shown = [
        name
        for name in PHASE_NAMES
        if any(p.phases.get(name, 0.0) >= 0.0005 for p in result.positions)
    ]
    above = "\n" if "austenite" in shown else ""
    heads = ["retained\naustenite" if name == "austenite" else above + name for name in shown]
    rows = [
        [p.name, *(_number(100.0 * abs(p.phases.get(name, 0.0)), 1) for name in shown)]
        for p in result.positions
    ]
    return _table(["position", *heads], rows, left={0})


def _honesty(result: Result) -> list[tuple[str, str]]:
    remembered = sum(source.status == "remembered" for source in result.sources)
    estimated = sum(source.status == "estimate" for source in result.sources)
    keys = {"hardness, time steps": "hardness_time_error_hv"}
    if result.resampling:
        rows = resampling_rows(result.resampling)
        keys = {"hardness, samples": "hardness_time_error_hv"}
    else:
        keys["hardness, grid"] = "hardness_grid_error_hv"
        rows = [
            (
                "heat balance closes to",
                f"{_closed(result.heat_balance_relative)} of the heat given",
            ),
            *(
                [
                    (
                        "balance in the furnace",
                        f"{_closed(result.heating.heat_balance_relative)} of it",
                    )
                ]
                if result.heating
                else []
            ),
            ("temperature, time steps", _error(result.time_error_K, "K")),
            ("temperature, grid", _error(result.grid_error_K, "K")),
        ]
    for label, key in keys.items():
        known = [(getattr(p, key), p.name) for p in result.positions]
        known = [(error, name) for error, name in known if math.isfinite(error)]
        worst = max(known, default=(math.nan, ""))
        place = f" at most, at: {worst[1]}" if worst[1] else ""
        rows.append((label, _error(worst[0], "HV") + place))
    count = len(result.sources)
    if count:
        estimates = f"{estimated} estimate{'s' * (estimated != 1)}"
        rows.append(("sources", f"{count} models; {remembered} from memory, {estimates}"))
    if remark(result):
        rows.append(("flag", remark(result)))
    if not result.notes:
        rows.append(("ranges", "every model was used inside the range of its source"))
    return rows


def _closed(relative: float) -> str:
    # Below it the digits are those of the last bit, not of the solver.
    return f"better than {_LAST_BIT:.0e}" if relative < _LAST_BIT else f"{relative:.1e}"


def _error(value: float, unit: str) -> str:
    return f"{value:.2g} {unit}" if math.isfinite(value) else "not estimated"


def duration(seconds: float) -> str:
    """A time as people say it: ``"45 s"``, ``"12 min 30 s"``, ``"4 h 05 min"``."""
    if seconds < 59.95:
        return f"{seconds:.3g} s"
    whole = round(seconds)
    if whole < 3600:
        return f"{whole // 60} min {whole % 60:02d} s"
    minutes = round(seconds / 60.0)
    return f"{minutes // 60} h {minutes % 60:02d} min"


def _number(value: float | None, digits: int) -> str:
    return "-" if value is None or not math.isfinite(value) else f"{value:.{digits}f}"


def _significant(value: float | None) -> str:
    """Three digits, and all of those before the point."""
    if value is None or not math.isfinite(value):
        return "-"
    digits = 2 - math.floor(math.log10(abs(value))) if value else 0
    return f"{value:.{min(max(digits, 0), 6)}f}"


def _text(string: str, style: str = "") -> "Text":
    from rich.text import Text

    # A title may hold escape characters; a terminal must not obey them.
    return Text("".join(c if c.isprintable() or c == "\n" else "?" for c in string), style)


def _table(heads: Sequence[str], rows: Sequence[Sequence[str]], *, left: set[int]) -> "Table":
    from rich.box import SIMPLE_HEAD
    from rich.table import Table

    table = Table(box=SIMPLE_HEAD, show_edge=False, pad_edge=False, padding=(0, 1, 0, 0))
    for k, head in enumerate(heads):
        side: Literal["left", "right"] = "left" if k in left else "right"
        table.add_column(_text(head), justify=side, vertical="top", overflow="fold")
    for row in rows:
        table.add_row(*(_text(cell) for cell in row))
    return table


def _pairs(rows: Sequence[tuple[str, str]]) -> "Table":
    from rich.table import Table

    table = Table.grid(padding=(0, 2, 0, 0))
    table.add_column(no_wrap=True)
    table.add_column()
    for key, value in rows:
        table.add_row(_text(key), _text(value))
    return table


def _bullets(console: "Console", heading: str, lines: Sequence[str] | Mapping[str, None]) -> None:
    if not lines:
        return
    console.print(_text(f"\n{heading}", "bold"))
    for line in lines:
        console.print(_pairs([("-", line)]))
