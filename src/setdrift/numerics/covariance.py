"""The covariance of sea level in space and time, and how its scales change with latitude."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.earth import beta_parameter, coriolis_parameter

Floats = NDArray[np.floating]

ZERO_CROSSING = 3.34
"""Scaled distance at which the correlation crosses zero (root of 1 + s + s^2/6 - s^3/6)."""

FAR_REACH = 2.0
"""Observations within this many zero-crossing scales of a place are worth using: beyond, the covariance is spent."""

# Zero-crossing scales by latitude: common practice, no source. Mesoscale features shrink with the deformation radius
# and are longer along the equator than across it.
_LATITUDES = np.array([0.0, 5.0, 10.0, 20.0, 30.0, 45.0, 60.0, 90.0])
_ZONAL_KM = np.array([800.0, 550.0, 320.0, 230.0, 190.0, 150.0, 120.0, 100.0])
_MERIDIONAL_KM = np.array([300.0, 280.0, 240.0, 210.0, 180.0, 145.0, 120.0, 100.0])

# The large-scale part, e-folding distances and time of a Gaussian: common practice, no source. It stands for
# equatorial waves and basin-wide change, which the mesoscale covariance has no room for.
LARGE_ZONAL_KM = 1500.0
LARGE_MERIDIONAL_KM = 500.0
LARGE_TIME_DAYS = 15.0

_GRAVITY_WAVE_SPEED = 2.5  # m s-1, first baroclinic mode of the tropics: common practice, no source
_LARGEST_DRIFT = 0.15  # m s-1: eddies near the equator do not follow the long-wave speed
_SECONDS_PER_DAY = 86400.0


@dataclass(frozen=True)
class Covariance:
    """Sea level covariance about one place: mesoscale, drifting with its pattern, plus large-scale.

    Attributes
    ----------
    variance, large_variance : float
        Prior variance of either part, m2.
    zonal_scale, meridional_scale : float
        Distance of the mesoscale part's zero crossing, km.
    time_scale : float
        e-folding time of the mesoscale part, days.
    zonal_drift : float
        Eastward drift of the mesoscale part, km a day.
    """

    variance: float
    large_variance: float
    zonal_scale: float
    meridional_scale: float
    time_scale: float
    zonal_drift: float

    @property
    def prior_variance(self) -> float:
        """Variance of the sea level, m2."""
        return self.variance + self.large_variance

    def scaled(self, x: ArrayLike, y: ArrayLike, t: ArrayLike) -> Floats:
        """Return coordinates in which both parts are isotropic and the mesoscale pattern stands still.

        Parameters
        ----------
        x, y, t : (n,) array
            Distance east and north (km) and time (days) from any origin.

        Returns
        -------
        (6, n) array
            East, north and time scaled for the mesoscale part, then for the large-scale part.
        """
        x, y, t = (np.asarray(part, dtype=float) for part in (x, y, t))
        return np.stack(
            (
                (x - self.zonal_drift * t) * (ZERO_CROSSING / self.zonal_scale),
                y * (ZERO_CROSSING / self.meridional_scale),
                t / self.time_scale,
                x / LARGE_ZONAL_KM,
                y / LARGE_MERIDIONAL_KM,
                t / LARGE_TIME_DAYS,
            )
        )

    def __call__(self, x: ArrayLike, y: ArrayLike, t: ArrayLike) -> Floats:
        """Return the covariance (m2) at lags east (km), north (km) and in time (days), of one shape."""
        squared = self.scaled(x, y, t) ** 2
        mesoscale = self.variance * correlation(squared[0] + squared[1], squared[2])
        return np.asarray(mesoscale + self.large_variance * np.exp(-squared[3] - squared[4] - squared[5]))


def correlation(distance_squared: ArrayLike, time_squared: ArrayLike) -> Floats:
    """Correlation of sea level at scaled lags.

    Parameters
    ----------
    distance_squared, time_squared : array
        Squared scaled distance s^2 and squared scaled time lag; they broadcast together.

    Returns
    -------
    array
        (1 + s + s^2/6 - s^3/6) exp(-s) exp(-t^2).

    References
    ----------
    Arhan and Colin de Verdiere (1985), J. Phys. Oceanogr. 15, for the form; Le Traon et al. (1998),
    J. Atmos. Oceanic Technol. 15, for its use with drift in altimetry.
    """
    s_squared = np.asarray(distance_squared, dtype=float)
    s = np.sqrt(s_squared)
    return np.asarray((1.0 + s + s_squared / 6.0 - s_squared * s / 6.0) * np.exp(-s - np.asarray(time_squared)))


@dataclass(frozen=True)
class CovarianceModel:
    """A covariance for every latitude.

    Attributes
    ----------
    standard_deviation, large_standard_deviation : float
        Prior standard deviation of the mesoscale and of the large-scale part, m.
    time_scale : float
        Days.
    zonal_scale, meridional_scale : float or None
        km; None takes the built-in table.
    zonal_drift : float or None
        km a day eastward; None takes the long-Rossby-wave drift.
    """

    standard_deviation: float
    time_scale: float
    large_standard_deviation: float = 0.0
    zonal_scale: float | None = None
    meridional_scale: float | None = None
    zonal_drift: float | None = None

    @property
    def prior_standard_deviation(self) -> float:
        """Standard deviation of the sea level, m."""
        return float(np.hypot(self.standard_deviation, self.large_standard_deviation))

    def at(self, latitude: float) -> Covariance:
        """Return the covariance at a latitude in degrees."""
        zonal, meridional = built_in_scales(latitude)
        drift = long_wave_drift(latitude) if self.zonal_drift is None else self.zonal_drift
        return Covariance(
            self.standard_deviation**2,
            self.large_standard_deviation**2,
            self.zonal_scale or float(zonal),
            self.meridional_scale or float(meridional),
            self.time_scale,
            float(drift),
        )


def built_in_scales(latitude: ArrayLike) -> tuple[Floats, Floats]:
    """Return zonal and meridional zero-crossing scales (km) at latitudes in degrees."""
    distance = np.abs(np.asarray(latitude, dtype=float))
    return np.interp(distance, _LATITUDES, _ZONAL_KM), np.interp(distance, _LATITUDES, _MERIDIONAL_KM)


def long_wave_drift(latitude: ArrayLike) -> Floats:
    """Eastward drift of sea level patterns: that of long baroclinic Rossby waves, bounded.

    The mid-latitude speed -beta c^2 / f^2 is joined to the equatorial first mode's -c/3 by adding 3 beta c to f^2,
    and bounded at 0.15 m/s (common practice, no source).

    Parameters
    ----------
    latitude : array
        Degrees.

    Returns
    -------
    array
        km a day, negative westward.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, equations 11.8.4 (equatorial) and 12.3.11 (mid-latitude long waves),
    numbers from memory.
    """
    f, beta, c = coriolis_parameter(latitude), beta_parameter(latitude), _GRAVITY_WAVE_SPEED
    speed = np.minimum(beta * c**2 / (f**2 + 3.0 * beta * c), _LARGEST_DRIFT)
    return np.asarray(-speed * _SECONDS_PER_DAY / 1000.0)
