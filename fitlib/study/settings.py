"""The checked study: frozen records that the other parts of fitlib work from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from fitlib.errors import Problem
from fitlib.study.positions import line_of
from fitlib.study.resolved import resolve


@dataclass(frozen=True)
class Quantity:
    """A quantity and the unit of its values."""

    quantity: str
    unit: str


@dataclass(frozen=True)
class Columns:
    """Names of the columns of a data file; None where there is no such column."""

    stimulus: str
    response: str
    series: str | None = None
    direction: str | None = None
    level: str | None = None


@dataclass(frozen=True)
class Exclusion:
    """Observations left out on purpose: which, why, on whose word and on what day (ISO 8601)."""

    where: dict[str, str | int | float]
    reason: str
    person: str
    date: str


@dataclass(frozen=True)
class DatasetSettings:
    """Everything the study says about one dataset, with `dataset_defaults` merged in.

    Attributes
    ----------
    id, file_name : str
        The id as written, and the name used for files and folders.
    key : str
        Dotted key of the entry in the study, for example ``datasets[0]``; shared by all datasets of one ``ids_from``.
    files : tuple of str
        Data files relative to the study's folder, with forward slashes, in the order given.
    columns : Columns
    delimiter : {"comma", "semicolon", "tab"} or None
        None when it is found from the file.
    decimal : {"point", "comma"}
    measuring_interval : tuple of two floats or None
        Lower and upper end, in the unit of the stimulus; None is the span of the levels used.
    evaluation : {"inverse", "direct"}
    function : {"calibration", "analysis"}
    level_tolerance : float or None
        In the unit of the stimulus.
    record : dict of str to str
        Technical record, in the order of its keys.
    exclusions : tuple of Exclusion
    verification_points : dict or None
        The ``where`` of the observations kept out of fitting and choosing.
    """

    id: str
    file_name: str
    key: str
    files: tuple[str, ...]
    columns: Columns
    delimiter: str | None = None
    decimal: str = "point"
    measuring_interval: tuple[float, float] | None = None
    evaluation: str = "inverse"
    function: str = "calibration"
    level_tolerance: float | None = None
    record: dict[str, str] = field(default_factory=dict)
    exclusions: tuple[Exclusion, ...] = ()
    verification_points: dict[str, str | int | float] | None = None


@dataclass(frozen=True)
class FamilySettings:
    """One entry of `families`: the candidates it declares.

    Attributes
    ----------
    family : str
    degrees : tuple of int
        Ascending, no repeats.
    fixed_points : tuple of (float, float)
        Pairs (stimulus, response) that every candidate passes through.
    candidate_ids : tuple of str
        One for each degree, in the same order.
    """

    family: str
    degrees: tuple[int, ...]
    fixed_points: tuple[tuple[float, float], ...]
    candidate_ids: tuple[str, ...]


@dataclass(frozen=True)
class SchemeSettings:
    """One entry of `validation`; None for what the scheme does not have.

    Attributes
    ----------
    id : str
        The scheme's name, with ``_series`` or ``_observation`` where the unit is not the level.
    scheme : str
    folds, repeats, draws : int or None
    unit : {"level", "series", "observation"} or None
    """

    id: str
    scheme: str
    folds: int | None = None
    repeats: int | None = None
    unit: str | None = None
    draws: int | None = None


@dataclass(frozen=True)
class Target:
    """Target uncertainty: expanded uncertainty in the unit of the evaluated quantity, and its coverage factor."""

    expanded: float
    coverage_factor: float


@dataclass(frozen=True)
class SelectionSettings:
    """How one candidate is chosen.

    Attributes
    ----------
    loss : str or None
        Id of the scheme that decides; None for the rules that use none.
    rule : {"supported_gain", "one_standard_error", "smallest_loss", "f_test", "aicc", "bic"}
    alpha : float
        Significance level of ``f_test``; other rules do not use it.
    monotone : bool
        As the study says; where it says nothing, true unless a dataset has direct evaluation. Inverse evaluation needs
        a strictly monotone function whatever stands here: ask `Study.requires_monotone`.
    degrees_of_freedom : int
        Least number of levels less parameters.
    target : Target or None
    """

    loss: str | None
    rule: str
    alpha: float = 0.05
    monotone: bool = True
    degrees_of_freedom: int = 3
    target: Target | None = None


@dataclass(frozen=True)
class Study:
    """A study that has passed every check of its text.

    Attributes
    ----------
    path : str
        The study file as the user named it.
    folder : pathlib.Path
        The folder that file names are relative to.
    text : bytes
        The file byte for byte.
    format : int
    name : str
        The value of the key ``study``.
    title, purpose : str
    random_seed : int or None
        None when no scheme draws at random.
    stimulus, response : Quantity
    datasets : tuple of DatasetSettings
        Sorted by id without regard to case, then by id.
    families, validation : tuple
        In the order of the study.
    weighting : str
    selection : SelectionSettings
    warnings : tuple of fitlib.errors.Problem
    lines : Mapping of str to int
        Line of every dotted key that stands in the file.
    """

    path: str
    folder: Path
    text: bytes = field(repr=False)
    format: int
    name: str
    title: str
    purpose: str
    random_seed: int | None
    stimulus: Quantity
    response: Quantity
    datasets: tuple[DatasetSettings, ...]
    families: tuple[FamilySettings, ...]
    weighting: str
    validation: tuple[SchemeSettings, ...]
    selection: SelectionSettings
    warnings: tuple[Problem, ...] = ()
    lines: Mapping[str, int] = field(default_factory=dict, repr=False, compare=False)

    def line_of(self, key: str) -> int | None:
        """Return the line of a dotted key, or of its nearest parent in the file.

        Parameters
        ----------
        key : str
            For example ``datasets[0].files``.
        """
        return line_of(self.lines, key)

    def requires_monotone(self, dataset: DatasetSettings) -> bool:
        """Tell whether a candidate must be strictly monotone for this dataset.

        Parameters
        ----------
        dataset : DatasetSettings
            One of `datasets`.
        """
        return dataset.evaluation == "inverse" or self.selection.monotone

    def resolved(self) -> dict[str, Any]:
        """Return the study with every default spelled out, as plain data for JSON.

        It does not depend on comments, quoting, the order of keys or the order of datasets.
        """
        return resolve(self)
