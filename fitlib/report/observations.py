"""Observations that want a look: exclusions, suspects, verification points; and the design."""

from __future__ import annotations

from fitlib.report.quantities import Quantities
from fitlib.report.rounding import NOTHING, table_number
from fitlib.report.table import Cell, Table, limited, make_table
from fitlib.report.words import counted, sentence


def observations_part(result: dict, quantities: Quantities) -> dict:
    """Words and tables about the observations."""
    return {
        "design": _design(result),
        "exclusions": _exclusions(result, quantities),
        "suspects": _suspects(result, quantities),
        "verification": _verification(result, quantities),
    }


def _design(result: dict) -> list[str]:
    design = result.get("design") or {}
    words = [
        f"{counted(design.get('observations') or 0, 'observation', 'observations')} used, "
        f"{counted(design.get('levels') or 0, 'level', 'levels')}, {design.get('series') or 0} series, "
        f"{'with' if design.get('replicates') else 'without'} replicates."
    ]
    if design.get("largest_supported_parameters") is not None:
        words.append(f"The design supports candidates of at most {design['largest_supported_parameters']} parameters.")
    return words + [sentence(note) for note in design.get("notes") or []]


def _rows_where(result: dict, key: str, value: str) -> list[int]:
    return [at for at, entry in enumerate((result.get("observations") or {}).get(key) or []) if entry == value]


def _place(observations: dict, at: int) -> list[str]:
    names = ("file", "row", "series", "direction")
    return [str(observations[name][at]) if observations.get(name) else NOTHING for name in names]


def _number(observations: dict, name: str, at: int, digits: int = 8) -> str:
    column = observations.get(name)
    return table_number(column[at], digits) if column else NOTHING


def _exclusions(result: dict, quantities: Quantities) -> Table | None:
    """Observations left out on purpose: why, by whom, when."""
    observations = result.get("observations") or {}
    rows = [
        [*_place(observations, at), _number(observations, "stimulus", at), _number(observations, "response", at),
         observations["reason"][at] or "no reason given"]
        for at in _rows_where(result, "state", "excluded")
    ]  # fmt: skip
    rows, note = limited(rows, "observations.csv")
    columns = ["file", "#row", "series", "direction", *_value_heads(quantities), "reason (person, date)"]
    return make_table("Excluded observations", columns, rows, note)


def _value_heads(quantities: Quantities) -> list[str]:
    return [
        quantities.head(quantities.stimulus["quantity"], quantities.stimulus),
        quantities.head(quantities.response["quantity"], quantities.response),
    ]


def _suspects(result: dict, quantities: Quantities) -> Table | None:
    """Flagged observations; they were kept."""
    observations = result.get("observations") or {}
    rows = [
        [*_place(observations, at), _number(observations, "stimulus", at), _number(observations, "response", at),
         _number(observations, "residual", at, 4), _number(observations, "studentized_residual", at, 3),
         _number(observations, "leverage", at, 3)]
        for at in _rows_where(result, "flag", "suspect")
    ]  # fmt: skip
    rows, note = limited(rows, "observations.csv")
    columns = ["file", "#row", "series", "direction", *_value_heads(quantities),
               quantities.head("residual", quantities.fitted), "#studentized residual", "#leverage"]  # fmt: skip
    note = f"Suspect observations are flagged and kept; only a person can exclude them. {note}".strip()
    return make_table("Suspect observations, kept", columns, rows, note)


def _against_interval(point: dict) -> list[object]:
    """Ends of the prediction interval of a point, and whether it lies within them."""
    within = point.get("within_prediction_interval")
    ends = [table_number(point.get(f"prediction_{end}"), 6) for end in ("lower", "upper")]
    word = NOTHING if within is None else "yes" if within else "outside"
    return [*ends, Cell(word, kind="tie" if within is False else "")]


def _verification(result: dict, quantities: Quantities) -> Table | None:
    """Observations kept out of fitting and choosing, against the chosen function."""
    points = result.get("verification") or []
    holds = result["selection"]["verdict"] != "inadequate"
    known = holds and any(point.get("within_prediction_interval") is not None for point in points)
    rows = [
        [str(point.get("file")), str(point.get("row")), str(point.get("series") or NOTHING),
         *(table_number(point.get(key), 8) for key in ("stimulus", "response", "fitted")),
         table_number(point.get("residual"), 4), table_number(point.get("evaluated_deviation"), 4),
         *(_against_interval(point) if known else ())]
        for point in points
    ]  # fmt: skip
    rows, note = limited(rows, "verification.csv")
    columns = ["file", "#row", "series", *_value_heads(quantities),
               quantities.head(f"fitted {quantities.fitted['quantity']}", quantities.fitted),
               quantities.head("residual", quantities.fitted),
               quantities.head("deviation, evaluated", quantities.evaluated)]  # fmt: skip
    note = f"These took no part in fitting or choosing. {note}".strip()
    if known:
        columns += [
            quantities.head(f"prediction interval 0.95, {end}", quantities.fitted) for end in ("lower", "upper")
        ]
        columns.append("within")
    elif points and not holds:
        note += " No prediction interval: it does not hold for a function that is inadequate."
    return make_table("Verification points", columns, rows, note)
