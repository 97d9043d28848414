"""The picture of the newest day: what it shows and says."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
import xarray as xr
from matplotlib.figure import Figure
from tiny_analysis import Configure, silent, tiny

from setdrift.data.configuration import Configuration
from setdrift.data.conventions import MapQuality
from setdrift.stages import bulletin


def picture(configuration: Configuration, **changes: object) -> Figure:
    day = xr.open_zarr(configuration.products / "daily.zarr").isel(time=-1).load().assign(changes)
    tree = xr.open_datatree(configuration.products / "eddies.zarr", engine="zarr")
    groups = (tree[name].to_dataset().load() for name in ("detections", "trajectories"))
    return bulletin._picture(configuration, day, *groups)


def words(figure: Figure) -> str:
    return " ".join(text.get_text().replace("\n", " ") for text in figure.texts)


def test_the_newest_day_is_drawn_and_named(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    bulletin.draw_bulletin(configuration, silent)
    path = configuration.products / "bulletin" / "2031-03-03.png"
    assert path.read_bytes().startswith(b"\x89PNG")
    assert path.stat().st_size > 20_000
    record = json.loads((configuration.work / "published" / "bulletin.json").read_text())
    assert record == {"day": "2031-03-03", "picture": "2031-03-03.png"}


def test_the_picture_says_what_it_must_not_be_used_for(analysed_sea: Path, configure: Configure) -> None:
    said = words(picture(tiny(configure)))
    assert "Not for navigation" in said
    assert "no tides" in said
    assert "3 March 2031, 12:00 UTC" in said


def test_every_eddy_of_the_day_is_outlined_and_counted(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    figure = picture(configuration)
    eddies = xr.open_zarr(configuration.products / "eddies.zarr", group="detections")
    today = eddies.polarity.values[eddies.time.values == eddies.time.values.max()]
    assert today.size > 0
    entries = [entry.get_text() for entry in figure.legends[0].get_texts()]
    assert entries[:2] == [f"anticyclonic eddy ({(today == 1).sum()})", f"cyclonic eddy ({(today == -1).sum()})"]
    # the dots at the ends of the tails are lines with a marker
    outlines = [x for x in figure.axes[0].lines if x.get_linewidth() == 1.5 and x.get_marker() == "None"]
    expected = [bulletin.ROTATION[int(polarity)][0] for polarity in today]
    assert sorted(str(line.get_color()) for line in outlines) == sorted(expected)


def test_unobserved_sea_is_hatched(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    day = xr.open_zarr(configuration.products / "daily.zarr").isel(time=-1)
    assert not any(c.hatches for c in picture(configuration).axes[0].collections if hasattr(c, "hatches"))
    unobserved = xr.full_like(day.map_quality, int(MapQuality.UNOBSERVED)).load()
    hatched = picture(configuration, map_quality=unobserved).axes[0].collections
    assert any(c.hatches == ["////"] for c in hatched if hasattr(c, "hatches"))


def test_a_day_without_any_velocity_is_drawn(analysed_sea: Path, configure: Configure) -> None:
    configuration = tiny(configure)
    day = xr.open_zarr(configuration.products / "daily.zarr").isel(time=-1).load()
    figure = picture(configuration, eastward_velocity=day.eastward_velocity * np.nan)
    assert figure.axes[0].collections


@pytest.mark.parametrize(
    ("value", "label"), [(0.0, "0°"), (12.5, "12.5°E"), (-30.0, "30°W"), (182.0, "178°W"), (-181.0, "179°E")]
)
def test_longitudes_are_labelled_in_the_common_way(value: float, label: str) -> None:
    assert bulletin._longitude_label(value) == label
