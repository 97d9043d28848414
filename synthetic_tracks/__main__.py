"""Write the Tarn Sea: `python -m synthetic_tracks --output build/tarn_sea`."""

from __future__ import annotations

import argparse
import sys
import time
from pathlib import Path

from synthetic_tracks import dialects, files, ocean, sampling, scenario, truth


def main(arguments: list[str] | None = None) -> int:
    """Write all files of a scenario, unless they are there already; return the exit status."""
    options = _parser().parse_args(arguments)
    try:
        chosen = scenario.load(options.scenario)
        if files.is_current(options.output, chosen.digest):
            print(f"{options.output}: complete for this scenario; nothing to do")
            return 0
        generate(chosen, options.output)
    except (OSError, ValueError) as error:
        print(f"synthetic_tracks: {error}", file=sys.stderr)
        return 1
    return 0


def generate(chosen: scenario.Scenario, folder: Path) -> list[Path]:
    """Write all files of a scenario.

    Parameters
    ----------
    chosen : Scenario
        The scenario.
    folder : Path
        Where to; made if need be.

    Returns
    -------
    list of Path
        The files written.
    """
    started = time.monotonic()
    folder.mkdir(parents=True, exist_ok=True)
    old = files.begin(folder)
    sea = ocean.build(chosen)
    print(f"{chosen.name}: an ocean with {len(sea.eddies)} eddies", flush=True)
    written = _write_truth(chosen, sea, folder)
    for altimeter in chosen.altimeters:
        written += _write_tracks(chosen, sea, altimeter, folder)
    files.finish(folder, chosen.digest, written, old)
    size = sum(path.stat().st_size for path in written) / 1e6
    print(f"{folder}: {len(written)} files, {size:.1f} MB, in {time.monotonic() - started:.0f} s")
    return written


def _write_truth(chosen: scenario.Scenario, sea: ocean.Ocean, folder: Path) -> list[Path]:
    """Write the gridded truth, the tables and the static fields."""
    names = ("truth", "truth_eddies", "mean_dynamic_topography", "land", "truth_errors")
    paths = [folder / f"{name}.nc" for name in names]
    truth.write_truth(paths[0], chosen, sea)
    truth.write_eddies(paths[1], chosen, sea)
    truth.write_topography(paths[2], chosen, sea)
    truth.write_land(paths[3], chosen, sea)
    truth.write_errors(paths[4], chosen)
    print("wrote " + ", ".join(path.name for path in paths), flush=True)
    return paths


def _write_tracks(
    chosen: scenario.Scenario, sea: ocean.Ocean, altimeter: scenario.Altimeter, folder: Path
) -> list[Path]:
    """Write the daily files of one altimeter and say what was left out or spoilt on purpose."""
    paths, points = [], 0
    for day in chosen.observed_days:
        if day in altimeter.missing_days:
            print(f"{altimeter.name}: no file for {day}, as the scenario says")
            continue
        observations = sampling.observe(chosen, sea, altimeter, day)
        path = dialects.file_of(folder, altimeter, day)
        dialects.write(path, altimeter, day, observations)
        if day in altimeter.cut_short:
            print(f"{altimeter.name}: {path.name} is cut short, as the scenario says")
        paths.append(path)
        points += observations.day.size
    print(f"{altimeter.name}: {len(paths)} daily files, {points:,} points", flush=True)
    return paths


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(prog="python -m synthetic_tracks", description=__doc__)
    parser.add_argument("--output", type=Path, required=True, help="folder to write to")
    parser.add_argument(
        "--scenario", type=Path, default=scenario.PACKAGED, help="a scenario file (default: the packaged one)"
    )
    return parser


if __name__ == "__main__":
    sys.exit(main())
