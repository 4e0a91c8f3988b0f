"""Tables with a row for every candidate declared, failed ones too."""

from __future__ import annotations

from fitlib.report.quantities import Quantities
from fitlib.report.rounding import NOTHING, is_number, percent, probability, statistic, table_number
from fitlib.report.standing import unusable
from fitlib.report.table import Cell, Table, make_table
from fitlib.report.words import sentence


def _yes(value: bool | None) -> str:
    return NOTHING if value is None else "yes" if value else "no"


def _loss(row: dict, scheme: str | None) -> dict:
    return (row.get("losses") or {}).get(scheme) or {}


def candidates_table(result: dict, quantities: Quantities) -> Table | None:
    """Every candidate with the reason why it was or was not chosen."""
    deciding = result["settings"].get("loss")
    rows, mark = [], unusable(result)
    for row in result["candidates"]:
        loss = _loss(row, deciding)
        first = Cell(row["candidate"], kind="chosen" if row.get("chosen") else "")
        rows.append(
            [
                first,
                table_number(row.get("parameters")),
                "fitted" if row.get("status") == "fitted" else "not fitted",
                quantities.loss_cell(loss.get("loss"), loss.get("standard_error")),
                percent(row.get("bootstrap_share")),
                _yes(bool(row.get("eligible"))),
                ("chosen" + (f", {mark}" if mark else "")) if row.get("chosen") else "no",
                _reason(row),
            ]
        )
    columns = ["=candidate", "#parameters", "=status", quantities.loss_head("deciding loss"), "#bootstrap share",
               "eligible", "chosen",
               quantities.reason_head([row.get("reason") for row in result["candidates"]])]  # fmt: skip
    note = f"{quantities.loss_note()} Bootstrap share: share of the draws in which the whole rule takes the candidate."
    return make_table("Candidates, all that were declared", columns, rows, note)


def _reason(row: dict) -> str:
    """The reason, and the message of the fit where the reason does not hold it already."""
    reason, message = row.get("reason") or "", row.get("message") or ""
    return sentence(reason) if message in reason else f"{sentence(reason)} {sentence(message)}"


def losses_table(result: dict, quantities: Quantities) -> Table | None:
    """Losses of every candidate under every scheme, beside the error at the fitted points."""
    schemes = [scheme["scheme"] for scheme in result.get("schemes") or []]
    deciding = result["settings"].get("loss")
    heads = [f"{name} (decides)" if name == deciding else name for name in schemes]
    if deciding in schemes:
        heads.append(f"{deciding}, interior levels only")
    rows = []
    for row in result["candidates"]:
        cells = [quantities.loss_cell(row.get("fitted_point_loss"))]
        for name in schemes:
            loss = _loss(row, name)
            failed = loss.get("failed_folds")
            cells.append(
                quantities.loss_cell(
                    loss.get("loss"), loss.get("standard_error"), f"failed folds: {failed}" if failed else ""
                )
            )
        if deciding in schemes:
            cells.append(quantities.loss_cell(_loss(row, deciding).get("interior_loss")))
        rows.append([row["candidate"], *cells])
    columns = ["=candidate", *map(quantities.loss_head, ["fitted points, not held out", *heads])]
    return make_table("Losses by scheme", columns, rows, quantities.loss_note())


def fits_table(result: dict, quantities: Quantities) -> Table | None:
    """Residuals and lack of fit of every candidate."""
    columns = ["=candidate", "#degrees of freedom", "#levels less parameters",
               quantities.head("residual standard deviation", quantities.fitted), "#lack of fit F", "#its p",
               "#lack of fit F, means of series taken out", "#its p",
               quantities.head("largest mean deviation of a level", quantities.evaluated), "#von Neumann ratio",
               "#its p"]  # fmt: skip
    note = (
        "Lack of fit is compared with pure error, the scatter within levels over all series; levels that carry a "
        "deviation of their own make F large even for the right function. The second F compares it with what remains "
        "when the means of the series are taken out; it stands and decides where whole series differ."
    )
    return make_table("Fits", columns, [_fit_row(row) for row in result["candidates"]], note)


def _fit_row(row: dict) -> list[object]:
    lack, within = row.get("lack_of_fit") or {}, row.get("lack_of_fit_within_series") or {}
    serial = row.get("serial") or {}
    return [
        row["candidate"],
        table_number(row.get("degrees_of_freedom")),
        table_number(row.get("level_degrees_of_freedom")),
        table_number(row.get("residual_standard_deviation"), 5),
        _with_degrees(lack),
        _whole(probability(lack.get("p"))),
        _with_degrees(within),
        _whole(probability(within.get("p"))),
        table_number(row.get("misfit"), 3),
        statistic(serial.get("ratio")),
        _whole(probability(serial.get("p"))),
    ]


def shapes_table(result: dict, quantities: Quantities) -> Table | None:
    """Information criteria, conditioning and shape of every candidate."""
    columns = ["=candidate", "#AICc, level means", "#BIC, level means", "#AICc, rows", "#BIC, rows",
               "#condition number", "monotone", quantities.head("excursion between levels", quantities.fitted),
               quantities.head("shift by writing in powers", quantities.fitted)]  # fmt: skip
    note = (
        "AICc and BIC of rows are shown only; as rules, the criteria work on level means. Excursion: how far the "
        "curve, between two neighbouring levels, leaves the range of what was observed at both."
    )
    return make_table("Criteria and shape", columns, [_shape_row(row) for row in result["candidates"]], note)


def _shape_row(row: dict) -> list[object]:
    excursion = row.get("excursion") or {}
    return [
        row["candidate"],
        *(table_number(row.get(key)) for key in ("aicc_levels", "bic_levels", "aicc", "bic")),
        table_number(row.get("condition_number"), 3),
        Cell(_yes(row.get("monotone")), _turning(row.get("turning_points") or [])),
        "none" if excursion.get("amount") == 0 else table_number(excursion.get("amount"), 3),
        table_number(row.get("power_shift"), 2),
    ]


def _turning(points: list[float]) -> str:
    if not points:
        return ""
    shown = ", ".join(table_number(point, 4) for point in points[:3])
    return f"turns at {shown}" + (f" and {len(points) - 3} more" if len(points) > 3 else "")


def _whole(text: str) -> str:
    """Text that is not broken at its spaces."""
    return text.replace(" ", "\N{NO-BREAK SPACE}")


def _with_degrees(lack: dict) -> Cell:
    if not is_number(lack.get("f")):
        return Cell(NOTHING)
    return Cell(statistic(lack["f"]), f"on {lack.get('numerator_df')} and {lack.get('denominator_df')}")
