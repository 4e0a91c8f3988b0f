"""Tables of what was decided for each dataset: datasets, record, chosen, components."""

from __future__ import annotations

from collections.abc import Iterator

from fitlib.collect.cells import Column, Table
from fitlib.collect.competing import WITHIN_SERIES, WITHIN_SERIES_COLUMNS, spread
from fitlib.collect.documents import function_path

DATASETS = (
    Column("dataset", "text", "", "The instrument or curve, as the study names it."),
    Column("file_name", "text", "", "Name of its files and folders in this revision."),
    Column("function_file", "text", "", "The issued function for machines; empty when there is none."),
    Column("function", "text", "", "calibration: response from stimulus; analysis: stimulus from response."),
    Column("evaluation", "text", "", "What the function is for: inverse (reading to value) or direct."),
    Column("stimulus_quantity", "text", "", "Reference quantity."),
    Column("stimulus_unit", "text", "", "Unit of the stimulus."),
    Column("response_quantity", "text", "", "What the instrument gives."),
    Column("response_unit", "text", "", "Unit of the response."),
    Column("fitted_quantity", "text", "", "Dependent variable of the fit; residuals and losses are on its scale."),
    Column("fitted_unit", "text", "", "Unit of the fitted quantity."),
    Column("evaluated_quantity", "text", "", "The quantity that the user wants."),
    Column("evaluated_unit", "text", "", "Unit of the evaluated quantity."),
    Column("interval_lower", "number", "stimulus", "Lower end of the measuring interval."),
    Column("interval_upper", "number", "stimulus", "Upper end; outside the interval the function must not be used."),
    Column("read", "whole_number", "1", "Rows read from all data files."),
    Column("used", "whole_number", "1", "Rows used for fitting and choosing."),
    Column("excluded", "whole_number", "1", "Rows left out on purpose."),
    Column("verification", "whole_number", "1", "Rows kept out of fitting and choosing."),
    Column("rejected", "whole_number", "1", "Rows that could not be used."),
    Column("levels", "whole_number", "1", "Levels used."),
    Column("series", "whole_number", "1", "Series used."),
    Column("replicates", "boolean", "", "Whether a level has more than one observation, over all series."),
    Column(
        "largest_supported_parameters",
        "whole_number",
        "1",
        "Most free coefficients that the levels leave room for.",
    ),
    Column("candidates", "whole_number", "1", "Candidates declared."),
    Column("candidates_fitted", "whole_number", "1", "Candidates that could be fitted."),
    Column("weighting", "text", "", "Weights of the observations."),
    Column("rule", "text", "", "Rule of the study that chooses."),
    Column("loss_scheme", "text", "", "Scheme whose loss the rule uses; empty for a rule without one."),
    Column("alpha", "number", "1", "Significance level of the rule f_test."),
    Column("required_degrees_of_freedom", "whole_number", "1", "Levels less parameters that a candidate must have."),
    Column("target_expanded_uncertainty", "number", "evaluated", "Expanded uncertainty that the user needs."),
    Column("target_coverage_factor", "number", "1", "Coverage factor of that target."),
    Column("notes", "text", "", "What the observations' layout limits, separated by vertical bars."),
    Column("failure", "text", "", "Why the dataset has no result; empty where it has one."),
)

RECORD = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("entry", "text", "", "Name of the entry in the technical record."),
    Column("content", "text", "", "What the study says under it; copied, not checked."),
)

CHOSEN = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("candidate", "text", "", "Candidate that the rule takes; empty when there is none."),
    Column("verdict", "text", "", "adequate, inadequate or not_evaluated; only an adequate function may be used."),
    Column("verdict_reason", "text", "", "Why the verdict is so."),
    Column("choice", "text", "", "decided, or tie when another candidate is as good; the simplest is issued then."),
    Column("choice_reason", "text", "", "How the rule came to the candidate."),
    Column("runner_up", "text", "", "The next best eligible candidate."),
    Column("margin", "number", "1", "Loss of the runner-up less loss of the chosen one, over the latter."),
    Column("smallest_loss_candidate", "text", "", "Candidate with the smallest deciding loss."),
    Column("threshold", "number", "fitted^2", "Smallest loss plus its standard error (rule one_standard_error)."),
    Column("interior_candidate", "text", "", "What the rule takes without the two end levels."),
    Column("loss", "number", "fitted^2", "Deciding loss of the chosen candidate; too small: it was chosen by it."),
    Column("outer_loss", "number", "fitted^2", "Loss when the whole selection is repeated without each level."),
    Column("outer_loss_interior", "number", "fitted^2", "The same, without the two end levels."),
    Column("lack_of_fit_f", "number", "1", "F ratio of lack of fit over pure error."),
    Column("lack_of_fit_p", "number", "1", "Probability of so large a ratio by chance, if the function were right."),
    Column("lack_of_fit_within_series_f", "number", "1", f"F ratio: {WITHIN_SERIES}."),
    Column("lack_of_fit_within_series_p", "number", "1", f"Probability of so large an F by chance: {WITHIN_SERIES}."),
    Column("misfit", "number", "evaluated", "Largest mean residual of a level, in the quantity that the user wants."),
    Column(
        "target_met",
        "boolean",
        "",
        "Whether misfit and expanded uncertainty of one converted reading stay within the target; empty without one.",
    ),
    Column(
        "largest_expanded_uncertainty",
        "number",
        "evaluated",
        "Of one converted reading, over the interval, from the fit alone; holds only for an adequate function.",
    ),
    Column("largest_expanded_uncertainty_at", "number", "abscissa", "Where in the interval it is so large."),
    Column("largest_residual", "number", "fitted", "Residual with the largest magnitude among the observations used."),
    Column("largest_residual_evaluated", "number", "evaluated", "The same, in the quantity that the user wants."),
    Column("largest_residual_stimulus", "number", "stimulus", "Stimulus of that observation."),
    Column("largest_residual_file", "text", "", "Data file of that observation."),
    Column("largest_residual_row", "whole_number", "1", "Line of that observation in its file."),
    Column("warnings", "text", "", "What a reader must know, separated by vertical bars."),
    Column("uncertainty_statement", "text", "", "What the uncertainty of the function covers."),
    Column("cautions", "text", "", "Limits of use, separated by vertical bars."),
)

COMPONENTS = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("component", "text", "", "repeatability, pure_error, level_deviation or series_deviation."),
    Column("value", "number", "fitted", "Standard deviation in the fitted quantity; empty where there is none."),
    Column("value_evaluated", "number", "evaluated", "The same, in the quantity that the user wants."),
    Column(
        "found",
        "boolean",
        "",
        "Whether levels, or whole series, carry a deviation of their own (these two components only).",
    ),
)

_COUNTS = ("read", "used", "excluded", "verification", "rejected")
_DESIGN = ("levels", "series", "replicates", "largest_supported_parameters")
_SELECTION = tuple(column.name for column in CHOSEN[1:14])
_EXPANDED = "largest_expanded_uncertainty"
_EXPANDED_COLUMNS = {"value": _EXPANDED, "at": f"{_EXPANDED}_at"}
_RESIDUAL = {
    "value": "largest_residual",
    "in_evaluated_unit": "largest_residual_evaluated",
    "stimulus": "largest_residual_stimulus",
    "file": "largest_residual_file",
    "row": "largest_residual_row",
}


def datasets_table(results: list[dict], failures: list[dict], file_names: dict[str, str]) -> Table:
    """One row per dataset, those without a result last."""
    failed = ({**entry, "file_name": file_names.get(entry["dataset"])} for entry in map(_failure, failures))
    return Table("datasets.csv", DATASETS, [*map(_dataset, results), *failed])


def record_table(results: list[dict]) -> Table:
    """One row per entry of a dataset's technical record."""
    return Table("record.csv", RECORD, _record(results))


def chosen_table(results: list[dict], failures: list[dict]) -> Table:
    """One row per dataset: what was chosen, and how good it is."""
    failed = (
        {"dataset": entry["dataset"], "verdict": "not_evaluated", "verdict_reason": entry["message"]}
        for entry in failures
    )
    return Table("chosen.csv", CHOSEN, [*map(_chosen, results), *failed])


def components_table(results: list[dict]) -> Table:
    """One row per dataset and component of the scatter."""
    return Table("components.csv", COMPONENTS, _components(results))


def _failure(entry: dict) -> dict:
    return {"dataset": entry["dataset"], "failure": entry["message"]}


def _dataset(result: dict) -> dict:
    settings, design, selected = result["settings"], result["design"], result["settings"]["target"] or {}
    row = {"dataset": result["dataset"], "file_name": result["file_name"]}
    row["function_file"] = function_path(result) if result["function"] is not None else None
    row |= {name: settings[name] for name in ("function", "evaluation", "weighting", "rule")}
    row["alpha"] = settings["alpha"] if settings["rule"] == "f_test" else None
    for role in ("stimulus", "response", "fitted", "evaluated"):
        row |= {f"{role}_{part}": settings[role][part] for part in ("quantity", "unit")}
    row["interval_lower"], row["interval_upper"] = settings["measuring_interval"]
    row |= {name: sum(entry[name] for entry in result["account"]) for name in _COUNTS}
    row |= {name: design[name] for name in _DESIGN}
    row["candidates"] = len(result["candidates"])
    row["candidates_fitted"] = sum(item["status"] == "fitted" for item in result["candidates"])
    row |= {"loss_scheme": settings["loss"], "required_degrees_of_freedom": settings["degrees_of_freedom"]}
    row["target_expanded_uncertainty"] = selected.get("expanded")
    row["target_coverage_factor"] = selected.get("coverage_factor")
    return row | {"notes": _sentences(design["notes"])}


def _sentences(sentences: list[str] | None) -> str | None:
    return " | ".join(sentences) if sentences else None


def _record(results: list[dict]) -> Iterator[dict]:
    for result in results:
        for entry, content in sorted(result["settings"]["record"].items()):
            yield {"dataset": result["dataset"], "entry": entry, "content": content}


def _chosen(result: dict) -> dict:
    selection, function = result["selection"], result["function"] or {}
    row = {name: selection.get(name) for name in _SELECTION if name in selection}
    row["dataset"] = result["dataset"]
    item = next((item for item in result["candidates"] if item["candidate"] == selection["candidate"]), {})
    lack = item.get("lack_of_fit") or {}
    row |= {"lack_of_fit_f": lack.get("f"), "lack_of_fit_p": lack.get("p"), "misfit": item.get("misfit")}
    row |= spread(item.get("lack_of_fit_within_series"), WITHIN_SERIES_COLUMNS)
    row |= {"target_met": selection.get("target_met")} | spread(selection.get(_EXPANDED), _EXPANDED_COLUMNS)
    residual = selection["largest_residual"] or {}
    row |= {name: residual.get(key) for key, name in _RESIDUAL.items()}
    row["warnings"] = _sentences(result["warnings"])
    row["uncertainty_statement"] = function.get("uncertainty_statement")
    return row | {"cautions": _sentences(function.get("cautions"))}


def _components(results: list[dict]) -> Iterator[dict]:
    for result in results:
        components = result["selection"]["components"] or {}
        for name in ("repeatability", "pure_error", "level_deviation", "series_deviation"):
            if name in components:
                yield {
                    "dataset": result["dataset"],
                    "component": name,
                    "value": components[name],
                    "value_evaluated": components.get(f"{name}_evaluated"),
                    "found": components.get(f"{name}_found"),
                }
