"""Rules between the keys of a study, and settings that would have no effect.

Refused because they would have no effect: `random_seed` where nothing is drawn at random; `selection.loss` with the
rules aicc, bic and f_test; `selection.alpha` with any rule but f_test; a key of `dataset_defaults` that every dataset
sets itself; a second entry of one scheme, of one candidate or of one exclusion; `level_tolerance` beside
`columns.level` (the last two in `dataset_rules`); keys of another scheme, and empty lists and groups (the models).
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from fitlib.study.dataset_merge import DEFAULTS, MERGED_INSIDE, Merged
from fitlib.study.models import StudyModel
from fitlib.study.scheme_models import RANDOM_SCHEMES, LeaveOneLevelOut
from fitlib.study.settings import SchemeSettings
from fitlib.study.shown import nearest, shown
from fitlib.study.unknown import UNKNOWN, Finding, UnknownValue

LEAST_DECIDING_FOLDS = 5
RULES_WITHOUT_LOSS = frozenset({"aicc", "bic", "f_test"})
SERIES_SCHEME = "leave_one_series_out"
DEFAULT_VALIDATION = (LeaveOneLevelOut(scheme="leave_one_level_out"),)


@dataclass(frozen=True)
class Draft:
    """A study whose values were checked one by one; any of them may be `UNKNOWN`."""

    model: StudyModel
    merged: Sequence[Merged]

    @property
    def validation(self) -> Sequence[Any]:
        """The schemes declared, or the one that stands in where there is no `validation`."""
        return DEFAULT_VALIDATION if self.model.validation is None else self.model.validation

    @property
    def schemes(self) -> list[SchemeSettings | Any]:
        """Settings of each scheme; `UNKNOWN` where the entry is faulty."""
        return [_settings(entry) for entry in self.validation]

    @property
    def families(self) -> list[Any]:
        """Settings of each family; `UNKNOWN` where the entry is faulty."""
        return [_settings(entry) for entry in self.model.families]


def _settings(entry: Any) -> Any:
    try:
        return entry.settings()
    except UnknownValue:
        return UNKNOWN


def _known(values: Sequence[Any]) -> list[Any]:
    return [value for value in values if value is not UNKNOWN]


def seed_where_random(draft: Draft) -> Iterator[Finding]:
    """A seed is needed exactly where something is drawn at random."""
    names = [entry.scheme for entry in _known(draft.validation)]
    random = [name for name in names if name in RANDOM_SCHEMES]
    seed = draft.model.random_seed
    if seed is None and random:
        yield "random_seed", f"this key is missing; {random[0]} draws at random and needs a whole number here"
    elif seed is not None and not random and len(names) == len(draft.validation):
        yield "random_seed", "this has no effect: no scheme of the study draws at random; remove it"


def schemes_once(draft: Draft) -> Iterator[Finding]:
    """A scheme is declared once for each unit."""
    first: dict[str, int] = {}
    for place, scheme in enumerate(draft.schemes):
        if scheme is not UNKNOWN and first.setdefault(scheme.id, place) != place:
            yield (
                f"validation[{place}]",
                f"{scheme.id} is declared already by validation[{first[scheme.id]}]; once each",
            )


def candidates_once(draft: Draft) -> Iterator[Finding]:
    """No two entries of `families` declare one candidate."""
    first: dict[str, int] = {}
    for place, family in enumerate(draft.families):
        repeats = [] if family is UNKNOWN else [c for c in family.candidate_ids if first.setdefault(c, place) != place]
        if repeats:
            more = f" (and {len(repeats) - 1} more)" if len(repeats) > 1 else ""
            yield (
                f"families[{place}].degree",
                f"{repeats[0]}{more} is declared already by families[{first[repeats[0]]}]; candidate ids are unique",
            )


def family_findings(draft: Draft) -> Iterator[Finding]:
    """Each family checks its own keys against each other."""
    for place, entry in enumerate(draft.model.families):
        if entry is UNKNOWN:
            continue
        try:
            for key, message in entry.findings():
                yield f"families[{place}].{key}", message
        except UnknownValue:
            continue


def fixed_responses_differ(draft: Draft) -> Iterator[Finding]:
    """An analysis function is fitted over the response, so that fixed points need responses of their own."""
    analysis = [merged.key for merged in draft.merged if _is(merged, "function", "analysis")]
    for place, family in enumerate(draft.families if analysis else ()):
        responses = [] if family is UNKNOWN else [response for _, response in family.fixed_points]
        for response in sorted({response for response in responses if responses.count(response) > 1}):
            yield (
                f"families[{place}].fixed_points",
                f"two fixed points at the response {response:g}; the analysis function of {analysis[0]} needs one each",
            )


def loss_needed(draft: Draft) -> Iterator[Finding]:
    """A rule that compares losses says which scheme's; the others have no use for one."""
    rule, loss = draft.model.selection.rule, draft.model.selection.loss
    if loss is UNKNOWN:
        return
    if rule in RULES_WITHOUT_LOSS:
        if loss is not None:
            yield "selection.loss", f"this has no effect with the rule {rule}, which uses no held-out loss; remove it"
    elif loss is None:
        yield "selection.loss", f"this key is missing; the rule {rule} needs the id of a scheme in validation"


def loss_declared(draft: Draft) -> Iterator[Finding]:
    """The deciding scheme is one of those declared, and one that may decide."""
    loss, schemes = draft.model.selection.loss, draft.schemes
    if loss is None or draft.model.selection.rule in RULES_WITHOUT_LOSS:
        return
    declared = {scheme.id: (place, scheme) for place, scheme in enumerate(schemes) if scheme is not UNKNOWN}
    if loss not in declared:
        if len(_known(schemes)) == len(schemes):
            close = nearest(loss, declared)
            asked = f"; did you mean {close}?" if close else ""
            yield "selection.loss", f"{shown(loss)} is not declared in validation; {', '.join(declared)}{asked}"
        return
    place, scheme = declared[loss]
    if scheme.scheme == SERIES_SCHEME or scheme.unit == "series":
        yield "selection.loss", f"{loss} cannot decide: it shows run-to-run differences; take a scheme over levels"
    elif scheme.scheme == "k_fold" and scheme.folds < LEAST_DECIDING_FOLDS:
        yield (
            f"validation[{place}].folds",
            f"{scheme.folds} is not allowed for the deciding scheme; a whole number of {LEAST_DECIDING_FOLDS} or more",
        )


def alpha_only_for_f_test(draft: Draft) -> Iterator[Finding]:
    """Only the F test has a significance level."""
    if draft.model.selection.alpha is not None and draft.model.selection.rule != "f_test":
        yield "selection.alpha", f"this has no effect with the rule {draft.model.selection.rule}; remove it"


def f_test_is_nested(draft: Draft) -> Iterator[Finding]:
    """The F test compares nested candidates, which are those of one entry."""
    count = len(draft.model.families)
    if draft.model.selection.rule == "f_test" and count != 1:
        yield "selection.rule", f"f_test compares the candidates of one entry of families; this study has {count}"


def inverse_is_monotone(draft: Draft) -> Iterator[Finding]:
    """Inverse evaluation needs a strictly monotone function."""
    if draft.model.selection.require.monotone is not False:
        return
    inverse = [merged.key for merged in draft.merged if _is(merged, "evaluation", "inverse")]
    if inverse:
        yield (
            "selection.require.monotone",
            f"false is not allowed: {inverse[0]} has inverse evaluation, which needs a strictly monotone function",
        )


def target_has_one_unit(draft: Draft) -> Iterator[Finding]:
    """The target is in the unit of the evaluated quantity, which then has to be one for the whole study."""
    if draft.model.selection.target_uncertainty is None:
        return
    kinds = {merged.value("evaluation") for merged in draft.merged}
    stimulus, response = draft.model.stimulus.unit, draft.model.response.unit
    if len(kinds) > 1 and stimulus != response:
        yield (
            "selection.target_uncertainty",
            f"some datasets evaluate the stimulus ({shown(stimulus)}) and some the response ({shown(response)}), "
            "so that the target has no one unit; make two studies",
        )


def defaults_used(draft: Draft) -> Iterator[Finding]:
    """A default that every dataset replaces has no effect."""
    defaults, entries = draft.model.dataset_defaults, draft.model.datasets
    for name in sorted(defaults.model_fields_set):
        value = getattr(defaults, name)
        if name not in MERGED_INSIDE:
            if all(name in entry.model_fields_set for entry in entries):
                yield f"{DEFAULTS}.{name}", "this has no effect: every dataset sets it itself; remove it"
            continue
        for inner in _names(value):
            if all(inner in _names(getattr(entry, name)) for entry in entries):
                yield f"{DEFAULTS}.{name}.{inner}", "this has no effect: every dataset sets it itself; remove it"


def _names(group: Any) -> Sequence[str]:
    if group is None:
        return ()
    return sorted(group) if isinstance(group, dict) else sorted(group.model_fields_set)


def _is(merged: Merged, name: str, word: str) -> bool:
    value = merged.value(name)
    return value is not UNKNOWN and value == word


STUDY_RULES: tuple[Callable[[Draft], Iterator[Finding]], ...] = (
    seed_where_random,
    schemes_once,
    candidates_once,
    family_findings,
    fixed_responses_differ,
    loss_needed,
    loss_declared,
    alpha_only_for_f_test,
    f_test_is_nested,
    inverse_is_monotone,
    target_has_one_unit,
    defaults_used,
)


def warnings_of(draft: Draft) -> Iterator[Finding]:
    """Yield what is allowed but leaks, misleads or was forgotten; for a draft without faults."""
    if UNFILLED in draft.model.purpose.lower():
        yield "purpose", "this still says what is to be filled in; write what the functions are for"
    for place, scheme in enumerate(draft.schemes):
        decides = scheme.id == draft.model.selection.loss
        if scheme.unit == "observation":
            yield f"validation[{place}].unit", f"{scheme.scheme} over single observations: {LEAK}"
        if decides and (scheme.unit == "observation" or scheme.scheme == "leave_one_out"):
            yield "selection.loss", f"{scheme.id} decides: {LEAK}"


UNFILLED = "to be filled in"  # as a proposed study says
LEAK = (
    "where levels have replicates, observations of one level stand on both sides, "
    "and the loss is too small for high degrees"
)
