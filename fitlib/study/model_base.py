"""The base of all models of the study format: strict, closed, and able to go on after a fault.

The study is validated once strictly, which gives the messages. Where that fails it is validated a second time in the
tolerant way: each faulty value becomes `UNKNOWN` and the rest is kept, so that the rules between keys are checked in
the same run. A key that is missing while an unknown one resembles it was most likely misspelt: it is `UNKNOWN` too.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from pydantic import BaseModel, ConfigDict, ValidationError, ValidationInfo, field_validator, model_validator

from fitlib.study.shown import nearest
from fitlib.study.unknown import UNKNOWN

TOLERANT = {"tolerant": True}  # pass as `context`


def tolerant(info: ValidationInfo) -> bool:
    """Tell whether this is the second, tolerant validation."""
    return info.context is TOLERANT


def tolerate(value: Any, handler: Callable[[Any], Any], info: ValidationInfo) -> Any:
    """Validate a value; in the tolerant way a faulty one becomes `UNKNOWN`."""
    if not tolerant(info):
        return handler(value)
    if value is UNKNOWN:
        return UNKNOWN
    try:
        return handler(value)
    except ValidationError:
        return UNKNOWN


class Model(BaseModel):
    """A group of keys: unknown keys are refused and no value is converted to another kind."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True)

    @model_validator(mode="wrap")
    @classmethod
    def _go_on(cls, value: Any, handler: Callable[[Any], Any], info: ValidationInfo) -> Any:
        if not tolerant(info):
            return handler(value)
        if not isinstance(value, dict):
            return UNKNOWN
        known = {name: item for name, item in value.items() if name in cls.model_fields}
        misspelt = {nearest(str(name), cls.model_fields) for name in value if name not in cls.model_fields}
        for name, field in cls.model_fields.items():
            if field.is_required() or name in misspelt:
                known.setdefault(name, UNKNOWN)
        return handler(known)

    @field_validator("*", mode="wrap")
    @classmethod
    def _keep_going(cls, value: Any, handler: Callable[[Any], Any], info: ValidationInfo) -> Any:
        return tolerate(value, handler, info)
