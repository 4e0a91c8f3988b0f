"""The first part of the report: what was asked, what came out, what to beware of."""

from __future__ import annotations

from fitlib.report.attention import attention_part, other_warnings
from fitlib.report.quantities import Quantities
from fitlib.report.rounding import NOTHING, is_number, percent, root, squared, table_number, with_unit
from fitlib.report.standing import choice_cell, expanded_cell, target_cell
from fitlib.report.table import Cell, Table, make_table
from fitlib.report.words import (
    CAUTIONS,
    FIT_ONLY,
    ROW_WISE_WHY,
    RULES,
    UNITS_LEFT_OUT,
    VERDICTS,
    counted,
    listed,
    spoken,
)

RECORD_ON_FRONT = ("serial_number", "date", "conditions")


def front_part(bundle: dict, revision: str, changes: list[str]) -> dict:
    """What the template needs for the first part.

    Parameters
    ----------
    bundle : dict
        ``study``, ``results`` and ``failures``.
    revision : str
    changes : list of str

    Returns
    -------
    dict
        Text and tables by name.
    """
    study, results, failures = bundle["study"], bundle["results"], bundle.get("failures") or []
    return {
        "title": study.get("title") or study["study"],
        "study": study["study"],
        "purpose": study.get("purpose") or "",
        "revision": revision,
        "changes": list(changes),
        "alarm": row_wise_alarm(results),
        "attention": attention_part(results, failures),
        "asked": _asked(study, results),
        "summary": _summary(results, failures),
        "datasets": _datasets(results),
        "cautions": CAUTIONS,
        "fit_only": FIT_ONLY,
        "record": _record(results),
        "warnings": _warnings(results),
        "account": _account(results),
    }


def row_wise_alarm(results: list[dict]) -> str:
    """A sentence for the very top where a scheme that splits rows of one level decides, else nothing."""
    deciding, _ = _row_wise(results)
    if not deciding:
        return ""
    return f"Row-wise folds decide: scheme {listed(deciding)}. Single rows are left out: {ROW_WISE_WHY}."


def _row_wise(results: list[dict]) -> tuple[list[str], list[str]]:
    """Schemes that split rows of one level: those that decide, and those declared for comparison only."""
    schemes = [(scheme, result["settings"].get("loss")) for result in results for scheme in result["schemes"]]
    named = {scheme["scheme"] for scheme, _ in schemes if scheme.get("row_wise")}
    deciding = {scheme["scheme"] for scheme, loss in schemes if scheme.get("row_wise") and scheme["scheme"] == loss}
    return sorted(deciding), sorted(named - deciding)


def _row_wise_remark(results: list[dict]) -> str:
    _, compared = _row_wise(results)
    if not compared:
        return ""
    verb = "leaves" if len(compared) == 1 else "leave"
    return f"{listed(compared)} {verb} out single rows and is for comparison only, it does not decide: {ROW_WISE_WHY}."


def _asked(study: dict, results: list[dict]) -> list[tuple[str, str]]:
    """What the study asked for, as pairs of term and words."""
    selection = study.get("selection") or {}
    rule, loss = selection.get("rule"), selection.get("loss")
    asked = [
        ("rule", f"{rule}: {RULES.get(rule, 'see the study')}"),
        ("deciding loss", loss or "none: the rule works without held-out losses"),
        ("required", _required(selection, results)),
        ("target uncertainty", _target(selection.get("target_uncertainty"), results)),
        ("weighting", spoken(study.get("weighting"))),
        ("candidates", listed(_declared_candidates(study, results)) or "none"),
        ("schemes", "; ".join(_scheme_words(scheme) for scheme in study.get("validation") or []) or "none"),
    ]
    if remark := _row_wise_remark(results):
        asked.append(("remark", remark))
    if selection.get("alpha") is not None:
        asked.insert(1, ("alpha of the F tests", table_number(selection["alpha"])))
    if study.get("random_seed") is not None:
        asked.append(("random seed", str(study["random_seed"])))
    for part in ("stimulus", "response"):
        if quantity := study.get(part):
            asked.append((part, f"{quantity['quantity']}, unit {quantity['unit']}"))
    return asked


def _required(selection: dict, results: list[dict]) -> str:
    require = selection.get("require") or {}
    words = []
    if require.get("degrees_of_freedom") is not None:
        words.append(f"levels less parameters at least {require['degrees_of_freedom']}")
    if require.get("monotone"):
        words.append("strictly monotone over the measuring interval")
    elif any(result["settings"].get("evaluation") == "inverse" for result in results):
        words.append("strictly monotone where the evaluation is inverse")
    return "; ".join(words) or "nothing more"


def _target(target: dict | None, results: list[dict]) -> str:
    if not target:
        return "none declared"
    unit = results[0]["settings"]["evaluated"]["unit"] if results else ""
    expanded = with_unit(table_number(target["expanded"]), unit)
    return f"expanded uncertainty {expanded}, coverage factor {table_number(target['coverage_factor'])}"


def _declared_candidates(study: dict, results: list[dict]) -> list[str]:
    declared = [name for family in study.get("families") or [] for name in family.get("candidates") or []]
    found = [candidate["candidate"] for result in results for candidate in result["candidates"]]
    return list(dict.fromkeys(declared + found))


def _scheme_words(scheme: dict) -> str:
    name = scheme.get("id") or scheme.get("scheme")
    parts = [f"{spoken(key)} {scheme[key]}" for key in ("folds", "repeats", "draws") if scheme.get(key) is not None]
    parts += [f"leaves out {UNITS_LEFT_OUT.get(scheme['unit'], scheme['unit'])}"] if scheme.get("unit") else []
    return name + (f" ({', '.join(parts)})" if parts else "")


def _summary(results: list[dict], failures: list[dict]) -> str:
    """Numbers of datasets by verdict."""
    verdicts = [result["selection"]["verdict"] for result in results]
    parts = [f"{verdicts.count(word)} {spoken(word)}" for word in VERDICTS if word in verdicts]
    ties = sum(result["selection"].get("choice") == "tie" for result in results)
    parts += [counted(ties, "tie", "ties")] if ties else []
    parts += [f"{len(failures)} without a result"] if failures else []
    return f"{counted(len(results) + len(failures), 'dataset', 'datasets')}: {', '.join(parts) or 'none'}."


def _datasets(results: list[dict]) -> Table | None:
    """One row for each dataset: what was chosen, and how sure that is."""
    columns = ["dataset", "=chosen", "verdict", "choice", "target", "#largest expanded uncertainty",
               "#root of loss", "#root of outer loss", "=runner-up, margin", "#levels, series",
               "#warnings"]  # fmt: skip
    rows = [_dataset_row(number, result) for number, result in enumerate(results, start=1)]
    note = (
        "Below each root stands the loss itself; a weighted loss has no root. The outer loss, of a loop that repeats "
        "the whole selection without each level, is the one to quote. Margin: how much larger the loss of the "
        "runner-up is, as a share of the loss of the chosen candidate; below zero where the rule prefers simplicity. "
        "Target: whether misfit and expanded uncertainty of one converted reading stay within it over the interval. "
        "Expanded uncertainty: of one converted reading, from the fit alone, where it is largest."
    )
    return make_table("Result for each dataset", columns, rows, note)


def _loss(quantities: Quantities, loss: float | None) -> Cell:
    """A loss with its unit: datasets side by side may differ in theirs."""
    if not is_number(loss):
        return Cell(NOTHING)
    own = with_unit(table_number(loss, 3), squared(quantities.fitted["unit"]))
    if not quantities.plain_root:
        return Cell(NOTHING, own)
    return Cell(with_unit(table_number(root(loss)[0], 4), quantities.fitted["unit"]), own)


def _dataset_row(number: int, result: dict) -> list[object]:
    selection, design, quantities = result["selection"], result.get("design") or {}, Quantities(result)
    return [
        Cell(result["dataset"], target=f"dataset-{number}"),
        selection.get("candidate") or "none",
        Cell(VERDICTS[selection["verdict"]], kind=selection["verdict"]),
        choice_cell(result),
        target_cell(result),
        expanded_cell(result, quantities.evaluated, quantities.across),
        _loss(quantities, selection.get("loss")),
        _loss(quantities, selection.get("outer_loss")),
        Cell(selection.get("runner_up") or "none", percent(selection.get("margin"))),
        f"{table_number(design.get('levels'))}, {table_number(design.get('series'))}",
        str(len(result.get("warnings") or [])),
    ]


def _record(results: list[dict]) -> Table | None:
    """Interval and record of each dataset, next to the cautions."""
    rows = []
    for number, result in enumerate(results, start=1):
        record = result["settings"].get("record") or {}
        given = [record.get(key) or "not given" for key in RECORD_ON_FRONT]
        rows.append([Cell(result["dataset"], target=f"dataset-{number}"), Quantities(result).interval(), *given])
    columns = ["dataset", "measuring interval", *(spoken(key) for key in RECORD_ON_FRONT)]
    return make_table("Where each function may be used", columns, rows, "The whole record stands with each dataset.")


def _warnings(results: list[dict]) -> list[dict]:
    """Each warning that is not said above once, with the datasets it belongs to; row-wise folds first."""
    by_text: dict[str, list[tuple[str, str]]] = {}
    for number, result in enumerate(results, start=1):
        for text in dict.fromkeys(other_warnings(result)):
            by_text.setdefault(text, []).append((f"dataset-{number}", result["dataset"]))
    ordered = sorted(by_text, key=lambda text: "row" not in text.split(":")[0].lower() or "wise" not in text)
    return [{"text": text, "datasets": by_text[text], "everywhere": len(by_text[text]) == len(results) > 3}
            for text in ordered]  # fmt: skip


def _account(results: list[dict]) -> Table | None:
    """Rows of each file: read = used + excluded + verification + rejected."""
    parts = ("used", "excluded", "verification", "rejected")
    rows, totals, wrong = [], dict.fromkeys(("read", *parts), 0), []
    for result in results:
        for entry in result.get("account") or []:
            rows.append([result["dataset"], entry["file"], *(str(entry[key]) for key in ("read", *parts))])
            totals = {key: total + entry[key] for key, total in totals.items()}
            wrong += [entry["file"]] if entry["read"] != sum(entry[part] for part in parts) else []
    note = "Read = used + excluded + verification + rejected: the account balances."
    if wrong:
        note = f"The account does not balance for {listed(wrong)}: rows read are not all accounted for."
    foot = ["all", "", *(str(total) for total in totals.values())] if len(rows) > 1 else None
    columns = ["dataset", "file", "#read", "#used", "#excluded", "#verification", "#rejected"]
    return make_table("Account of the rows read", columns, rows, note, foot)
