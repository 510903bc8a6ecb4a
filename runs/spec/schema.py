"""The JSON Schema of a spec file, for editors."""

from __future__ import annotations

from typing import Any

from .document import Spec
from .entries import BOUNDS
from .parts import SHAPES


def json_schema() -> dict[str, Any]:
    """Return the JSON Schema of a spec file.

    What pydantic cannot know is added: a mover may take its keys from the base, and an entry has exactly one bound.
    """
    schema = Spec.model_json_schema(mode="validation")
    schema["$schema"] = "https://json-schema.org/draft/2020-12/schema"
    definitions = schema["$defs"]
    whole = [{"$ref": f"#/$defs/{model.__name__}"} for model in SHAPES.values()]
    schema["properties"]["mover"] = {"anyOf": [*whole, _like(definitions)]}
    for name, definition in definitions.items():
        if name.startswith("Require"):
            definition["oneOf"] = [{"required": [bound]} for bound in BOUNDS]
        elif name.startswith("Improve"):
            definition["oneOf"] = [{"required": ["sense"]}, {"required": ["toward"]}]
    return schema


def _like(definitions: dict[str, Any]) -> dict[str, Any]:
    """Return the schema of a mover that takes its keys from the base: every key of any shape, none but like needed."""
    properties: dict[str, Any] = {}
    for model in SHAPES.values():
        properties |= definitions[model.__name__]["properties"]
    properties["shape"] = {"enum": list(SHAPES)}
    properties["like"] = {"const": "base", "description": "Take every key of [base]; a key given here overrides."}
    definitions["MoverLikeBase"] = {
        "type": "object",
        "additionalProperties": False,
        "properties": properties,
        "required": ["like"],
    }
    return {"$ref": "#/$defs/MoverLikeBase"}
