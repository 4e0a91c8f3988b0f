"""Turns the faults that the models find into plain sentences with the dotted key of each."""

from __future__ import annotations

import re
from collections.abc import Iterable, Sequence
from typing import Any

from fitlib.study.keys import keys_by_place
from fitlib.study.kinds import OWN_SENTENCE, without_unit
from fitlib.study.models import TOLD_APART
from fitlib.study.positions import child, parent_of, within
from fitlib.study.shown import nearest, shown
from fitlib.study.unknown import Finding

NEEDS_A_GROUP = frozenset({"model_type", "dict_type", "model_attributes_type"})
GROUPS = {
    "stimulus": "{quantity: water level, unit: m}",
    "response": "{quantity: loop current, unit: mA}",
    "columns": "{stimulus: level_m, response: current_mA, series: run}",
    "record": "{serial_number: LS-101, date: 2026-04-03}",
    "verification_points": "{where: {run: 9}}",
    "where": "{run: 2, level_m: 4.0}",
    "families[]": "{family: polynomial, degree: 1..3}",
    "validation[]": "{scheme: leave_one_level_out}",
    "datasets[]": "{id: LS-101, files: [LS-101.csv]}",
    "exclusions[]": "{where: {run: 2}, reason: cable moved, person: shift lead, date: 2026-04-03}",
    "selection": "{rule: supported_gain, loss: leave_one_level_out}",
    "require": "{monotone: true, degrees_of_freedom: 3}",
    "target_uncertainty": "{expanded: 0.01, coverage_factor: 2}",
}
UNKNOWN_KEY = "extra_forbidden"
MISSING_KEY = "missing"


def misspelt_keys(errors: Sequence[dict[str, Any]], data: Any) -> set[str]:
    """Return the dotted keys that are most likely meant by unknown ones."""
    return {child(_parent(error, data), close) for error in errors if (close := _nearest_of(error, data))}


def plain_sentences(errors: Sequence[dict[str, Any]], data: Any, hidden: Iterable[str] = ()) -> list[Finding]:
    """Return (dotted key, sentence) for each error of pydantic.

    Parameters
    ----------
    errors : sequence of dict
        As given by ``ValidationError.errors()``.
    data : object
        The data that was validated.
    hidden : iterable of str
        Dotted keys whose value was refused already; what follows from that is not said again.
    """
    hidden = tuple(hidden)
    located = [(_locate(error, error["loc"], data), error) for error in errors]
    misspelt = misspelt_keys(errors, data)
    findings = []
    for key, error in located:
        if error["type"] == MISSING_KEY and key in misspelt:
            continue  # the unknown key beside it says so already
        if error["type"] != UNKNOWN_KEY and any(within(other, key) or within(key, other) for other in hidden):
            continue
        findings.append(_finding(key, error, data))
    return findings


def _locate(error: dict[str, Any], parts: Sequence[str | int], data: Any) -> str:
    """Return the dotted key of an error; parts of its location that name a variant of an entry are passed over."""
    key, here = "", data
    for place, part in enumerate(parts):
        if (isinstance(here, list) and isinstance(part, int)) or (isinstance(here, dict) and part in here):
            key, here = child(key, part), here[part]
        elif error["type"] == MISSING_KEY and place == len(parts) - 1:
            key = child(key, part)
    return key


def _place_of(key: str) -> str:
    return re.sub(r"\[[0-9]+\]", "[]", key)


def _parent(error: dict[str, Any], data: Any) -> str:
    return _locate(error, error["loc"][:-1], data)


def _known_beside(error: dict[str, Any], data: Any) -> frozenset[str]:
    """Return the keys known where an unknown key stands."""
    return keys_by_place().get(_place_of(_parent(error, data)), frozenset())


def _nearest_of(error: dict[str, Any], data: Any) -> str | None:
    if error["type"] != UNKNOWN_KEY:
        return None
    return nearest(str(error["loc"][-1]), _known_beside(error, data))


def _finding(key: str, error: dict[str, Any], data: Any) -> Finding:
    kind, value = error["type"], error["input"]
    if kind == OWN_SENTENCE:
        return key, error["ctx"]["sentence"]
    if kind == MISSING_KEY:
        return key, "this key is missing"
    if kind == UNKNOWN_KEY:
        return key, _unknown_key(error, _known_beside(error, data))
    if kind in NEEDS_A_GROUP:
        return key, f"{shown(value)} is not allowed; a group of keys{_such_as(key)}{without_unit(value)}"
    if kind == "list_type":
        return key, f"{shown(value)} is not allowed; a list"
    if kind == "too_short":
        return key, "nothing stands under this key; write at least one entry or leave the key out"
    if kind.startswith("union_tag"):
        return _untold(key, value)
    return key, f"{shown(value)} is not allowed; {error['msg'][:1].lower()}{error['msg'][1:]}"


def _such_as(key: str) -> str:
    example = GROUPS.get(_place_of(key).rpartition(".")[2])
    return f" such as {example}" if example else ""


def _untold(key: str, value: Any) -> Finding:
    """Say that the word that tells the entries of a list apart is missing or not known."""
    name, words = TOLD_APART[parent_of(key)]
    if name not in value:
        return child(key, name), f"this key is missing; one of {', '.join(words)}"
    word = value[name]
    close = nearest(word, words) if isinstance(word, str) else None
    asked = f"; did you mean {close}?" if close else ""
    return child(key, name), f"{shown(word)} is not allowed; one of {', '.join(words)}{asked}"


def _unknown_key(error: dict[str, Any], known: frozenset[str]) -> str:
    name, places = str(error["loc"][-1]), keys_by_place()
    if name in known:
        return f"this key has no effect here; {_variant(error)}"
    close = nearest(name, known)
    if close:
        return f"unknown key; did you mean '{close}'?"
    elsewhere = sorted(place for place, names in places.items() if name in names)
    if elsewhere:
        return f"unknown key here; it belongs in {' or '.join(place or 'the study itself' for place in elsewhere)}"
    return f"unknown key; known here: {', '.join(sorted(known))}"


def _variant(error: dict[str, Any]) -> str:
    tag = error["loc"][-2] if len(error["loc"]) > 1 else ""
    if tag == "<pattern>":
        return "an entry has either ids_from, or id and files"
    return f"{tag} does not use it"
