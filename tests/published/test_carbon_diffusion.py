"""Diffusion of carbon in austenite against the customary expression evaluated by hand."""

import numpy as np
import pytest
from numpy.testing import assert_allclose

from midradius.thermo.diffusional import carbon_diffusivity

# Agren 1986 at 0.8 % C, from memory, found within 15 % of mobilities that were read
CUSTOMARY = ((900.0, 1.45e-11), (700.0, 8.0e-13))  # degC, m2/s


@pytest.mark.parametrize(("temp_degC", "diffusivity"), CUSTOMARY)
def test_carbon_diffuses_as_fast_as_the_customary_expression_says(
    temp_degC: float, diffusivity: float
) -> None:
    ours = carbon_diffusivity(np.array([temp_degC + 273.15]), 0.8)
    assert_allclose(ours, diffusivity, rtol=0.15, atol=0.0)
