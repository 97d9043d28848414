"""Geostrophic velocity from sea level, pole to pole."""

from __future__ import annotations

from dataclasses import dataclass
from enum import IntEnum

import numpy as np
from numpy.typing import ArrayLike, NDArray

from setdrift.numerics.derivatives import slopes
from setdrift.numerics.earth import WGS84, Earth, coriolis_parameter, gravity
from setdrift.numerics.equatorial_balance import (
    EquatorialBand,
    equatorial_error_gain,
    equatorial_velocity,
)

__all__ = [
    "EquatorialBand",
    "GeostrophicVelocity",
    "VelocityMethod",
    "equatorial_velocity",
    "f_plane_velocity",
    "geostrophic_velocity",
    "geostrophic_velocity_error",
    "rossby_number",
    "velocity_from_slopes",
]

FloatArray = NDArray[np.float64]


class VelocityMethod(IntEnum):
    """Which balance a velocity comes from."""

    NONE = 0
    F_PLANE = 1
    BLENDED = 2
    BETA_PLANE = 3


@dataclass(frozen=True)
class GeostrophicVelocity:
    """Velocity and the balance it comes from.

    Parameters
    ----------
    eastward, northward : (..., y, x) array
        m s-1; NaN in both where `method` is NONE.
    method : (..., y, x) array of int8
        `VelocityMethod` codes.
    """

    eastward: FloatArray
    northward: FloatArray
    method: NDArray[np.int8]


def velocity_from_slopes(
    slope_x: ArrayLike, slope_y: ArrayLike, latitude: ArrayLike, earth: Earth = WGS84
) -> tuple[FloatArray, FloatArray]:
    """Return the velocity whose Coriolis force balances a sea surface slope.

    Parameters
    ----------
    slope_x, slope_y : (..., y, x) array
        Eastward and northward slope, m m-1.
    latitude : (y,) array
        Degrees north.
    earth : Earth
        Earth model.

    Returns
    -------
    eastward, northward : (..., y, x) array
        u = -(g/f) slope_y and v = (g/f) slope_x, m s-1; NaN on the equator.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, section 7.6.
    """
    coriolis = coriolis_parameter(latitude, earth)
    # a row meant to be the equator may sit a rounding error away from it
    on_equator = np.abs(coriolis) < 1e-12
    factor = (gravity(latitude, earth) / np.where(on_equator, np.nan, coriolis))[:, np.newaxis]
    return -factor * np.asarray(slope_y, np.float64), factor * np.asarray(slope_x, np.float64)


def f_plane_velocity(
    height: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    *,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> tuple[FloatArray, FloatArray]:
    """Return the velocity in f-plane balance with sea level, latitude by latitude.

    Parameters
    ----------
    height : (..., y, x) array
        Sea level, m; NaN for none.
    latitude, longitude : (y,) and (x,) array
        Degrees, ascending, regular.
    periodic : bool
        Whether the columns go round the globe.
    earth : Earth
        Earth model.

    Returns
    -------
    eastward, northward : (..., y, x) array
        m s-1; NaN on the equator, and where the slope it needs is not known.

    Raises
    ------
    ValueError
        As `derivatives.slopes`.

    References
    ----------
    Gill (1982), Atmosphere-Ocean Dynamics, section 7.6.
    """
    slope_x, slope_y = slopes(height, latitude, longitude, periodic=periodic, earth=earth)
    return velocity_from_slopes(slope_x, slope_y, latitude, earth)


def geostrophic_velocity(
    height: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    *,
    band: EquatorialBand | None = None,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> GeostrophicVelocity:
    """Return the geostrophic velocity at all latitudes.

    Poleward of `band.outer` it is the f-plane balance, equatorward of `band.inner` the beta-plane balance of
    `equatorial_velocity`, and between them a blend whose weight and its slope are continuous. Where the
    equatorial fit is impossible (a grid that holds one side of the equator only, a coast close to it) the
    f-plane serves down to `band.minimum_latitude`, and there is no velocity below that.

    Parameters
    ----------
    height : (..., y, x) array
        Sea level, m; NaN for none. For the same velocity from a regional grid as from a global one, the
        grid reaches `band.half_width` on both sides of the equator wherever it holds part of the band.
    latitude, longitude : (y,) and (x,) array
        Degrees, ascending, regular.
    band : EquatorialBand, optional
        Treatment of the equator; the default band unless given.
    periodic : bool
        Whether the columns go round the globe.
    earth : Earth
        Earth model.

    Returns
    -------
    GeostrophicVelocity
        Both components, or neither, at each point.

    Raises
    ------
    ValueError
        As `derivatives.slopes`.

    References
    ----------
    Lagerloef, Mitchum, Lukas and Niiler (1999), J. Geophys. Res. 104, 23313-23326 (the blending).
    """
    band = band or EquatorialBand()
    values = np.asarray(height, dtype=np.float64)
    rows = np.asarray(latitude, dtype=np.float64)
    eastward, northward = f_plane_velocity(values, rows, longitude, periodic=periodic, earth=earth)
    unknown = np.isnan(eastward) | np.isnan(northward)
    eastward[unknown] = northward[unknown] = np.nan
    method = np.where(unknown, VelocityMethod.NONE, VelocityMethod.F_PLANE).astype(np.int8)

    near = np.abs(rows) <= band.half_width + 1e-9
    if near.any():
        balanced = equatorial_velocity(
            values[..., near, :], rows[near], longitude, band=band, periodic=periodic, earth=earth
        )
        weight = _f_plane_weight(~unknown[..., near, :], ~np.isnan(balanced[0]), rows[near], band)
        eastward[..., near, :] = _mixed(eastward[..., near, :], balanced[0], weight)
        northward[..., near, :] = _mixed(northward[..., near, :], balanced[1], weight)
        method[..., near, :] = _method(weight)
    return GeostrophicVelocity(eastward, northward, method)


def geostrophic_velocity_error(
    height_error: ArrayLike,
    slope_x_error: ArrayLike,
    slope_y_error: ArrayLike,
    latitude: ArrayLike,
    *,
    correlation_length: float,
    band: EquatorialBand | None = None,
    earth: Earth = WGS84,
) -> tuple[FloatArray, FloatArray]:
    """Return the standard errors of `geostrophic_velocity`.

    The f-plane passes on the errors of the slopes, the equatorial fit those of sea level itself; the blend
    adds the two with their weights as if they were fully correlated, which cannot be too small.

    Parameters
    ----------
    height_error : (..., y, x) array
        Standard error of sea level, m, for the fit; taken as uniform over each column's band.
    slope_x_error, slope_y_error : (..., y, x) array
        Standard errors of the eastward and northward slope, m m-1, for the f-plane.
    latitude : (y,) array
        Degrees north, ascending, regular.
    correlation_length : float
        Of the sea level error, m: correlation exp(-(r / correlation_length)^2).
    band : EquatorialBand, optional
        Treatment of the equator; the default band unless given.
    earth : Earth
        Earth model.

    Returns
    -------
    eastward, northward : (..., y, x) array
        m s-1. The caller blanks the points whose velocity is not known.

    Raises
    ------
    ValueError
        If the correlation length is not positive.

    References
    ----------
    Gauss's propagation of error through the balances of `velocity_from_slopes` and `equatorial_velocity`.
    """
    band = band or EquatorialBand()
    rows = np.asarray(latitude, dtype=np.float64)
    eastward, northward = velocity_from_slopes(slope_x_error, slope_y_error, rows, earth)
    gains = equatorial_error_gain(rows, correlation_length, band=band, earth=earth)
    weight = _f_plane_weight(~np.isnan(eastward + northward), ~np.isnan(gains[0])[:, np.newaxis], rows, band)
    height = np.asarray(height_error, np.float64)
    return (
        _mixed(np.abs(eastward), height * gains[0][:, np.newaxis], weight),
        _mixed(np.abs(northward), height * gains[1][:, np.newaxis], weight),
    )


def rossby_number(
    relative_vorticity: ArrayLike,
    latitude: ArrayLike,
    *,
    minimum_latitude: float = 2.0,
    earth: Earth = WGS84,
) -> FloatArray:
    """Return the Rossby number, relative vorticity over the Coriolis parameter.

    Parameters
    ----------
    relative_vorticity : (..., y, x) array
        s-1.
    latitude : (y,) array
        Degrees north.
    minimum_latitude : float
        No value closer to the equator than this, degrees: the ratio says nothing where f vanishes.
    earth : Earth
        Earth model.

    Returns
    -------
    (..., y, x) array
        Dimensionless; positive for cyclonic, negative for anticyclonic rotation in either hemisphere.

    References
    ----------
    Vallis (2017), Atmospheric and Oceanic Fluid Dynamics, section 2.8 (scale U / (f L) of the same ratio;
    from memory).
    """
    rows = np.asarray(latitude, dtype=np.float64)
    coriolis = np.where(np.abs(rows) < minimum_latitude, np.nan, coriolis_parameter(rows, earth))
    return np.asarray(relative_vorticity, np.float64) / coriolis[:, np.newaxis]


def _f_plane_weight(
    f_plane: NDArray[np.bool_], beta_plane: NDArray[np.bool_], latitude: FloatArray, band: EquatorialBand
) -> FloatArray:
    """Return the weight of the f-plane value where either balance is known; NaN where neither is."""
    distance = np.abs(latitude)[:, np.newaxis]
    share = np.clip((distance - band.inner) / (band.outer - band.inner), 0.0, 1.0)
    smooth = share**2 * (3.0 - 2.0 * share)
    alone = np.where(f_plane & (distance >= band.minimum_latitude), 1.0, np.nan)
    return np.where(beta_plane, np.where(f_plane, smooth, 0.0), alone)


def _mixed(f_plane: FloatArray, beta_plane: FloatArray, weight: FloatArray) -> FloatArray:
    """Return the blend; a balance without weight has no say, even where it is not known (NaN)."""
    blend = weight * f_plane + (1.0 - weight) * beta_plane
    return np.where(weight == 0.0, beta_plane, np.where(weight == 1.0, f_plane, blend))


def _method(weight: FloatArray) -> NDArray[np.int8]:
    codes = np.full(weight.shape, VelocityMethod.BLENDED, dtype=np.int8)
    codes[weight == 0.0] = VelocityMethod.BETA_PLANE
    codes[weight == 1.0] = VelocityMethod.F_PLANE
    codes[np.isnan(weight)] = VelocityMethod.NONE
    return codes
