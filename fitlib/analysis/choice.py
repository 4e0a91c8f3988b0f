"""The step ``selection``: eligibility, the rule, the outer loop, the resampled selection, the verdict."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from fitlib.analysis.candidates import CandidateSet
from fitlib.analysis.fits import loss_floor
from fitlib.analysis.jsonable import number
from fitlib.analysis.schemes import FEWEST_FOLDS_TO_DECIDE, evaluate_scheme, make_units
from fitlib.analysis.streams import draw_counts
from fitlib.analysis.words import amount, listed
from fitlib.numerics.bootstrap import RESIDUALS_AT_ONCE
from fitlib.numerics.evidence import Evidence, ManyEvidence
from fitlib.numerics.selection import FIT_RULES, LOSS_RULES, Choice, choose, take, take_many
from fitlib.numerics.validation import Fold, level_means, summarise, unit_folds

#: With more levels than this, outer folds and folds within resamples are interleaved groups of levels.
MOST_LEVEL_FOLDS = 60


@dataclass(frozen=True)
class Rule:
    """The rule of the study with what it needs: deciding scheme (None for level rules), alpha, seed, dataset."""

    name: str
    scheme: object
    alpha: float
    seed: int | None
    dataset_id: str


def make_rule(study, dataset) -> Rule:
    """The rule of a study for one dataset.

    Parameters
    ----------
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    Rule
    """
    selection = study.selection
    scheme = next((scheme for scheme in study.validation if scheme.id == selection.loss), None)
    alpha = 0.05 if selection.alpha is None else selection.alpha
    return Rule(selection.rule, scheme, alpha, study.random_seed, dataset.id)


def eligibility(candidates: CandidateSet, records: dict, deciding: dict | None, study, dataset) -> dict[str, list[str]]:
    """Reasons why each candidate cannot be chosen; an empty list for an eligible one.

    Decided once, on all used observations.

    Parameters
    ----------
    candidates : CandidateSet
    records : dict
        Of the step ``fits``.
    deciding : dict or None
        Result of the deciding scheme.
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    dict of str to list of str
    """
    return {name: _obstacles(record, deciding, study, dataset) for name, record in records.items()}


def _obstacles(record: dict, deciding: dict | None, study, dataset) -> list[str]:
    if record["status"] != "fitted":
        return [record["message"]]
    found = []
    need = study.selection.degrees_of_freedom
    if record["level_degrees_of_freedom"] < need:
        found.append(f"levels less parameters is {record['level_degrees_of_freedom']}; {need} is required")
    if study.requires_monotone(dataset) and not record["monotone"]:
        found.append(_not_monotone(record, dataset, study))
    if deciding is not None and deciding["status"] == "evaluated":
        found += _failed_folds(record["candidate"], deciding)
    return found


def _not_monotone(record: dict, dataset, study) -> str:
    quantity = study.response if dataset.function == "analysis" else study.stimulus
    if not record["turning_points"]:
        return "not strictly monotone over the measuring interval: constant"
    places = listed([amount(point, quantity.unit) for point in record["turning_points"]])
    return f"not monotone over the measuring interval: the slope changes sign at {places}"


def _failed_folds(candidate: str, deciding: dict) -> list[str]:
    scheme = deciding["scheme"]
    failed = [fold["fold"] for fold in deciding["folds"] if fold["losses"].get(candidate) is None]
    deficient = (deciding["rank_deficient_draws"] or {}).get(candidate, 0)
    if deciding["losses"][candidate]["loss"] is None and deficient:
        return [f"{deficient} of {deciding['draws']} draws of {scheme} do not determine it"]
    if not failed:
        return []
    shown = listed(failed[:3]) + (f" and {len(failed) - 3} more" if len(failed) > 3 else "")
    return [f"not determined without {shown} ({scheme})"]


def may_decide(deciding: dict | None) -> str:
    """Why the deciding scheme cannot decide for this dataset; empty when it can."""
    if deciding is None:
        return ""
    if deciding["status"] != "evaluated":
        return f"the deciding scheme {deciding['scheme']} does not apply: {deciding['message']}"
    count = deciding["folds_per_repeat"]
    if count < FEWEST_FOLDS_TO_DECIDE:
        return (
            f"the deciding scheme {deciding['scheme']} has {count} folds; at least {FEWEST_FOLDS_TO_DECIDE} are needed"
        )
    return ""


def evidence_for(candidates: CandidateSet, rule: Rule, stream_names: tuple = ()) -> Evidence | None:
    """What the rule looks at, computed from one set of observations.

    Parameters
    ----------
    candidates : CandidateSet
    rule : Rule
    stream_names : tuple
        Added to the names of the random streams (in an outer fold: that fold).

    Returns
    -------
    Evidence or None
        None where the deciding scheme does not apply.
    """
    data = candidates.data
    losses = np.full((len(candidates.entries), data.levels.size), np.nan)
    if rule.name in LOSS_RULES:
        names = (rule.dataset_id, rule.scheme.id, *stream_names)
        outcome = evaluate_scheme(candidates, _fitting(rule.scheme, data), rule.seed, names)
        if outcome.message:
            return None
        losses = outcome.loss.levels
    return Evidence(candidates.parameters, losses, data.level_weights, _level_squares(candidates), loss_floor(data))


def _level_squares(candidates: CandidateSet) -> np.ndarray:
    """Weighted sum of squares of the level means about each fit, shape (entries,)."""
    data = candidates.data
    means = level_means(candidates.residuals(), data.root_weights**2, data.level_index, data.levels.size)
    return means**2 @ data.level_weights


def _fitting(scheme, data):
    """The deciding scheme with no more folds than an outer fold has left."""
    if scheme.scheme != "k_fold":
        return scheme
    return replace(scheme, folds=min(scheme.folds, len(make_units(data, scheme.unit).labels)))


def level_groups(level_index: np.ndarray, count: int) -> list[Fold]:
    """Folds of levels, one level each, or interleaved groups where there are very many."""
    groups = min(count, MOST_LEVEL_FOLDS)
    return unit_folds(level_index % groups, [f"outer {k + 1}" for k in range(groups)])


def outer_loop(candidates: CandidateSet, rule: Rule, eligible: np.ndarray) -> dict:
    """Repeat the whole selection without each level in turn, and judge what it takes by that level.

    The winner's own loss is optimistic, because the minimum was sought; the error of the procedure is that of the
    selection repeated inside each fold (Stone 1974, sec. 3; Varma & Simon, BMC Bioinformatics 7 (2006) 91). Eligibility
    is not decided anew: only rank counts.

    Parameters
    ----------
    candidates : CandidateSet
    rule : Rule
    eligible : ndarray of shape (entries,), bool

    Returns
    -------
    dict
        ``outer_loss``, ``outer_loss_interior`` (None when a fold has no choice), ``outer_choices``, ``outer_message``.
    """
    data = candidates.data
    folds = level_groups(data.level_index, data.levels.size)
    errors = candidates.errors(folds).squared
    squared = np.full(data.rows.size, np.nan)
    choices: dict[str, int] = {}
    for fold in folds:
        taken = _choice_without(candidates, fold, rule, eligible)
        if taken is not None:
            squared[fold.rows] = errors[taken, fold.rows]
            name = candidates.entries[taken].candidate
            choices[name] = choices.get(name, 0) + 1
    loss = summarise(squared[None, :], data.root_weights, data.level_index, data.levels.size)
    none = len(folds) - sum(choices.values())
    return {
        "outer_loss": number(loss.loss[0]),
        "outer_loss_interior": number(loss.interior[0]),
        "outer_choices": dict(sorted(choices.items())),
        "outer_folds": len(folds),
        "outer_message": f"{none} of {len(folds)} outer folds have no choice" if none else "",
    }


def _choice_without(candidates: CandidateSet, fold: Fold, rule: Rule, eligible: np.ndarray) -> int | None:
    keep = np.ones(candidates.data.rows.size, dtype=bool)
    keep[fold.rows] = False
    if not keep.any():
        return None
    evidence = evidence_for(candidates.part(keep), rule, ("outer", fold.label))
    return None if evidence is None else take(evidence, rule.name, eligible, rule.alpha)


def resampled_selection(candidates: CandidateSet, rule: Rule, scheme, eligible: np.ndarray) -> dict:
    """Share of bootstrap draws in which the rule takes each candidate.

    In each draw the rule is applied to the draw: to leave-one-level-out losses over the levels drawn (copies of a level
    are left out together), or to the level means of the draw for ``f_test``, ``aicc`` and ``bic``.

    Parameters
    ----------
    candidates : CandidateSet
    rule : Rule
    scheme : fitlib.study.SchemeSettings
        The bootstrap scheme that gives unit and draws.
    eligible : ndarray of shape (entries,), bool

    Returns
    -------
    dict
        ``bootstrap_share`` per candidate, ``draws_without_choice``.
    """
    data = candidates.data
    units = make_units(data, scheme.unit)
    taken = np.zeros(len(candidates.entries), dtype=int)
    step = max(1, RESIDUALS_AT_ONCE // (data.rows.size * len(candidates.entries)))
    for counts in draw_counts(rule.seed, (rule.dataset_id, scheme.id), len(units.labels), scheme.draws):
        for start in range(0, counts.shape[0], step):
            evidence = _evidence_of_draws(candidates, counts[start : start + step, units.index], rule)
            positions = take_many(evidence, rule.name, eligible, rule.alpha)
            taken += np.bincount(positions[positions >= 0], minlength=taken.size)
    entries = enumerate(candidates.entries)
    share = {entry.candidate: float(taken[k] / scheme.draws) for k, entry in entries if entry.candidate}
    return {"bootstrap_share": share, "draws_without_choice": int(scheme.draws - taken.sum())}


def _evidence_of_draws(candidates: CandidateSet, rows: np.ndarray, rule: Rule) -> ManyEvidence:
    """Evidence of each draw; observations are in the order of their levels."""
    data = candidates.data
    weights = (data.root_weights**2 * rows).T
    starts = np.flatnonzero(np.diff(data.level_index, prepend=-1))
    level_weights = np.add.reduceat(weights, starts, axis=0)
    losses = np.full((len(candidates.entries), level_weights.shape[0], rows.shape[0]), np.nan)
    squares = np.full((len(candidates.entries), rows.shape[0]), np.nan)
    if rule.name in LOSS_RULES:
        blocks = [fold.rows for fold in level_groups(data.level_index, data.levels.size)]
        losses = _per_level(candidates.resampled_held_out(rows, blocks) ** 2, weights, level_weights, starts)
    if rule.name in FIT_RULES:
        means = _per_level(candidates.refit(rows), weights, level_weights, starts)
        squares = np.einsum("mld,ld->md", means**2, level_weights)
    # With no level more than its parameters nothing would be left to judge a candidate by
    undetermined = candidates.parameters[:, None] >= (level_weights > 0).sum(axis=0)[None, :]
    losses.transpose(0, 2, 1)[undetermined] = np.nan
    squares[undetermined] = np.nan
    return ManyEvidence(candidates.parameters, losses, level_weights, squares, loss_floor(data))


def _per_level(values: np.ndarray, weights: np.ndarray, level_weights: np.ndarray, starts: np.ndarray) -> np.ndarray:
    """Weighted means per level, shape (entries, L, draws); 0 at levels that were not drawn."""
    sums = np.add.reduceat(np.where(weights > 0, values * weights, 0.0), starts, axis=1)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(level_weights > 0, sums / level_weights, 0.0)


def interior_choice(evidence: Evidence, rule: Rule, eligible: np.ndarray) -> int | None:
    """What the rule takes when the losses of the first and last level are set aside; None for level rules."""
    if rule.name not in LOSS_RULES or evidence.level_weights.size < 5:
        return None
    inner = Evidence(
        evidence.parameters,
        evidence.level_losses[:, 1:-1],
        evidence.level_weights[1:-1],
        evidence.level_squares,
        evidence.floor,
    )
    return take(inner, rule.name, eligible, rule.alpha)


def make_choice(evidence: Evidence, rule: Rule, eligible: np.ndarray) -> Choice:
    """Apply the rule to all used observations."""
    return choose(evidence, rule.name, eligible, rule.alpha)
