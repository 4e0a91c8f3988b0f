"""Families of functions that a study may name. Adding one is one model and one entry of `KNOWN_FAMILIES`.

A model has `settings()`, and `findings()` for rules between its own keys. `fitlib.study.models` takes the union of all
models, told apart by the key `family`.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from typing import Annotated, Any

from pydantic import BeforeValidator, WithJsonSchema

from fitlib.study.kinds import choice, is_number, not_allowed, refusal
from fitlib.study.model_base import Model
from fitlib.study.settings import FamilySettings
from fitlib.study.shown import shown
from fitlib.study.unknown import Finding

HIGHEST_DEGREE = 50
RANGE = re.compile(r"([0-9]{1,9})\.\.([0-9]{1,9})")
DEGREE_ALLOWED = f"a whole number from 0 to {HIGHEST_DEGREE}, a range such as 0..6, or a list such as [0, 2, 4]"


def _degree(value: Any) -> int:
    if type(value) is not int or not 0 <= value <= HIGHEST_DEGREE:
        raise not_allowed(value, DEGREE_ALLOWED)
    return value


def _from_range(text: str) -> list[int]:
    found = RANGE.fullmatch(text)
    if not found:
        raise not_allowed(text, DEGREE_ALLOWED)
    low, high = int(found[1]), int(found[2])
    if low > high:
        raise refusal(f"the range {text} runs downwards; write {high}..{low}")
    if high > HIGHEST_DEGREE:
        raise not_allowed(text, DEGREE_ALLOWED)
    return list(range(low, high + 1))


def read_degrees(value: Any) -> list[int]:
    """Return the degrees, ascending, from a whole number, a range ``0..6`` or a list."""
    if isinstance(value, str):
        return _from_range(value)
    degrees = [_degree(item) for item in value] if isinstance(value, list) else [_degree(value)]
    if not degrees:
        raise not_allowed(value, DEGREE_ALLOWED)
    for degree in degrees:
        if degrees.count(degree) > 1:
            raise refusal(f"degree {degree} is given twice; write each degree once")
    return sorted(degrees)


def read_fixed_points(value: Any) -> list[list[float]]:
    """Return the pairs [stimulus, response]."""
    allowed = "a list of pairs [stimulus, response], for example [[0, 4]]"
    if not isinstance(value, list) or not value:
        raise not_allowed(value, f"{allowed}, or leave the key out")
    for pair in value:
        if not isinstance(pair, list) or len(pair) != 2:
            raise refusal(f"{shown(pair)} is not allowed as a fixed point; {allowed}")
        for number in pair:
            if not is_number(number):
                raise refusal(f"{shown(number)} is not allowed in a fixed point; {allowed}")
    return [[float(stimulus), float(response)] for stimulus, response in value]


_WHOLE = {"type": "integer", "minimum": 0, "maximum": HIGHEST_DEGREE}
Degrees = Annotated[
    list[int],
    BeforeValidator(read_degrees),
    WithJsonSchema(
        {
            "anyOf": [
                _WHOLE,
                {"type": "string", "pattern": r"^[0-9]+\.\.[0-9]+$"},
                {"type": "array", "items": _WHOLE, "minItems": 1, "uniqueItems": True},
            ]
        }
    ),
]
_PAIR = {"type": "array", "items": {"type": "number"}, "minItems": 2, "maxItems": 2}
FixedPoints = Annotated[
    list[list[float]],
    BeforeValidator(read_fixed_points),
    WithJsonSchema({"type": "array", "items": _PAIR, "minItems": 1}),
]


class PolynomialEntry(Model):
    """Polynomials of the degrees given, through the fixed points given."""

    family: choice("polynomial")  # type: ignore[valid-type]
    degree: Degrees
    fixed_points: FixedPoints | None = None

    def settings(self) -> FamilySettings:
        """Return the candidates that this entry declares."""
        ending = "-fixed" if self.fixed_points else ""
        return FamilySettings(
            family=self.family,
            degrees=tuple(self.degree),
            fixed_points=tuple((stimulus, response) for stimulus, response in self.fixed_points or ()),
            candidate_ids=tuple(f"{self.family}-{degree}{ending}" for degree in self.degree),
        )

    def findings(self) -> Iterator[Finding]:
        """Yield faults between the keys of this entry, with keys relative to it."""
        if self.fixed_points is None:
            return
        stimuli = [pair[0] for pair in self.fixed_points]
        for stimulus in sorted({stimulus for stimulus in stimuli if stimuli.count(stimulus) > 1}):
            yield "fixed_points", f"two fixed points at the stimulus {stimulus:g}; each needs its own stimulus"
        if len(stimuli) > min(self.degree):
            found = "1 fixed point leaves" if len(stimuli) == 1 else f"{len(stimuli)} fixed points leave"
            yield (
                "fixed_points",
                f"{found} nothing to fit at degree {min(self.degree)}; the lowest degree allowed is {len(stimuli)}",
            )


KNOWN_FAMILIES: dict[str, type[Model]] = {
    "polynomial": PolynomialEntry,
}
