"""Why each candidate was or was not chosen, in one sentence."""

from __future__ import annotations

import numpy as np

from fitlib.analysis.judgement import lack_of_fit_words
from fitlib.analysis.words import figure, listed, probability
from fitlib.numerics.components import SIGNIFICANT
from fitlib.numerics.gains import Gain
from fitlib.numerics.selection import Choice


def candidate_reasons(
    names: list[str],
    choice: Choice,
    gains: dict[int, tuple[int, Gain]],
    obstacles: dict[str, list[str]],
    records: dict,
    rule: str,
    cannot_decide: str,
) -> dict[str, str]:
    """One sentence for every candidate declared.

    Parameters
    ----------
    names : list of str
        Candidate of each entry; empty for probes.
    choice : Choice
    gains : dict of int to (int, Gain)
        For the rule ``supported_gain``: what decided against each candidate.
    obstacles : dict of str to list of str
    records : dict
        Of the step ``fits``.
    rule : str
    cannot_decide : str
        Why the deciding scheme cannot decide; empty when it can.

    Returns
    -------
    dict of str to str
    """
    positions = {name: k for k, name in enumerate(names) if name}
    result = {}
    for name in records:
        if obstacles[name]:
            result[name] = "not eligible: " + "; ".join(obstacles[name])
        elif cannot_decide or choice.chosen is None:
            result[name] = f"no choice: {cannot_decide or 'no eligible candidate has a loss'}"
        else:
            result[name] = _of_eligible(positions[name], names, choice, gains, rule) + _lack(records[name])
    return result


def _lack(record: dict) -> str:
    lack = None if record["exact"] else record["lack_of_fit"]
    return f"; {lack_of_fit_words(lack)}" if lack is not None and lack["p"] < SIGNIFICANT else ""


def _of_eligible(position: int, names: list[str], choice: Choice, gains: dict[int, tuple[int, Gain]], rule: str) -> str:
    if position == choice.chosen:
        tied = f"; tie with {listed([names[k] for k in choice.tied])}" if choice.tied else ""
        return "chosen: " + _why_chosen(names, choice, rule) + tied
    if rule == "supported_gain":
        return _why_no_gain(position, names, choice, gains)
    return _why_not(position, names, choice, rule)


def _why_chosen(names: list[str], choice: Choice, rule: str) -> str:
    if choice.runner_up is None:
        return "the only eligible candidate"
    if rule == "one_standard_error":
        if choice.chosen == choice.smallest:
            return "smallest loss, and no simpler candidate within one standard error of it"
        return f"simplest candidate whose loss is within one standard error of the smallest ({names[choice.smallest]})"
    if rule == "supported_gain":
        return "simplest candidate over which no gain of one with more parameters is supported"
    if rule == "f_test":
        return "dropping its last term is significant, dropping those of higher ones is not"
    return {
        "smallest_loss": "smallest loss",
        "aicc": "smallest AICc on level means",
        "bic": "smallest BIC on level means",
    }[rule]


def _why_no_gain(position: int, names: list[str], choice: Choice, gains: dict[int, tuple[int, Gain]]) -> str:
    if position not in gains:
        return f"not chosen: {names[choice.chosen]} has the smaller loss with as many parameters"
    other, found = gains[position]
    size = found.standard_errors[0]
    looks = f"{figure(abs(size), 2)} paired standard errors, F test on level means {probability(found.p[0])}"
    if other != position:  # a richer candidate is preferred to this one
        return f"not chosen: {names[other]} has a loss lower by {looks}"
    direction = "lower" if size > 0 else "higher"
    return f"not chosen: its gain over {names[choice.chosen]} is not supported (loss {direction} by {looks})"


def _why_not(position: int, names: list[str], choice: Choice, rule: str) -> str:
    value, chosen = choice.values[position], names[choice.chosen]
    if not np.isfinite(value) and rule not in ("aicc", "bic"):
        return "not chosen: it has no loss"
    if rule == "one_standard_error":
        if value <= choice.threshold:
            within = f"loss {figure(value)} is within one standard error of the smallest"
            return f"not chosen: {within}, but {chosen} is simpler"
        return f"not chosen: loss {figure(value)} is above the one-standard-error threshold {figure(choice.threshold)}"
    if rule == "smallest_loss":
        return f"not chosen: loss {figure(value)} against {figure(choice.values[choice.chosen])} of {chosen}"
    if rule == "f_test":
        return f"not chosen: backward elimination stopped at {chosen}"
    return (
        f"not chosen: {rule.upper()} {figure(value, 6)} against {figure(choice.values[choice.chosen], 6)} of {chosen}"
    )
