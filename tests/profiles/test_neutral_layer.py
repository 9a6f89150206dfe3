"""The universal neutral layer: its constants and its agreement with a layer solved otherwise."""

from __future__ import annotations

import numpy as np
import pytest
import synthetic

from backveer.profiles.drag_law import SHERLOCK, TENNEKES, TROEN_PETERSEN, VON_KARMAN
from backveer.profiles.neutral_layer import departure, depth_of


@pytest.mark.parametrize("pair", [TROEN_PETERSEN, TENNEKES, SHERLOCK])
def test_the_constants_of_the_drag_law_come_out(pair) -> None:
    z = np.array([1e-6, 1e-5])
    found = departure(z, pair.b)
    assert VON_KARMAN * found.imag == pytest.approx(pair.b, rel=5e-3)
    # A was not asked for: 1.3 to 1.7 come out, published are 0.8 to 1.8.
    a = VON_KARMAN * found.real - np.log(z)
    assert (np.abs(a - pair.a) < 1.0).all()


def test_it_is_the_layer_that_collocation_finds() -> None:
    """The same viscosity, solved by scipy's solve_bvp for one wind and roughness (synthetic.py)."""
    latitude, roughness = 52.0, 0.02
    truth = synthetic.solve(11.0, latitude, roughness, synthetic.neutral(latitude, share=0.0346))
    z = np.array([20.0, 60.0, 150.0, 300.0, 600.0])
    along = np.exp(-1j * np.radians(truth.cross_isobar_angle)) * (truth.wind(z) - truth.geostrophic)
    along = along / (truth.geostrophic / abs(truth.geostrophic))
    found = departure(z * truth.f / truth.u_star, b=4.5)
    # A viscosity of 0.1 m2/s aloft stands in the one and not in the other.
    np.testing.assert_allclose(found, along / truth.u_star, atol=0.2)


def test_the_layer_deepens_as_b_falls() -> None:
    assert depth_of(3.5) > depth_of(4.5) > depth_of(5.5)


def test_outside_the_layer() -> None:
    found = departure(np.array([np.nan, 1e-9, -1.0, 0.9, np.inf]), 4.5)
    assert np.isnan(found).tolist() == [True, True, True, False, True]
    assert abs(found[3]) < 1e-6


@pytest.mark.parametrize("b", [1.0, 20.0])
def test_constants_that_no_layer_has_are_refused(b: float) -> None:
    with pytest.raises(ValueError, match=rf"B = {b:g} is outside 3\.0 to 6\.\d"):
        departure(np.array([0.01]), b)
