"""From losses to a choice: the rules that a study may name, ties, and the runner-up."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from scipy import stats

from fitlib.numerics.diagnostics import information_criteria
from fitlib.numerics.evidence import Evidence, ManyEvidence
from fitlib.numerics.gains import LEAST_STANDARD_ERRORS, Gain, damped_weights, gain, simplest_unbeaten
from fitlib.numerics.validation import standard_error

#: Losses and criteria that differ by less than this, relative, are not told apart on every machine.
RELATIVE_MARGIN = 1e-8

LOSS_RULES = ("supported_gain", "one_standard_error", "smallest_loss")
LEVEL_RULES = ("f_test", "aicc", "bic")
#: Rules that look at the fits to the level means.
FIT_RULES = (*LEVEL_RULES, "supported_gain")


@dataclass(frozen=True)
class Choice:
    """What a rule takes.

    Attributes
    ----------
    chosen, runner_up, smallest : int or None
        The candidate taken; the one the same rule takes when that is withdrawn; the one with the smallest value.
    tied : tuple of int
        Candidates that the rule cannot tell from the chosen one.
    values : ndarray of shape (m,)
        The rule's own value of each candidate (loss, AICc, BIC, or the level sum of squares for the F test).
    threshold : float
        Largest loss that the one-standard-error rule accepts; nan for other rules.
    margin : float
        Of the runner-up over the chosen one, relative for losses, a difference for criteria; nan without a runner-up.
    """

    chosen: int | None
    runner_up: int | None = None
    smallest: int | None = None
    tied: tuple[int, ...] = ()
    values: np.ndarray = field(default_factory=lambda: np.empty(0))
    threshold: float = np.nan
    margin: float = np.nan


def choose(evidence: Evidence, rule: str, eligible: np.ndarray, alpha: float = 0.05) -> Choice:
    """Apply a rule to the eligible candidates.

    Parameters
    ----------
    evidence : Evidence
    rule : {"supported_gain", "one_standard_error", "smallest_loss", "f_test", "aicc", "bic"}
    eligible : ndarray of shape (m,), bool
    alpha : float
        Of the F test of ``f_test`` and ``supported_gain``.

    Returns
    -------
    Choice
        ``chosen`` is None when no eligible candidate has a value.
    """
    values = _values(evidence, rule)
    open_to = eligible & ~np.isnan(values)
    taken = _take(evidence, values, rule, open_to, alpha)
    if taken is None:
        return Choice(None, values=values)
    others = open_to.copy()
    others[taken] = False
    runner_up = _take(evidence, values, rule, others, alpha)
    return Choice(
        chosen=taken,
        runner_up=runner_up,
        smallest=_simplest(evidence, values, open_to, _least(values, open_to, evidence.floor)),
        tied=_tied(evidence, values, rule, open_to, taken, alpha),
        values=values,
        threshold=_threshold(evidence, values, open_to) if rule == "one_standard_error" else np.nan,
        margin=_margin(values, taken, runner_up, rule, evidence.floor),
    )


def take(evidence: Evidence, rule: str, eligible: np.ndarray, alpha: float = 0.05) -> int | None:
    """The candidate that a rule takes, without ties and runner-up; for outer loops and resamples.

    Parameters
    ----------
    evidence : Evidence
    rule : str
    eligible : ndarray of shape (m,), bool
    alpha : float

    Returns
    -------
    int or None
    """
    values = _values(evidence, rule)
    return _take(evidence, values, rule, eligible & ~np.isnan(values), alpha)


def take_many(evidence: ManyEvidence, rule: str, eligible: np.ndarray, alpha: float = 0.05) -> np.ndarray:
    """What a rule takes in each of many resamples.

    Parameters
    ----------
    evidence : ManyEvidence
    rule : str
    eligible : ndarray of shape (m,), bool
    alpha : float

    Returns
    -------
    ndarray of shape (draws,), int
        -1 where the rule takes nothing.
    """
    if rule == "supported_gain":
        return _take_supported(evidence, eligible, alpha)
    if rule in LOSS_RULES:
        return _take_by_loss(evidence, rule, eligible)
    positions = np.full(evidence.level_weights.shape[1], -1)
    for draw in range(positions.size):
        drawn = evidence.level_weights[:, draw] > 0
        one = Evidence(
            evidence.parameters,
            evidence.level_losses[:, drawn, draw],
            evidence.level_weights[drawn, draw],
            evidence.level_squares[:, draw],
            evidence.floor,
        )
        position = take(one, rule, eligible, alpha)
        positions[draw] = -1 if position is None else position
    return positions


def _take_by_loss(evidence: ManyEvidence, rule: str, eligible: np.ndarray) -> np.ndarray:
    weights = evidence.level_weights / np.maximum(evidence.level_weights.sum(axis=0), np.finfo(float).tiny)
    loss = np.einsum("mld,ld->md", evidence.level_losses, weights)
    loss[~eligible] = np.nan
    value = np.where(np.isnan(loss), np.inf, loss)
    best, draws = np.argmin(value, axis=0), np.arange(value.shape[1])
    limit = np.maximum(value[best, draws], evidence.floor)
    if rule == "one_standard_error":
        levels = (weights > 0).sum(axis=0)
        difference = evidence.level_losses[best, :, draws].T - value[best, draws]
        with np.errstate(divide="ignore", invalid="ignore"):
            error = np.sqrt(levels / (levels - 1) * np.einsum("ld,ld->d", weights**2, difference**2))
        limit = np.maximum(limit, value[best, draws] + np.nan_to_num(error, posinf=0.0))
    within = value <= limit
    return simplest_unbeaten(
        np.zeros((eligible.size, eligible.size, 1), dtype=bool), value, evidence.parameters, within & np.isfinite(value)
    )


def _take_supported(evidence: ManyEvidence, eligible: np.ndarray, alpha: float) -> np.ndarray:
    weights = damped_weights(evidence.level_weights)
    losses = np.einsum("mld,ld->md", evidence.level_losses, weights)
    usable = eligible[:, None] & ~np.isnan(losses)
    order = np.flatnonzero(eligible)
    supported = np.zeros((eligible.size, eligible.size, weights.shape[1]), dtype=bool)
    for k in order:
        for j in order:
            if evidence.parameters[j] > evidence.parameters[k]:
                supported[k, j] = _gain(evidence, weights, k, j).supported(alpha)
    return simplest_unbeaten(supported, losses, evidence.parameters, usable)


def _gain(evidence: ManyEvidence, weights: np.ndarray, simpler: int, richer: int) -> Gain:
    pair = (simpler, richer)
    return gain(
        evidence.level_losses[simpler],
        evidence.level_losses[richer],
        weights,
        tuple(evidence.level_squares[k] for k in pair),
        tuple(int(evidence.parameters[k]) for k in pair),
        (evidence.floor, evidence.floor * evidence.level_weights.sum(axis=0)),
    )


def deciding_gains(
    evidence: Evidence, choice: Choice, eligible: np.ndarray, alpha: float
) -> dict[int, tuple[int, Gain]]:
    """What decided against each candidate under ``supported_gain``.

    Parameters
    ----------
    evidence : Evidence
    choice : Choice
    eligible : ndarray of shape (m,), bool
    alpha : float

    Returns
    -------
    dict of int to (int, Gain)
        For a candidate over which a richer one has a supported gain: that one (the chosen, if it is one of them) and
        its gain. For a richer one than the
        chosen: itself and its gain over the chosen. None for one with as many parameters as the chosen.
    """
    found: dict[int, tuple[int, Gain]] = {}
    usable = [int(k) for k in np.flatnonzero(eligible) if np.isfinite(choice.values[k])]
    for k in usable:
        richer = [j for j in usable if evidence.parameters[j] > evidence.parameters[k]]
        gains = [(j, gain_between(evidence, k, j)) for j in richer]
        better = [item for item in gains if item[1].supported(alpha)[0]]
        if better and k != choice.chosen:
            found[k] = max(better, key=lambda item: (item[0] == choice.chosen, item[1].standard_errors[0]))
        elif evidence.parameters[k] > evidence.parameters[choice.chosen]:
            found[k] = (k, gain_between(evidence, choice.chosen, k))
    return found


def _as_many(evidence: Evidence) -> ManyEvidence:
    return ManyEvidence(
        evidence.parameters,
        np.asarray(evidence.level_losses, dtype=float)[:, :, None],
        np.asarray(evidence.level_weights, dtype=float)[:, None],
        np.asarray(evidence.level_squares, dtype=float)[:, None],
        evidence.floor,
    )


def gain_between(evidence: Evidence, simpler: int, richer: int) -> Gain:
    """Gain of a richer candidate over a simpler one on all used observations.

    Parameters
    ----------
    evidence : Evidence
    simpler, richer : int
        Numbers of the candidates.

    Returns
    -------
    Gain
        Arrays of shape (1,).
    """
    many = _as_many(evidence)
    return _gain(many, damped_weights(many.level_weights), simpler, richer)


def _values(evidence: Evidence, rule: str) -> np.ndarray:
    if rule in LOSS_RULES:
        return evidence.level_losses @ evidence.level_weights / evidence.level_weights.sum()
    if rule == "f_test":
        return np.asarray(evidence.level_squares, dtype=float)
    root = np.sqrt(evidence.level_weights / evidence.level_weights.mean())
    least = evidence.floor * evidence.level_weights.sum()
    scaled = np.maximum(evidence.level_squares, least) / evidence.level_weights.mean()
    pairs = zip(scaled, evidence.parameters, strict=True)
    criteria = [information_criteria(square, root, int(p)) if np.isfinite(square) else None for square, p in pairs]
    return np.array([np.nan if item is None else getattr(item, rule) for item in criteria])


def _take(evidence: Evidence, values: np.ndarray, rule: str, open_to: np.ndarray, alpha: float) -> int | None:
    if not open_to.any():
        return None
    if rule == "f_test":
        return _backward(evidence, open_to, alpha)
    if rule == "supported_gain":
        position = int(_take_supported(_as_many(evidence), open_to, alpha)[0])
        return None if position < 0 else position
    limit = _least(values, open_to, evidence.floor)
    if rule == "one_standard_error":
        limit = max(limit, _threshold(evidence, values, open_to))
    return _simplest(evidence, values, open_to, limit)


def _least(values: np.ndarray, open_to: np.ndarray, floor: float) -> float:
    least = float(np.min(values[open_to]))
    return floor if 0 <= least < floor else least


def _threshold(evidence: Evidence, values: np.ndarray, open_to: np.ndarray) -> float:
    """Smallest loss plus one standard error of that loss (Breiman et al. 1984, sec. 3.4.3)."""
    best = int(np.flatnonzero(open_to)[np.argmin(values[open_to])])
    error = standard_error(evidence.level_losses[best : best + 1], evidence.level_weights)[0]
    return max(float(values[best] + (error if np.isfinite(error) else 0.0)), evidence.floor)


def _simplest(evidence: Evidence, values: np.ndarray, open_to: np.ndarray, limit: float) -> int | None:
    within = [k for k in np.flatnonzero(open_to) if values[k] <= limit]
    return int(min(within, key=lambda k: (evidence.parameters[k], values[k], k))) if within else None


def _backward(evidence: Evidence, open_to: np.ndarray, alpha: float) -> int:
    """Backward elimination in a nested chain (Draper & Smith 1998, sec. 15.4): drop while it is not significant."""
    chain = sorted(np.flatnonzero(open_to), key=lambda k: evidence.parameters[k])
    while len(chain) > 1 and not f_probability(evidence, chain[-2], chain[-1]) < alpha:
        chain.pop()
    return int(chain[-1])


def f_probability(evidence: Evidence, smaller: int, larger: int) -> float:
    """Upper tail probability of the F test of a larger member against a smaller one, on level means.

    Parameters
    ----------
    evidence : Evidence
    smaller, larger : int
        Numbers of the members.

    Returns
    -------
    float
        1 when the larger member brings nothing, or both fit exactly.
    """
    spare = evidence.level_weights.size - evidence.parameters[larger]
    extra = evidence.parameters[larger] - evidence.parameters[smaller]
    gain = evidence.level_squares[smaller] - evidence.level_squares[larger]
    floor = evidence.floor * evidence.level_weights.sum()
    if spare < 1 or evidence.level_squares[smaller] <= floor:
        return 1.0
    if evidence.level_squares[larger] <= floor:
        return 0.0
    return float(stats.f.sf(gain / extra / (evidence.level_squares[larger] / spare), extra, spare))


def _tied(evidence, values, rule, open_to, taken, alpha) -> tuple[int, ...]:
    others = [int(k) for k in np.flatnonzero(open_to) if k != taken]
    if rule == "f_test":
        return tuple(k for k in others if _flips_f_test(evidence, open_to, k, taken, alpha))
    if rule == "supported_gain":
        return tuple(k for k in others if _gain_tie(evidence, values, k, taken, alpha))
    if rule in LEVEL_RULES:
        return tuple(k for k in others if _close(values[k], values[taken]))
    limit = _threshold(evidence, values, open_to) if rule == "one_standard_error" else np.inf
    return tuple(k for k in others if _loss_tie(evidence, values, limit, k, taken))


def _loss_tie(evidence: Evidence, values: np.ndarray, limit: float, other: int, taken: int) -> bool:
    if max(values[other], values[taken]) <= evidence.floor:
        return False  # equal losses: the simplest wins, on every machine
    if np.isfinite(limit):
        simpler = evidence.parameters[other] <= evidence.parameters[taken]
        if simpler and _close(values[other], limit):
            return True
        if _close(values[taken], limit) and evidence.parameters[other] > evidence.parameters[taken]:
            return values[other] <= limit
    elif _close(values[other], values[taken]):
        return True
    if evidence.parameters[other] != evidence.parameters[taken] or values[other] > limit:
        return False
    return abs(values[other] - values[taken]) < paired_standard_error(evidence, other, taken)


def paired_standard_error(evidence: Evidence, first: int, second: int) -> float:
    """Standard error of the difference of two losses, paired by level.

    Parameters
    ----------
    evidence : Evidence
    first, second : int

    Returns
    -------
    float
    """
    difference = evidence.level_losses[first] - evidence.level_losses[second]
    return float(standard_error(difference[None, :], evidence.level_weights)[0])


def _gain_tie(evidence: Evidence, values: np.ndarray, other: int, taken: int, alpha: float) -> bool:
    if evidence.parameters[other] == evidence.parameters[taken]:
        return _loss_tie(evidence, values, np.inf, other, taken)
    pair = sorted((other, taken), key=lambda k: evidence.parameters[k])
    found = gain_between(evidence, *pair)
    return _close(found.standard_errors[0], LEAST_STANDARD_ERRORS) or _close(found.p[0], alpha)


def _flips_f_test(evidence: Evidence, open_to: np.ndarray, other: int, taken: int, alpha: float) -> bool:
    chain = sorted(np.flatnonzero(open_to), key=lambda k: evidence.parameters[k])
    places = {int(k): place for place, k in enumerate(chain)}
    if abs(places[other] - places[taken]) != 1:
        return False
    smaller, larger = sorted((other, taken), key=lambda k: places[k])
    return _close(f_probability(evidence, smaller, larger), alpha)


def _close(a: float, b: float) -> bool:
    return bool(a == b or abs(a - b) <= RELATIVE_MARGIN * max(abs(a), abs(b)))


def _margin(values: np.ndarray, taken: int, runner_up: int | None, rule: str, floor: float) -> float:
    if runner_up is None:
        return np.nan
    difference = float(values[runner_up] - values[taken])
    if rule in ("aicc", "bic"):
        return difference
    return difference / float(values[taken]) if values[taken] > max(floor, 0.0) else np.nan
