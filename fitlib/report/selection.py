"""How the choice came about: rankings, outer loop, lack of fit, components."""

from __future__ import annotations

from fitlib.report.quantities import Quantities
from fitlib.report.rounding import (
    NOTHING,
    equals,
    is_number,
    percent,
    place_number,
    probability,
    statistic,
    table_number,
    text_number,
    with_unit,
)
from fitlib.report.standing import chosen_row
from fitlib.report.table import Cell, Table, limited, make_table
from fitlib.report.words import (
    END_LEVELS,
    OPTIMISTIC,
    ROW_WISE_WHY,
    SERIES_WHY,
    UNITS_LEFT_OUT,
    listed,
    sentence,
    spoken,
)


def selection_part(result: dict, quantities: Quantities) -> dict:
    """Words and tables about the choice and the verdict."""
    return {
        "losses": _loss_words(result, quantities),
        "rankings": _rankings(result),
        "notes": _ranking_notes(result),
        "schemes": _schemes(result),
        "outer": _outer(result),
        "levels": _levels(result, quantities),
        "lack_of_fit": _lack_of_fit(result, quantities),
        "components": _components(result, quantities),
        "components_words": _components_words(result),
        "direction": _direction(result, quantities),
        "need": _need(result, quantities),
        "largest_residual": _largest_residual(result, quantities),
    }


def _loss_words(result: dict, quantities: Quantities) -> list[str]:
    """Loss, outer loss and margin in sentences."""
    selection, deciding = result["selection"], result["settings"].get("loss")
    if selection.get("candidate") is None:
        return ["No candidate was chosen, so there is no loss to quote."]
    error = ((chosen_row(result) or {}).get("losses") or {}).get(deciding) or {}
    kind = "Root of the" if quantities.plain_root else "The"
    words = []
    if is_number(selection.get("loss")):
        own = quantities.loss_words(selection["loss"], error.get("standard_error"))
        words.append(f"{kind} deciding loss of {selection['candidate']}: {own}.")
    if is_number(selection.get("outer_loss")):
        words.append(
            f"{kind} outer loss: {quantities.loss_words(selection['outer_loss'])} over all levels, "
            f"{quantities.loss_words(selection.get('outer_loss_interior'))} over interior levels. {OPTIMISTIC}"
        )
    words += [sentence(selection["outer_message"])] if selection.get("outer_message") else []
    words += [f"Tied: {listed(selection['tied'])}."] if selection.get("tied") else []
    if lost := selection.get("draws_without_choice"):
        words.append(f"Bootstrap draws in which the rule takes no candidate: {lost}.")
    if selection.get("runner_up"):
        margin = selection.get("margin")
        by = f"; its loss is {percent(margin)} larger" if is_number(margin) and margin >= 0 else ""
        by = f"; its loss is {percent(-margin)} smaller" if is_number(margin) and margin < 0 else by
        words.append(f"Runner-up: {selection['runner_up']}{by}.")
    return words


CRITERIA = {
    "aicc": "AICc, rows",
    "bic": "BIC, rows",
    "aicc_levels": "AICc, level means",
    "bic_levels": "BIC, level means",
}


def _rankings(result: dict) -> Table | None:
    """What each scheme or criterion would take, and whether it is the chosen one."""
    selection = result["selection"]
    chosen = selection.get("candidate")
    rows = [
        [CRITERIA.get(name, name), candidate or "none", "same" if candidate == chosen else "differs"]
        for name, candidate in (selection.get("rankings") or {}).items()
    ]
    if chosen is not None:
        inner = selection.get("interior_candidate")
        rows.append(["the rule, on interior levels only", inner or "none", "same" if inner == chosen else "differs"])
    note = "Smallest value among the candidates, before the rule prefers simplicity."
    columns = ["scheme or criterion", "=smallest value", "against the chosen candidate"]
    return make_table("Rankings side by side", columns, rows, note)


def _ranking_notes(result: dict) -> list[str]:
    """Why another candidate preferred by some scheme was not taken."""
    selection, rankings = result["selection"], result["selection"].get("rankings") or {}
    chosen, notes = selection.get("candidate"), []
    if chosen is None:
        return notes
    for scheme in result.get("schemes") or []:
        name, taken = scheme["scheme"], rankings.get(scheme["scheme"])
        if taken in (None, chosen) or name == result["settings"].get("loss"):
            continue
        if scheme.get("row_wise"):
            notes.append(f"{name} prefers {taken}. It is not trusted to choose: {ROW_WISE_WHY}.")
        elif scheme.get("unit") == "series":
            notes.append(f"{name} prefers {taken}. It is not trusted to choose: {SERIES_WHY}.")
        else:
            notes.append(f"{name} prefers {taken}; the study names another scheme or rule to decide.")
    inner = selection.get("interior_candidate")
    if inner not in (None, chosen):
        notes.append(f"On interior levels only, the rule takes {inner} instead of {chosen}. {END_LEVELS}")
    elif inner is not None:
        notes.append(f"On interior levels only, the rule takes {inner} as well. {END_LEVELS}")
    return notes


def _schemes(result: dict) -> Table | None:
    """Every scheme declared, those that did not apply too."""
    rows = []
    for scheme in result.get("schemes") or []:
        deficient = {name: count for name, count in (scheme.get("rank_deficient_draws") or {}).items() if count}
        remarks = [sentence(scheme.get("message"))] if scheme.get("message") else []
        remarks += ["Row-wise: copies of a level stand on both sides."] if scheme.get("row_wise") else []
        if deficient:
            counts = listed([f"{name} {count}" for name, count in deficient.items()])
            remarks.append(f"Rank-deficient draws: {counts}.")
        rows.append(
            [
                scheme["scheme"],
                UNITS_LEFT_OUT.get(scheme.get("unit"), spoken(scheme.get("unit"))),
                spoken(scheme.get("status")),
                str(len(scheme.get("folds") or [])),
                table_number(scheme.get("draws")),
                " ".join(remarks) or NOTHING,
            ]
        )
    columns = ["scheme", "leaves out", "status", "#folds or units", "#draws", "remarks"]
    return make_table("Schemes", columns, rows)


def _outer(result: dict) -> Table | None:
    choices = result["selection"].get("outer_choices") or {}
    rows = [[name, str(count)] for name, count in sorted(choices.items(), key=lambda item: (-item[1], item[0]))]
    return make_table("Choices of the outer loop", ["=candidate", "#outer folds that take it"], rows)


def _levels(result: dict, quantities: Quantities) -> Table | None:
    """Levels with the held-out loss of the chosen candidate and of the runner-up."""
    selection, deciding = result["selection"], result["settings"].get("loss")
    evaluated = [scheme for scheme in result.get("schemes") or [] if scheme.get("status") == "evaluated"]
    named = [scheme for scheme in evaluated if scheme["scheme"] == deciding]
    scheme = (named or [s for s in evaluated if s.get("unit") == "level"] or evaluated or [{}])[0]
    per_level = scheme.get("level_losses") or {}
    shown = [name for name in (selection.get("candidate"), selection.get("runner_up")) if name in per_level]
    columns = [quantities.head("level", quantities.stimulus), "#observations", "#series"]
    columns += [quantities.loss_head(f"loss, {name}") for name in shown]
    rows = []
    for at, level in enumerate(result.get("levels") or []):
        losses = [quantities.loss_cell(per_level[name][at] if at < len(per_level[name]) else None) for name in shown]
        cells = [Cell(loss.text) for loss in losses]
        rows.append([table_number(level["level"], 8), str(level["observations"]), str(level["series"]), *cells])
    rows, note = limited(rows, "folds.csv")
    return make_table(f"Levels{', ' + scheme['scheme'] if shown else ''}", columns, rows, note)


def _lack_of_fit(result: dict, quantities: Quantities) -> str:
    """Lack of fit of the chosen candidate in words, with its size in the evaluated unit."""
    row = chosen_row(result)
    if row is None:
        return ""
    lack, within, misfit = row.get("lack_of_fit"), row.get("lack_of_fit_within_series"), row.get("misfit")
    size = ""
    if is_number(misfit):
        amount = with_unit(text_number(misfit, 2), quantities.evaluated["unit"])
        size = f" Its size: the largest mean deviation of a level is {amount}."
    if not lack:
        return "Lack of fit was not tested: no level has replicates over the series." + size
    words = f"Lack of fit against pure error: {_f_test(lack)}."
    if within:
        words += (
            " Whole series differ, which makes pure error large. Against what remains when the means of the series are "
            f"taken out: {_f_test(within)}; this test decides."
        )
    return words + size


def _f_test(lack: dict) -> str:
    if not is_number(lack.get("f")):
        return f"no F, because replicates agree exactly, on {lack.get('denominator_df')} degrees of freedom"
    return (
        f"F = {statistic(lack['f'])} on {lack.get('numerator_df')} and {lack.get('denominator_df')} degrees of "
        f"freedom, p {equals(probability(lack.get('p')))}"
    )


COMPONENTS = (
    ("repeatability", "repeatability", "scatter within a level and series"),
    ("series_deviation", "series deviation", "what a series carries on its own, shared by its observations"),
    ("pure_error", "pure error", "scatter within a level, over all series"),
    ("level_deviation", "level deviation", "what a level carries on its own, shared by its observations"),
)


def _components(result: dict, quantities: Quantities) -> Table | None:
    components = result["selection"].get("components") or {}
    rows = [
        [Cell(name, meaning), table_number(components.get(key), 4), table_number(components.get(f"{key}_evaluated"), 4)]
        for key, name, meaning in COMPONENTS
        if key in components
    ]
    columns = ["component", quantities.head(quantities.fitted["quantity"], quantities.fitted),
               quantities.head(quantities.evaluated["quantity"], quantities.evaluated)]  # fmt: skip
    return make_table("Components of the scatter (standard deviations)", columns, rows)


def _components_words(result: dict) -> str:
    components = result["selection"].get("components") or {}
    if components.get("level_deviation_found"):
        return (
            "The levels carry deviations of their own, larger than their replicates explain. They are counted once, "
            "in the uncertainty of the function; averaging readings does not reduce them."
        )
    return ""


def _direction(result: dict, quantities: Quantities) -> str:
    """Rising less falling, where the observations say which way they were met."""
    found = (result["selection"].get("components") or {}).get("direction_difference")
    if not found:
        return ""
    size = with_unit(text_number(found.get("largest"), 2), quantities.evaluated["unit"])
    place = with_unit(place_number(found.get("at")), quantities.stimulus["unit"])
    test = (
        f" (F = {statistic(found['f'])}, p {equals(probability(found.get('p')))})" if is_number(found.get("f")) else ""
    )
    meaning = (
        "the directions differ; the function runs between them, and averaging readings does not divide the difference"
        if found.get("found")
        else "no difference between the directions was detected"
    )
    return f"Rising less falling: the largest difference has a size of {size}, at {place}{test}; {meaning}."


def _need(result: dict, quantities: Quantities) -> str:
    """The largest expanded uncertainty of a converted reading, and the target."""
    selection, target = result["selection"], result["settings"].get("target")
    largest, met, words = selection.get("largest_expanded_uncertainty"), selection.get("target_met"), ""
    if largest and selection["verdict"] != "inadequate":
        size = with_unit(text_number(largest.get("value"), 2), quantities.evaluated["unit"])
        place = with_unit(place_number(largest.get("at")), quantities.across["unit"])
        words = f"Largest expanded uncertainty of one converted reading, from the fit alone: {size}, at {place}. "
    if met is not None and target:
        needed = with_unit(table_number(target.get("expanded")), quantities.evaluated["unit"])
        words += f"The target of {needed} is {'met' if met else 'not met'} over the interval."
    return words.strip()


def _largest_residual(result: dict, quantities: Quantities) -> str:
    largest = result["selection"].get("largest_residual")
    if not largest:
        return ""
    value = with_unit(text_number(largest.get("value"), 2), quantities.fitted["unit"])
    evaluated = with_unit(text_number(largest.get("in_evaluated_unit"), 2), quantities.evaluated["unit"])
    place = with_unit(place_number(largest.get("stimulus")), quantities.stimulus["unit"])
    converted = f", that is {evaluated} of {quantities.evaluated['quantity']}"
    same = quantities.evaluated["quantity"] == quantities.fitted["quantity"]
    return (
        f"Largest residual: {value}{'' if same else converted}, at {place}, {largest.get('file')} row "
        f"{largest.get('row')}."
    )
