"""The approximate knife edge against the Fresnel integrals, integrated here by quadrature and by SciPy's function."""

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import fresnel

from fellspan.propagation import knife_edge_loss_db, knife_edge_loss_exact_db


def _by_scipy(nu: np.ndarray) -> np.ndarray:
    sine, cosine = fresnel(nu)
    return -20 * np.log10(np.abs((1 - cosine - sine) + 1j * (cosine - sine)) / 2)


def test_approximation_stays_within_its_stated_bound() -> None:
    nu = np.linspace(-0.7, 30.0, 30_701)
    error = np.abs(np.asarray(knife_edge_loss_db(nu)) - _by_scipy(nu))
    assert error.max() < 0.1235  # found 0.1230 at nu 4.57: the bound is tight
    assert error.max() > 0.1220
    assert nu[error.argmax()] == pytest.approx(4.57, abs=0.02)


def test_exact_form_equals_the_integrals() -> None:
    nu = np.linspace(-5.0, 30.0, 701)
    np.testing.assert_allclose(knife_edge_loss_exact_db(nu), _by_scipy(nu), atol=1e-9)


@pytest.mark.parametrize("nu", [-2.0, -0.849, 0.3, 2.4, 4.57])
def test_exact_form_equals_quadrature(nu: float) -> None:
    cosine = quad(lambda s: np.cos(np.pi * s * s / 2), 0, nu, epsabs=1e-12)[0]
    sine = quad(lambda s: np.sin(np.pi * s * s / 2), 0, nu, epsabs=1e-12)[0]
    amplitude = np.hypot(1 - cosine - sine, cosine - sine) / 2
    assert knife_edge_loss_exact_db(nu) == pytest.approx(-20 * np.log10(amplitude), abs=1e-8)


def test_sixty_percent_clearance_costs_nothing() -> None:
    # 0.6 F1 is nu -0.849: P.526-16 (30) gives a gain of 0.37 dB by hand, (31) nothing.
    assert knife_edge_loss_exact_db(-0.6 * np.sqrt(2)) == pytest.approx(-0.37, abs=0.006)
    assert knife_edge_loss_db(-0.6 * np.sqrt(2)) == 0.0
