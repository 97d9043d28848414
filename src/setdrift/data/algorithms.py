"""Which settings and which version of the algorithm each stage's results depend on.

The workflow reruns a stage when its digest here changes, and a stage makes a day again when it does: both take it
from this one table, which imports nothing heavy.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from setdrift.data.configuration import Configuration
from setdrift.data.digests import digest
from setdrift.data.grids import Grid, analysis_grid, observation_area, working_grid

VERSIONS = {
    "observations": 4,
    "fixed": 1,
    "maps": 1,
    "dynamic_topography": 1,
    "currents": 1,
    "eddies": 1,
    "trajectories": 1,
    "daily": 1,
    "eddy_product": 1,
    "bulletin": 1,
}
"""Raised by hand, a stage at a time, whenever its results change for the same input and settings."""

TRACKING_KEYS = {"gate_km", "gap_days"}
"""Settings that link eddies and do not change what is detected."""


def settings_digest(configuration: Configuration, stage: str) -> str:
    """Return the digest of a stage's version and of the settings its results depend on.

    Parameters
    ----------
    configuration : Configuration
        The analysis.
    stage : str
        A key of `VERSIONS`.

    Returns
    -------
    str
        Hexadecimal digest.
    """
    settings = SETTINGS.get(stage)
    return digest(stage, VERSIONS[stage], settings(configuration) if settings else None)


def _reading(configuration: Configuration) -> list[Any]:
    reading = {name: altimeter.reading for name, altimeter in configuration.altimeters.items()}
    fields = [(configuration.land or configuration.mean_dynamic_topography).variable]
    fields += [configuration.depth.variable] if configuration.depth else []
    return [reading, configuration.editing, str(observation_area(configuration)), fields]


def _fixed(configuration: Configuration) -> list[Any]:
    land = configuration.land.variable if configuration.land else None
    return [_points(working_grid(configuration)), configuration.mean_dynamic_topography.variable, land]


def _mapping(configuration: Configuration) -> list[Any]:
    noise = {name: altimeter.noise_m for name, altimeter in configuration.altimeters.items()}
    return [configuration.mapping, noise, _points(working_grid(configuration))]


def _detection(configuration: Configuration) -> list[Any]:
    return [configuration.eddies.model_dump(exclude=TRACKING_KEYS), _points(analysis_grid(configuration))]


def _product(configuration: Configuration) -> list[Any]:
    return [configuration.publish, _points(analysis_grid(configuration))]


def _points(grid: Grid) -> list[Any]:
    return [grid.latitude.tolist(), grid.longitude.tolist(), grid.periodic]


SETTINGS: dict[str, Callable[[Configuration], Any]] = {
    "observations": _reading,
    "fixed": _fixed,
    "maps": _mapping,
    "currents": lambda configuration: configuration.currents,
    "eddies": _detection,
    "trajectories": lambda configuration: configuration.eddies.model_dump(include=TRACKING_KEYS),
    "daily": _product,
    "eddy_product": _product,
}
"""The settings that each stage reads; stages that read none are left out."""
