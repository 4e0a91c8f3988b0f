"""From a checked study to its plan: what will be computed, in which batch, under which fingerprint."""

from __future__ import annotations

import hashlib
from dataclasses import asdict
from pathlib import Path

from fitlib.plan.canonical import digest
from fitlib.plan.code import CodeIdentity, code_identity
from fitlib.plan.fingerprints import hash_files, step_fingerprints, step_settings
from fitlib.plan.records import FORMAT, Batch, DatasetPlan, Plan
from fitlib.plan.versions import numeric_versions, rendering_versions

BATCHES = 16
"""Default number of batches: few jobs, and enough of them for several cores."""


def batch_of(dataset_id: str, batches: int) -> str:
    """Return the name of the batch of a dataset; it depends on nothing but the id, so that adding one moves no other.

    Parameters
    ----------
    dataset_id : str
    batches : int
        How many there are; 1 or more.

    Returns
    -------
    str
    """
    number = int(hashlib.sha256(dataset_id.encode("utf-8")).hexdigest(), 16) % batches
    return f"{number:0{max(2, len(str(batches - 1)))}d}"


def make_plan(study, batches: int = BATCHES, cache: Path | None = None) -> Plan:
    """Return the plan of a study.

    Parameters
    ----------
    study : Study
        As :func:`fitlib.study.load_study` returns it.
    batches : int, default 16
        Into how many batches datasets are dealt; 1 or more. It has no effect on any digest but those of the batches.
    cache : Path, optional
        See :func:`fitlib.plan.code_identity`.

    Returns
    -------
    Plan
        The same for the same content: neither time stamps nor the order of datasets in the study count.

    Raises
    ------
    InputError
        A data file cannot be read.
    """
    if batches < 1:
        raise ValueError(f"batches is {batches}; 1 or more is needed")
    code, numeric = code_identity(cache), numeric_versions()
    ordered = sorted(study.datasets, key=lambda each: (each.id.casefold(), each.id))
    datasets = tuple(plan_dataset(study, each, batches, code.numerics, numeric) for each in ordered)
    content = _content(study, datasets, code)
    versions = {**numeric, **rendering_versions()}
    return Plan(
        study=study.name,
        random_seed=study.random_seed,
        datasets=datasets,
        batches=_batches(datasets, code.drawing, rendering_versions()),
        digest=digest({"content": content, "versions": versions}),
        content_digest=digest(content),
        code=asdict(code),
        versions=versions,
    )


def plan_dataset(study, dataset, batches: int, numerics: str, versions: dict[str, str]) -> DatasetPlan:
    """Return the plan of one dataset.

    Parameters
    ----------
    study : Study
    dataset : DatasetSettings
    batches : int
    numerics : str
        The hash of the code that can change a number.
    versions : dict of str to str
        Of the numeric libraries.

    Returns
    -------
    DatasetPlan

    Raises
    ------
    InputError
        A data file cannot be read.
    """
    files, settings = hash_files(study, dataset), step_settings(study, dataset)
    return DatasetPlan(
        id=dataset.id,
        file_name=dataset.file_name,
        batch=batch_of(dataset.id, batches),
        files=files,
        settings={group: value[:16] for used in settings.values() for group, value in used.items()},
        steps=step_fingerprints(dataset.id, files, settings, numerics, versions),
    )


def _content(study, datasets: tuple[DatasetPlan, ...], code: CodeIdentity) -> dict[str, object]:
    return {
        "format": FORMAT,
        "study": study.resolved(),
        "files": {each.id: each.files for each in datasets},
        "code": asdict(code),
    }


def _batches(datasets: tuple[DatasetPlan, ...], drawing: str, versions: dict[str, str]) -> tuple[Batch, ...]:
    """Figures are drawn in the batches, so that what draws them counts too."""
    names = sorted({each.batch for each in datasets})
    return tuple(
        _batch(name, [each for each in datasets if each.batch == name], {"code": drawing, "versions": versions})
        for name in names
    )


def _batch(name: str, members: list[DatasetPlan], drawing: dict[str, object]) -> Batch:
    fingerprints = {each.id: [each.fingerprint, each.file_name] for each in members}
    return Batch(
        name=name,
        members=tuple(each.id for each in members),
        digest=digest({"format": FORMAT, "members": fingerprints, "drawing": drawing}),
    )
