"""``midradius media``: what a part may be cooled or heated in."""

import json
from typing import Any

import click

SCHEMA_VERSION = 1


@click.command(short_help="List the media and their bath temperatures.")
@click.option("--heating", is_flag=True, help="List those that a part is heated in.")
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
def media(*, heating: bool, as_json: bool) -> None:
    """List the media and the bath or furnace temperatures they are known for.

    With each goes half the width of the band on its film, for a single part.
    """
    known = _heating() if heating else _cooling()
    if as_json:
        content = {"schema_version": SCHEMA_VERSION, "media": known}
        click.echo(json.dumps(content, indent=1, allow_nan=False))
        return
    for item in known:
        low, high, sure = (item[k] for k in ("lowest_degC", "highest_degC", "film_uncertainty_pct"))
        span = "" if low is None else f"{low:.0f} to {high:.0f} degC"
        film = f"film +-{sure:.0f} %" if sure else "no heat passes"
        click.echo(f"{item['name']:{28 if heating else 26}} {span:18} {film}")


def _cooling() -> list[dict[str, Any]]:
    from midradius.fem.media import ZERO_DEGC, medium, names

    rows = []
    for found in map(medium, names()):
        bounds = found.bath_min - ZERO_DEGC, found.bath_max - ZERO_DEGC
        low, high = (None, None) if found.kind == "ideal" else bounds
        rows.append(_row(found.name, low, high, found.uncertainty_pct, found.cautions))
    return rows


def _heating() -> list[dict[str, Any]]:
    from midradius.fem.furnace import ZERO_DEGC, furnace_medium, furnace_names

    rows = []
    for found in map(furnace_medium, furnace_names()):
        low, high = found.coldest - ZERO_DEGC, found.hottest - ZERO_DEGC
        rows.append(_row(found.name, low, high, found.uncertainty_pct, found.cautions))
    return rows


def _row(
    name: str, low: float | None, high: float | None, sure: float, cautions: tuple[str, ...]
) -> dict[str, Any]:
    """One medium; temperatures of the bath or the furnace."""
    return {
        "name": name,
        "lowest_degC": None if low is None else round(low, 6),
        "highest_degC": None if high is None else round(high, 6),
        "film_uncertainty_pct": sure or None,
        "cautions": list(cautions),
    }
