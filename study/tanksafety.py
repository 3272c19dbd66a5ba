"""Whether a tank may be called an answer, and the cautions that go with every one.

The texts are general. They decide nothing: local codes, the standards of the trade and
licensed practice rule, and the supplier's data sheet of the fluid.

Source
------
General practice of quench tanks (heat treaters' handbooks, remembered; columns of
MacKenzie, read): flash point about 50 K above the bath, water in oil below 0.1 %.

Holds for
---------
Open tanks of oil, water, brine, polymer and salt. Vacuum and integral furnaces have
interlocks of their own.
"""

from dataclasses import dataclass
from typing import Literal

from midradius.fem.fluids import Fluid
from midradius.thermo.source import Source

SOURCES = (
    Source(
        "flash point about 50 K above the bath",
        "MacKenzie, base oils column",
        "rule of use",
        "read",
    ),
    Source(
        "freeboard of 150 mm at the worst level",
        "engineering estimate",
        "own judgement",
        "estimate",
    ),
)

ZERO_DEGC = 273.15
FLASH_MARGIN = 50.0  # K
FREEBOARD = 0.15  # m, where the case gives none
BOILING_MARGIN = 10.0  # K below 100 degC
SALT_HIGHEST = 550.0 + ZERO_DEGC  # nitrate salt decomposes above about that

_RULE = (
    "These cautions are general and decide nothing: local codes, fire authority, insurer and"
    " licensed practice rule."
)
_OIL = (
    "Hot oil burns: keep its flash point at least 50 K above the highest bath temperature; oil"
    " beside the load is hotter than the bath.",
    "Immerse fully and fast and never stop a load half in; a load that hangs at the surface sets"
    " the oil on fire.",
    "An excess-temperature cut-out well below the flash point, independent of the controller,"
    " stops heating and charging; interlock level and flow, and prove agitation before quenching.",
    "No water in the oil: from about 0.1 % it is free water, foams over and flashes to steam."
    " Dry loads, cooler with its water below the oil's pressure or air-cooled; test the oil.",
    "150 to 300 mm of oil or more over the top of the load, agitation in reach of all of it.",
    "The level rises as the oil warms and again as the load goes in: keep the freeboard, and an"
    " overflow to a closed dump tank.",
    "A lid, fixed extinguishing suited to oil (never water), hood or flame curtain, and nobody"
    " above the tank.",
)
_WATER = (
    "Steam and hot spray scald: stand clear while the load goes in; the level rises by what the"
    " load displaces.",
    "Water and brine crack steels of higher hardenability, sharp sections most; brine corrodes"
    " parts and tank.",
    "No oil quenched part or oily fixture into hot water baths beside oil tanks: water carried"
    " back into oil is dangerous.",
)
_POLYMER = (
    "Polymer: check concentration and cooling curve, top up what drags out, and keep it from"
    " fouling; the warm bath separates above its cloud point.",
    *_WATER[:1],
)
_SALT = (
    "Molten nitrate salt burns whoever it touches and feeds fire: no oil, soot, cyanide,"
    " magnesium or organic matter into it; dry loads only, water explodes to steam.",
    "Nitrate salt decomposes above about 550 degC: an independent cut-out, and no local"
    " overheating at the heaters.",
    "The level rises as the load goes in: keep the freeboard.",
)


Verdict = Literal["acceptable", "not acceptable", "not judged in full"]


@dataclass(frozen=True)
class Check:
    """One thing that an acceptable design meets; ``met`` None where it cannot be judged."""

    name: str
    value: float | None
    limit: float | None
    unit: str
    met: bool | None
    why: str


def cautions(fluid: Fluid) -> tuple[str, ...]:
    """The cautions of a fluid, the deferral to codes last."""
    by_kind = {
        "oil": _OIL,
        "water": _WATER,
        "brine": _WATER,
        "polymer": _POLYMER,
        "salt": _SALT,
    }
    return (*by_kind[fluid.kind], _RULE)


def checks(
    fluid: Fluid,
    *,
    flash: float | None,
    flash_given: bool,
    film_max: float | None,
    limit: float,
    hottest: float,
    rise: float,
    rise_limit: float | None,
    at_next: float,
    ready: float | None,
    level: float | None,
    lip: float | None,
    freeboard: float,
    settled: bool,
    cut_short: bool,
) -> tuple[Check, ...]:
    """All checks of a design; temperatures [K], level and lip [m] above the floor.

    ``flash_given`` says that the flash point is that of this very oil; one that is only
    usual can refuse a design, not accept it. ``film_max`` is the hottest bath whose film
    is known.
    """
    found = [
        _below("bath at its hottest", hottest - ZERO_DEGC, limit - ZERO_DEGC, "degC", "its limit"),
    ]
    if fluid.kind == "oil":
        why = "flash point less 50 K, for the limit of the bath and for its hottest"
        if flash is None:
            found.append(Check("flash point", None, None, "degC", False, "not known: give it"))
        else:
            most = flash - FLASH_MARGIN - ZERO_DEGC
            value = max(limit, hottest) - ZERO_DEGC
            # "within 50 K" counts the bound itself as too near
            met = value < most
            if met and not flash_given:
                why = "usual for such an oil, so not judged: give flash_point of yours"
            judged = None if met and not flash_given else met
            found.append(Check("bath below the flash point", value, most, "degC", judged, why))
    elif fluid.aqueous:
        most = 100.0 - BOILING_MARGIN
        value = max(limit, hottest) - ZERO_DEGC
        found.append(_below("bath below boiling", value, most, "degC", "steam"))
    else:
        value = max(limit, hottest)
        why = "the salt decomposes"
        found.append(_below("salt", value - ZERO_DEGC, SALT_HIGHEST - ZERO_DEGC, "degC", why))
    if film_max is not None:
        value, most = max(limit, hottest) - ZERO_DEGC, film_max - ZERO_DEGC
        why = "above it no film is known: it was held, and figures are out of range"
        if value <= most:
            why = "the hottest bath whose film is known, for limit and hottest"
        found.append(_below("film of the bath", value, most, "degC", why))
    if level is None or lip is None:
        why = "give length, width and depth of the tank: the level is not judged"
        found.append(Check("level at the worst moment", None, None, "mm", None, why))
    else:
        why = f"lip less {1e3 * freeboard:.0f} mm of freeboard"
        most = 1e3 * (lip - freeboard)
        found.append(_below("level at the worst moment", 1e3 * level, most, "mm", why))
    if rise_limit is not None:
        found.append(_below("rise under one load", rise, rise_limit, "K", "its limit"))
    if ready is not None:
        value = at_next - ZERO_DEGC
        found.append(_below("bath before the next load", value, ready - ZERO_DEGC, "degC", "ready"))
    if cut_short:
        why = "its bath is too hot for the condition that ends its stage: taken out before it"
        found.append(Check("load cooled as the route asks", None, None, "", False, why))
    if not settled:
        why = "the bath still drifts from day to day"
        found.append(Check("periodic state", None, None, "K", False, why))
    return tuple(found)


def verdict(checks: tuple[Check, ...]) -> Verdict:
    """Acceptable where every check is judged and met; what is not judged is no yes."""
    if any(check.met is False for check in checks):
        return "not acceptable"
    return "acceptable" if all(check.met for check in checks) else "not judged in full"


def limit_is_safe(
    fluid: Fluid, *, flash: float | None, limit: float, film_max: float | None
) -> bool:
    """Whether a bath at its limit [K] keeps its distance to flash point, boiling, decay,
    and its film is known."""
    if film_max is not None and limit > film_max:
        return False
    if fluid.kind == "oil":
        return flash is not None and limit < flash - FLASH_MARGIN
    return limit <= (100.0 - BOILING_MARGIN + ZERO_DEGC if fluid.aqueous else SALT_HIGHEST)


def _below(name: str, value: float, limit: float, unit: str, why: str) -> Check:
    return Check(name, value, limit, unit, bool(value <= limit), why)
