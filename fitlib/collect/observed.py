"""Tables of what was observed: observations, account, levels, verification."""

from __future__ import annotations

from collections.abc import Iterator

from fitlib.collect.cells import Column, Table

OBSERVATIONS = (
    Column("dataset", "text", "", "The instrument or curve that the row belongs to."),
    Column("file", "text", "", "Data file, relative to the study."),
    Column("row", "whole_number", "1", "Line in the file; the header is line 1."),
    Column("series", "text", "", "One pass through the levels, as the file labels it."),
    Column("direction", "text", "", "Rising or falling, as the file labels it."),
    Column("level", "number", "stimulus", "Value of the stimulus that the observation counts for."),
    Column("stimulus", "number", "stimulus", "Reference quantity as read."),
    Column("response", "number", "response", "What the instrument gave, as read."),
    Column("state", "text", "", "used, excluded or verification."),
    Column("reason", "text", "", "Why the row is excluded, by whom and when."),
    Column("fitted", "number", "fitted", "Value of the chosen candidate."),
    Column("residual", "number", "fitted", "Observed less fitted value of the chosen candidate."),
    Column("leverage", "number", "1", "Share of the observation in its own fitted value, 0 to 1."),
    Column("studentized_residual", "number", "1", "Residual over its own standard deviation, fitted without this row."),
    Column("flag", "text", "", "suspect where a test points at the row; no row is dropped by a test."),
)

ACCOUNT = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("file", "text", "", "Data file, relative to the study."),
    Column("read", "whole_number", "1", "Rows read; equals used + excluded + verification + rejected."),
    Column("used", "whole_number", "1", "Rows used for fitting and choosing."),
    Column("excluded", "whole_number", "1", "Rows left out on purpose, each with a reason in observations.csv."),
    Column("verification", "whole_number", "1", "Rows kept out of fitting and choosing, to check the chosen function."),
    Column("rejected", "whole_number", "1", "Rows that could not be used."),
)

LEVELS = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("level", "number", "stimulus", "Value of the stimulus at which observations were made."),
    Column("observations", "whole_number", "1", "Observations used at the level."),
    Column("series", "whole_number", "1", "Series with an observation used at the level."),
    Column("first_stimulus", "number", "stimulus", "Smallest stimulus counted for the level."),
    Column("last_stimulus", "number", "stimulus", "Largest stimulus counted for the level."),
)

VERIFICATION = (
    Column("dataset", "text", "", "The instrument or curve."),
    Column("candidate", "text", "", "Chosen candidate that the point checks."),
    Column("file", "text", "", "Data file, relative to the study."),
    Column("row", "whole_number", "1", "Line in the file; the header is line 1."),
    Column("series", "text", "", "One pass through the levels, as the file labels it."),
    Column("stimulus", "number", "stimulus", "Reference quantity as read."),
    Column("response", "number", "response", "What the instrument gave, as read."),
    Column("verdict", "text", "", "within_interval; or below_range or above_range: then nothing is evaluated."),
    Column("fitted", "number", "fitted", "Value of the chosen candidate."),
    Column("residual", "number", "fitted", "Observed less fitted value; the point took no part in the fit."),
    Column("evaluated_deviation", "number", "evaluated", "The same deviation in the quantity that the user wants."),
    Column(
        "prediction_lower", "number", "fitted", "Lower end of the 95 % prediction interval of one observation there."
    ),
    Column("prediction_upper", "number", "fitted", "Upper end; the interval holds only for an adequate function."),
    Column(
        "within_prediction_interval", "boolean", "", "Whether the observation lies in that interval, ends included."
    ),
)


def observations_table(results: list[dict]) -> Table:
    """One row per observation read."""
    return Table("observations.csv", OBSERVATIONS, _observations(results))


def account_table(results: list[dict]) -> Table:
    """One row per dataset and data file."""
    rows = ({"dataset": result["dataset"], **entry} for result in results for entry in result["account"])
    return Table("account.csv", ACCOUNT, rows)


def levels_table(results: list[dict], schemes: list[str]) -> Table:
    """One row per level, with the loss of the chosen candidate there under each scheme."""
    losses = tuple(_level_loss(scheme) for scheme in schemes)
    return Table("levels.csv", LEVELS + losses, _levels(results))


def verification_table(results: list[dict]) -> Table:
    """One row per verification point."""
    rows = (
        {"dataset": result["dataset"], "candidate": result["selection"]["candidate"], **entry}
        for result in results
        for entry in result["verification"]
    )
    return Table("verification.csv", VERIFICATION, rows)


def _observations(results: list[dict]) -> Iterator[dict]:
    names = [column.name for column in OBSERVATIONS[1:]]
    for result in results:
        columns = [result["observations"][name] for name in names]
        for values in zip(*columns, strict=True):
            yield {"dataset": result["dataset"], **dict(zip(names, values, strict=True))}


def _level_loss(scheme: str) -> Column:
    meaning = f"Mean loss of the chosen candidate at this level under {scheme}."
    return Column(f"loss_{scheme}", "number", "fitted^2", meaning)


def _levels(results: list[dict]) -> Iterator[dict]:
    for result in results:
        chosen = result["selection"]["candidate"]
        losses = {
            f"loss_{scheme['scheme']}": (scheme.get("level_losses") or {}).get(chosen) for scheme in result["schemes"]
        }
        for index, level in enumerate(result["levels"]):
            row = {name: values[index] for name, values in losses.items() if values}
            yield {"dataset": result["dataset"], **level, **row}
