"""Cementite on the grain faces of a hypereutectoid steel: how thick, and whether it is a net.

Model
-----
The mass fraction ``f`` that formed on faces of ``2/l`` per volume (``l`` the mean
intercept of the austenite grain) is a film of ``w = f l / 2``; by mass, which is by
volume within 2 %. What the soak left is spheroids inside the grains and no film.

The flag compares the thickness with two limits: from ``CONTINUOUS`` on the film is called a
continuous network, below ``NOTHING`` there is none, between the two it is broken.

Source
------
Faces per volume 2/l: stereology, as in ASTM E112 (remembered). Limits: estimates. 0.3 um
is what a dry light microscope resolves (half the wavelength of green light over the
aperture), so that a net shows in the etched section; 0.05 um is the floor of the
thickness model. Charts of carbide networks (such as SEP 1520) rate pictures, not
thicknesses: no published limit was found.

Holds for
---------
Plain carbon steel above the eutectoid. Chromium slows the thickening (Ando & Krauss 1981,
title remembered) and spheroids left by the soak take carbon: with 1 % Cr or more, or
carbide left, the thickness is an upper bound.
"""

import numpy as np

from midradius.thermo.arrays import Array, IntArray
from midradius.thermo.source import RangeNote, Source
from midradius.thermo.steel import Composition

SOURCES = (
    Source("thickness of a cementite film", "stereology, ASTM E112", "2/l faces", "remembered"),
    Source("cementite network", "limits 0.05 and 0.3 um", "thermo.network", "estimate"),
)
CONTINUOUS, NOTHING = 0.3e-6, 0.05e-6  # m
NAMES = ("none", "broken", "continuous")  # by the codes 0, 1, 2
CRITERION = "continuous from 0.3 um, none below 0.05 um, broken between (estimate)"
SLOW_CHROMIUM_PCT = 1.0


def film_thickness(on_faces: Array, grain_intercept: Array | float) -> Array:
    """Thickness [m] of the film, (n_node,).

    Parameters
    ----------
    on_faces
        Mass fraction of the cementite that formed on grain faces [-], (n_node,).
    grain_intercept
        Mean intercept of the austenite grain [m], one or (n_node,).
    """
    return np.asarray(np.maximum(on_faces, 0.0) * grain_intercept / 2.0)


def network(film: Array) -> IntArray:
    """Code of :data:`NAMES` for films of a thickness [m], (n_node,)."""
    return np.digitize(film, (NOTHING, CONTINUOUS)).astype(np.int64)


def range_notes(
    composition: Composition, film: Array, *, carbide_left: float
) -> tuple[RangeNote, ...]:
    """Notes where a film [m] is only an upper bound; ``carbide_left`` of the soak [-]."""
    if not (film >= NOTHING).any():
        return ()
    model, notes = SOURCES[0].model, []
    if composition.Cr >= SLOW_CHROMIUM_PCT:
        allowed = f"below {SLOW_CHROMIUM_PCT:g} % (above: an upper bound)"
        notes.append(RangeNote(model, "Cr", f"{composition.Cr:g} %", allowed))
    if carbide_left > 0.0:
        value = f"{100.0 * carbide_left:.1f} %"
        notes.append(RangeNote(model, "carbide left by the soak", value, "none: an upper bound"))
    return tuple(notes)
