"""Phase boundaries and amounts against a minimisation of the Gibbs energy by another code.

``calphad.csv``: pycalphad 0.11.2 with the iron-carbon database that it carries, an
assessment of its own for cementite (Hallstedt et al. 2010) that takes iron, carbon and
the solutions from the works that ours takes them from. So this proves our solution and
lever rule, not the assessment. Shifts by alloying elements: ``iron_carbon.csv``. The
tolerances are those of our lines between points 1 K apart.
"""

import csv
from pathlib import Path

import pytest
from numpy.testing import assert_allclose

from midradius.thermo.amounts import at
from midradius.thermo.boundaries import boundaries
from midradius.thermo.equilibrium import equilibrium
from midradius.thermo.steel import Composition

ZERO = 273.15
Row = dict[str, str]
TABLE = Path(__file__).parent / "calphad.csv"
ROWS: list[Row] = list(csv.DictReader(TABLE.read_text(encoding="utf-8").splitlines()))


def _ours(row: Row) -> float:
    carbon = float(row["carbon_pct"] or "0.4")
    temp = float(row["temp_degC"] or "nan") + ZERO
    eq = equilibrium(Composition(C=carbon))
    beside = row["quantity"].removesuffix(" beside austenite")
    if row["quantity"] in ("ferrite beside austenite", "cementite beside austenite"):
        return {item.name: item.mass_fraction for item in at(eq, temp)}[beside]
    known = {
        "carbon of austenite beside ferrite": lambda: eq.austenite_vs_ferrite(temp),
        "carbon of austenite beside cementite": lambda: eq.austenite_vs_cementite(temp),
        "carbon of ferrite beside austenite": lambda: eq.ferrite_solubility(temp),
        "carbon of ferrite beside cementite": lambda: eq.ferrite_solubility(temp),
        "Ae3": lambda: boundaries().a3(carbon) - ZERO,
        "Acm": lambda: boundaries().acm(carbon) - ZERO,
        "Ae1": lambda: eq.ae1 - ZERO,
    }
    return float(known[row["quantity"]]())


@pytest.mark.parametrize("row", ROWS, ids=[" ".join(list(r.values())[:3]) for r in ROWS])
def test_iron_and_carbon_share_out_as_an_independent_minimisation_finds(row: Row) -> None:
    assert_allclose(_ours(row), float(row["value"]), rtol=0.0, atol=float(row["tolerance"]))
