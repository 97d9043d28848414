"""The command: quick to answer, and one line for whatever goes wrong."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest
import yaml
from small_analysis import SMALL_ANALYSIS

from setdrift import __version__, cli
from setdrift.cli import FAILED, MISUSED, main
from setdrift.operations import jobs, preparation

HEAVY = ("numpy", "scipy", "numba", "xarray", "zarr", "dask", "netCDF4", "pydantic", "yaml", "matplotlib")


@pytest.fixture
def config(tmp_path: Path) -> Path:
    path = tmp_path / "small_sea.yaml"
    path.write_text(yaml.safe_dump(SMALL_ANALYSIS))
    return path


def test_help_imports_nothing_heavy() -> None:
    code = (
        "import sys, setdrift.cli\n"
        "try: setdrift.cli.main(['--help'])\n"
        "except SystemExit: pass\n"
        f"print('heavy:', [name for name in {HEAVY} if name in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.startswith("usage: setdrift [-h]")
    assert done.stdout.endswith("heavy: []\n")
    for command in ("check", "look-at", "job", "verify", "compare-altimeters", "prepare"):
        assert f"\n    {command}" in done.stdout


def test_module_runs_as_a_program(config: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-m", "setdrift.cli", "check", "no.yaml"], capture_output=True, text=True, check=False
    )
    assert (done.returncode, done.stdout) == (FAILED, "")
    assert done.stderr.count("\n") == 1


def test_version(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as left:
        main(["--version"])
    assert left.value.code == 0
    assert capsys.readouterr().out == f"setdrift {__version__}\n"


@pytest.mark.parametrize(
    ("words", "line"),
    [
        ([], "the following arguments are required: COMMAND"),
        (["chek"], "argument COMMAND: invalid choice: 'chek' (choose from"),
        (["check"], "the following arguments are required: config"),
        (["job", "map_sea_level"], "the following arguments are required: config"),
        (["verify", "x.yaml"], "the following arguments are required: --truth"),
        (["prepare", "now"], "unrecognized arguments: now"),
    ],
)
def test_wrong_words_are_misuse(words: list[str], line: str, capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as left:
        main(words)
    assert left.value.code == MISUSED
    assert line in capsys.readouterr().err.splitlines()[-1]


@pytest.mark.parametrize(
    ("words", "line"),
    [
        (["check", "none.yaml"], "none.yaml: cannot be read (No such file or directory); give the path of a config"),
        (["job", "map", "CONFIG"], "job map: is not a rule; choose one of gather_observations, prepare_fixed_fields"),
        (["job", "map_sea_level", "none.yaml"], "none.yaml: cannot be read (No such file or directory); give the path"),
        (["job", "map_sea_level", "CONFIG"], "map_sea_level: works on a block of days and was given none; add --block"),
        (
            ["job", "map_sea_level", "CONFIG", "--block", "march"],
            "--block march: is not the first day of a block; write it as YYYY-MM-DD (Invalid isoformat string",
        ),
        (
            ["job", "map_sea_level", "CONFIG", "--block", "2031-03-01"],
            "--block 2031-03-01: is not the first day of a block; write it as YYYY-MM-DD (label: no block of 2 days",
        ),
        (["job", "prepare_fixed_fields", "CONFIG"], "land.nc: cannot be read as NetCDF (No such file or directory)"),
        (["job", "link_trajectories", "CONFIG"], "period.json: is missing or damaged; delete it and run the workflow"),
        (["verify", "CONFIG", "--truth", "t.nc"], "daily.zarr: cannot be read; run the workflow first"),
        (["verify", "none.yaml", "--truth", "t.nc"], "none.yaml: cannot be read (No such file or directory); give"),
    ],
)
def test_failed_work_is_one_line(words: list[str], line: str, config: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([str(config) if word == "CONFIG" else word for word in words]) == FAILED
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith("setdrift: ")
    assert err.count("\n") == 1
    assert line in err


def test_check_tells_what_the_configuration_asks_for(config: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(config)]) == 0
    out = capsys.readouterr().out
    assert out.startswith(f"{config} is sound\n")
    assert "small_sea, 2031-03-01 to 2031-03-03" in out
    assert "6 x 8 points, worked on as 14 x 16" in out
    assert f"heron: {config.parent}/heron/*.nc" in out
    assert out.endswith(f"next: snakemake --cores 2 --configfile {config}\n")


def test_check_refuses_a_wrong_configuration(config: Path, capsys: pytest.CaptureFixture[str]) -> None:
    config.write_text(config.read_text().replace("spacing: 0.5", "spacing: 5"))
    assert main(["check", str(config)]) == FAILED
    assert capsys.readouterr().err == (f"setdrift: {config}: grid.spacing: 5 is refused; give a value of at most 2\n")


def test_job_runs_the_rule_with_its_block_and_log(
    config: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(jobs.RULES, "map_sea_level", lambda job, announce: announce(f"{job.block.last} done"))
    log = config.parent / "logs" / "map.log"
    words = ["job", "map_sea_level", str(config), "--block", "2031-02-28", "--log", str(log)]
    assert main(words) == 0
    assert capsys.readouterr().out == "map_sea_level 2031-02-28: 2031-03-01 done\n"
    assert [line.split(" ", 1)[1] for line in log.read_text().splitlines()] == [
        "INFO small_sea map_sea_level 2031-02-28: begins",
        "INFO small_sea map_sea_level 2031-02-28: 2031-03-01 done",
        "INFO small_sea map_sea_level 2031-02-28: ends",
    ]


def test_keyboard_stops_with_one_line(
    config: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def stop(_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(cli, "_check", stop)
    assert main(["check", str(config)]) == FAILED
    assert capsys.readouterr().err == "setdrift: stopped from the keyboard; run the same command to go on\n"


def test_prepare_tells_of_what_took_time(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(preparation, "compile_kernels", lambda announce: announce("  passes ready after 1.0 s"))
    assert main(["prepare"]) == 0
    assert capsys.readouterr().out == "  passes ready after 1.0 s\n"


def test_a_reader_that_has_seen_enough_is_no_error(config: Path) -> None:
    command = f"{sys.executable} -m setdrift.cli check {config} | true; exit ${{PIPESTATUS[0]}}"
    done = subprocess.run(["bash", "-c", command], capture_output=True, text=True, check=False)
    assert (done.returncode, done.stderr) == (0, "")
