"""From checked models to the frozen records of `fitlib.study.settings`."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from fitlib.study.cross_rules import Draft
from fitlib.study.dataset_merge import Merged
from fitlib.study.expansion import Found
from fitlib.study.models import ColumnsGroup, QuantityGroup, SelectionGroup
from fitlib.study.names import file_name_of
from fitlib.study.settings import Columns, DatasetSettings, Exclusion, Quantity, SelectionSettings, Target


def build_datasets(found: Iterable[Found], merged: Sequence[Merged]) -> tuple[DatasetSettings, ...]:
    """Return the datasets, sorted by id without regard to case, then by id."""
    datasets = [_dataset(dataset, merged[dataset.entry]) for dataset in found]
    return tuple(sorted(datasets, key=lambda dataset: (dataset.id.casefold(), dataset.id)))


def _dataset(found: Found, merged: Merged) -> DatasetSettings:
    interval, verification = merged.value("measuring_interval"), merged.value("verification_points")
    return DatasetSettings(
        id=found.id,
        file_name=file_name_of(found.id),
        key=merged.key,
        files=found.files,
        columns=Columns(**{role: merged.value(f"columns.{role}") for role in ColumnsGroup.model_fields}),
        delimiter=merged.value("delimiter"),
        decimal=merged.value("decimal"),
        measuring_interval=None if interval is None else (interval[0], interval[1]),
        evaluation=merged.value("evaluation"),
        function=merged.value("function"),
        level_tolerance=merged.value("level_tolerance"),
        record=dict(merged.value("record")),
        exclusions=tuple(
            Exclusion(_in_order(entry.where), entry.reason, entry.person, entry.date)
            for entry in merged.value("exclusions") or ()
        ),
        verification_points=None if verification is None else _in_order(verification.where),
    )


def _in_order(where: dict) -> dict:
    return {name: where[name] for name in sorted(where)}


def build_quantity(group: QuantityGroup) -> Quantity:
    """Return a quantity with its unit."""
    return Quantity(group.quantity, group.unit)


def build_selection(draft: Draft) -> SelectionSettings:
    """Return how one candidate is chosen, defaults filled in."""
    group: SelectionGroup = draft.model.selection
    target, monotone = group.target_uncertainty, group.require.monotone
    if monotone is None:
        monotone = all(merged.value("evaluation") == "inverse" for merged in draft.merged)
    return SelectionSettings(
        loss=group.loss,
        rule=group.rule,
        alpha=SelectionSettings.alpha if group.alpha is None else group.alpha,
        monotone=monotone,
        degrees_of_freedom=group.require.degrees_of_freedom,
        target=None if target is None else Target(target.expanded, target.coverage_factor),
    )
