"""What is wrong with settings, in the words of their files: the key, the fault, and what is allowed."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from pydantic import ValidationError

from agewatch.plant.contradictions import ContradictionError, Key
from agewatch.plant.nearest import did_you_mean
from agewatch.plant.settings import Settings

_BARE = re.compile(r"[A-Za-z0-9_-]+", re.ASCII)
_TABLES = ("feed", "endpoint")
_LIMITS = {
    "exclusiveMinimum": "above {:g}",
    "minimum": "at least {:g}",
    "exclusiveMaximum": "below {:g}",
    "maximum": "at most {:g}",
}
_KINDS = {
    "number": "a number",
    "integer": "a whole number",
    "boolean": "true or false",
    "string": "text in quotes",
    "array": "a list in [ ]",
    "object": "a table",
}

Schema = Mapping[str, Any]


@dataclass(frozen=True, slots=True)
class Fault:
    """One fault: the key's names and places in the tree of settings, and what is wrong and allowed there."""

    key: Key
    reason: str


def faults(error: ValidationError, *, whole: bool = True) -> list[Fault]:
    """Every fault that the validation of `Settings` found.

    Unless the settings are `whole` (every file could be read), keys that miss or contradict each other are passed
    over: the missing file may hold what they lack.
    """
    schema = Settings.model_json_schema()
    found: list[Fault] = []
    for detail in error.errors(include_url=False):
        key, kind, given = detail["loc"], detail["type"], detail["input"]
        cause = detail.get("ctx", {}).get("error")
        if not whole and (kind == "missing" or isinstance(cause, ContradictionError)):
            continue
        if isinstance(cause, ContradictionError):
            found += [Fault((*key, *inner), text) for inner, text in cause.found]
        elif kind == "value_error":
            found.append(Fault(key, str(cause)))
        elif kind == "extra_forbidden":
            allowed = _at(schema, key[:-1]).get("properties", {})
            found.append(Fault(key, _unknown_key(str(key[-1]), list(allowed))))
        elif key[-1] == "[key]":
            allowed = _at(schema, key[:-2]).get("propertyNames", {}).get("enum", [])
            found.append(Fault(key[:-1], _unknown_key(str(key[-2]), allowed)))
        elif kind == "missing":
            found.append(Fault(key, f"is missing; needed is {_allowed(_at(schema, key))}"))
        else:
            found.append(Fault(key, f"{_shown(given)} will not do; allowed is {_allowed(_at(schema, key))}"))
    return found


def dotted(key: Key) -> str:
    """A key as TOML writes it, with places in arrays from 0: `feed[2].every ([[feed]] number 3)`."""
    text = ""
    for part in key:
        if isinstance(part, int):
            text += f"[{part}]"
        else:
            name = part if _BARE.fullmatch(part) else json.dumps(part, ensure_ascii=False)
            text += f".{name}" if text else name
    match key:
        case (str(table), int(place), *_) if table in _TABLES:
            return f"{text} ([[{table}]] number {place + 1})"
    return text or "the settings"


def _unknown_key(name: str, allowed: list[str]) -> str:
    return f"is no known key{did_you_mean(name, allowed)}; allowed are {', '.join(allowed)}"


def _at(schema: Schema, key: Key) -> Schema:
    """The part of the schema that a key is about; empty where the schema is silent."""
    part = _resolved(schema, schema)
    for name in key:
        inner = part.get("items") if isinstance(name, int) else part.get("properties", {}).get(name)
        part = _resolved(schema, inner or part.get("additionalProperties") or {})
    return part


def _resolved(schema: Schema, part: Schema) -> Schema:
    for choice in part.get("anyOf", ()):
        if choice.get("type") != "null":
            return _resolved(schema, choice)
    if "$ref" in part:
        return _resolved(schema, schema["$defs"][part["$ref"].rsplit("/", 1)[-1]])
    return part


def _allowed(part: Schema) -> str:
    if "enum" in part:
        return " or ".join(_shown(choice) for choice in part["enum"])
    if part.get("format") == "date-time":
        return "a time with its offset: 2026-05-01T00:00:00Z"
    kind = _KINDS.get(part.get("type", ""), "another value")
    limits = [text.format(part[name]) for name, text in _LIMITS.items() if name in part]
    if "minItems" in part and part.get("minItems") == part.get("maxItems"):
        limits.append(f"of exactly {part['minItems']}")
    if "minLength" in part:
        limits.append(
            "that is not empty" + (f", up to {part['maxLength']} characters" if "maxLength" in part else "")
        )
    return " ".join([kind, " and ".join(limits)]).strip()


def _shown(value: object) -> str:
    """A value as TOML writes it, cut where it is long."""
    if isinstance(value, bool | str):
        text = json.dumps(value, ensure_ascii=False)
    elif isinstance(value, dict):
        text = "a table"
    elif isinstance(value, list):
        text = f"a list of {len(value)}"
    else:
        text = str(value)
    return text if len(text) <= 60 else text[:59] + "…"
