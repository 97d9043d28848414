"""The configuration: what is accepted, and the one line that tells what is wrong."""

from __future__ import annotations

import copy
import datetime as dt
import typing
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import annotated_types
import pytest
import yaml
from pydantic import BaseModel
from pydantic.fields import FieldInfo
from small_analysis import SMALL_ANALYSIS

from setdrift.data.configuration import Configuration, load_configuration
from setdrift.data.digests import digest
from setdrift.errors import SetdriftError

Configure = Callable[..., Configuration]
Key = tuple[str, ...]

# a value for every optional section, so that every key of the model can be reached
WHOLE: dict[str, Any] = SMALL_ANALYSIS | {
    "altimeters": {"heron": {"files": "heron/*.nc", "variables": {}, "good": {"variable": "bits", "values": [0]}}},
    "land": {"file": "land.nc"},
    "depth": {"file": "depth.nc"},
    "editing": {},
    "mapping": {},
    "currents": {},
    "eddies": {},
    "publish": {},
}


def sections(annotation: Any) -> list[type[BaseModel]]:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [annotation]
    return [found for part in typing.get_args(annotation) for found in sections(part)]


def fields(model: type[BaseModel] = Configuration, before: Key = ()) -> Iterator[tuple[Key, FieldInfo]]:
    """Yield every key of the model, however deep."""
    for name, field in model.model_fields.items():
        yield (*before, name), field
        inner = (*before, name, "heron") if typing.get_origin(field.annotation) is dict else (*before, name)
        for section in sections(field.annotation):
            yield from fields(section, inner)


FIELDS = dict(fields())
SECTIONS = sorted({key[:-1] for key in FIELDS})
LEAVES = {key: field for key, field in FIELDS.items() if not sections(field.annotation)}


def types(field: FieldInfo) -> set[Any]:
    def flat(annotation: Any) -> set[Any]:
        return {annotation}.union(*(flat(part) for part in typing.get_args(annotation)))

    return flat(field.annotation)


def limits(field: FieldInfo) -> list[Any]:
    """Return values that the field's limits do not allow."""
    beyond: list[Any] = []
    nested = [m for part in typing.get_args(field.annotation) for m in getattr(part, "__metadata__", ())]
    rules = list(field.metadata) + [rule for m in nested for rule in getattr(m, "metadata", [m])]
    for rule in rules:
        if isinstance(rule, annotated_types.Gt):
            beyond.append(rule.gt)
        elif isinstance(rule, annotated_types.Ge):
            beyond.append(rule.ge - 1)
        elif isinstance(rule, annotated_types.Lt):
            beyond.append(rule.lt)
        elif isinstance(rule, annotated_types.Le):
            beyond.append(rule.le + 1)
    return beyond


def changed(key: Key, value: Any = ..., content: dict[str, Any] = WHOLE) -> dict[str, Any]:
    """Return the whole configuration with one key changed, or taken away."""
    content = copy.deepcopy(content)
    section = content
    for part in key[:-1]:
        section = section.setdefault(part, {})
    if value is ...:
        section.pop(key[-1], None)
    else:
        section[key[-1]] = value
    return content


@pytest.fixture
def refusal(tmp_path: Path) -> Callable[[Any], str]:
    """Return a function that loads a wrong configuration and returns its one line, the file's name taken off."""

    def refuse(content: Any) -> str:
        path = tmp_path / "wrong.yaml"
        if isinstance(content, bytes):
            path.write_bytes(content)
        else:
            path.write_text(content if isinstance(content, str) else yaml.safe_dump(content), encoding="utf-8")
        with pytest.raises(SetdriftError) as caught:
            load_configuration(path)
        line = str(caught.value)
        assert line.startswith(f"{path}: ")
        assert line.isprintable()
        assert "; " in line
        assert caught.value.remedy
        for jargon in ("valid dictionary", "instance of", "pattern", "Input", "[key]", "pydantic", "tuple", "breaks"):
            assert jargon not in line
        return line.removeprefix(f"{path}: ")

    return refuse


def test_whole_configuration_is_sound(tmp_path: Path) -> None:
    (tmp_path / "whole.yaml").write_text(yaml.safe_dump(WHOLE))
    configuration = load_configuration(tmp_path / "whole.yaml")
    assert configuration.period.start == dt.date(2031, 3, 1)
    assert len(LEAVES) > 50


@pytest.mark.parametrize("section", SECTIONS, ids=".".join)
def test_unknown_key_is_refused_in_every_section(section: Key, refusal: Callable[[Any], str]) -> None:
    line = refusal(changed((*section, "qqqq"), 1))
    known = [key[-1] for key in FIELDS if key[:-1] == section]
    assert line.startswith(f"{'.'.join((*section, 'qqqq'))}: is not a known key; known keys here: {', '.join(known)}")


@pytest.mark.parametrize("key", FIELDS, ids=".".join)
def test_misspelt_key_is_told_the_right_one(key: Key, refusal: Callable[[Any], str]) -> None:
    misspelt = (*key[:-1], key[-1] + "x")
    line = refusal(changed(misspelt, 1))
    assert line.startswith(f"{'.'.join(misspelt)}: is not a known key; did you mean {key[-1]}?")


@pytest.mark.parametrize("key", [key for key, field in FIELDS.items() if field.is_required()], ids=".".join)
def test_missing_key_is_named(key: Key, refusal: Callable[[Any], str]) -> None:
    assert refusal(changed(key)) == f"{'.'.join(key)}: is missing; add it; config/README.md lists every key"


@pytest.mark.parametrize("key", [key for key, field in FIELDS.items() if sections(field.annotation)], ids=".".join)
def test_section_without_keys_is_told_its_keys(key: Key, refusal: Callable[[Any], str]) -> None:
    line = refusal(changed(key, "text"))
    assert line.startswith(f"{'.'.join(key)}: 'text' is refused; ")
    if typing.get_origin(FIELDS[key].annotation) is not dict:
        assert line.endswith(", ".join(k[-1] for k in FIELDS if k[:-1] == key))
    if type(None) not in types(FIELDS[key]):
        assert refusal(changed(key, None)) == f"{'.'.join(key)}: is empty; give it a value, or take the key away"


@pytest.mark.parametrize("key", LEAVES, ids=".".join)
def test_wrong_type_is_named(key: Key, refusal: Callable[[Any], str]) -> None:
    where = ".".join(key) + ": "
    for value in ({"a": 1}, True, [["nested"]]):
        line = refusal(changed(key, value))
        assert line.startswith(where.removesuffix(": "))
        assert value is True or repr(value)[:-1].strip("[") in line
    known = types(LEAVES[key])
    if float in known or int in known:
        assert " " in refusal(changed(key, "many"))
    if str in known and tuple not in {typing.get_origin(a) for a in known}:
        assert refusal(changed(key, 5)).startswith(f"{where}5 is refused; write one text")


@pytest.mark.parametrize("key", [k for k, f in LEAVES.items() if types(f) & {int, float}], ids=".".join)
def test_number_with_a_unit_is_told_to_stand_alone(key: Key, refusal: Callable[[Any], str]) -> None:
    many = any(typing.get_origin(a) is tuple for a in types(LEAVES[key]))
    line = refusal(changed(key, ["5 km"] if many else "5 km"))
    assert "'5 km' is refused; write a" in line
    assert "number alone: the unit is in the key's name" in line
    line = refusal(changed(key, [float("nan")] if many else float("nan")))
    assert line.split(": ", 1)[1].startswith("nan is refused; write a ")


@pytest.mark.parametrize(
    ("key", "value"),
    [(key, value) for key, field in LEAVES.items() for value in limits(field)],
    ids=lambda part: ".".join(part) if isinstance(part, tuple) else str(part),
)
def test_value_out_of_range_is_shown(key: Key, value: Any, refusal: Callable[[Any], str]) -> None:
    line = refusal(changed(key, value))
    assert line.startswith(f"{'.'.join(key)}: {value!r} is refused; give a value ")
    assert any(words in line for words in ("above", "of at least", "below", "of at most"))


@pytest.mark.parametrize("key", [k for k, f in LEAVES.items() if types(f) & {int, float}], ids=".".join)
def test_every_number_has_a_limit(key: Key) -> None:
    free = {
        ("altimeters", "heron", "good", "values"),
        ("publish", "zarr_format"),
    }
    assert limits(LEAVES[key]) or key in free


@pytest.mark.parametrize(
    ("keys", "line"),
    [
        ({"period.start": "2031-03-04"}, "period: start (2031-03-04) must not be after end (2031-03-03); change one"),
        ({"grid.south": 11.0}, "grid: south (11.0) must be below north (11.0); change one of them"),
        ({"grid.spacing": 0.7}, "grid: spacing (0.7) must divide west to east (4 degrees) into a whole number of"),
        ({"grid.spacing": 2}, "grid: spacing (2.0) must divide west to east (4 degrees) into a whole number of cells"),
        ({"grid.north": 11.3}, "grid: spacing (0.5) must divide south to north (3.3 degrees) into a whole number"),
        ({"grid.east": -30}, "grid: west (-30.0) to east (-30.0) is no box; a whole turn is written as west: -180"),
        ({"grid.west": -180, "grid.east": 190}, "grid: west (-180.0) to east (190.0) is no box; a whole turn is"),
        ({"currents.blend_from_degrees": 6}, "currents: blend_from_degrees (6.0) must be below blend_to_degrees (6.0)"),
        ({"currents.blend_to_degrees": 8}, "currents: blend_from_degrees (4.0) must be below blend_to_degrees (8.0)"),
        (
            {"eddies.minimum_radius_km": 300},
            "eddies: minimum_radius_km (300.0) must be below maximum_radius_km (250.0)",
        ),
        ({"altimeters.heron.good.mask": 5}, "altimeters.heron.good: needs one rule; give either values"),
        ({"altimeters.heron.good.values": None}, "altimeters.heron.good: needs one rule; give either values"),
        (
            {"altimeters.heron.good": {"variable": "bits", "mask": 5, "equals": 2}},
            "altimeters.heron.good: equals (2) has bits that mask (5) lacks; no flag could be good",
        ),
        ({"altimeters.heron.good.values": []}, "altimeters.heron.good.values: [] is refused; give at least 1"),
        ({"altimeters": {}}, "altimeters: {} is refused; give at least 1"),
        ({"altimeters.Heron 2": {"files": "x"}}, "altimeters.Heron 2: 'Heron 2' is refused; use lower case letters,"),
        ({"altimeters.heron.subtract": "tide"}, "altimeters.heron.subtract: 'tide' is refused; write a list, such as"),
        ({"altimeters.heron.subtract": [3]}, "altimeters.heron.subtract.0: 3 is refused; write one text"),
        ({"analysis": "Tarn Sea"}, "analysis: 'Tarn Sea' is refused; use lower case letters, digits and underscores"),
        ({"analysis": "a" * 41}, f"analysis: '{'a' * 41}' is refused; use at most 40 characters"),
        ({"publish.zarr_format": 4}, "publish.zarr_format: 4 is refused; write 2 or 3"),
        ({"eddies.field": "height"}, "eddies.field: 'height' is refused; write 'sea_level_anomaly' or 'dynamic_topog"),
        ({"analysis": "x" * 500}, "analysis: '" + "x" * 56 + "... is refused; use at most 40 characters"),
        ({"grid.spacing": 3, "publish.zarr_format": 4}, "grid.spacing: 3 is refused; give a value of at most 2 (1 mor"),
    ],
)
def test_rules_between_keys(keys: dict[str, Any], line: str, refusal: Callable[[Any], str]) -> None:
    content = WHOLE
    for key, value in keys.items():
        content = changed(tuple(key.split(".")), value, content)
    assert refusal(content).startswith(line)


@pytest.mark.parametrize("end", ["start", "end"])
@pytest.mark.parametrize(
    "value",
    [
        "2031-3-1",
        "2031-02-30",
        "1 March 2031",
        "20310301",
        "2031-W09-6",
        "2031-03-01T12:00:00",
        20310301,
        1930089600,
        0,
    ],
)
def test_only_a_plain_date_is_a_day(end: str, value: Any, refusal: Callable[[Any], str]) -> None:
    line = refusal(changed(("period", end), value))
    assert line == f"period.{end}: {value!r} is not a day; write it as YYYY-MM-DD" + ", or latest" * (end == "end")


@pytest.mark.parametrize("value", ["1969-12-31", "2200-01-01", "0001-01-01"])
def test_days_nobody_observed_are_refused(value: str, refusal: Callable[[Any], str]) -> None:
    line = refusal(changed(("period", "start"), value))
    assert line == f"period.start: '{value}' is out of range; give a day from 1970-01-01 to 2199-12-31"


def test_impossible_date_without_quotes_is_refused_too(refusal: Callable[[Any], str]) -> None:
    text = yaml.safe_dump(WHOLE).replace("'2031-03-01'", "2031-02-30")
    assert refusal(text).startswith("period.start: '2031-02-30' is not a day")


def test_no_end_of_the_period_is_a_day_in_words(configure: Configure) -> None:
    assert configure(period__end="latest").period.end == "latest"


@pytest.mark.parametrize(
    ("content", "line"),
    [
        (b"analysis: \xff\xfe", "cannot be read (it is not UTF-8 text); save it as UTF-8"),
        ("", "holds no keys; start from a file in config/"),
        ("# nothing but a comment\n", "holds no keys; start from a file in config/"),
        ("[1, 2]\n", "holds no keys; start from a file in config/"),
        ("analysis\n", "holds no keys; start from a file in config/"),
        ("analysis: a\ngrid:\n\twest: 1\n", "has a tab at line 3; indent with spaces only"),
        ("analysis: a\nanalysis: b\n", "gives the key analysis again in line 2, after line 1; keep one of them"),
        ("a:\n  b: {c: 1}\n  d: 1\n  b: 2\n", "gives the key b again in line 4, after line 2; keep one of them"),
        ("grid: {west: 1\n", "is not valid YAML at line 2 (expected ',' or '}', but got '<stream end>'); mend the"),
        ("a: b: c\n", "is not valid YAML at line 1 (mapping values are not allowed here); mend the indentation"),
        ("a: 1\n---\nb: 2\n", "is not valid YAML at line 2 (but found another document); mend"),
        ("a: !!python/object:os.system x\n", "is not valid YAML at line 1 (could not determine a constructor"),
        ("? [a]\n: 1\n", "is not valid YAML at line 1 (found unhashable key); mend"),
        ("\x00", "is not valid YAML; mend"),
        ("a: " + "[" * 5000, "is not valid YAML; mend"),
        ("1: 2\n", "1: is not a known key; known keys here: analysis, output, period"),
    ],
    ids=range(16),
)
def test_what_is_no_configuration_at_all(content: Any, line: str, refusal: Callable[[Any], str]) -> None:
    assert refusal(content).startswith(line)


@pytest.mark.parametrize(("name", "reason"), [("none.yaml", "No such file or directory"), (".", "Is a directory")])
def test_what_is_no_file(name: str, reason: str, tmp_path: Path) -> None:
    with pytest.raises(SetdriftError) as caught:
        load_configuration(tmp_path / name)
    assert str(caught.value) == f"{tmp_path / name}: cannot be read ({reason}); give the path of a configuration file"


def test_merged_keys_are_not_repeated_ones(tmp_path: Path) -> None:
    content = changed(("altimeters",))
    text = yaml.safe_dump(content) + (
        "altimeters:\n  heron: &usual {files: 'h/*.nc', noise_m: 0.02}\n  plover: {<<: *usual, files: 'p/*.nc'}\n"
    )
    (tmp_path / "merged.yaml").write_text(text, encoding="utf-8-sig")
    plover = load_configuration(tmp_path / "merged.yaml").altimeters["plover"]
    assert (plover.files, plover.noise_m) == ("p/*.nc", 0.02)


def test_altimeter_named_like_a_key_is_still_told_its_keys(refusal: Callable[[Any], str]) -> None:
    line = refusal(changed(("altimeters", "variables"), {"files": "x", "fils": 1}))
    assert line == "altimeters.variables.fils: is not a known key; did you mean files?"


def test_order_of_altimeters_changes_nothing(configure: Configure) -> None:
    heron, plover = {"files": "h/*.nc"}, {"files": "p/*.nc"}
    first, second = (
        configure(altimeters=dict(order))
        for order in ([("heron", heron), ("plover", plover)], [("plover", plover), ("heron", heron)])
    )
    assert list(second.altimeters) == ["heron", "plover"]
    assert digest(first) == digest(second)


@pytest.mark.parametrize(
    ("west", "east", "width"),
    [
        (-180, 180, 360),
        (0, 360, 360),
        (-16.1, 343.9, 360),
        (170, -170, 20),
        (170, 190, 20),
        (-190, -170, 20),
        (20, -20, 320),
    ],
)
def test_box_in_any_convention(west: float, east: float, width: float, configure: Configure) -> None:
    grid = configure(grid={"west": west, "east": east, "south": 0, "north": 20, "spacing": 2}).grid
    assert grid.width == pytest.approx(width)
    assert grid.periodic == (width == 360)


def test_paths_are_relative_to_the_file(configure: Configure, tmp_path: Path) -> None:
    configuration = configure(output="../elsewhere")
    assert configuration.path == tmp_path / "small_sea.yaml"
    assert configuration.work == tmp_path.parent / "elsewhere" / "work" / "small_sea"
    assert configuration.products == tmp_path.parent / "elsewhere" / "products" / "small_sea"
    assert configuration.resolve("/data/x.nc") == Path("/data/x.nc")
    assert configuration.resolve("~/x.nc") == Path.home() / "x.nc"


def test_values_never_change(configure: Configure) -> None:
    with pytest.raises(ValueError, match="frozen"):
        configure().mapping.window_days = 3  # type: ignore[misc]
