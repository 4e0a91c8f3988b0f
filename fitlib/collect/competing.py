"""Tables of what competed: candidates, coefficients, schemes, folds."""

from __future__ import annotations

import math
from collections.abc import Iterator

from fitlib.collect.cells import Column, Table

WITHIN_SERIES = (
    "lack of fit against what remains when the means of the series are taken out; it decides where whole series differ"
)

CANDIDATES = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("family", "text", "", "Kind of function."),
    Column("candidate", "text", "", "Member of the family that can be chosen."),
    Column("degree", "whole_number", "1", "Degree of the polynomial."),
    Column("parameters", "whole_number", "1", "Number of free coefficients."),
    Column("status", "text", "", "fitted or not_fitted."),
    Column("message", "text", "", "Why the candidate was not fitted, or what the fit warns of."),
    Column("degrees_of_freedom", "whole_number", "1", "Observations used less parameters."),
    Column("level_degrees_of_freedom", "whole_number", "1", "Levels less parameters; what a candidate is judged by."),
    Column("residual_sum_of_squares", "number", "weighted^2", "Sum of weighted squared residuals of the fit."),
    Column("residual_standard_deviation", "number", "weighted", "Root of that sum over degrees_of_freedom."),
    Column("fitted_point_loss", "number", "fitted^2", "Loss at the fitted points; too small, never decides."),
    Column("aicc", "number", "1", "Information criterion with small-sample correction over observations; shown only."),
    Column("bic", "number", "1", "Bayesian information criterion over observations; shown only."),
    Column("aicc_levels", "number", "1", "The same as aicc over level means; what the rule aicc uses."),
    Column("bic_levels", "number", "1", "The same as bic over level means; what the rule bic uses."),
    Column("condition_number", "number", "1", "Condition of the scaled least-squares problem."),
    Column("monotone", "boolean", "", "Whether the function rises or falls throughout the measuring interval."),
    Column("turning_points", "text", "stimulus", "Where it turns inside the interval, separated by semicolons."),
    Column(
        "excursion_stimulus",
        "number",
        "stimulus",
        "Where it leaves the range of both neighbouring levels most.",
    ),
    Column("excursion_amount", "number", "fitted", "By how much it leaves that range; 0 when it never does."),
    Column("excursion_in_residual_sd", "number", "1", "The same, in residual standard deviations."),
    Column("excursion_in_span", "number", "1", "The same, as a share of the span of the fitted quantity."),
    Column("lack_of_fit_f", "number", "1", "F ratio of lack of fit over pure error."),
    Column("lack_of_fit_p", "number", "1", "Probability of so large a ratio by chance, if the function were right."),
    Column("lack_of_fit_numerator_df", "whole_number", "1", "Degrees of freedom of lack of fit."),
    Column("lack_of_fit_denominator_df", "whole_number", "1", "Degrees of freedom of pure error."),
    Column("lack_of_fit_within_series_f", "number", "1", f"F ratio: {WITHIN_SERIES}."),
    Column("lack_of_fit_within_series_p", "number", "1", f"Probability of so large an F by chance: {WITHIN_SERIES}."),
    Column("lack_of_fit_sum_of_squares", "number", "weighted^2", "Sum of squares of lack of fit."),
    Column("pure_error_sum_of_squares", "number", "weighted^2", "Sum of squares within levels."),
    Column("misfit", "number", "evaluated", "Largest mean residual of a level, in the quantity that the user wants."),
    Column("serial_ratio", "number", "1", "Von Neumann ratio of the level residuals; near 2 without a pattern."),
    Column("serial_p", "number", "1", "Probability of so small a ratio by chance."),
    Column("power_shift", "number", "fitted", "Largest shift caused by rounding the coefficients in powers of x."),
    Column("bootstrap_share", "number", "1", "Share of the draws in which the whole rule takes this candidate."),
    Column("outer_choices", "whole_number", "1", "Outer folds in which the whole rule takes this candidate."),
    Column("eligible", "boolean", "", "Whether the study's requirements let it be chosen."),
    Column("chosen", "boolean", "", "Whether it is the issued function."),
    Column("reason", "text", "", "Why it was chosen, or why not."),
)

COEFFICIENTS = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("candidate", "text", "", "Candidate that was fitted, chosen or not."),
    Column("basis", "text", "", "scaled: sum of c_k T_k((x - centre) / half_span); power: sum of c_k x^k."),
    Column("term", "text", "", "T0, T1... (scaled) or x^0, x^1... (power)."),
    Column("estimate", "number", "coefficient", "Coefficient; the issued function is the one in functions/, not this."),
    Column("standard_uncertainty", "number", "coefficient", "From the fit only; empty where it was not computed."),
    Column("centre", "number", "abscissa", "Centre of the scaled variable (scaled basis)."),
    Column("half_span", "number", "abscissa", "Half span of the scaled variable (scaled basis)."),
    Column("fixed_points", "text", "", "Points the function passes through (scaled basis), as x : value."),
    Column("chosen", "boolean", "", "Whether the candidate is the issued function."),
    Column("verdict", "text", "", "Verdict on the issued function, which must be adequate; empty for the others."),
)

SCHEMES = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("scheme", "text", "", "How observations were held out."),
    Column("status", "text", "", "evaluated or not_evaluated."),
    Column("message", "text", "", "Why it was not evaluated, or what it warns of."),
    Column("unit", "text", "", "What is held out as one: level, series or observation."),
    Column("row_wise", "boolean", "", "Whether observations of one level stand on both sides, so that losses are low."),
    Column("decides", "boolean", "", "Whether the study's rule uses this scheme."),
    Column("folds", "whole_number", "1", "Folds evaluated."),
    Column("draws", "whole_number", "1", "Resamples drawn (bootstrap)."),
    Column("smallest_loss_candidate", "text", "", "Candidate with the smallest loss under this scheme."),
)

FOLDS = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("scheme", "text", "", "How observations were held out."),
    Column("fold", "text", "", "What was held out; for the bootstrap the unit, over the draws without it."),
    Column("candidate", "text", "", "Candidate that was fitted without the fold."),
    Column("observations", "whole_number", "1", "Observations held out."),
    Column("draws", "whole_number", "1", "Draws that left the unit out (bootstrap)."),
    Column("loss", "number", "fitted^2", "Loss of the fold; empty where the fit failed."),
)

_EXCURSION = ("stimulus", "amount", "in_residual_sd", "in_span")
_SERIAL = ("ratio", "p")
_LACK_OF_FIT = {
    "f": "lack_of_fit_f",
    "p": "lack_of_fit_p",
    "numerator_df": "lack_of_fit_numerator_df",
    "denominator_df": "lack_of_fit_denominator_df",
    "sum_of_squares": "lack_of_fit_sum_of_squares",
    "pure_error_sum_of_squares": "pure_error_sum_of_squares",
}
WITHIN_SERIES_COLUMNS = {"f": "lack_of_fit_within_series_f", "p": "lack_of_fit_within_series_p"}
_NESTED = ("turning_points", "excursion", "lack_of_fit", "serial")


def candidates_table(results: list[dict], schemes: list[str]) -> Table:
    """One row per dataset and candidate declared, failed ones too."""
    losses = tuple(column for scheme in schemes for column in _loss_columns(scheme))
    place = next(i for i, column in enumerate(CANDIDATES) if column.name == "bootstrap_share")
    columns = CANDIDATES[:place] + losses + CANDIDATES[place:]
    return Table("candidates.csv", columns, _candidates(results))


def coefficients_table(results: list[dict]) -> Table:
    """One row per dataset, candidate fitted, basis and term."""
    rows = (row for result in results for item in result["candidates"] for row in _coefficients(result, item))
    return Table("coefficients.csv", COEFFICIENTS, rows)


def schemes_table(results: list[dict]) -> Table:
    """One row per dataset and scheme, those that did not apply too."""
    return Table("schemes.csv", SCHEMES, _schemes(results))


def folds_table(results: list[dict]) -> Table:
    """One row per dataset, scheme, fold and candidate."""
    return Table("folds.csv", FOLDS, _folds(results))


def _loss_columns(scheme: str) -> Iterator[Column]:
    held = f"under {scheme}"
    yield Column(f"loss_{scheme}", "number", "fitted^2", f"Loss {held}: mean weighted squared held-out residual.")
    yield Column(f"loss_{scheme}_se", "number", "fitted^2", f"Standard error of the loss {held}.")
    yield Column(f"loss_{scheme}_interior", "number", "fitted^2", f"Loss {held} without the two end levels.")
    yield Column(f"loss_{scheme}_failed_folds", "whole_number", "1", f"Folds {held} in which the fit failed.")
    if scheme.startswith("bootstrap"):
        meaning = f"Draws {held} in which the candidate has no unique fit."
        yield Column(f"loss_{scheme}_rank_deficient_draws", "whole_number", "1", meaning)


def _candidates(results: list[dict]) -> Iterator[dict]:
    plain = {column.name for column in CANDIDATES}.difference(_NESTED)
    for result in results:
        outer = result["selection"].get("outer_choices")
        for item in result["candidates"]:
            row = {name: value for name, value in item.items() if name in plain}
            row |= {"dataset": result["dataset"], "turning_points": _joined(item.get("turning_points"))}
            row |= spread(item.get("excursion"), {key: f"excursion_{key}" for key in _EXCURSION})
            row |= spread(item.get("lack_of_fit"), _LACK_OF_FIT)
            row |= spread(item.get("lack_of_fit_within_series"), WITHIN_SERIES_COLUMNS)
            row |= spread(item.get("serial"), {key: f"serial_{key}" for key in _SERIAL})
            row["outer_choices"] = outer.get(item["candidate"], 0) if outer else None
            yield row | _losses(item) | _deficient_draws(result, item["candidate"])


def _joined(values: list[float] | None) -> str | None:
    return "; ".join(repr(float(value)) for value in values) if values else None


def spread(record: dict | None, names: dict[str, str]) -> dict:
    return {} if record is None else {name: record.get(key) for key, name in names.items()}


def _losses(item: dict) -> dict:
    row = {}
    for scheme, record in item["losses"].items():
        row[f"loss_{scheme}"] = record.get("loss")
        row[f"loss_{scheme}_se"] = record.get("standard_error")
        row[f"loss_{scheme}_interior"] = record.get("interior_loss")
        row[f"loss_{scheme}_failed_folds"] = _count(record.get("failed_folds"))
    return row


def _count(folds: object) -> object:
    """Number of folds, whether they are counted or listed."""
    return len(folds) if isinstance(folds, list) else folds


def _deficient_draws(result: dict, candidate: str) -> dict:
    return {
        f"loss_{scheme['scheme']}_rank_deficient_draws": scheme["rank_deficient_draws"].get(candidate)
        for scheme in result["schemes"]
        if scheme.get("rank_deficient_draws")
    }


def _coefficients(result: dict, item: dict) -> Iterator[dict]:
    same = {
        "dataset": result["dataset"],
        "candidate": item["candidate"],
        "chosen": item["chosen"],
        "verdict": result["selection"]["verdict"] if item["chosen"] else None,
    }
    for term in item["terms"]:
        yield {**same, "basis": "power", **term}
    scaled = item["scaled"]
    if scaled is None:
        return
    same |= {"basis": "scaled", "centre": scaled["centre"], "half_span": scaled["half_span"]}
    same["fixed_points"] = "; ".join(f"{float(x)!r} : {float(y)!r}" for x, y in scaled["fixed_points"]) or None
    deviations = _scaled_uncertainties(result, item)
    for index, estimate in enumerate(scaled["coefficients"]):
        yield {**same, "term": f"T{index}", "estimate": estimate, "standard_uncertainty": deviations[index]}


def _scaled_uncertainties(result: dict, item: dict) -> list[float | None]:
    """Roots of the diagonal of the covariance, which only the issued function has."""
    function = result["function"]
    if not item["chosen"] or function is None or function.get("covariance") is None:
        return [None] * len(item["scaled"]["coefficients"])
    return [math.sqrt(row[index]) for index, row in enumerate(function["covariance"])]


def _schemes(results: list[dict]) -> Iterator[dict]:
    for result in results:
        for scheme in result["schemes"]:
            yield {
                "dataset": result["dataset"],
                **{name: scheme.get(name) for name in ("scheme", "status", "message", "unit", "row_wise", "draws")},
                "decides": scheme["scheme"] == result["settings"]["loss"],
                "folds": len(scheme["folds"]),
                "smallest_loss_candidate": (result["selection"].get("rankings") or {}).get(scheme["scheme"]),
            }


def _folds(results: list[dict]) -> Iterator[dict]:
    for result in results:
        order = [item["candidate"] for item in result["candidates"]]
        for scheme in result["schemes"]:
            for fold in scheme["folds"]:
                same = {"dataset": result["dataset"], "scheme": scheme["scheme"], "fold": fold["fold"]}
                same |= {"observations": fold["observations"], "draws": fold.get("draws")}
                for candidate in order:
                    if candidate in fold["losses"]:
                        yield {**same, "candidate": candidate, "loss": fold["losses"][candidate]}
