"""Read a study and all its data, and say what a run would work on. Also public as ``fitlib.check``."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from fitlib.errors import InputError, Problem


@dataclass(frozen=True)
class DatasetSummary:
    """What was read of one dataset.

    Attributes
    ----------
    dataset : str
    levels, series : int
        Of the observations used.
    read, used, excluded, verification : int
        Observations.
    """

    dataset: str
    levels: int
    series: int
    read: int
    used: int
    excluded: int
    verification: int


@dataclass(frozen=True)
class CheckSummary:
    """A study that can be run.

    Attributes
    ----------
    study : Study
    datasets : tuple of DatasetSummary
    warnings : tuple of Problem
    """

    study: Any
    datasets: tuple[DatasetSummary, ...]
    warnings: tuple[Problem, ...]


def _summarize(dataset: str, observations) -> DatasetSummary:
    used = [i for i, state in enumerate(observations.state) if state == "used"]
    return DatasetSummary(
        dataset=dataset,
        levels=len({int(observations.level_index[i]) for i in used}),
        series=len({observations.series[i] for i in used}),
        read=len(observations.state),
        used=len(used),
        excluded=observations.state.count("excluded"),
        verification=observations.state.count("verification"),
    )


def _notes(study, datasets, observations) -> list[Problem]:
    """The readers' remarks on the data, each with the place of its dataset in the study."""
    return [
        Problem(file=study.path, message=note, line=study.line_of(settings.key), key=settings.id, severity="warning")
        for settings, record in zip(datasets, observations, strict=True)
        for note in record.notes
    ]


def check(study_file: str) -> CheckSummary:
    """Check a study and every data file of it, before any work.

    Parameters
    ----------
    study_file : str or path-like
        The study, a YAML file.

    Returns
    -------
    CheckSummary

    Raises
    ------
    InputError
        Holds every problem found, not only the first.
    """
    from fitlib.observations import check_observations
    from fitlib.study import load_study

    study = load_study(study_file)
    problems, observations = check_observations(study)
    if any(problem.severity == "error" for problem in problems):
        raise InputError(problems)
    datasets = tuple(_summarize(each.id, record) for each, record in zip(study.datasets, observations, strict=True))
    warnings = (*study.warnings, *problems, *_notes(study, study.datasets, observations))
    return CheckSummary(study, datasets, warnings)
