"""The documentation agrees with the code: tables, examples and links."""

from __future__ import annotations

import importlib.util
import re
import subprocess
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest
import xarray as xr
import yaml

from setdrift.data.configuration import Configuration, load_configuration
from setdrift.data.conventions import DAILY_VARIABLES, EDDY_COLUMNS

ROOT = Path(__file__).parents[1]
KEYS = (ROOT / "config" / "README.md").read_text(encoding="utf-8")
METHODS = (ROOT / "docs" / "methods.md").read_text(encoding="utf-8")
PRODUCTS = (ROOT / "docs" / "products.md").read_text(encoding="utf-8")


@pytest.fixture(scope="module")
def generate() -> ModuleType:
    spec = importlib.util.spec_from_file_location("generate", ROOT / "docs" / "generate.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def between(text: str, name: str) -> str:
    return (
        text.split(f"<!-- generated: {name} -->")[1].split(f"<!-- end of generated: {name} -->", maxsplit=1)[0].strip()
    )


def pages() -> list[Path]:
    try:
        listed = subprocess.run(["git", "ls-files", "*.md"], cwd=ROOT, check=True, capture_output=True, text=True)
        return [ROOT / name for name in listed.stdout.split() if (ROOT / name).exists()]
    except (OSError, subprocess.CalledProcessError):
        # a released archive is no repository
        return [*ROOT.glob("*.md"), *(ROOT / "docs").rglob("*.md"), *(ROOT / "config").glob("*.md")]


def examples() -> list[str]:
    return re.findall(r"```yaml\n(.*?)```", KEYS, flags=re.DOTALL)


def keys_of(schema: dict[str, Any]) -> set[str]:
    return {name for part in (schema, *schema["$defs"].values()) for name in part["properties"]}


def test_the_table_of_keys_is_that_of_the_model(generate: ModuleType) -> None:
    assert between(KEYS, "keys") == generate.key_tables()


def test_every_key_has_one_row_and_a_meaning(generate: ModuleType) -> None:
    rows = re.findall(r"^\| `(\w+)` \|.*\| (.*) \|$", between(KEYS, "keys"), flags=re.MULTILINE)
    assert {name for name, _ in rows} == keys_of(Configuration.model_json_schema())
    assert all(meaning.strip() for _, meaning in rows)


def test_every_key_of_the_model_has_a_meaning() -> None:
    """Sections have a table of their own; every other key must say what it means."""
    schema = Configuration.model_json_schema()
    for section in (schema, *schema["$defs"].values()):
        for name, key in section["properties"].items():
            assert "description" in key or "$ref" in str(key), f"{section['title']}.{name}"


@pytest.mark.parametrize("number", range(len(examples())))
def test_every_example_is_a_sound_configuration(number: int, tmp_path: Path) -> None:
    """The first one is whole; the others are parts that take the place of its keys."""
    path = tmp_path / "example.yaml"
    # dates stay text, as in the project's own reading
    smallest, part = (yaml.load(examples()[k], yaml.BaseLoader) for k in (0, number))
    path.write_text(yaml.safe_dump(smallest | part), encoding="utf-8")
    written = re.sub(r"'(-?[\d.]+)'", r"\1", path.read_text(encoding="utf-8"))
    path.write_text(written, encoding="utf-8")
    assert load_configuration(path).analysis == smallest["analysis"]


def test_the_tables_of_variables_are_those_of_the_code(generate: ModuleType) -> None:
    assert between(PRODUCTS, "daily variables") == generate.daily_table()
    assert between(PRODUCTS, "eddy properties") == generate.eddy_table()


def test_the_table_of_scales_is_that_of_the_covariance(generate: ModuleType) -> None:
    assert between(METHODS, "scales") == generate.scales_table()


@pytest.mark.parametrize(("store", "table"), [("daily.zarr", DAILY_VARIABLES), ("eddies.zarr", EDDY_COLUMNS)])
def test_the_listings_hold_every_variable_of_the_code(store: str, table: tuple[Any, ...]) -> None:
    listing = between(PRODUCTS, store)
    for row in table:
        block = re.search(rf"^  \w+ {row.name}\(.*\n((?:      .*\n)+)", listing, flags=re.MULTILINE)
        assert block, row.name
        assert f'      long_name = "{row.long_name}"' in block[1]
        assert f'      units = "{row.units}"' in block[1]


def test_a_listing_is_made_of_what_the_store_holds(generate: ModuleType, tmp_path: Path) -> None:
    data = xr.Dataset({"height": (("y", "x"), [[1.0, 2.0]], {"units": "m", "comment": "long " * 40})})
    data.to_zarr(tmp_path / "a.zarr", consolidated=False, encoding={"height": {"chunks": (1, 1)}})
    lines = generate.listing(tmp_path / "a.zarr").splitlines()
    assert "  dimensions: x = 2, y = 1" in lines
    assert "  float64 height(y, x), chunks (1, 1)" in lines
    assert '      units = "m"' in lines
    assert max(map(len, lines)) < 140


def test_a_page_without_markers_is_refused(generate: ModuleType) -> None:
    with pytest.raises(ValueError, match="lacks the markers"):
        generate.replaced_between("no markers", "keys", "text")


def test_only_the_part_between_the_markers_changes(generate: ModuleType) -> None:
    page = "above <!-- generated: a -->old<!-- end of generated: a --> below"
    assert generate.replaced_between(page, "a", "new") == (
        "above <!-- generated: a -->\n\nnew\n\n<!-- end of generated: a --> below"
    )


@pytest.mark.parametrize("page", pages(), ids=lambda page: str(page.relative_to(ROOT)))
def test_every_relative_link_leads_somewhere(page: Path) -> None:
    text = re.sub(r"```.*?```", "", page.read_text(encoding="utf-8"), flags=re.DOTALL)
    links = re.findall(r"\]\(([^)\s]+)\)", text) + re.findall(r'(?:src|href)="([^"]+)"', text)
    for link in links:
        name, _, anchor = link.partition("#")
        if ":" in link.split("/")[0]:
            continue
        target = page.parent / name if name else page
        assert target.exists(), f"{link} leads nowhere"
        if anchor and target.suffix == ".md":
            assert anchor in anchors(target), f"{link} names no heading"


def anchors(page: Path) -> set[str]:
    headings = re.findall(r"^#+ (.*)$", page.read_text(encoding="utf-8"), flags=re.MULTILINE)
    return {re.sub(r"[^\w\- ]", "", heading.lower()).strip().replace(" ", "-") for heading in headings}
