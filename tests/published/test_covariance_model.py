"""The mesoscale covariance against its published form, and the conditions any covariance must meet."""

from __future__ import annotations

from decimal import Decimal, localcontext

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import j0

from setdrift.numerics.covariance import ZERO_CROSSING, Covariance, correlation

FORM = (
    "Arhan and Colin de Verdiere (1985), J. Phys. Oceanogr. 15; Le Traon et al. (1998), J. Atmos. Oceanic Technol. 15"
)


def at_distance(s):
    return float(correlation(s * s, 0.0))


def root():
    """Root of 6 + 6 s + s^2 - s^3 by Newton's method in forty digits."""
    with localcontext() as context:
        context.prec = 40
        s = Decimal(3)
        for _ in range(12):
            s -= (6 + 6 * s + s**2 - s**3) / (6 + 2 * s - 3 * s**2)
        assert abs(6 + 6 * s + s**2 - s**3) < Decimal("1e-36")
        return float(s)


@pytest.mark.source(FORM)
def test_value_at_no_lag():
    assert at_distance(0.0) == 1.0


@pytest.mark.source(FORM)
def test_zero_crossing():
    # the form to rounding; at its root all terms of order one cancel
    assert abs(at_distance(root())) < 1e-15
    assert at_distance(root() - 1e-9) > 0.0 > at_distance(root() + 1e-9)
    # the papers' 3.34 is 0.09 % more than the root 3.336912: three digits, half a unit of the last
    assert 3.34 / root() - 1.0 == pytest.approx(9.25e-4, abs=1e-6)
    assert pytest.approx(root(), abs=0.005) == ZERO_CROSSING


@pytest.mark.source(FORM)
def test_crosses_zero_once():
    values = correlation(np.arange(0.0, 60.0, 0.01) ** 2, 0.0)
    assert np.count_nonzero(np.diff(np.sign(values))) == 1


@pytest.mark.source(FORM + "; the derivative is worked out from the form")
def test_derivative():
    s = np.linspace(0.05, 12.0, 200)
    step = 1e-4
    differences = (correlation((s + step) ** 2, 0.0) - correlation((s - step) ** 2, 0.0)) / (2.0 * step)
    # centred differences: truncation step^2/6 C''' is below 1e-8, rounding 1e-16 / step
    np.testing.assert_allclose(differences, -s * (4.0 + 4.0 * s - s**2) / 6.0 * np.exp(-s), atol=1e-8)


@pytest.mark.source(FORM + "; curvature at no lag, which is the slope variance, is 2/3")
def test_curvature_at_no_lag():
    step = 1e-3
    # 1 - C = s^2/3 - s^3/3...: first order in the step
    assert 2.0 * (1.0 - at_distance(step)) / step**2 == pytest.approx(2.0 / 3.0, abs=2.0 * step)


@pytest.mark.source("Bochner's theorem in the plane; transform worked out from the form: 17.5 k^2 (1 + k^2)^(-9/2)")
def test_spectrum_in_the_plane_is_nonnegative_and_zero_at_wavenumber_zero():
    wavenumbers = np.concatenate(([0.0], np.geomspace(1e-3, 8.0, 40)))
    spectrum = [quad(lambda s, k=k: s * at_distance(s) * j0(k * s), 0.0, 60.0, limit=800)[0] for k in wavenumbers]
    # quadrature's own error; the tail beyond 60 is below 1e-20
    np.testing.assert_allclose(spectrum, 17.5 * wavenumbers**2 * (1.0 + wavenumbers**2) ** -4.5, atol=1e-9)
    assert abs(spectrum[0]) < 1e-10
    assert min(spectrum) >= -1e-10


@pytest.mark.source("definition of a covariance; " + FORM)
@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("spread", [0.1, 1.0, 5.0])
def test_positive_definite_in_space_and_time(seed, spread):
    rng = np.random.default_rng(seed)
    covariance = Covariance(1.0, 0.0, *rng.uniform(80.0, 400.0, 2), rng.uniform(5.0, 30.0), rng.uniform(-13.0, 0.0))
    x, y, t = rng.normal(0.0, spread * np.array([[200.0], [200.0], [15.0]]), (3, 200))
    matrix = covariance(x[:, None] - x, y[:, None] - y, t[:, None] - t)
    # crowded places make eigenvalues that are zero but for rounding, 1e-16 times the greatest (at most 200)
    assert np.linalg.eigvalsh(matrix).min() >= -1e-10


@pytest.mark.source("definition of a covariance: this test can tell a form that is none")
def test_a_form_that_is_no_covariance_fails_the_same_test():
    x = np.random.default_rng(0).uniform(-5.0, 5.0, (2, 200))
    s = np.hypot(*(x[:, :, None] - x[:, None, :]))
    assert np.linalg.eigvalsh(np.where(s < 2.0, 1.0 - s / 4.0, 0.0)).min() < -0.1
