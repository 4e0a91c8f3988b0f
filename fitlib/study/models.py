"""The study format as typed models: which keys there are and what each value may be.

Rules between keys are in `cross_rules`; `settings` holds what comes out.
"""

from __future__ import annotations

from functools import reduce
from operator import or_
from typing import Annotated, Any, Literal

from pydantic import BeforeValidator, Discriminator, Field, Tag, WrapValidator

from fitlib.study.family_models import KNOWN_FAMILIES
from fitlib.study.kinds import (
    DatasetId,
    Day,
    Flag,
    Interval,
    StudyName,
    WhereValue,
    choice,
    line_text,
    not_allowed,
    not_negative,
    paragraph,
    positive,
    whole,
)
from fitlib.study.model_base import Model, tolerate
from fitlib.study.scheme_models import KNOWN_SCHEMES

FORMAT = 1
LARGEST_SEED = 2**53 - 1  # the largest whole number that every JSON reader keeps exactly
WEIGHTINGS = ("none", "inverse_stimulus", "inverse_stimulus_squared")
LATER_WEIGHTINGS = ("per_point", "estimated")
RULES = ("supported_gain", "one_standard_error", "smallest_loss", "f_test", "aicc", "bic")
DEFAULT_RULE = RULES[0]

Line = line_text()
Word = line_text(100)
Path = line_text(1000)
Where = Annotated[dict[Word, WhereValue], Field(min_length=1)]


class QuantityGroup(Model):
    """A quantity and its unit."""

    quantity: Word
    unit: Word


class ColumnsGroup(Model):
    """Names of the columns of a data file; which ones are needed is known after `dataset_defaults` is merged in."""

    stimulus: Word | None = None
    response: Word | None = None
    series: Word | None = None
    direction: Word | None = None
    level: Word | None = None


class ExclusionEntry(Model):
    """Observations left out on purpose; every key is needed."""

    where: Where
    reason: Line
    person: Word
    date: Day


class VerificationGroup(Model):
    """Observations kept out of fitting and choosing."""

    where: Where


class DatasetKeys(Model):
    """Keys that a dataset, an `ids_from` entry and `dataset_defaults` share."""

    columns: ColumnsGroup | None = None
    delimiter: choice("comma", "semicolon", "tab") | None = None
    decimal: choice("point", "comma") = "point"
    measuring_interval: Interval | None = None
    evaluation: choice("inverse", "direct") = "inverse"
    function: choice("calibration", "analysis") = "calibration"
    level_tolerance: not_negative() | None = None
    record: Annotated[dict[Word, Line], Field(min_length=1)] | None = None
    exclusions: Annotated[list[ExclusionEntry], Field(min_length=1)] | None = None
    verification_points: VerificationGroup | None = None


class DatasetDefaults(DatasetKeys):
    """Keys for all datasets that do not set them; `columns` and `record` are merged key by key."""


class NamedDataset(DatasetKeys):
    """One dataset with its id and files."""

    id: DatasetId
    files: Annotated[list[Path], Field(min_length=1)]


class DatasetPattern(DatasetKeys):
    """One dataset for each file that the pattern matches."""

    ids_from: Path


class RequireGroup(Model):
    """Conditions for being eligible."""

    monotone: Flag | None = None
    degrees_of_freedom: whole(2) = 3


class TargetGroup(Model):
    """Target uncertainty, in the unit of the evaluated quantity."""

    expanded: positive()
    coverage_factor: positive()


class SelectionGroup(Model):
    """How one candidate is chosen."""

    loss: Word | None = None
    rule: choice(*RULES) = DEFAULT_RULE
    alpha: positive(below=1) | None = None
    require: RequireGroup = RequireGroup()
    target_uncertainty: TargetGroup | None = None


def _dataset_kind(value: Any) -> str:
    return "<pattern>" if isinstance(value, dict) and "ids_from" in value else "<named>"


def _one_of(models: dict[str, type[Model]], key: str) -> Any:
    """Return the union of the models, told apart by the word under `key`; a faulty entry does not hide the others."""

    def kind(value: Any) -> str | None:
        if not isinstance(value, dict):
            return next(iter(models))  # its own check says that a group of keys is needed
        word = value.get(key)
        return word if isinstance(word, str) and word in models else None

    if len(models) == 1:
        return Annotated[next(iter(models.values())), WrapValidator(tolerate)]
    members = [Annotated[model, Tag(word)] for word, model in models.items()]
    return Annotated[reduce(or_, members), Discriminator(kind), WrapValidator(tolerate)]


DatasetEntry = Annotated[
    Annotated[NamedDataset, Tag("<named>")] | Annotated[DatasetPattern, Tag("<pattern>")],
    Discriminator(_dataset_kind),
    WrapValidator(tolerate),
]
FamilyEntry = _one_of(KNOWN_FAMILIES, "family")
SchemeEntry = _one_of(KNOWN_SCHEMES, "scheme")


def _check_format(value: Any) -> int:
    if type(value) is not int or value != FORMAT:
        raise not_allowed(value, f"this version of fitlib reads format {FORMAT}")
    return value


class StudyModel(Model):
    """One study file."""

    format: Annotated[Literal[FORMAT], BeforeValidator(_check_format)]
    study: StudyName
    title: Line
    purpose: paragraph() = ""
    random_seed: whole(0, LARGEST_SEED) | None = None
    stimulus: QuantityGroup
    response: QuantityGroup
    dataset_defaults: DatasetDefaults = DatasetDefaults()
    datasets: Annotated[list[DatasetEntry], Field(min_length=1)]
    families: Annotated[list[FamilyEntry], Field(min_length=1)]
    weighting: choice(*WEIGHTINGS, later=LATER_WEIGHTINGS) = "none"
    validation: Annotated[list[SchemeEntry], Field(min_length=1)] | None = None
    selection: SelectionGroup


# Lists whose entries are told apart by a word: dotted key of the list -> (the key of the word, the words).
TOLD_APART = {"validation": ("scheme", tuple(KNOWN_SCHEMES)), "families": ("family", tuple(KNOWN_FAMILIES))}
