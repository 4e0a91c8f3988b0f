"""The chosen function of one dataset: equation, coefficients, scaled basis, values with bands."""

from __future__ import annotations

import re

from fitlib.report.quantities import Quantities
from fitlib.report.rounding import exact, is_number, place_number, powered, table_number, text_number, with_unit
from fitlib.report.standing import chosen_row, unusable
from fitlib.report.table import Table, make_table

POINTS = 11  # rows of the table of values


def function_part(result: dict, quantities: Quantities) -> dict | None:
    """Words and tables about the chosen function; None where none was chosen."""
    row = chosen_row(result)
    if row is None or not row.get("terms"):
        return None
    mark = unusable(result)
    return {
        "mark": mark,
        "equation": _equation(row, quantities),
        "coefficients": _coefficients(row, quantities, mark),
        "shift": " ".join(part for part in (_shift(row, quantities), _short_form(result)) if part),
        "scaled": _scaled(row, mark),
        "scaled_words": _scaled_words(row),
        "points": _values(result, quantities),
        "excursion": excursion_words(row, quantities),
    }


def _power(term: str) -> int | None:
    found = re.fullmatch(r"x\^(\d+)", term)
    return int(found[1]) if found else None


def _equation(row: dict, quantities: Quantities) -> str:
    """Which quantity the function gives from which."""
    powers = [_power(term["term"]) for term in row["terms"]]
    left, right = quantities.fitted, quantities.across
    where = f"x is {right['quantity']}" + (f" in {right['unit']}" if right["unit"] not in ("", "1") else "")
    left_words = with_unit_words(left)
    if None in powers:
        return f"{left_words} = sum of coefficient · term, where {where}."
    factors = {0: "", 1: " · x"}
    terms = " + ".join(f"c{power}" + factors.get(power, f" · x^{power}") for power in powers)
    return f"{left_words} = {terms}, where {where}."


def with_unit_words(quantity: dict) -> str:
    """A quantity and the unit its numbers are in."""
    unit = quantity["unit"]
    return quantity["quantity"] if unit in ("", "1") else f"{quantity['quantity']} in {unit}"


def _coefficient_unit(term: str, quantities: Quantities) -> str:
    power = _power(term)
    below = powered(quantities.across["unit"], -power) if power else ""
    return " · ".join(part for part in (quantities.fitted["unit"], below) if part not in ("", "1")) or "1"


def _marked(caption: str, mark: str) -> str:
    return f"{caption} – {mark}" if mark else caption


def _coefficients(row: dict, quantities: Quantities, mark: str) -> Table | None:
    rows = [
        [
            term["term"],
            exact(term.get("estimate")),
            table_number(term.get("standard_uncertainty"), 3),
            _coefficient_unit(term["term"], quantities),
        ]
        for term in row["terms"]
    ]
    note = (
        "All digits are needed: the coefficients depend on each other, and rounding them one by one to their "
        "uncertainties can move the function by more than its uncertainty."
    )
    columns = ["term", "#estimate", "#standard uncertainty", "unit"]
    return make_table(_marked("Coefficients in powers", mark), columns, rows, note)


def _shift(row: dict, quantities: Quantities) -> str:
    shift = row.get("power_shift")
    if not is_number(shift):
        return ""
    amount = with_unit(text_number(shift, 2), quantities.fitted["unit"])
    return f"Written in powers, the function shifts by at most {amount} against the issued one over the interval."


def _short_form(result: dict) -> str:
    """The fewest digits that a program with few digits may use."""
    form = (result.get("function") or {}).get("short_form")
    if not form:
        return ""
    terms = ", ".join(f"c{power} = {word}" for power, word in enumerate(form["coefficients"]))
    return (
        f"Where fewer digits have to do, {form['digits']} are enough: with {terms} no converted value moves by more "
        "than 1/20 of its standard uncertainty. With fewer digits it would."
    )


def _scaled_words(row: dict) -> str:
    scaled = row.get("scaled")
    if not scaled:
        return ""
    words = (
        f"The issued function is this one, in {str(scaled.get('basis', 'scaled')).capitalize()} polynomials of "
        f"(x - {exact(scaled.get('centre'))}) / {exact(scaled.get('half_span'))}"
    )
    if points := scaled.get("fixed_points"):
        words += "; it passes through " + ", ".join(f"({exact(x)}, {exact(y)})" for x, y in points)
    return words + ". The file in functions/ holds it with its covariance."


def _scaled(row: dict, mark: str) -> Table | None:
    scaled = row.get("scaled")
    if not scaled:
        return None
    rows = [[str(order), exact(value)] for order, value in enumerate(scaled.get("coefficients") or [])]
    return make_table(_marked("Coefficients in the scaled basis", mark), ["order", "#coefficient"], rows)


def _values(result: dict, quantities: Quantities) -> Table | None:
    """The function at a few places, with its band and interval unless it is inadequate: they do not hold then."""
    curves = result.get("curves") or {}
    grid = curves.get("stimulus") or curves.get("response") or []
    values = (curves.get("candidates") or {}).get(result["selection"].get("candidate"))
    if not grid or not values:
        return None
    places = sorted({round(step * (len(grid) - 1) / (POINTS - 1)) for step in range(POINTS)})
    columns = [quantities.head(quantities.across["quantity"], quantities.across)]
    columns.append(quantities.head(quantities.fitted["quantity"], quantities.fitted))
    bands, inadequate = [], result["selection"]["verdict"] == "inadequate"
    for key, name in (("confidence_band", "confidence band"), ("prediction_interval", "prediction interval")):
        if (band := curves.get(key)) and not inadequate:
            share = f"{name} {table_number(band['coverage_probability'])}"
            columns += [quantities.head(f"{share}, {end}", quantities.fitted) for end in ("lower", "upper")]
            bands += [band["lower"], band["upper"]]
    rows = [[table_number(line[at], 7) for line in (grid, values, *bands)] for at in places]
    note = (
        "The confidence band is of the mean response, the prediction interval of one new observation; the numbers "
        "are coverage probabilities of the fit alone, for the candidate taken as given."
    )
    if inadequate:
        note = "No confidence band and no prediction interval: neither holds for a function that is inadequate."
    caption = _marked("Values of the function", unusable(result))
    return make_table(caption, columns, rows, note if bands or inadequate else "")


def excursion_words(row: dict, quantities: Quantities) -> str:
    """How far the function bends away between levels, and what that means."""
    excursion = row.get("excursion")
    if not excursion or not is_number(excursion.get("amount")):
        return ""
    if excursion["amount"] <= 0:
        return "Between levels, the curve nowhere leaves the observations of its neighbouring levels (no excursion)."
    amount = with_unit(text_number(excursion.get("amount"), 2), quantities.fitted["unit"])
    place = with_unit(place_number(excursion.get("stimulus")), quantities.across["unit"])
    size = text_number(excursion.get("in_residual_sd"), 2)
    relative = f", or {size} residual standard deviations" if is_number(excursion.get("in_residual_sd")) else ""
    return (
        f"Excursion between levels: at most {amount}{relative}, at {place}. It is how far the curve, between two "
        "neighbouring levels, leaves the range of what was observed at both; a curve that swings between levels has "
        "a large one."
    )
