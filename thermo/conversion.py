"""From Vickers hardness to Rockwell C, Brinell and tensile strength, and back.

Model
-----
Straight lines between the printed rows of ``conversion.csv``, so that a printed
row converts to itself both ways. Brinell is 0.95 of Vickers, as the standard's
table is built.

Source
------
Rockwell C: ASTM E140 Table 1, ten rows read (every fifth HRC), the rest
remembered. Tensile strength and Brinell: ISO 18265 Table A.1 (remembered;
agrees with rows read in a BS 860 table within 2 %).

Holds for
---------
Rockwell C 20 to 68 (238 to 940 HV), Brinell 76 to 618 and tensile strength 255
to 2180 MPa (80 to 650 HV). Outside the answer is nan, never a clamped number:
a scale does not exist there.
"""

import csv
from functools import cache
from importlib import resources

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.source import Source

SOURCES = (
    Source("HV to HRC", "ASTM E140", "Table 1", "remembered"),
    Source("HV to HB and tensile strength", "ISO 18265", "Table A.1", "remembered"),
)
BRINELL_RATIO = 0.95


def hv_to_hrc(hardness_hv: Array | float) -> Array:
    """Rockwell C of Vickers hardness, any shape; nan outside 238 to 940 HV."""
    hv, hrc = _table("HRC")
    return _between(hardness_hv, hv, hrc)


def hrc_to_hv(hardness_hrc: Array | float) -> Array:
    """Vickers hardness of Rockwell C, any shape; nan outside 20 to 68 HRC."""
    hv, hrc = _table("HRC")
    return _between(hardness_hrc, hrc, hv)


def hv_to_hb(hardness_hv: Array | float) -> Array:
    """Brinell hardness of Vickers hardness, any shape; nan outside 80 to 650 HV."""
    hv, _ = _table("MPa")
    return _between(hardness_hv, hv, BRINELL_RATIO * hv)


def hb_to_hv(hardness_hb: Array | float) -> Array:
    """Vickers hardness of Brinell hardness, any shape; nan outside 76 to 617.5 HB."""
    hv, _ = _table("MPa")
    return _between(hardness_hb, BRINELL_RATIO * hv, hv)


def hv_to_uts(hardness_hv: Array | float) -> Array:
    """Tensile strength [MPa] of Vickers hardness, any shape; nan outside 80 to 650 HV."""
    hv, tensile = _table("MPa")
    return _between(hardness_hv, hv, tensile)


def uts_to_hv(tensile_mpa: Array | float) -> Array:
    """Vickers hardness of tensile strength [MPa], any shape; nan outside 255 to 2180 MPa."""
    hv, tensile = _table("MPa")
    return _between(tensile_mpa, tensile, hv)


def _between(value: Array | float, at: Array, gives: Array) -> Array:
    return np.asarray(np.interp(value, at, gives, left=np.nan, right=np.nan))


@cache
def _table(scale: str) -> tuple[Array, Array]:
    """Vickers hardness and the value on ``scale``, both rising."""
    path = resources.files("midradius.thermo").joinpath("conversion.csv")
    rows = csv.DictReader(path.read_text(encoding="utf-8").splitlines())
    pairs = [(float(row["hv"]), float(row["value"])) for row in rows if row["scale"] == scale]
    table = np.array(sorted(pairs))
    return table[:, 0], table[:, 1]
