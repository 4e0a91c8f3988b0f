"""The fingerprint of each step of a dataset: what it is computed from, in one hash.

What a step is known not to use is named here and left out. Everything else counts, so that a setting that is added
later can make a result be computed too often, but never too seldom.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from fitlib.errors import InputError, Problem
from fitlib.plan.canonical import digest, plain

WITHOUT_EFFECT = ("path", "folder", "text", "lines", "warnings", "datasets")
"""Of a study: where it stands, how it is written; its datasets come one by one."""

ONLY_SHOWN = ("format", "name", "title", "purpose")
"""Of a study: enters the assembled result at most."""

UNITS = ("stimulus", "response")
"""Of a study: no number depends on it, but the reasons of a choice name it."""

FITS_UNUSED = ("id", "file_name", "key", "record")
"""Of a dataset: no number depends on it."""

DECISIONS = ("validation", "selection", "random_seed")
"""Of a study: does not enter the fits."""

RANDOM_SCHEMES = ("k_fold", "bootstrap")


def hash_files(study, dataset) -> dict[str, str]:
    """Return the SHA-256 of the raw bytes of each file of a dataset.

    Parameters
    ----------
    study : Study
    dataset : DatasetSettings

    Returns
    -------
    dict of str to str
        By the file's name relative to the study.

    Raises
    ------
    InputError
        A file cannot be read.
    """
    hashes, problems = {}, []
    for name in dataset.files:
        try:
            hashes[name] = hash_file(Path(study.folder) / name)
        except OSError as error:
            message = f"{name}: cannot be read ({error.strerror})"
            key = f"{dataset.key}.files"
            problems.append(Problem(str(study.path), message, study.line_of(key), None, key))
    if problems:
        raise InputError(problems)
    return hashes


def hash_file(path: Path) -> str:
    """Return the SHA-256 of a file's bytes.

    Parameters
    ----------
    path : Path

    Returns
    -------
    str
        64 hexadecimal digits.
    """
    with open(path, "rb") as stream:
        return hashlib.file_digest(stream, "sha256").hexdigest()


def step_names(study) -> tuple[str, ...]:
    """Return the steps of a dataset in order, the assembled result last.

    Parameters
    ----------
    study : Study

    Returns
    -------
    tuple of str
    """
    return ("fits", *(f"scheme:{scheme.id}" for scheme in study.validation), "selection", "result")


def step_settings(study, dataset) -> dict[str, dict[str, str]]:
    """Return, for each step of a dataset, the digest of each group of settings that it uses.

    Parameters
    ----------
    study : Study
    dataset : DatasetSettings

    Returns
    -------
    dict of str to dict of str to str
        By step, then by group: the group's name says what has changed when its digest differs.
    """
    fits = _fits_settings(study, dataset)
    settings = {"fits": fits}
    for scheme in study.validation:
        settings[f"scheme:{scheme.id}"] = {**fits, **_scheme_settings(study, scheme)}
    decision = {name: digest(getattr(study, name)) for name in (*DECISIONS, *UNITS)}
    settings["selection"] = {**fits, **decision}
    shown = {name: digest(getattr(study, name)) for name in ONLY_SHOWN}
    settings["result"] = {**fits, **decision, **shown, "record": digest(dataset.record)}
    return settings


def _fits_settings(study, dataset) -> dict[str, str]:
    known = (*WITHOUT_EFFECT, *ONLY_SHOWN, *UNITS, *DECISIONS)
    of_study = {name: value for name, value in _record(study).items() if name not in known}
    of_dataset = {name: value for name, value in _record(dataset).items() if name not in FITS_UNUSED}
    return {name: digest(value) for name, value in {**of_dataset, **of_study}.items()}


def _scheme_settings(study, scheme) -> dict[str, str]:
    """A scheme that draws nothing at random does not depend on the seed."""
    own = {f"validation {scheme.id}": digest(scheme)}
    if scheme.scheme in RANDOM_SCHEMES:
        own["random_seed"] = digest(study.random_seed)
    return own


def _record(record) -> Mapping[str, Any]:
    """The fields of a study or dataset by name; the study's own bytes and paths have no canonical text."""
    return {name: plain(getattr(record, name)) for name in record.__dataclass_fields__ if name not in WITHOUT_EFFECT}


def step_fingerprints(
    dataset_id: str,
    files: Mapping[str, str],
    settings: Mapping[str, Mapping[str, str]],
    numerics: str,
    versions: Mapping[str, str],
) -> dict[str, str]:
    """Return the fingerprint of each step of a dataset.

    Parameters
    ----------
    dataset_id : str
        Counts in every step: random streams derive from it, and no two datasets share an entry of the store.
    files : dict of str to str
        From :func:`hash_files`.
    settings : dict
        From :func:`step_settings`.
    numerics : str
        The hash of the code that can change a number.
    versions : dict of str to str
        Of the numeric libraries.

    Returns
    -------
    dict of str to str
        By step, in the order of ``settings``.
    """
    common = {"dataset": dataset_id, "files": files, "numerics": numerics, "versions": versions}
    return {step: digest({**common, "step": step, "settings": used}) for step, used in settings.items()}
