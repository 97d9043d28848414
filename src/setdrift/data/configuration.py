"""The configuration of an analysis: one small YAML file, checked before anything runs."""

from __future__ import annotations

import datetime as dt
import os
import re
from pathlib import Path
from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationError, field_validator, model_validator

from setdrift.data.configuration_errors import explained
from setdrift.data.yaml_files import read_yaml
from setdrift.errors import SetdriftError

FIRST_DAY, LAST_DAY = dt.date(1970, 1, 1), dt.date(2199, 12, 31)
"""Days that observations are believed of."""


def _day(value: Any) -> Any:
    """Return a date written as YYYY-MM-DD; other notations, and numbers, could mean another day."""
    try:
        day = dt.date.fromisoformat(value if re.fullmatch(r"\d{4}-\d{2}-\d{2}", value) else "")
    except (TypeError, ValueError) as error:
        raise ValueError(f"{value!r} is not a day; write it as YYYY-MM-DD") from error
    if not FIRST_DAY <= day <= LAST_DAY:
        raise ValueError(f"{value!r} is out of range; give a day from {FIRST_DAY} to {LAST_DAY}")
    return day


def _day_or_latest(value: Any) -> Any:
    try:
        return value if value == "latest" else _day(value)
    except ValueError as error:
        raise ValueError(f"{error}, or latest") from error


Positive = Annotated[float, Field(gt=0)]
NotNegative = Annotated[float, Field(ge=0)]
Name = Annotated[str, Field(pattern=r"^[a-z][a-z0-9_]*$", max_length=40)]


class Section(BaseModel):
    """A part of the configuration: unknown keys are refused, values never change."""

    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)

    @field_validator("*", mode="before")
    @classmethod
    def _no_truth_value(cls, value: Any) -> Any:
        # YAML reads a bare yes, no, on or off as a truth value, which would pass for the number 1 or 0
        if isinstance(value, bool):
            raise ValueError("holds yes or no, on or off; write a number, or put the text in quotes")
        return value


class Period(Section):
    """Days to analyse, both ends included."""

    start: Annotated[dt.date, BeforeValidator(_day)] = Field(description="first day")
    end: Annotated[dt.date | Literal["latest"], BeforeValidator(_day_or_latest)] = Field(
        description="a date, or 'latest': the newest day with observations"
    )

    @model_validator(mode="after")
    def _in_order(self) -> Period:
        if self.end != "latest" and self.end < self.start:
            raise ValueError(f"start ({self.start}) must not be after end ({self.end}); change one of them")
        return self


_ROUNDING = 1e-9


class GridBox(Section):
    """The box and its spacing in degrees; grid points are the centres of its cells."""

    west: float = Field(ge=-360, le=360, description="western edge of the box, degrees east; any convention")
    east: float = Field(ge=-360, le=360, description="eastern edge; below `west` for a box across the dateline")
    south: float = Field(ge=-90, le=90, description="southern edge, degrees north")
    north: float = Field(ge=-90, le=90, description="northern edge, degrees north")
    spacing: float = Field(gt=0, le=2, description="degrees, in both directions")

    @model_validator(mode="after")
    def _sound(self) -> GridBox:
        if self.south >= self.north:
            raise ValueError(f"south ({self.south}) must be below north ({self.north}); change one of them")
        if self.west == self.east or self.east - self.west > 360.0:
            raise ValueError(
                f"west ({self.west}) to east ({self.east}) is no box; "
                "a whole turn is written as west: -180, east: 180, and no box is wider"
            )
        for low, high, extent in (("west", "east", self.width), ("south", "north", self.north - self.south)):
            cells = extent / self.spacing
            if abs(cells - round(cells)) > 1e-6 * max(cells, 1.0) or round(cells) < 4:
                raise ValueError(
                    f"spacing ({self.spacing}) must divide {low} to {high} ({extent:g} degrees) "
                    "into a whole number of cells, at least 4; change one of them"
                )
        return self

    @property
    def width(self) -> float:
        """Eastward extent in degrees, 360 for a global box."""
        width = (self.east - self.west) % 360.0
        # ends such as -16.1 and 343.9 differ from a whole turn by a rounding error
        return 360.0 if min(width, 360.0 - width) < _ROUNDING else width

    @property
    def periodic(self) -> bool:
        """Whether the box goes once round the globe."""
        return self.width == 360.0


class VariableNames(Section):
    """Names of variables in files that carry no CF standard names; those left out are found by standard name."""

    time: str | None = Field(default=None, description="name of the variable that holds the time")
    time_offset: str | None = Field(
        default=None, description="the same for a time to add to the first, where that is one for a whole record"
    )
    latitude: str | None = Field(default=None, description="the same for latitude")
    longitude: str | None = Field(default=None, description="the same for longitude")
    sea_level_anomaly: str | None = Field(default=None, description="the same for the sea level anomaly")
    pass_number: str | None = Field(
        default=None, description="the same for the number of the pass; used only with `cycle_number`"
    )
    cycle_number: str | None = Field(
        default=None, description="the same for the number of the cycle; used only with `pass_number`"
    )


class GoodValues(Section):
    """Which observations are good: the flag's value is one of `values`, or its masked bits equal `equals`."""

    variable: str = Field(description="name of the flag variable")
    values: tuple[int, ...] | None = Field(default=None, min_length=1, description="good values of the flag")
    mask: int | None = Field(default=None, ge=1, description="bits of the flag that count")
    equals: int = Field(default=0, ge=0, description="what these bits are where the observation is good")

    @model_validator(mode="after")
    def _one_rule(self) -> GoodValues:
        if (self.values is None) == (self.mask is None):
            raise ValueError(
                "needs one rule; give either values (a list of good values of the flag) or mask (with equals)"
            )
        if self.equals & ~(self.mask or 0):
            raise ValueError(f"equals ({self.equals}) has bits that mask ({self.mask}) lacks; no flag could be good")
        return self


class Altimeter(Section):
    """One altimeter's files and how to read them."""

    files: str = Field(description="glob of along-track files, relative to the configuration file")
    variables: VariableNames = VariableNames()
    subtract: tuple[str, ...] = Field(default=(), description="correction variables to subtract from the sea level")
    add: tuple[str, ...] = Field(default=(), description="correction variables to add to the sea level")
    good: GoodValues | None = None
    noise_m: Positive = Field(default=0.03, le=1.0, description="white-noise standard deviation of one observation")

    @property
    def reading(self) -> dict[str, Any]:
        """The keys that decide what is read from a file: not where it is, nor how far it is trusted."""
        return self.model_dump(mode="json", exclude={"files", "noise_m"})


class Source(Section):
    """A gridded input file, and the variable in it where standard names do not tell."""

    file: str = Field(description="path of the gridded file, relative to the configuration file")
    variable: str | None = Field(default=None, description="name of the field where its standard name does not tell")


class Editing(Section):
    """Limits of the tests that set observations aside."""

    largest_anomaly_m: Positive = Field(default=2.0, description="gross limit of the anomaly's magnitude")
    largest_spread_m: Positive = Field(
        default=2.0, description="a file whose sea level spreads more, robustly, is set aside as a whole"
    )
    spike_window: int = Field(default=9, ge=5, le=101, description="points of the running median")
    spike_limit: Positive = Field(default=5.0, description="robust standard deviations from the running median")
    spike_floor_m: Positive = Field(default=0.10, description="departures below this are never spikes")
    pass_gap_s: Positive = Field(default=300.0, description="a longer gap in time starts a new pass")
    shortest_segment: int = Field(
        default=3, ge=0, le=1000, description="fewer points alone between gaps are dropped; 0: none are"
    )
    least_depth_m: Positive = Field(default=100.0, description="shallower sea is left out; used only with `depth`")


class Mapping(Section):
    """The covariance of sea level, its errors, and the window of the mapping."""

    window_days: int = Field(
        default=15, ge=1, le=60, description="observations up to so many days either side are used"
    )
    signal_m: Positive = Field(default=0.10, le=2.0, description="prior standard deviation of the sea level anomaly")
    large_scale_m: NotNegative = Field(
        default=0.03, description="prior standard deviation of the part with scales of 500 to 1500 km"
    )
    zonal_scale_km: Positive | None = Field(
        default=None, description="zero crossing of the covariance; left out: by latitude"
    )
    meridional_scale_km: Positive | None = Field(default=None, description="as zonal_scale_km, northward")
    time_scale_days: Positive = Field(default=15.0, description="e-folding time of the covariance")
    zonal_drift_km_per_day: float | None = Field(
        default=None, ge=-200, le=200, description="eastward drift of sea level patterns; left out: by latitude"
    )
    long_wave_m: NotNegative = Field(default=0.02, description="standard deviation of the error shared along a pass")
    bias_m: NotNegative = Field(default=0.03, description="standard deviation of the bias between altimeters")


class Currents(Section):
    """Latitudes, in degrees, of the equatorial band."""

    band_degrees: Positive = Field(default=6.0, le=10, description="the equatorial fit uses sea level up to here")
    blend_from_degrees: Positive = Field(default=4.0, description="pure beta-plane balance up to here")
    blend_to_degrees: Positive = Field(default=6.0, description="pure f-plane balance from here")

    @model_validator(mode="after")
    def _in_order(self) -> Currents:
        if not self.blend_from_degrees < self.blend_to_degrees <= self.band_degrees:
            raise ValueError(
                f"blend_from_degrees ({self.blend_from_degrees}) must be below blend_to_degrees "
                f"({self.blend_to_degrees}), and that not above band_degrees ({self.band_degrees}); change one of them"
            )
        return self


class Eddies(Section):
    """What counts as an eddy and how detections are linked from day to day."""

    field: Literal["sea_level_anomaly", "dynamic_topography"] = Field(
        default="sea_level_anomaly", description="the map that eddies are sought in"
    )
    minimum_amplitude_m: Positive = Field(
        default=0.02, description="least height of the extreme above or below the outer contour"
    )
    minimum_prominence_m: Positive = Field(
        default=0.01, description="least height of an extreme over the saddle to a stronger one"
    )
    minimum_radius_km: Positive = Field(default=20.0, description="of the circle of the outer contour's area")
    maximum_radius_km: Positive = Field(default=250.0, description="of the circle of the outer contour's area")
    maximum_circle_misfit: float = Field(
        default=0.5, gt=0, le=2, description="area between the outer contour and that circle, over that area"
    )
    equatorial_exclusion_degrees: float = Field(
        default=5.0, ge=0, le=90, description="no eddy is centred nearer the equator"
    )
    gate_km: Positive = Field(default=150.0, description="farthest a detection may lie from the predicted position")
    gap_days: int = Field(default=5, ge=0, le=30, description="days a trajectory may go unseen")

    @model_validator(mode="after")
    def _in_order(self) -> Eddies:
        if self.minimum_radius_km >= self.maximum_radius_km:
            raise ValueError(
                f"minimum_radius_km ({self.minimum_radius_km}) must be below "
                f"maximum_radius_km ({self.maximum_radius_km}); change one of them"
            )
        return self


class Publish(Section):
    """How products are written and whose they are."""

    zarr_format: Literal[2, 3] = Field(default=3, description="format of the stores")
    institution: str = Field(default="not stated", description="whose product it is; goes into the attributes")
    licence: str = Field(
        default="not stated: ask the institution before use", description="terms of use; goes into the attributes"
    )
    creator_name: str = Field(default="not stated", description="goes into the attributes")
    creator_email: str = Field(default="not stated", description="goes into the attributes")


class Configuration(Section):
    """The whole configuration of one analysis."""

    analysis: Name = Field(description="names the outputs: lower case letters, digits and underscores")
    output: str = Field(description="work files and products go below this folder, under the analysis's name")
    period: Period
    grid: GridBox
    altimeters: dict[Name, Altimeter] = Field(
        min_length=1, max_length=100, json_schema_extra={"additionalProperties": False}
    )
    mean_dynamic_topography: Source
    land: Source | None = Field(
        default=None, description="land mask; left out: land is where the mean dynamic topography is missing"
    )
    depth: Source | None = Field(
        default=None, description="depth or height of the sea floor; left out: shallow sea is used like any other"
    )
    editing: Editing = Editing()
    mapping: Mapping = Mapping()
    currents: Currents = Currents()
    eddies: Eddies = Eddies()
    publish: Publish = Publish()
    block_days: int = Field(default=10, ge=1, le=366, description="days handled by one job")

    _path: Path = Path("configuration.yaml")

    @field_validator("altimeters", mode="after")
    @classmethod
    def _ordered(cls, value: dict[str, Altimeter]) -> dict[str, Altimeter]:
        # the order of keys in the file must not change any result
        return dict(sorted(value.items()))

    @property
    def path(self) -> Path:
        """The file the configuration was read from."""
        return self._path

    def resolve(self, name: str) -> Path:
        """Return a path of the configuration, relative ones taken from the file's own folder."""
        return Path(os.path.normpath(self._path.parent / Path(name).expanduser()))

    @property
    def work(self) -> Path:
        """Folder of this analysis's intermediate files."""
        return self.resolve(self.output) / "work" / self.analysis

    @property
    def products(self) -> Path:
        """Folder of this analysis's published products."""
        return self.resolve(self.output) / "products" / self.analysis


def load_configuration(path: str | Path) -> Configuration:
    """Read and check a configuration file.

    Parameters
    ----------
    path : str or Path
        The YAML file.

    Returns
    -------
    Configuration
        The checked configuration.

    Raises
    ------
    SetdriftError
        The file cannot be read, is not YAML, or a key is unknown, missing or out of range.
    """
    path = Path(path)
    content = read_yaml(path)
    try:
        configuration = Configuration.model_validate(content)
    except ValidationError as error:
        raise SetdriftError(*explained(path, error, Configuration)) from error
    configuration._path = path.absolute()  # noqa: SLF001 - the loader is the one place that knows the file
    return configuration
