"""The part of the report about one dataset."""

from __future__ import annotations

from fitlib.report.candidates import candidates_table, fits_table, losses_table, shapes_table
from fitlib.report.function import function_part
from fitlib.report.observations import observations_part
from fitlib.report.pictures import inline_svg
from fitlib.report.quantities import Quantities
from fitlib.report.selection import selection_part
from fitlib.report.standing import choice_words, chosen_row, is_unstable, stability_words, unusable
from fitlib.report.table import Table, make_table
from fitlib.report.words import VERDICT_MEANING, VERDICTS, sentence, spoken

CAPTIONS = {
    "data": "Observations, functions, and deviations from the chosen function",
    "loss": "Loss against number of parameters: what is held out, and what was fitted",
    "level_loss": "Held-out loss of each level",
    "residuals": "Residuals of the chosen function",
}


def dataset_part(result: dict, figures: dict[str, str], number: int) -> dict:
    """What the template needs for one dataset.

    Parameters
    ----------
    result : dict
        The result of the dataset.
    figures : dict of str to str
        SVG text by name.
    number : int
        Position of the dataset in the report, from 1.

    Returns
    -------
    dict
        Text, tables and figures by name.
    """
    selection, quantities = result["selection"], Quantities(result)
    return {
        "anchor": f"dataset-{number}",
        "name": result["dataset"],
        "verdict": {"key": selection["verdict"], "text": VERDICTS[selection["verdict"]]},
        "candidate": selection.get("candidate"),
        "choice": choice_words(result),
        "tie": selection.get("choice") == "tie",
        "stability": stability_words(result) if is_unstable(result) else "",
        "verdict_reason": sentence(selection.get("verdict_reason")),
        "verdict_meaning": VERDICT_MEANING[selection["verdict"]],
        "choice_reason": _choice_reason(result),
        "interval": quantities.interval(),
        "warnings": list(result.get("warnings") or []),
        "function": function_part(result, quantities),
        "candidates": candidates_table(result, quantities),
        "losses": losses_table(result, quantities),
        "fits": fits_table(result, quantities),
        "shapes": shapes_table(result, quantities),
        "selection": selection_part(result, quantities),
        "observations": observations_part(result, quantities),
        "figures": _figures(figures, number, unusable(result)),
        "record": _record(result),
    }


def _choice_reason(result: dict) -> str:
    """Why this candidate: the reason of the choice, else that of the candidate."""
    reason = result["selection"].get("choice_reason") or (chosen_row(result) or {}).get("reason") or ""
    return sentence(reason.removeprefix("chosen: "))


def _figures(figures: dict[str, str], number: int, mark: str) -> list[dict]:
    """The figures in the report's order; one that is missing says so, and a function not to be used is marked."""
    found = []
    for name, caption in CAPTIONS.items():
        text = figures.get(name)
        svg = inline_svg(text, f"d{number}") if text else ""
        found.append({"caption": caption + (f" ({mark})" if mark else ""), "svg": svg})
    return found


def _record(result: dict) -> Table | None:
    record = result["settings"].get("record") or {}
    settings = [[spoken(key), spoken(result["settings"].get(key))] for key in ("function", "evaluation", "weighting")]
    rows = [[spoken(key), str(record[key])] for key in sorted(record)] + settings
    return make_table("Record", ["entry", "what it says"], rows)
