"""Write the generated parts of the documentation: tables, listings of the products, and the graph of the rules.

    python docs/generate.py [FOLDER OF PRODUCTS] [--config FILE] [--truth FILE]

Generated text stands between markers, so that the text round it is written by hand. The tables need nothing but the
code; listings and accuracy need the demonstration's products, and the graph needs Graphviz.
"""

from __future__ import annotations

import argparse
import re
import shutil
import subprocess
import sys
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any

import xarray as xr

from setdrift.data.configuration import Configuration, load_configuration
from setdrift.data.conventions import DAILY_VARIABLES, EDDY_COLUMNS
from setdrift.numerics.covariance import built_in_scales, long_wave_drift
from setdrift.operations.verification import verification_lines

ROOT = Path(__file__).resolve().parents[1]
KEYS_FILE, PRODUCTS_FILE = ROOT / "config" / "README.md", ROOT / "docs" / "products.md"
METHODS_FILE = ROOT / "docs" / "methods.md"
STORES = ("daily.zarr", "eddies.zarr")

# attributes that differ from one publication to the next would change the page for nothing
PASSING = {"history", "date_created", "source_digests", "source_digest", "settings_digest", "layout_digest"}
GRAPH_STYLE = """digraph rules {
graph [bgcolor="#fbfbf8", pad=0.2]
node [shape=box, style=rounded, fontname="sans-serif", fontsize=12, color="#1f2d3a", fontcolor="#1f2d3a"]
edge [color="#5b6b78"]"""
LONGEST = 100  # characters of an attribute that are shown


def replaced_between(text: str, name: str, content: str) -> str:
    """Return a page with the part between the markers of a name replaced.

    Parameters
    ----------
    text : str
        The page.
    name : str
        Which markers.
    content : str
        What is to stand between them.

    Returns
    -------
    str
        The page, its markers kept.

    Raises
    ------
    ValueError
        The page has no such markers.
    """
    begin, end = f"<!-- generated: {name} -->", f"<!-- end of generated: {name} -->"
    if begin not in text or end not in text:
        raise ValueError(f"text: lacks the markers {begin} and {end}")
    before, rest = text.split(begin, 1)
    return f"{before}{begin}\n\n{content.strip()}\n\n{end}{rest.split(end, 1)[1]}"


def table(heads: Sequence[str], rows: Sequence[Sequence[str]]) -> str:
    """Return a Markdown table."""
    lines = [heads, ["---"] * len(heads), *rows]
    return "\n".join("| " + " | ".join(cell.replace("|", "\\|") for cell in line) + " |" for line in lines)


def key_tables() -> str:
    """Return a table of the keys of each section of the configuration, from the model that checks them."""
    schema = Configuration.model_json_schema()
    parts = []
    for title, note, section in _sections(schema):
        rows = [_key_row(name, field, section) for name, field in section["properties"].items()]
        rows = [row for row in rows if row]
        parts.append(f"### {title}\n\n{note}\n\n{table(('key', 'type', 'default', 'limits', 'meaning'), rows)}")
    return "\n\n".join(parts)


def _sections(schema: Mapping[str, Any]) -> Iterator[tuple[str, str, Mapping[str, Any]]]:
    """Yield title, description and schema of every section, outermost first."""
    yield "The file itself", schema["description"], schema
    waiting = [(name, field, "") for name, field in schema["properties"].items()]
    while waiting:
        name, field, prefix = waiting.pop(0)
        section = _section_of(field, schema["$defs"])
        if section is None:
            continue
        path = prefix + name + (".NAME" if "patternProperties" in field else "")
        yield f"`{path}`", section["description"], section
        waiting = [(inner, value, f"{path}.") for inner, value in section["properties"].items()] + waiting


def _section_of(field: Mapping[str, Any], sections: Mapping[str, Any]) -> Mapping[str, Any] | None:
    for choice in (field, *field.get("anyOf", ()), *field.get("patternProperties", {}).values()):
        if "$ref" in choice:
            found: Mapping[str, Any] = sections[choice["$ref"].rsplit("/", 1)[1]]
            return found
    return None


def _key_row(name: str, field: Mapping[str, Any], section: Mapping[str, Any]) -> list[str]:
    """Return the cells of a key's row."""
    choices = [choice for choice in field.get("anyOf", [field]) if choice.get("type") != "null"]
    is_section = any("$ref" in choice for choice in choices) or "patternProperties" in field
    meaning = field.get("description", "see its own table below")
    if name in section.get("required", ()):
        default = "**required**"
    elif field.get("default") in (None, [], {}) or is_section:
        default = "none" if field.get("default") in (None, []) else "its own defaults"
    else:
        default = f"`{field['default']}`"
    kinds = " or ".join("section" if is_section else _kind(choice) for choice in choices)
    return [f"`{name}`", kinds, default, "; ".join(_limits(field, choices)), meaning]


def _kind(choice: Mapping[str, Any]) -> str:
    if "enum" in choice or "const" in choice:
        return " or ".join(f"`{value}`" for value in choice.get("enum", [choice.get("const")]))
    if choice["type"] == "array":
        return f"list of {_kind(choice['items'])}"
    if choice.get("format") == "date":
        return "date"
    return {"string": "text", "number": "number", "integer": "whole number"}[choice["type"]]


def _limits(field: Mapping[str, Any], choices: Sequence[Mapping[str, Any]]) -> Iterator[str]:
    words = {
        "exclusiveMinimum": "above {}",
        "minimum": "at least {}",
        "maximum": "at most {}",
        "pattern": "matches `{}`",
        "maxLength": "at most {} characters",
        "minProperties": "at least {} entry",
        "maxProperties": "at most {} entries",
    }
    for key, phrase in words.items():
        for value in {choice[key] for choice in (field, *choices) if key in choice}:
            yield phrase.format(f"{value:g}" if isinstance(value, int | float) else value)


def daily_table() -> str:
    """Return the table of the daily product's variables, from the table of names."""
    rows = [
        [f"`{v.name}`", f"`{v.units}`", f"`{v.standard_name}`" if v.standard_name else "none exists", v.long_name]
        for v in DAILY_VARIABLES
    ]
    return table(("variable", "units", "CF standard name", "meaning"), rows)


def eddy_table() -> str:
    """Return the table of the properties of eddies, from the table of names."""
    return table(("variable", "units", "meaning"), [[f"`{c.name}`", f"`{c.units}`", c.long_name] for c in EDDY_COLUMNS])


def scales_table() -> str:
    """Return the table of the built-in scales and drift of the covariance at some latitudes."""
    rows = []
    for latitude in (0, 5, 10, 20, 30, 45, 60, 90):
        zonal, meridional = built_in_scales(latitude)
        rows.append([f"{latitude}", f"{zonal:.0f}", f"{meridional:.0f}", f"{-long_wave_drift(latitude):.1f}"])
    return table(("degrees from the equator", "Lx, km", "Ly, km", "westward drift, km a day"), rows)


def accuracy(config: Path, truth: Path) -> str:
    """Return how far the published days of an analysis are from the truth."""
    # the first line names a path of this machine
    lines = list(verification_lines(load_configuration(config), truth))[1:]
    return "```text\n" + "\n".join(lines) + "\n```"


def listing(store: Path) -> str:
    """Return what a store holds: dimensions, variables with type, chunks and attributes, and global attributes.

    Parameters
    ----------
    store : Path
        A Zarr store.

    Returns
    -------
    str
        A listing, group by group.
    """
    lines = [store.name]
    with xr.open_datatree(store, engine="zarr", consolidated=False, decode_cf=False) as tree:
        for group in sorted(tree.subtree, key=lambda group: group.path):
            lines += _group_lines(group)
    return "\n".join(lines)


def _group_lines(group: xr.DataTree) -> Iterator[str]:
    # groups, variables and dimensions of a store come in no order of their own
    yield ""
    yield f"group {group.path}"
    if group.sizes:
        yield "  dimensions: " + ", ".join(f"{name} = {size}" for name, size in sorted(group.sizes.items()))
    for name, variable in sorted(
        group.dataset.variables.items(), key=lambda item: (item[0] not in group.dims, item[0])
    ):
        chunks = variable.encoding.get("chunks")
        yield f"  {variable.dtype} {name}({', '.join(map(str, variable.dims))})" + (
            f", chunks {chunks}" if chunks else ""
        )
        yield from (f"      {key} = {_shown(key, value)}" for key, value in variable.attrs.items())
    if group.attrs:
        yield "  attributes:"
        yield from (f"      {key} = {_shown(key, value)}" for key, value in group.attrs.items())


def _shown(key: object, value: Any) -> str:
    if key in PASSING:
        return "(differs from one publication to the next)"
    text = f'"{value}"' if isinstance(value, str) else str(value)
    return text if len(text) <= LONGEST else f'{text[: LONGEST - 4]}..."'


def rule_graph(config: Path) -> str:
    """Return the graph of the workflow's rules as SVG, readable on light and dark pages.

    Parameters
    ----------
    config : Path
        A configuration whose input files exist.

    Returns
    -------
    str
        SVG text.
    """
    snakemake = [str(Path(sys.executable).with_name("snakemake")), "--cores", "1", "--configfile", str(config)]
    printed = _output_of([*snakemake, "--rulegraph"])
    names = dict(re.findall(r'(\d+)\[label = "(\w+)"', printed))
    arrows = sorted(f"{names[start]} -> {names[end]}" for start, end in re.findall(r"(\d+) -> (\d+)", printed))
    # numbers and hues change from run to run, and hues would suggest a meaning: the graph is written anew
    return _output_of(["dot", "-Tsvg"], "\n".join([GRAPH_STYLE, *arrows, "}"]))


def _output_of(command: Sequence[str], given: str = "") -> str:
    """Return what a command prints, run in the project's root."""
    done = subprocess.run(command, cwd=ROOT, input=given, check=True, capture_output=True, text=True)  # noqa: S603 - the words are fixed above
    return done.stdout


def main(arguments: Sequence[str] | None = None) -> int:
    """Write the generated parts.

    Parameters
    ----------
    arguments : sequence of str, optional
        Words of the command line; those of the process when left out.

    Returns
    -------
    int
        0 where everything was written, 1 where something it needs was missing.
    """
    parser = argparse.ArgumentParser(description="Write the generated parts of the documentation.")
    parser.add_argument("products", nargs="?", type=Path, default=ROOT / "results" / "products" / "tarn_sea")
    parser.add_argument("--config", type=Path, default=ROOT / "config" / "tarn_sea.yaml")
    parser.add_argument("--truth", type=Path, default=ROOT / "build" / "tarn_sea" / "truth.nc")
    chosen = parser.parse_args(arguments)

    _rewrite(KEYS_FILE, {"keys": key_tables()})
    _rewrite(PRODUCTS_FILE, {"daily variables": daily_table(), "eddy properties": eddy_table()})
    _rewrite(METHODS_FILE, {"scales": scales_table()})
    lacking = [path for path in [*(chosen.products / store for store in STORES), chosen.truth] if not path.exists()]
    if lacking:
        print(f"listings and accuracy left as they are: no {', '.join(map(str, lacking))}; run `make demo` first")
    else:
        listings = {store: f"```text\n{listing(chosen.products / store)}\n```" for store in STORES}
        _rewrite(PRODUCTS_FILE, listings)
        _rewrite(METHODS_FILE, {"accuracy": accuracy(chosen.config, chosen.truth)})
    if shutil.which("dot") is None:
        print("docs/rule_graph.svg left as it is: install Graphviz (the command `dot`) to draw it")
    else:
        (ROOT / "docs" / "rule_graph.svg").write_text(rule_graph(chosen.config.resolve()), encoding="utf-8")
    return 1 if lacking else 0


def _rewrite(page: Path, parts: Mapping[str, str]) -> None:
    text = page.read_text(encoding="utf-8")
    for name, content in parts.items():
        text = replaced_between(text, name, content)
    page.write_text(text, encoding="utf-8")


if __name__ == "__main__":
    sys.exit(main())
