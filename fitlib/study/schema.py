"""The JSON Schema of the study format, made from the models; editors complete and check a study with it."""

from __future__ import annotations

import json
from importlib.resources import files
from typing import Any

from fitlib.study.glossary import load_glossary
from fitlib.study.models import StudyModel

SHIPPED = "study.schema.json"


def export_schema() -> dict[str, Any]:
    """Return the JSON Schema (draft 2020-12) of a study file.

    It knows keys and values; rules between keys and file names are checked by `load_study` alone.
    """
    schema = _tidy(StudyModel.model_json_schema())
    meanings = {word: entry.meaning for word, entry in load_glossary().items()}
    for group in (schema, *schema["$defs"].values()):
        for name, value in group.get("properties", {}).items():
            if name in meanings:
                value["description"] = meanings[name]
    return {"$schema": "https://json-schema.org/draft/2020-12/schema", "title": "fitlib study, format 1", **schema}


def schema_text() -> str:
    """Return the schema as it is shipped in `study.schema.json`; ``fitlib schema`` prints the same."""
    return json.dumps(export_schema(), indent=2, ensure_ascii=False) + "\n"


def shipped_schema_text() -> str:
    """Return the text of the schema that stands beside this module."""
    return files("fitlib.study").joinpath(SHIPPED).read_text(encoding="utf-8")


def _tidy(node: Any, names: bool = False) -> Any:
    """Drop what pydantic adds and a study has no use for: titles, null as a value, defaults.

    `names` is true for a mapping whose keys are names of the study format and not words of JSON Schema.
    """
    if isinstance(node, list):
        return [_tidy(item) for item in node]
    if not isinstance(node, dict):
        return node
    kept = {
        key: _tidy(value, names=key in ("properties", "$defs") and not names)
        for key, value in node.items()
        if names or key not in ("title", "default", "description")
    }
    return kept if names else _without_null(kept)


def _without_null(node: dict[str, Any]) -> dict[str, Any]:
    choices = [choice for choice in node.get("anyOf", ()) if choice != {"type": "null"}]
    if "anyOf" not in node or len(choices) == len(node["anyOf"]):
        return node
    rest = {key: value for key, value in node.items() if key != "anyOf"}
    return rest | (choices[0] if len(choices) == 1 else {"anyOf": choices})
