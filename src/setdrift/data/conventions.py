"""The one table of names: what each published variable is called, means, and how it is rounded."""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import IntFlag

METRE_STEP = 2.0**-14
"""Rounding step of lengths and speeds, m and m s-1: 0.06 mm, far below any error, and compresses well."""
PER_SECOND_STEP = 2.0**-40
"""Rounding step of vorticity, s-1."""
NUMBER_STEP = 2.0**-14
"""Rounding step of pure numbers."""

CAUTION = (
    "Not for navigation, search and rescue, or any decision on which safety depends. Official notices, local "
    "authorities and licensed practice come first. These currents are estimates from satellite sea level and "
    "can be wrong."
)
LIMITS = (
    "Balanced (geostrophic, near the equator beta-plane) surface currents only: no tides, inertial motion, wind "
    "drift or Stokes drift, and nothing smaller than the mapping's covariance scales."
)

SEA_LEVEL = "sea_surface_height_above_mean_sea_level"
TOPOGRAPHY = "sea_surface_height_above_geoid"
EASTWARD = "surface_geostrophic_eastward_sea_water_velocity"
NORTHWARD = "surface_geostrophic_northward_sea_water_velocity"
ANOMALY = "_assuming_mean_sea_level_for_geoid"


class MapQuality(IntFlag):
    """Bits of `map_quality`; 0 is good."""

    UNOBSERVED = 1
    LAND = 2


UNOBSERVED_LIMIT = 0.9
"""A point is unobserved where its error exceeds this part of the prior standard deviation."""


@dataclass(frozen=True)
class Variable:
    """A published variable.

    Attributes
    ----------
    name, units, long_name : str
        As in the product.
    standard_name : str
        CF standard name; empty where none exists.
    step : float
        Rounding step; 0 for integers.
    stage : str
        Work store the values come from; "fixed" for fields without time.
    ancillary : str
        Names of variables that qualify this one.
    more : dict
        Further attributes.
    """

    name: str
    units: str
    long_name: str
    standard_name: str
    step: float
    stage: str
    ancillary: str = ""
    more: dict[str, object] = field(default_factory=dict)

    @property
    def attributes(self) -> dict[str, object]:
        """CF attributes of the variable."""
        attributes: dict[str, object] = {"long_name": self.long_name, "units": self.units}
        if self.standard_name:
            attributes["standard_name"] = self.standard_name
        if self.stage != "fixed":
            attributes["cell_methods"] = "time: point"
        if self.ancillary:
            attributes["ancillary_variables"] = self.ancillary
        return attributes | {"grid_mapping": "earth"} | self.more


DAILY_VARIABLES = (
    Variable(
        "sea_level_anomaly",
        "m",
        "sea level anomaly",
        SEA_LEVEL,
        METRE_STEP,
        "maps",
        "sea_level_anomaly_error observation_count map_quality",
    ),
    Variable(
        "sea_level_anomaly_error",
        "m",
        "formal standard error of the sea level anomaly",
        f"{SEA_LEVEL} standard_error",
        METRE_STEP,
        "maps",
    ),
    Variable(
        "observation_count",
        "1",
        "observations behind the map at this point",
        "number_of_observations",
        0.0,
        "maps",
    ),
    Variable(
        "map_quality",
        "1",
        "quality of the map: 0 is good",
        "status_flag",
        0.0,
        "maps",
        "",
        {
            "flag_masks": [int(bit) for bit in MapQuality],
            "flag_meanings": "unobserved land",
            "comment": f"unobserved: the error exceeds {UNOBSERVED_LIMIT} of the prior standard deviation",
        },
    ),
    Variable(
        "dynamic_topography",
        "m",
        "dynamic topography: sea level anomaly plus mean dynamic topography",
        TOPOGRAPHY,
        METRE_STEP,
        "dynamic_topography",
        "map_quality",
    ),
    Variable(
        "eastward_velocity",
        "m s-1",
        "eastward balanced surface velocity",
        EASTWARD,
        METRE_STEP,
        "currents",
        "velocity_method map_quality",
        {"comment": LIMITS},
    ),
    Variable(
        "northward_velocity",
        "m s-1",
        "northward balanced surface velocity",
        NORTHWARD,
        METRE_STEP,
        "currents",
        "velocity_method map_quality",
        {"comment": LIMITS},
    ),
    Variable(
        "eastward_velocity_anomaly",
        "m s-1",
        "eastward balanced surface velocity of the sea level anomaly",
        EASTWARD + ANOMALY,
        METRE_STEP,
        "currents",
        "velocity_method map_quality",
        {"comment": LIMITS},
    ),
    Variable(
        "northward_velocity_anomaly",
        "m s-1",
        "northward balanced surface velocity of the sea level anomaly",
        NORTHWARD + ANOMALY,
        METRE_STEP,
        "currents",
        "velocity_method map_quality",
        {"comment": LIMITS},
    ),
    Variable(
        "relative_vorticity",
        "s-1",
        "relative vorticity of the balanced surface velocity",
        "ocean_relative_vorticity",
        PER_SECOND_STEP,
        "currents",
    ),
    Variable(
        "rossby_number",
        "1",
        "Rossby number: relative vorticity over Coriolis parameter",
        "",
        NUMBER_STEP,
        "currents",
        "",
        {"comment": "signed; missing near the equator; where its magnitude nears one the balance is in doubt"},
    ),
    Variable(
        "velocity_method",
        "1",
        "balance used for the velocity",
        "status_flag",
        0.0,
        "currents",
        "",
        {"flag_values": [0, 1, 2, 3], "flag_meanings": "none f_plane blended beta_plane"},
    ),
    Variable(
        "mean_dynamic_topography",
        "m",
        "mean dynamic topography",
        "",
        METRE_STEP,
        "fixed",
    ),
    Variable(
        "land_fraction",
        "1",
        "part of the cell that is land",
        "land_area_fraction",
        NUMBER_STEP,
        "fixed",
    ),
)


@dataclass(frozen=True)
class Column:
    """A published property of eddies: one value a detection."""

    name: str
    units: str
    long_name: str
    standard_name: str = ""

    @property
    def attributes(self) -> dict[str, object]:
        """CF attributes of the column."""
        attributes: dict[str, object] = {"long_name": self.long_name, "units": self.units}
        if self.standard_name:
            attributes["standard_name"] = self.standard_name
        return attributes


EDDY_COLUMNS = (
    Column("latitude", "degrees_north", "latitude of the fitted extreme", "latitude"),
    Column("longitude", "degrees_east", "longitude of the fitted extreme", "longitude"),
    Column("amplitude", "m", "distance between the fitted extreme and the level of the outer contour"),
    Column("extremum", "m", "fitted extreme of the sea level"),
    Column("outer_level", "m", "sea level of the outer contour"),
    Column("area", "m2", "area inside the outer contour"),
    Column("equal_area_radius", "m", "radius of the circle with the outer contour's area"),
    Column("circle_misfit", "1", "area between the outer contour and the circle of its area, over that area"),
    Column("rotation_speed", "m s-1", "mean speed along the contour where it is greatest"),
    Column("fastest_rotation_radius", "m", "radius of the circle with the area inside the contour of fastest rotation"),
    Column("rossby_number", "1", "mean relative vorticity inside that contour over the Coriolis parameter"),
)
