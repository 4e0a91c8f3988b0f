"""The steps of one dataset, by name; each result is JSON-able and can be stored."""

from __future__ import annotations

import numpy as np

from fitlib.analysis.candidates import CandidateSet
from fitlib.analysis.choice import (
    eligibility,
    evidence_for,
    interior_choice,
    make_choice,
    make_rule,
    may_decide,
    outer_loop,
    resampled_selection,
)
from fitlib.analysis.dataset import DatasetArrays, make_arrays
from fitlib.analysis.fits import fit_candidates, make_candidates
from fitlib.analysis.jsonable import number, numbers
from fitlib.analysis.judgement import judge
from fitlib.analysis.reasons import candidate_reasons
from fitlib.analysis.schemes import UNIT_OF, evaluate_scheme, is_row_wise, level_losses
from fitlib.numerics.selection import LOSS_RULES, Choice, deciding_gains
from fitlib.numerics.validation import weighted_mean


def step_names(study) -> list[str]:
    """Names of the steps of every dataset of a study, in order.

    Parameters
    ----------
    study : fitlib.study.Study

    Returns
    -------
    list of str
    """
    return ["fits", *(f"scheme:{scheme.id}" for scheme in study.validation), "selection"]


def run_step(step: str, study, dataset, observations, earlier: dict[str, dict]) -> dict:
    """Run one step of one dataset.

    Parameters
    ----------
    step : str
        ``fits``, ``scheme:<id>`` or ``selection``.
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    observations : fitlib.observations.Observations
    earlier : dict of str to dict
        Results of the steps before.

    Returns
    -------
    dict
        JSON-able.

    Raises
    ------
    KeyError
        If the step is not known or an earlier result is missing.
    """
    candidates = make_candidates(make_arrays(study, dataset, observations), study)
    if step == "fits":
        return fit_candidates(candidates, study, dataset)
    if step == "selection":
        return _selection(candidates, study, dataset, earlier)
    scheme = {f"scheme:{scheme.id}": scheme for scheme in study.validation}[step]
    return _scheme(candidates, scheme, study.random_seed, dataset.id)


def _scheme(candidates: CandidateSet, scheme, seed: int | None, dataset_id: str) -> dict:
    result = {
        "scheme": scheme.id,
        "unit": UNIT_OF[scheme.scheme](scheme),
        "row_wise": is_row_wise(scheme),
        "draws": scheme.draws,
        "rank_deficient_draws": None,
        "folds": [],
        "folds_per_repeat": 0,
        "losses": {},
        "level_losses": {},
    }
    if not candidates.entries:
        return result | {"status": "not_evaluated", "message": "no candidate can be fitted to these levels"}
    outcome = evaluate_scheme(candidates, scheme, seed, (dataset_id, scheme.id))
    if outcome.message:
        return result | {"status": "not_evaluated", "message": outcome.message}
    named = [(k, entry.candidate) for k, entry in enumerate(candidates.entries) if entry.candidate]
    failed = outcome.failed if outcome.failed is not None else np.zeros(len(candidates.entries), dtype=int)
    loss = outcome.loss
    result["losses"] = {
        name: {
            "loss": number(loss.loss[k]),
            "standard_error": number(loss.standard_error[k]),
            "interior_loss": number(loss.interior[k]),
            "failed_folds": int(failed[k]),
        }
        for k, name in named
    }
    result["level_losses"] = {name: numbers(loss.levels[k]) for k, name in named}
    result["folds"] = [
        {"fold": label, "observations": size, "losses": {name: number(losses[k]) for k, name in named}}
        | ({} if left_out is None else {"draws": left_out})
        for label, size, losses, left_out in outcome.folds
    ]
    result["folds_per_repeat"] = scheme.folds or len(outcome.folds)
    if outcome.rank_deficient is not None:
        result["rank_deficient_draws"] = {name: int(outcome.rank_deficient[k]) for k, name in named}
    return result | {"status": "evaluated", "message": ""}


def _selection(candidates: CandidateSet, study, dataset, earlier: dict[str, dict]) -> dict:
    records = earlier["fits"]["candidates"]
    rule = make_rule(study, dataset)
    deciding = earlier[f"scheme:{rule.scheme.id}"] if rule.name in LOSS_RULES else None
    cannot = may_decide(deciding)
    obstacles = eligibility(candidates, records, deciding, study, dataset)
    names = [entry.candidate for entry in candidates.entries]
    eligible = np.array([bool(name) and not obstacles[name] for name in names], dtype=bool)
    result = _nothing(records, obstacles)
    choice, gains = Choice(None), {}
    if not cannot and eligible.any():
        evidence = evidence_for(candidates, rule)
        choice = make_choice(evidence, rule, eligible)
        if rule.name == "supported_gain" and choice.chosen is not None:
            gains = deciding_gains(evidence, choice, eligible, rule.alpha)
        result |= outer_loop(candidates, rule, eligible)
        result |= _chosen(candidates, choice, evidence, rule, eligible, names)
        result |= _resampled(candidates, study, rule, eligible)
    result["reasons"] = candidate_reasons(names, choice, gains, obstacles, records, rule.name, cannot)
    if result["candidate"] is not None:
        result["choice_reason"] = result["reasons"][result["candidate"]].removeprefix("chosen: ")
    result |= _verdict(result["candidate"], records, candidates.data, study, dataset, cannot, eligible)
    return result


def _nothing(records: dict, obstacles: dict) -> dict:
    return {
        "candidate": None,
        "choice": None,
        "choice_reason": "",
        "runner_up": None,
        "margin": None,
        "smallest_loss_candidate": None,
        "threshold": None,
        "loss": None,
        "outer_loss": None,
        "outer_loss_interior": None,
        "outer_choices": {},
        "outer_folds": 0,
        "outer_message": "",
        "interior_candidate": None,
        "bootstrap_share": {},
        "draws_without_choice": None,
        "tied": [],
        "eligible": {name: not obstacles[name] for name in records},
    }


def _chosen(candidates: CandidateSet, choice: Choice, evidence, rule, eligible, names: list[str]) -> dict:
    if choice.chosen is None:
        return {}
    inner = interior_choice(evidence, rule, eligible)
    losses = evidence.level_losses if rule.name in LOSS_RULES else level_losses(candidates)
    loss = weighted_mean(losses[choice.chosen], evidence.level_weights)
    tied = [names[k] for k in choice.tied]
    return {
        "candidate": names[choice.chosen],
        "choice": "tie" if tied else "decided",
        "runner_up": None if choice.runner_up is None else names[choice.runner_up],
        "margin": number(choice.margin),
        "smallest_loss_candidate": None if choice.smallest is None else names[choice.smallest],
        "threshold": number(choice.threshold),
        "loss": number(loss),
        "interior_candidate": None if inner is None else names[inner],
        "tied": tied,
    }


def _resampled(candidates: CandidateSet, study, rule, eligible: np.ndarray) -> dict:
    scheme = next((scheme for scheme in study.validation if scheme.scheme == "bootstrap"), None)
    if scheme is None or candidates.data.levels.size < 3:
        return {}
    if scheme.unit == "series" and len(candidates.data.series) < 2:
        return {}
    return resampled_selection(candidates, rule, scheme, eligible)


def _verdict(chosen, records: dict, data: DatasetArrays, study, dataset, cannot: str, eligible) -> dict:
    if chosen is not None:
        target = study.selection.target
        evaluated = study.stimulus if dataset.evaluation == "inverse" else study.response
        verdict, reason = judge(
            records[chosen],
            data.levels.size,
            data.rows.size > data.levels.size,
            None if target is None else target.expanded,
            evaluated.unit,
        )
        return {"verdict": verdict, "verdict_reason": reason}
    if not any(record["status"] == "fitted" for record in records.values()):
        why = next(iter(records.values()))["message"]
        return {"verdict": "not_evaluated", "verdict_reason": f"no candidate can be fitted: {why}"}
    if cannot:
        return {"verdict": "not_evaluated", "verdict_reason": cannot}
    return {"verdict": "inadequate", "verdict_reason": "none of the candidates is eligible"}
