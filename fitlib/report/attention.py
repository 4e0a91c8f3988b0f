"""What in the results needs a person, dataset by dataset; and the warnings that say nothing more than that."""

from __future__ import annotations

from fitlib.report.quantities import Quantities
from fitlib.report.rounding import is_number, table_number, text_number, with_unit
from fitlib.report.standing import chosen_row, is_unstable, stability_words
from fitlib.report.words import UNUSABLE, counted, listed, sentence

KINDS = {
    "failed": "No result",
    "verdict": "The function must not be used",
    "tie": "A tie: the simplest candidate is issued, a person has to decide",
    "target": "The target is not met",
    "unstable": "Decided by the rule, not stable",
    "verification": "Verification points outside their prediction interval",
    "suspect": "Suspect observations, kept: only a person can exclude them",
}
# A warning that holds these words is not repeated where the dataset stands under this kind.
SAID_ALREADY = {
    "tie": "choice is a tie",
    "target": "target",
    "unstable": "choice is not stable",
    "verification": "prediction interval",
    "suspect": "suspect",
}
_NAMED = 5  # rows of files named; the rest is counted


def attention_part(results: list[dict], failures: list[dict]) -> list[dict]:
    """Groups of datasets that need a person, in order of urgency.

    Parameters
    ----------
    results, failures : list of dict

    Returns
    -------
    list of dict
        ``head`` and ``entries``; each entry with ``anchor`` (empty for a failure), ``name`` and ``text``.
    """
    groups: dict[str, list[dict]] = {kind: [] for kind in KINDS}
    groups["failed"] = [{"anchor": "", "name": one["dataset"], "text": one["message"]} for one in failures]
    for number, result in enumerate(results, start=1):
        for kind, text in needs(result).items():
            groups[kind].append({"anchor": f"dataset-{number}", "name": result["dataset"], "text": text})
    return [{"head": KINDS[kind], "entries": entries} for kind, entries in groups.items() if entries]


def needs(result: dict) -> dict[str, str]:
    """What needs a person in one dataset: a sentence by kind."""
    found = {
        "verdict": _verdict(result),
        "tie": _tie(result),
        "target": _target(result),
        "unstable": stability_words(result) if is_unstable(result) else "",
        "verification": _verification(result),
        "suspect": _suspects(result),
    }
    return {kind: text for kind, text in found.items() if text}


def other_warnings(result: dict) -> list[str]:
    """The warnings that say more than what stands under what needs a person."""
    said = [SAID_ALREADY[kind] for kind in needs(result) if kind in SAID_ALREADY]
    return [text for text in result.get("warnings") or [] if not any(words in text for words in said)]


def _verdict(result: dict) -> str:
    verdict = result["selection"]["verdict"]
    if verdict not in UNUSABLE:
        return ""
    reason = sentence(result["selection"].get("verdict_reason")) or "No reason is given."
    return f"{verdict.replace('_', ' ').capitalize()}. {reason}"


def _tie(result: dict) -> str:
    selection = result["selection"]
    if selection.get("choice") != "tie":
        return ""
    others = listed(selection.get("tied") or [selection.get("runner_up") or "another candidate"])
    return f"{selection.get('candidate')} is issued; {others} cannot be told apart from it."


def _target(result: dict) -> str:
    """Which of the two sizes is above the target; the uncertainty counts only where it holds."""
    selection, target, quantities = result["selection"], result["settings"].get("target"), Quantities(result)
    if selection.get("target_met") is not False or not target:
        return ""
    unit, words = quantities.evaluated["unit"], []
    expanded = (selection.get("largest_expanded_uncertainty") or {}).get("value")
    if selection["verdict"] != "inadequate":
        words.append(("the expanded uncertainty of one converted reading reaches", expanded))
    words.append(("the largest mean deviation of a level is", (chosen_row(result) or {}).get("misfit")))
    above = [f"{name} {with_unit(text_number(value, 2), unit)}" for name, value in words
             if is_number(value) and value > target["expanded"]]  # fmt: skip
    needed = with_unit(table_number(target["expanded"]), unit)
    return f"{needed} is needed; {listed(above) or 'whether it is met could not be shown'}."


def _verification(result: dict) -> str:
    points = result.get("verification") or []
    outside = [point for point in points if point.get("within_prediction_interval") is False]
    if not outside or result["selection"]["verdict"] == "inadequate":
        return ""
    count = f"{len(outside)} of {counted(len(points), 'point lies', 'points lie')} outside"
    places = _places([(point.get("file"), point.get("row")) for point in outside])
    return f"{count}: {places}. By chance, one in twenty does."


def _suspects(result: dict) -> str:
    rows = result.get("observations") or {}
    found = [at for at, flag in enumerate(rows.get("flag") or []) if flag]
    if not found:
        return ""
    places = _places([(rows["file"][at], rows["row"][at]) for at in found])
    return f"{counted(len(found), 'observation', 'observations')}: {places}."


def _places(places: list[tuple]) -> str:
    named = [f"{file} row {row}" for file, row in places[:_NAMED]]
    more = len(places) - len(named)
    return listed(named + ([f"{more} more"] if more else []))
