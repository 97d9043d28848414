"""Velocity in balance with sea level across the equator, where the Coriolis parameter vanishes.

Close to the equator f u = -g dh/dy and f v = g dh/dx hold only for the part of the slope that vanishes
with f. What is left of the slope at the equator is balanced by acceleration (of u in a Kelvin wave, of v in
a mixed Rossby-gravity wave) and falls off with latitude like the trapped waves themselves. So, column by
column, least squares over the band give

    dh/dy = a S(y) + y P(y),    dh/dx = b S(y) + y Q(y),    S = exp(-beta y^2 / (2 c)),

with polynomials P and Q. The trapped parts a S and b S are left out, and u = -g P y/f, v = g Q y/f have no
singularity because y/f is finite at the equator. At the equator itself this is the second-derivative
relation of Picaut et al. (1989), beta u = -g d2h/dy2 and beta v = g d2h/dxdy.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import erf

from setdrift.numerics.derivatives import eastward_slope
from setdrift.numerics.earth import WGS84, Earth, beta_parameter, gravity, meridional_radius

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IndexArray = NDArray[np.intp]


@dataclass(frozen=True)
class EquatorialBand:
    """How velocity is found near the equator.

    Parameters
    ----------
    half_width : float
        Latitude up to which sea level enters the fit, degrees.
    inner, outer : float
        The fit alone serves up to `inner`, the f-plane alone from `outer`, a smooth blend between, degrees.
    degree : int
        Highest power of y in the sea level fitted for u over the whole band; v takes two less.
    wave_speed : float
        Gravity-wave speed c of the trapped shape S, m s-1: between the first and second baroclinic modes.
    largest_gap : float
        Widest piece of land, degrees of latitude, that a fit may bridge (islands, not continents).
    least_reach : float
        A fit needs sea at least this far from the equator on both sides, degrees.
    minimum_latitude : float
        Where no fit is possible the f-plane serves down to this latitude, degrees, and nothing below.
    """

    half_width: float = 6.0
    inner: float = 4.0
    outer: float = 6.0
    degree: int = 8
    wave_speed: float = 2.0
    largest_gap: float = 1.5
    least_reach: float = 2.0
    minimum_latitude: float = 2.0

    def __post_init__(self) -> None:
        """Refuse settings that contradict each other."""
        if not 0.0 < self.inner < self.outer <= self.half_width:
            raise ValueError(
                f"inner, outer and half_width must be positive and ascending, not {self.inner}, "
                f"{self.outer}, {self.half_width}"
            )
        if self.degree < 3:
            raise ValueError(f"degree must be at least 3, not {self.degree}")
        if self.wave_speed <= 0.0:
            raise ValueError(f"wave_speed must be positive, not {self.wave_speed}")


def equatorial_velocity(
    height: ArrayLike,
    latitude: ArrayLike,
    longitude: ArrayLike,
    *,
    band: EquatorialBand | None = None,
    periodic: bool = False,
    earth: Earth = WGS84,
) -> tuple[FloatArray, FloatArray]:
    """Return the velocity in beta-plane balance with sea level within the equatorial band.

    In each column the fit uses the sea that is connected across the equator, bridging islands narrower
    than `band.largest_gap`. Its degree shrinks in proportion to the length of that stretch of sea, and
    where the stretch ends less than `band.least_reach` from the equator on either side there is no fit.

    Parameters
    ----------
    height : (..., y, x) array
        Sea level, m; NaN for none. The grid may hold any part of the band.
    latitude, longitude : (y,) and (x,) array
        Degrees, ascending, regular.
    band : EquatorialBand, optional
        Extent and degree of the fit; the default band unless given.
    periodic : bool
        Whether the columns go round the globe.
    earth : Earth
        Earth model.

    Returns
    -------
    eastward, northward : (..., y, x) array
        m s-1; NaN outside the band and where there is no fit.

    Raises
    ------
    ValueError
        As `derivatives.slopes`.

    References
    ----------
    Picaut, Hayes and McPhaden (1989), J. Geophys. Res. 94, 3228-3236 (second-derivative balance);
    Lagerloef, Mitchum, Lukas and Niiler (1999), J. Geophys. Res. 104, 23313-23326 (polynomials in y, and
    blending with the f-plane); Matsuno (1966), J. Meteorol. Soc. Japan 44, 25-43 (the trapped shape).
    """
    band = band or EquatorialBand()
    values = np.asarray(height, dtype=np.float64)
    rows = np.asarray(latitude, dtype=np.float64)
    slope_x = eastward_slope(values, rows, longitude, periodic=periodic, earth=earth)
    eastward, northward = np.full_like(values, np.nan), np.full_like(values, np.nan)
    inside = np.abs(rows) <= band.half_width + 1e-9
    if inside.any():
        u, v = _fitted_columns(
            _as_columns(values[..., inside, :]), _as_columns(slope_x[..., inside, :]), rows[inside], band, earth
        )
        shape = np.moveaxis(values[..., inside, :], -2, 0).shape
        eastward[..., inside, :] = np.moveaxis(u.reshape(shape), 0, -2)
        northward[..., inside, :] = np.moveaxis(v.reshape(shape), 0, -2)
    return eastward, northward


def equatorial_error_gain(
    latitude: ArrayLike,
    correlation_length: float,
    *,
    band: EquatorialBand | None = None,
    earth: Earth = WGS84,
) -> tuple[FloatArray, FloatArray]:
    """Return how the fit amplifies an error of sea level into errors of velocity.

    The error has the same size everywhere and the correlation exp(-(r / correlation_length)^2); the column
    is sea throughout. Where land cuts the column short it is larger, up to 2.4 times (measured).

    Parameters
    ----------
    latitude : (y,) array
        Degrees north, ascending, regular.
    correlation_length : float
        m.
    band : EquatorialBand, optional
        Extent and degree of the fit; the default band unless given.
    earth : Earth
        Earth model.

    Returns
    -------
    gain_u, gain_v : (y,) array
        m s-1 per m; NaN outside the band and where there is no fit.

    Raises
    ------
    ValueError
        If the correlation length is not positive.

    References
    ----------
    Gauss's propagation of error: the diagonal of A C A^T for velocity A h and covariance C.
    """
    if correlation_length <= 0.0:
        raise ValueError(f"correlation_length must be positive, not {correlation_length}")
    band = band or EquatorialBand()
    rows = np.asarray(latitude, dtype=np.float64)
    gain_u, gain_v = np.full(rows.shape, np.nan), np.full(rows.shape, np.nan)
    used = _connected_sea(np.abs(rows) <= band.half_width + 1e-9, rows, band)
    degree = _affordable_degree(rows[used], band)
    if degree >= 2:
        for_u, for_v = _operators(rows[used], degree, band, earth)
        metres = np.deg2rad(rows[used]) * meridional_radius(0.0, earth)
        covariance = np.exp(-(((metres[:, np.newaxis] - metres) / correlation_length) ** 2))
        gain_u[used] = np.sqrt(np.sum(for_u @ covariance * for_u, axis=1))
        # the covariance of dh/dx along a column is -C'' across it, 2 / L^2 times that of h
        gain_v[used] = np.sqrt(2.0 * np.sum(for_v @ covariance * for_v, axis=1)) / correlation_length
    return gain_u, gain_v


def _as_columns(values: FloatArray) -> FloatArray:
    """Return a (..., y, x) array as (y, number of columns)."""
    return np.moveaxis(values, -2, 0).reshape(values.shape[-2], -1)


def _fitted_columns(
    height: FloatArray, slope_x: FloatArray, latitude: FloatArray, band: EquatorialBand, earth: Earth
) -> tuple[FloatArray, FloatArray]:
    """Return the velocity of (y, column) arrays; columns with the same gaps share their operators."""
    eastward, northward = np.full_like(height, np.nan), np.full_like(height, np.nan)
    sea = np.isfinite(height) & np.isfinite(slope_x)
    patterns, which = np.unique(np.packbits(sea, axis=0), axis=1, return_inverse=True)
    for number in range(patterns.shape[1]):
        columns = np.flatnonzero(which.ravel() == number)
        used = _connected_sea(sea[:, columns[0]], latitude, band)
        degree = _affordable_degree(latitude[used], band)
        if degree < 2:
            continue
        for_u, for_v = _operators(latitude[used], degree, band, earth)
        cells = np.ix_(used, columns)
        eastward[cells] = for_u @ height[cells]
        northward[cells] = for_v @ slope_x[cells]
    return eastward, northward


def _connected_sea(sea: BoolArray, latitude: FloatArray, band: EquatorialBand) -> IndexArray:
    """Return the rows of the stretch of sea that spans the equator; empty if none reaches far enough."""
    rows = np.flatnonzero(sea)
    step = latitude[1] - latitude[0] if latitude.size > 1 else 0.0
    breaks = np.flatnonzero(np.diff(latitude[rows]) > band.largest_gap + step + 1e-6) + 1
    for stretch in np.split(rows, breaks):
        reaches = latitude[stretch]
        if reaches.size and reaches[0] <= -band.least_reach and reaches[-1] >= band.least_reach:
            return stretch
    return rows[:0]


def _affordable_degree(latitude: FloatArray, band: EquatorialBand) -> int:
    """Return the degree for a stretch of sea: in proportion to its length, and overdetermined."""
    if latitude.size == 0:
        return 0
    # length over degree stays the same, and so, roughly, does the amplification of noise at the ends
    share = (latitude[-1] - latitude[0]) / (2.0 * band.half_width)
    # a grid whose cell centres stop half a step short of the band's edge still holds the whole band
    proportional = int(band.degree * share + 0.5)
    return min(proportional, latitude.size - 2)


def _operators(latitude: FloatArray, degree: int, band: EquatorialBand, earth: Earth) -> tuple[FloatArray, FloatArray]:
    """Return the matrices that take a column of sea level to u, and of its eastward slope to v."""
    y = latitude / band.half_width
    trapped, its_integral = _trapped_shape(latitude, band, earth)
    # y / f with f = 2 Omega sin(latitude): finite at the equator
    sine_ratio = np.sinc(latitude / 180.0)
    y_over_f = 1.0 / (np.deg2rad(band.half_width) * 2.0 * earth.rotation_rate * sine_ratio)
    scale = (gravity(latitude, earth) * y_over_f)[:, np.newaxis]
    metres = (np.deg2rad(band.half_width) * meridional_radius(latitude, earth))[:, np.newaxis]

    powers = np.arange(2, degree + 1)
    basis = np.column_stack([np.ones_like(y), its_integral, y[:, np.newaxis] ** powers])
    slope_over_y = np.column_stack([np.zeros_like(y), np.zeros_like(y), powers * y[:, np.newaxis] ** (powers - 2)])
    for_u = -scale / metres * (slope_over_y @ np.linalg.pinv(basis))

    powers = np.arange(1, max(degree - 2, 1) + 1)
    basis = np.column_stack([trapped, y[:, np.newaxis] ** powers])
    rest_over_y = np.column_stack([np.zeros_like(y), y[:, np.newaxis] ** (powers - 1)])
    for_v = scale * (rest_over_y @ np.linalg.pinv(basis))
    return for_u, for_v


def _trapped_shape(latitude: FloatArray, band: EquatorialBand, earth: Earth) -> tuple[FloatArray, FloatArray]:
    """Return S = exp(-beta y^2 / (2 c)) and its integral over latitude / half_width."""
    metres = np.deg2rad(band.half_width) * float(meridional_radius(0.0, earth))
    width = np.sqrt(band.wave_speed / float(beta_parameter(0.0, earth))) / metres
    y = latitude / band.half_width
    return np.exp(-0.5 * (y / width) ** 2), width * np.sqrt(np.pi / 2.0) * erf(y / (width * np.sqrt(2.0)))
