"""The scales that a requirement may be written in, and how their values are shown.

Limits in HRC, HB, MPa and ksi are turned into HV by `thermo.conversion`, values into
the unit asked; nan where a scale has no such value.
"""

from collections.abc import Callable, Mapping

from midradius.thermo import conversion

MPA_PER_KSI = 6.894757293168361
_Scale = tuple[Callable[[float], float], Callable[[float], float]]
# Unit: what a Vickers hardness is in it, and back; nan where neither exists.
SCALES: Mapping[str, _Scale] = {
    "HV": (lambda hv: hv, lambda hv: hv),
    "HRC": (
        lambda hv: float(conversion.hv_to_hrc(hv)),
        lambda hrc: float(conversion.hrc_to_hv(hrc)),
    ),
    "HB": (lambda hv: float(conversion.hv_to_hb(hv)), lambda hb: float(conversion.hb_to_hv(hb))),
    "MPa": (
        lambda hv: float(conversion.hv_to_uts(hv)),
        lambda mpa: float(conversion.uts_to_hv(mpa)),
    ),
    "ksi": (
        lambda hv: float(conversion.hv_to_uts(hv)) / MPA_PER_KSI,
        lambda ksi: float(conversion.uts_to_hv(ksi * MPA_PER_KSI)),
    ),
}


def shown(value: float | None, unit: str, *, bare: bool = False) -> str:
    """A value for a person, with the digits that its unit deserves; ``bare``: no unit."""
    if value is None:
        return "-"
    digits = {"HRC": 1, "%": 1, "mm": 1, "in": 2, "um": 2, "ASTM": 1, "ksi": 1}.get(unit, 0)
    number = f"{value:.{digits}f}"
    if bare:
        return number
    return f"{unit} {number}" if unit == "ASTM" else f"{number} {unit}"
