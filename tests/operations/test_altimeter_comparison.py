"""The report on the altimeters: known biases and drifts come out, and what cannot be compared is one line."""

from __future__ import annotations

import datetime as dt
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import xarray as xr

from setdrift.cli import FAILED, MISUSED, main
from setdrift.data.configuration import Configuration
from setdrift.data.day_store import DayStore
from setdrift.errors import SetdriftError
from setdrift.operations.altimeter_comparison import comparison_lines

Configure = Callable[..., Configuration]
FIRST = dt.date(2031, 3, 1)
BIASES = {"curlew": 0.02, "heron": -0.03, "plover": 0.01}
DAYS = 20


def configuration_of(configure: Configure, names: tuple[str, ...] = tuple(BIASES), **changes: Any) -> Configuration:
    altimeters = {name: {"files": f"{name}/*.nc", "noise_m": 0.01} for name in names}
    return configure(altimeters=altimeters, mapping__signal_m=0.02, mapping__large_scale_m=0.01, **changes)


def gather(
    configuration: Configuration, days: int = DAYS, drift: float = 0.0, parallel: bool = False, without: str = ""
) -> None:
    """Write what gathering would have: of each altimeter two passes a day across a box on a still sea.

    Every altimeter's passes lean both ways, by an angle of its own, unless all are to be parallel.
    """
    names = list(configuration.altimeters)
    store = DayStore(configuration.work / "observations")
    rng = np.random.default_rng(7)
    step = np.arange(150)
    for n in range(days):
        columns: dict[str, list[Any]] = {
            c: [] for c in ("time", "latitude", "longitude", "sea_level_anomaly", "pass_number", "altimeter")
        }
        for k, name in enumerate(names):
            for number in range(0 if name == without else 2):
                lean = (1 if parallel or number else -1) * (0.3 if parallel else 0.3 + 0.1 * k)
                west = -30.0 + (1.7 * n + k) % 4.0
                start = (FIRST - dt.date(1970, 1, 1)).days * 86400.0 + n * 86400.0 + 9000.0 * (2 * k + number) + 600.0
                level = BIASES[name] + 0.015 * rng.standard_normal() + 0.01 * rng.standard_normal(step.size)
                level += drift * (n - DAYS / 2) * (name == "heron")
                columns["time"].append(start + step)
                columns["latitude"].append(7.0 + 0.04 * step)
                columns["longitude"].append(west + lean * 0.04 * (step - 75))
                columns["sea_level_anomaly"].append(level)
                columns["pass_number"].append(np.full(step.size, 2 * n + number))
                columns["altimeter"].append(np.full(step.size, k, dtype=np.int16))
        data = {name: ("observation", np.concatenate(values)) for name, values in columns.items()}
        store.save(FIRST + dt.timedelta(days=n), xr.Dataset(data, attrs={"altimeters": " ".join(names)}), "")


def rows(lines: list[str]) -> dict[str, list[float]]:
    """Return the numbers of the table of altimeters."""
    start = next(i for i, line in enumerate(lines) if line.startswith("altimeter "))
    return {line.split()[0]: [float(word) for word in line.split()[1:]] for line in lines[start + 2 : start + 5]}


def write_truth(path: Path) -> Path:
    names = list(BIASES)[::-1]
    bias = ("altimeter", [BIASES[name] + 0.05 for name in names])
    xr.Dataset({"bias": bias}, coords={"altimeter": names}).to_netcdf(path, engine="netcdf4")
    return path


def test_known_biases_come_out(configure: Configure, tmp_path: Path) -> None:
    configuration = configuration_of(configure)
    gather(configuration)
    lines = list(comparison_lines(configuration, truth=write_truth(tmp_path / "errors.nc")))
    assert lines[0].startswith("small_sea: 3 altimeters, 20 days from 2031-03-01 to 2031-03-20; ")
    assert "relative to the mean of the altimeters, each weighted equally" in lines[1]
    for name, (passes, crossovers, bias, error, slope, slope_error, deviation) in rows(lines).items():
        assert passes == 2 * DAYS
        assert crossovers > 100
        assert 0.1 < error < 0.6
        assert abs(bias - 100.0 * BIASES[name]) < 3.0 * error
        assert abs(slope) < 3.0 * slope_error
        assert deviation == pytest.approx(1.5, rel=0.4)
    assert not any("going wrong" in line for line in lines)
    windows = [line.split()[0] for line in lines if line.startswith("2031-")]
    assert windows == ["2031-03-01", "2031-03-11"]
    observed, biases, passes_too = (
        float(next(line for line in lines if line.startswith(start)).split()[-1])
        for start in ("as observed", "less biases", "less errors")
    )
    assert observed > 0.0
    assert 0.0 < biases < passes_too < 100.0
    compared = {line.split()[0]: line.split()[1:] for line in lines[-3:]}
    assert {name: float(words[0]) for name, words in compared.items()} == {
        name: 100.0 * bias for name, bias in BIASES.items()
    }
    for name, words in compared.items():
        assert float(words[1]) == pytest.approx(rows(lines)[name][2] - 100.0 * BIASES[name], abs=0.011)


def test_an_instrument_going_wrong_is_pointed_out(configure: Configure) -> None:
    configuration = configuration_of(configure)
    gather(configuration, drift=0.004)
    lines = list(comparison_lines(configuration))
    slope, error = rows(lines)["heron"][4:6]
    # 4 cm in ten days, relative to the mean of three
    assert slope == pytest.approx(40.0 * 2.0 / 3.0, abs=3.5 * error)
    assert any(line.startswith("heron: its bias changes, by ") for line in lines)


def test_days_can_be_chosen(configure: Configure, capsys: pytest.CaptureFixture[str]) -> None:
    configuration = configuration_of(configure)
    gather(configuration, days=12)
    words = ["compare-altimeters", str(configuration.path), "--from", "2031-03-03", "--to", "2031-03-10"]
    assert main(words) == 0
    out = capsys.readouterr().out.splitlines()
    assert "8 days from 2031-03-03 to 2031-03-10" in out[0]
    assert out == list(comparison_lines(configuration, dt.date(2031, 3, 3), dt.date(2031, 3, 10)))


def test_an_altimeter_without_observations_is_told(configure: Configure) -> None:
    configuration = configuration_of(configure)
    gather(configuration, days=10, without="plover")
    lines = list(comparison_lines(configuration))
    assert any(line.startswith("plover ") and "no crossover with another altimeter" in line for line in lines)


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["--from", "2031-04-01"], "--from 2031-04-01: was not gathered (2031-03-01 to 2031-03-04 were); choose"),
        (["--to", "2031-04-01"], "--to 2031-04-01: was not gathered"),
        (["--from", "2031-03-03", "--to", "2031-03-02"], "--to 2031-03-02: lies before --from 2031-03-03; swap them"),
        (["--truth", "none.nc"], "none.nc: holds no true bias of every altimeter; give a NetCDF file with"),
    ],
)
def test_what_cannot_be_done_is_one_line(
    words: list[str], message: str, configure: Configure, capsys: pytest.CaptureFixture[str]
) -> None:
    configuration = configuration_of(configure)
    gather(configuration, days=4)
    assert main(["compare-altimeters", str(configuration.path), *words]) == FAILED
    err = capsys.readouterr().err
    assert err.startswith("setdrift: ")
    assert err.count("\n") == 1
    assert message in err


def test_observations_must_be_gathered_first(configure: Configure) -> None:
    with pytest.raises(SetdriftError, match="holds no observations yet; run the workflow first"):
        list(comparison_lines(configuration_of(configure)))


def test_passes_that_never_cross_are_told(configure: Configure) -> None:
    configuration = configuration_of(configure)
    gather(configuration, days=3, parallel=True)
    with pytest.raises(SetdriftError, match="no two altimeters' passes cross within 10 days; gather more"):
        list(comparison_lines(configuration))


def test_one_altimeter_has_none_to_be_compared_with(configure: Configure) -> None:
    with pytest.raises(SetdriftError, match="has one altimeter, and so none to compare it with; add another"):
        list(comparison_lines(configuration_of(configure, ("heron",))))


def test_no_expected_error_means_nothing_to_look_for(configure: Configure) -> None:
    with pytest.raises(SetdriftError, match=r"mapping.bias_m is 0: there is nothing to look for; set it above 0"):
        list(comparison_lines(configuration_of(configure, mapping__bias_m=0)))


def test_a_day_is_written_as_a_day(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as left:
        main(["compare-altimeters", "x.yaml", "--from", "march"])
    assert left.value.code == MISUSED
    assert "argument --from: 'march' is not a day; write it as YYYY-MM-DD" in capsys.readouterr().err
