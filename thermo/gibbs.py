"""Gibbs energy of iron-carbon phases, with exact enthalpy and heat capacity.

Model
-----
Each phase is a polynomial in temperature, a magnetic term (Inden, Hillert and
Jarl) and, for the two solutions, carbon on an interstitial sublattice:
``G = (1-y) G(Fe:Va) + y G(Fe:C) + a R T [y ln y + (1-y) ln(1-y)] + y (1-y) L``
per mole of iron, ``a`` interstitial sites per iron atom (1 in austenite, 3 in
ferrite). ``h = G - T dG/dT`` and ``cp = dh/dT`` term by term, no differences.

Source
------
Iron, carbon: Dinsdale, Calphad 15 (1991) 317. Solutions: Gustafson, Scand. J.
Metall. 14 (1985) 259. Cementite twice: Gustafson 1985 (``CEMENTITE_GUSTAFSON``,
remembered) and Hallstedt et al., Calphad 34 (2010) 129 (``CEMENTITE_HALLSTEDT``).
All but the former were read in an open database that cites these works. The two
give 688 and 604 J/(kg K) at 25 degC (tabulated: about 590) but 0.2 K and 0.2 kJ/kg
of difference in the eutectoid; enthalpy uses the first, phase boundaries the
second, each as the tables that check them were made.

Holds for
---------
298 to 1811 K by the source; continued to 200 K, where the polynomials stay smooth.
"""

from dataclasses import dataclass

import numpy as np

from midradius.thermo.arrays import Array
from midradius.thermo.source import Source

_LISTED = "parameters as listed in an open steel database that cites it"
SOURCES = (
    Source("Gibbs energy of iron and carbon", "Dinsdale 1991", _LISTED, "read"),
    Source("carbon in austenite and ferrite", "Gustafson 1985", _LISTED, "read"),
    Source("cementite, for phase boundaries", "Hallstedt 2010", _LISTED, "read"),
    Source("cementite, for enthalpy", "Gustafson 1985", "Scand. J. Metall. 14, 259", "remembered"),
)

Values = Array | float  # one number or an array: the formulas do not care
GAS_CONSTANT = 8.31451  # J/(mol K), the value of the 1991 assessment
IRON = 55.845e-3  # kg/mol
CARBON = 12.011e-3  # kg/mol
CEMENTITE_CARBON_PCT = 6.690  # 100 * 12.011 / (12.011 + 3 * 55.845)


@dataclass(frozen=True)
class Polynomial:
    """``const + t T + tlnt T ln T + t2 T^2 + t3 T^3 + m1/T + m2/T^2 + m3/T^3`` [J/mol]."""

    const: float = 0.0
    t: float = 0.0
    tlnt: float = 0.0
    t2: float = 0.0
    t3: float = 0.0
    m1: float = 0.0
    m2: float = 0.0
    m3: float = 0.0

    def plus(self, other: "Polynomial", times: float = 1.0) -> "Polynomial":
        """``self + times * other``, term by term."""
        return Polynomial(
            const=self.const + times * other.const,
            t=self.t + times * other.t,
            tlnt=self.tlnt + times * other.tlnt,
            t2=self.t2 + times * other.t2,
            t3=self.t3 + times * other.t3,
            m1=self.m1 + times * other.m1,
            m2=self.m2 + times * other.m2,
            m3=self.m3 + times * other.m3,
        )

    def gibbs(self, temp: Values) -> Array:
        """Gibbs energy [J/mol] at ``temp`` [K], any shape."""
        T = temp
        low = self.m1 / T + self.m2 / T**2 + self.m3 / T**3
        return np.asarray(
            self.const + self.t * T + self.tlnt * T * np.log(T) + self.t2 * T**2 + self.t3 * T**3
            + low
        )  # fmt: skip

    def enthalpy(self, temp: Values) -> Array:
        """``G - T dG/dT`` [J/mol] at ``temp`` [K], any shape."""
        T = temp
        low = 2.0 * self.m1 / T + 3.0 * self.m2 / T**2 + 4.0 * self.m3 / T**3
        return np.asarray(self.const - self.tlnt * T - self.t2 * T**2 - 2.0 * self.t3 * T**3 + low)

    def heat_capacity(self, temp: Values) -> Array:
        """``dh/dT`` [J/(mol K)] at ``temp`` [K], any shape."""
        T = temp
        low = -2.0 * self.m1 / T**2 - 6.0 * self.m2 / T**3 - 12.0 * self.m3 / T**4
        return np.asarray(-self.tlnt - 2.0 * self.t2 * T - 6.0 * self.t3 * T**2 + low)


@dataclass(frozen=True)
class Magnet:
    """Magnetic contribution: Curie (or Neel) temperature [K], moment, share ``p``."""

    curie: float
    moment: float
    p: float

    def gibbs(self, temp: Values) -> Array:
        """``R T ln(moment + 1) g(tau)`` [J/mol]."""
        scale = GAS_CONSTANT * np.log(self.moment + 1.0)
        return np.asarray(scale * temp * self._function(temp, 0))

    def enthalpy(self, temp: Values) -> Array:
        """``-R T ln(moment + 1) tau g'`` [J/mol]."""
        scale = GAS_CONSTANT * np.log(self.moment + 1.0)
        return np.asarray(-scale * temp * self._function(temp, 1))

    def heat_capacity(self, temp: Values) -> Array:
        """``-R ln(moment + 1) [u + tau u']`` with ``u = tau g'`` [J/(mol K)]."""
        both = self._function(temp, 1) + self._function(temp, 2)
        return np.asarray(-GAS_CONSTANT * np.log(self.moment + 1.0) * both)

    def _function(self, temp: Values, order: int) -> Array:
        """``g`` after applying ``tau d/dtau`` ``order`` times: each power gets its exponent."""
        tau = np.asarray(temp, dtype=np.float64) / self.curie
        share = 1.0 / self.p - 1.0
        scale = 518.0 / 1125.0 + 11692.0 / 15975.0 * share
        below = np.full(tau.shape, 1.0 if order == 0 else 0.0)
        cold = np.minimum(tau, 1.0)  # each branch is evaluated inside its own half only
        for power, factor in (
            (-1, 79.0 / (140.0 * self.p)),
            (3, 474.0 / 497.0 * share / 6.0),
            (9, 474.0 / 497.0 * share / 135.0),
            (15, 474.0 / 497.0 * share / 600.0),
        ):
            below -= float(power) ** order * factor * cold**power / scale
        above = np.zeros(tau.shape)
        hot = np.maximum(tau, 1.0)
        for power, factor in ((-5, 1.0 / 10.0), (-15, 1.0 / 315.0), (-25, 1.0 / 1500.0)):
            above -= float(power) ** order * factor * hot**power / scale
        return np.where(tau <= 1.0, below, above)


@dataclass(frozen=True)
class Interstitial:
    """A solution of carbon in iron, per mole of iron.

    ``sites`` per iron atom; ``empty`` and ``filled`` are the end members;
    ``attraction`` is L [J/mol], temperature-dependent.
    """

    sites: float
    empty: Polynomial
    filled: Polynomial
    attraction: Polynomial
    magnet: Magnet

    def site_fraction(self, carbon_pct: Values) -> Array:
        """Occupied share of the interstitial sites for mass percent carbon."""
        per_iron = (carbon_pct / CARBON) / ((100.0 - carbon_pct) / IRON)
        return np.asarray(per_iron / self.sites)

    def carbon_pct(self, site_fraction: Values) -> Array:
        """Mass percent carbon for an occupied share of the sites."""
        carbon = self.sites * site_fraction * CARBON
        return np.asarray(100.0 * carbon / (carbon + IRON))

    def iron_potential(self, temp: Values, site_fraction: Values) -> Array:
        """Chemical potential of iron [J/mol]."""
        y = site_fraction
        mixing = self.sites * GAS_CONSTANT * temp * np.log1p(-y)
        excess = y**2 * self.attraction.gibbs(temp)
        return np.asarray(self.empty.gibbs(temp) + self.magnet.gibbs(temp) + mixing + excess)

    def carbon_potential(self, temp: Values, site_fraction: Values) -> Array:
        """Chemical potential of carbon [J/mol]."""
        y = site_fraction
        mixing = self.sites * GAS_CONSTANT * temp * (np.log(y) - np.log1p(-y))
        excess = (1.0 - 2.0 * y) * self.attraction.gibbs(temp)
        ends = self.filled.gibbs(temp) - self.empty.gibbs(temp)
        return np.asarray((ends + mixing + excess) / self.sites)

    def enthalpy(self, temp: Values, carbon_pct: Values) -> Array:
        """Enthalpy [J per kg of solution] at ``temp`` [K] and ``carbon_pct``, broadcast."""
        return self._mass_specific(temp, carbon_pct, "enthalpy")

    def heat_capacity(self, temp: Values, carbon_pct: Values) -> Array:
        """Heat capacity [J/(kg K)] at ``temp`` [K] and ``carbon_pct``, broadcast."""
        return self._mass_specific(temp, carbon_pct, "heat_capacity")

    def _mass_specific(self, temp: Values, carbon_pct: Values, quantity: str) -> Array:
        # ideal mixing has no enthalpy, so only ends, attraction and magnetism remain
        y = self.site_fraction(carbon_pct)
        empty = getattr(self.empty, quantity)(temp)
        filled = getattr(self.filled, quantity)(temp)
        attraction = getattr(self.attraction, quantity)(temp)
        magnetic = getattr(self.magnet, quantity)(temp)
        molar = (1.0 - y) * empty + y * filled + y * (1.0 - y) * attraction + magnetic
        return np.asarray(molar / (IRON + self.sites * y * CARBON))


@dataclass(frozen=True)
class Compound:
    """Fe3C, per mole of Fe3C."""

    lattice: Polynomial
    magnet: Magnet

    def gibbs(self, temp: Values) -> Array:
        """Gibbs energy [J/mol]."""
        return self.lattice.gibbs(temp) + self.magnet.gibbs(temp)

    def enthalpy(self, temp: Values) -> Array:
        """Enthalpy [J/kg]."""
        molar = self.lattice.enthalpy(temp) + self.magnet.enthalpy(temp)
        return np.asarray(molar / (3.0 * IRON + CARBON))

    def heat_capacity(self, temp: Values) -> Array:
        """Heat capacity [J/(kg K)]."""
        molar = self.lattice.heat_capacity(temp) + self.magnet.heat_capacity(temp)
        return np.asarray(molar / (3.0 * IRON + CARBON))


_FE = Polynomial(const=1225.7, t=124.134, tlnt=-23.5143, t2=-4.39752e-3, t3=-5.8927e-8, m1=77359.0)
_C = Polynomial(
    const=-17368.441, t=170.73, tlnt=-24.3, t2=-4.723e-4, m1=2562600.0, m2=-2.643e8, m3=1.2e10
)
_FCC_FE = _FE.plus(Polynomial(const=-1462.4, t=8.282, tlnt=-1.15, t2=6.4e-4))

# The austenite end member Fe:C stands on fcc iron (Gustafson). Set on bcc iron instead, the
# boundaries move by 0.04 % C and the enthalpy of a 0.77 % C austenite by 0.6 kJ/kg.
AUSTENITE = Interstitial(
    sites=1.0,
    empty=_FCC_FE,
    filled=_FCC_FE.plus(_C).plus(Polynomial(const=77207.0, t=-15.877)),
    attraction=Polynomial(const=-34671.0),
    magnet=Magnet(curie=67.0, moment=0.7, p=0.28),
)
FERRITE = Interstitial(
    sites=3.0,
    empty=_FE,
    filled=_FE.plus(_C, 3.0).plus(Polynomial(const=322050.0, t=75.667)),
    attraction=Polynomial(t=-190.0),
    magnet=Magnet(curie=1043.0, moment=2.22, p=0.40),
)
_CEMENTITE_MAGNET = Magnet(curie=485.0, moment=1.008, p=0.28)
CEMENTITE_GUSTAFSON = Compound(
    lattice=Polynomial(const=-10745.0, t=706.04, tlnt=-120.6), magnet=_CEMENTITE_MAGNET
)
CEMENTITE_HALLSTEDT = Compound(
    lattice=Polynomial(const=-10195.86, t=690.949888, tlnt=-118.47637, t2=-7e-4, m1=590527.0),
    magnet=_CEMENTITE_MAGNET,
)
