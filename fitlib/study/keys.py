"""Which keys the study format has, and where: read from the models."""

from __future__ import annotations

from functools import cache
from typing import Annotated, Any, get_args, get_origin

from pydantic import BaseModel

from fitlib.study.models import StudyModel


def _models_in(annotation: Any, suffix: str = "") -> list[tuple[str, type[BaseModel]]]:
    """Return the models inside an annotation, each with ``[]`` for every list around it."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [(suffix, annotation)]
    inner = get_args(annotation)
    if get_origin(annotation) is Annotated:
        inner = inner[:1]
    suffix = f"{suffix}[]" if get_origin(annotation) is list else suffix
    return [found for part in inner for found in _models_in(part, suffix)]


def _walk(model: type[BaseModel], place: str, found: dict[str, set[str]]) -> None:
    found.setdefault(place, set()).update(model.model_fields)
    for name, field in model.model_fields.items():
        for suffix, inner in _models_in(field.annotation):
            _walk(inner, f"{place}.{name}{suffix}" if place else f"{name}{suffix}", found)


@cache
def keys_by_place() -> dict[str, frozenset[str]]:
    """Return the keys known at each place; places are dotted, with ``[]`` for an entry of a list."""
    found: dict[str, set[str]] = {}
    _walk(StudyModel, "", found)
    return {place: frozenset(names) for place, names in found.items()}


def study_keys() -> tuple[str, ...]:
    """Return every key of the study format once, sorted."""
    return tuple(sorted(frozenset().union(*keys_by_place().values())))
