"""The newest day as one picture: currents, eddies with their paths, and what they must not be used for."""

from __future__ import annotations

import textwrap
from collections.abc import Callable
from typing import Any

import matplotlib as mpl

mpl.use("Agg")

import numpy as np
import xarray as xr
from matplotlib.axes import Axes
from matplotlib.colors import LinearSegmentedColormap
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from setdrift.data.configuration import Configuration
from setdrift.data.conventions import CAUTION, LIMITS, MapQuality
from setdrift.data.records import replacing, write_record

PAPER, INK, LAND = "#fbfaf6", "#23303a", "#cfc8b8"
SPEED = LinearSegmentedColormap.from_list(
    "setdrift_speed", ["#fbfaf6", "#cfdcd6", "#86ada9", "#477c86", "#2b4a66", "#2a1f45"]
)
# blue and vermilion of Okabe and Ito (2008), told apart by readers of any colour vision; line styles differ too
ROTATION: dict[int, tuple[str, Any, str]] = {
    1: ("#d55e00", "-", "anticyclonic"),
    -1: ("#0072b2", (0, (4, 1.5)), "cyclonic"),
}

ARROWS_ACROSS = 34
TAIL_DAYS = 10
RESOLUTION = 150  # dots per inch


def draw_bulletin(configuration: Configuration, announce: Callable[[str], None]) -> None:
    """Draw the newest published day.

    Parameters
    ----------
    configuration : Configuration
        The analysis, already published.
    announce : callable
        Told where the picture is.
    """
    with xr.open_zarr(configuration.products / "daily.zarr") as daily:
        day = daily.isel(time=-1).load()
    with xr.open_datatree(configuration.products / "eddies.zarr", engine="zarr") as tree:
        detections, trajectories = tree["detections"].to_dataset().load(), tree["trajectories"].to_dataset().load()
    date = str(day.time.dt.strftime("%Y-%m-%d").values)
    figure = _picture(configuration, day, detections, trajectories)
    path = configuration.products / "bulletin" / f"{date}.png"
    with replacing(path) as temporary:
        figure.savefig(temporary, format="png", dpi=RESOLUTION, facecolor=PAPER, metadata={"Software": "setdrift"})
    announce(f"picture {path}")
    write_record(configuration.work / "published" / "bulletin.json", {"day": date, "picture": path.name})


def _picture(configuration: Configuration, day: xr.Dataset, detections: xr.Dataset, trajectories: xr.Dataset) -> Figure:
    rows, columns = day.sizes["latitude"], day.sizes["longitude"]
    aspect = 1.0 / np.cos(np.deg2rad(float(day.latitude.mean())))
    # the map keeps its shape; the foot and the margins keep their height in inches
    width = 8.6
    height = float(np.clip(6.9 * rows / columns * aspect, 3.0, 11.0)) + 2.3
    figure = Figure(figsize=(width, height), facecolor=PAPER)
    axes = figure.add_axes((0.075, 1.65 / height, 0.80, 1.0 - 2.3 / height), facecolor=LAND)
    axes.set_aspect(aspect)
    speed = _draw_currents(axes, day)
    _draw_eddies(axes, day, detections, trajectories)
    _draw_frame(figure, axes, speed, day, configuration)
    _write_foot(figure, height, day, detections)
    return figure


def _draw_currents(axes: Axes, day: xr.Dataset) -> Any:
    u, v = day.eastward_velocity.values, day.northward_velocity.values
    longitude, latitude = day.longitude.values, day.latitude.values
    speed = np.hypot(u, v)
    top = max(0.2, float(np.ceil(np.nanpercentile(speed, 99.5) * 10.0) / 10.0)) if np.isfinite(speed).any() else 0.2
    shading = axes.pcolormesh(
        longitude, latitude, speed, cmap=SPEED, vmin=0.0, vmax=top, shading="nearest", rasterized=True
    )
    unobserved = (day.map_quality.values & MapQuality.UNOBSERVED) != 0
    if unobserved.any():
        axes.contourf(longitude, latitude, unobserved, levels=[0.5, 1.5], colors="none", hatches=["////"])
    step = max(1, longitude.size // ARROWS_ACROSS)
    part = (slice(step // 2, None, step), slice(step // 2, None, step))
    axes.quiver(
        longitude[part[1]],
        latitude[part[0]],
        u[part],
        v[part],
        color=INK,
        angles="uv",
        scale=top * ARROWS_ACROSS / 1.6,
        width=0.0016,
        headwidth=4.5,
        alpha=0.85,
    )
    return shading


def _draw_eddies(axes: Axes, day: xr.Dataset, detections: xr.Dataset, trajectories: xr.Dataset) -> None:
    today = detections.time.values == day.time.values
    after = np.cumsum(detections.outer_node_count.values)
    nodes = np.stack((detections.outer_longitude.values, detections.outer_latitude.values))
    for i in np.flatnonzero(today):
        colour, style, _ = ROTATION[int(detections.polarity[i])]
        outline = nodes[:, after[i] - int(detections.outer_node_count[i]) : after[i]]
        axes.plot(*np.append(outline, outline[:, :1], axis=1), color=colour, linestyle=style, linewidth=1.5)
    alive = set(detections.trajectory.values[detections.trajectory_index.values[today]].tolist())
    ends = np.cumsum(trajectories.row_size.values)
    for identifier, size, end in zip(trajectories.trajectory.values, trajectories.row_size.values, ends, strict=True):
        if int(identifier) in alive:
            _draw_tail(axes, trajectories.isel(point=slice(max(end - size, end - TAIL_DAYS), end)))


def _draw_tail(axes: Axes, path: xr.Dataset) -> None:
    colour = ROTATION[int(path.polarity[-1])][0]
    axes.plot(path.longitude, path.latitude, color=PAPER, linewidth=2.6, solid_capstyle="round")
    axes.plot(path.longitude, path.latitude, color=colour, linewidth=1.2, solid_capstyle="round")
    axes.plot(path.longitude[-1], path.latitude[-1], "o", color=colour, markersize=3.5, markeredgecolor=PAPER)


def _draw_frame(figure: Figure, axes: Axes, shading: Any, day: xr.Dataset, configuration: Configuration) -> None:
    half = configuration.grid.spacing / 2.0
    axes.set_xlim(float(day.longitude[0]) - half, float(day.longitude[-1]) + half)
    axes.set_ylim(float(day.latitude[0]) - half, float(day.latitude[-1]) + half)
    axes.tick_params(colors=INK, labelsize=8, direction="out", length=3)
    axes.xaxis.set_major_formatter(lambda value, _: _longitude_label(value))
    axes.yaxis.set_major_formatter(lambda value, _: _degrees(value, "N", "S"))
    if configuration.grid.south < 0.0 < configuration.grid.north:
        axes.axhline(0.0, color=INK, linewidth=0.6, linestyle=(0, (1, 3)))
    box = axes.get_position()
    bar = figure.colorbar(shading, cax=figure.add_axes((0.895, box.y0, 0.016, box.height)), extend="max")
    bar.set_label("speed, m s⁻¹", color=INK, fontsize=9)
    bar.ax.tick_params(colors=INK, labelsize=8)
    title = day.time.dt.strftime("%-d %B %Y, 12:00 UTC").item()
    figure.text(
        0.075, box.y1 + 0.018, f"{configuration.analysis}: surface currents", color=INK, fontsize=14, weight="bold"
    )
    figure.text(0.875, box.y1 + 0.018, title, color=INK, fontsize=11, ha="right")


def _longitude_label(value: float) -> str:
    return _degrees((value + 180.0) % 360.0 - 180.0, "E", "W")


def _degrees(value: float, positive: str, negative: str) -> str:
    return f"{abs(value):g}°{positive if value > 0 else negative if value < 0 else ''}"


def _write_foot(figure: Figure, height: float, day: xr.Dataset, detections: xr.Dataset) -> None:
    today = detections.polarity.values[detections.time.values == day.time.values]
    entries: list[Any] = [
        Line2D([], [], color=colour, linestyle=style, label=f"{name} eddy ({int((today == polarity).sum())})")
        for polarity, (colour, style, name) in ROTATION.items()
    ]
    entries.append(Line2D([], [], color=INK, marker="o", markersize=3.5, label=f"its last {TAIL_DAYS} days"))
    entries.append(Patch(facecolor=PAPER, edgecolor=INK, hatch="////", label="unobserved"))
    figure.legend(
        handles=entries,
        loc="upper left",
        bbox_to_anchor=(0.065, 1.28 / height),
        ncols=4,
        frameon=False,
        fontsize=8.5,
        labelcolor=INK,
    )
    text = textwrap.fill(LIMITS, 118) + "\n" + textwrap.fill(CAUTION, 118)
    figure.text(0.075, 0.95 / height, text, color=INK, fontsize=8, va="top", linespacing=1.35)
