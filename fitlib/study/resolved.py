"""The study with every default spelled out, as plain data.

Works on the records of `fitlib.study.settings` by their attributes and imports none of them.
"""

from __future__ import annotations

from dataclasses import asdict
from typing import Any

# The place of an entry in the file says nothing about what is fitted.
NOT_SETTINGS = ("key",)


def resolve(study: Any) -> dict[str, Any]:
    """Return JSON-able data that is the same for two studies that mean the same.

    Parameters
    ----------
    study : Study

    Returns
    -------
    dict
        Keys as in the study file, with `dataset_defaults` merged into each dataset and each whole number that was
        written as ``4.0`` given as 4.
    """
    return {
        "format": study.format,
        "study": study.name,
        "title": study.title,
        "purpose": study.purpose,
        "random_seed": study.random_seed,
        "stimulus": asdict(study.stimulus),
        "response": asdict(study.response),
        "datasets": [resolve_dataset(dataset) for dataset in study.datasets],
        "families": [_family(family) for family in study.families],
        "weighting": study.weighting,
        "validation": [_plain(asdict(scheme)) for scheme in study.validation],
        "selection": _selection(study.selection),
    }


def resolve_dataset(dataset: Any) -> dict[str, Any]:
    """Return the settings of one dataset as plain data.

    Parameters
    ----------
    dataset : DatasetSettings

    Returns
    -------
    dict
        JSON-able; `verification_points` keeps its ``where``, and the place of the entry in the file is left out.
    """
    settings = {name: value for name, value in asdict(dataset).items() if name not in NOT_SETTINGS}
    if dataset.verification_points is not None:
        settings["verification_points"] = {"where": dataset.verification_points}
    return _plain(settings)


def _family(family: Any) -> dict[str, Any]:
    settings = asdict(family)
    settings["degree"] = settings.pop("degrees")
    settings["candidates"] = settings.pop("candidate_ids")
    return _plain(settings)


def _selection(selection: Any) -> dict[str, Any]:
    return {
        "loss": selection.loss,
        "rule": selection.rule,
        "alpha": selection.alpha if selection.rule == "f_test" else None,
        "require": {"monotone": selection.monotone, "degrees_of_freedom": selection.degrees_of_freedom},
        "target_uncertainty": _plain(asdict(selection.target)) if selection.target else None,
    }


def _plain(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _plain(value[key]) for key in sorted(value)}
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if isinstance(value, float) and value.is_integer():
        return int(value)
    return value
