"""All tables of a study, and the table that explains their columns."""

from __future__ import annotations

from collections.abc import Iterator

from fitlib.collect import competing, decided, observed
from fitlib.collect.cells import Column, Table
from fitlib.collect.units import Units, units_of

COLUMNS = (
    Column("table", "text", "", "File in tables/."),
    Column("column", "text", "", "Header in that file."),
    Column("type", "text", "", "text, number, whole_number or boolean (true, false); an empty cell means: none."),
    Column("unit", "text", "", "Unit; 1 for a pure number, empty for words."),
    Column("meaning", "text", "", "What the column holds."),
)


def build_tables(bundle: dict) -> dict[str, str]:
    """Every table of a study as CSV text.

    Parameters
    ----------
    bundle : dict
        ``study`` (resolved), ``results`` (one dict per dataset, any order) and ``failures``.

    Returns
    -------
    dict of str to str
        Text by file name; the order of datasets is that of their ids, of candidates that of the study.

    Raises
    ------
    ValueError
        If a result holds something that its column cannot show: a fault of the program, never dropped in silence.
    """
    tables = list(_tables(bundle))
    units = units_of(bundle)
    tables.append(_columns_table(tables, units))
    return {table.name: table.text() for table in tables}


def _tables(bundle: dict) -> Iterator[Table]:
    results = sorted(bundle["results"], key=_by_id)
    failures = sorted(bundle.get("failures") or [], key=_by_id)
    schemes = _scheme_ids(bundle["study"], results)
    file_names = {item["id"]: item.get("file_name") for item in bundle["study"].get("datasets", [])}
    yield decided.datasets_table(results, failures, file_names)
    yield decided.record_table(results)
    yield observed.account_table(results)
    yield observed.observations_table(results)
    yield observed.levels_table(results, schemes)
    yield competing.candidates_table(results, schemes)
    yield competing.coefficients_table(results)
    yield competing.schemes_table(results)
    yield competing.folds_table(results)
    yield decided.chosen_table(results, failures)
    yield decided.components_table(results)
    yield observed.verification_table(results)


def _by_id(entry: dict) -> tuple[str, str]:
    return entry["dataset"].casefold(), entry["dataset"]


def _scheme_ids(study: dict, results: list[dict]) -> list[str]:
    """Schemes in the order of the study; one that only a result knows comes after."""
    declared = [entry["id"] for entry in study.get("validation", []) if "id" in entry]
    met = [scheme["scheme"] for result in results for scheme in result["schemes"]]
    return list(dict.fromkeys(declared + met))


def _columns_table(tables: list[Table], units: Units) -> Table:
    own = Table("columns.csv", COLUMNS, ())
    rows = [_explained(table.name, column, units) for table in [*tables, own] for column in table.columns]
    return Table(own.name, COLUMNS, rows)


def _explained(table: str, column: Column, units: Units) -> dict:
    return {
        "table": table,
        "column": column.name,
        "type": column.type,
        "unit": units.words(column.unit),
        "meaning": column.meaning,
    }
