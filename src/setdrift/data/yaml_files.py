"""Reading YAML that people write: what they get wrong ends in one error with the line."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import yaml

from setdrift.errors import SetdriftError

_TIMESTAMP = "tag:yaml.org,2002:timestamp"


class _Loader(yaml.SafeLoader):
    """Safe YAML, but a key given twice is refused, and dates stay text."""

    # an impossible date would otherwise end the reading without a line, and 2031-3-1 pass for a date
    yaml_implicit_resolvers = {  # noqa: RUF012 - the library's own attribute
        first: [(tag, pattern) for tag, pattern in resolvers if tag != _TIMESTAMP]
        for first, resolvers in yaml.SafeLoader.yaml_implicit_resolvers.items()
    }

    def compose_mapping_node(self, anchor: Any) -> yaml.MappingNode:
        node = super().compose_mapping_node(anchor)
        seen: dict[str, int] = {}
        for key, _ in node.value:
            if not isinstance(key, yaml.ScalarNode):
                continue
            line = key.start_mark.line + 1
            if key.value in seen:
                raise _RepeatedKeyError(f"gives the key {key.value} again in line {line}, after line {seen[key.value]}")
            seen[key.value] = line
        return node


class _RepeatedKeyError(Exception):
    """The same key twice in one mapping."""


def read_yaml(path: Path) -> dict[str, Any]:
    """Read a YAML file that holds keys.

    Parameters
    ----------
    path : Path
        The file.

    Returns
    -------
    dict
        Its content; dates as text.

    Raises
    ------
    SetdriftError
        The file cannot be read, is not YAML, repeats a key, or holds no keys.
    """
    try:
        content = yaml.load(path.read_text(encoding="utf-8-sig"), _Loader)  # noqa: S506 - a safe loader
    except UnicodeDecodeError as error:
        raise SetdriftError(str(path), "cannot be read (it is not UTF-8 text)", "save it as UTF-8") from error
    except OSError as error:
        what = f"cannot be read ({error.strerror})"
        raise SetdriftError(str(path), what, "give the path of a configuration file") from error
    except _RepeatedKeyError as error:
        raise SetdriftError(str(path), str(error), "keep one of them") from error
    except (yaml.YAMLError, ValueError, RecursionError) as error:
        raise SetdriftError(str(path), *_explained(error)) from error
    if not isinstance(content, dict):
        raise SetdriftError(str(path), "holds no keys", "start from a file in config/")
    return content


def _explained(error: Exception) -> tuple[str, str]:
    """Return what is wrong with YAML, and the remedy."""
    mark, problem = getattr(error, "problem_mark", None), getattr(error, "problem", None) or ""
    line = f" at line {mark.line + 1}" if mark else ""
    if "'\\t'" in problem:
        return f"has a tab{line}", "indent with spaces only"
    reason = f" ({problem})" if problem else ""
    return f"is not valid YAML{line}{reason}", "mend the indentation or quoting there"
