"""The JSON schema of the configuration, for editors: `python -m setdrift.data.schema` writes it anew."""

from __future__ import annotations

import json
from pathlib import Path

from setdrift.data.configuration import Configuration

PATH = Path("workflow") / "schemas" / "configuration.schema.json"
"""The schema's file, seen from the folder that holds the workflow."""


def configuration_schema() -> str:
    """Return the JSON schema that the configuration's model stands for, as text.

    It knows each key, its type, range and default, and no rule between two keys: those only the model checks.

    Returns
    -------
    str
        JSON, ending in a line break.
    """
    schema = {"$schema": "https://json-schema.org/draft/2020-12/schema"} | Configuration.model_json_schema()
    return json.dumps(schema, indent=2) + "\n"


if __name__ == "__main__":
    PATH.write_text(configuration_schema(), encoding="utf-8")
