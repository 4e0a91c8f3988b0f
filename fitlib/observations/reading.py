"""Reads the observations of a dataset: files, claims, levels, account, and every fault at once."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from pathlib import PurePosixPath
from typing import TYPE_CHECKING

import numpy as np

from fitlib.errors import InputError, Problem
from fitlib.observations import sources
from fitlib.observations.claims import Place, match
from fitlib.observations.columns import FileRows, missing_columns, read_roles
from fitlib.observations.design import design_advice
from fitlib.observations.faults import Faults
from fitlib.observations.grouping import Grouped, Rows, group_used
from fitlib.observations.notes import blank_line_notes, repeated_row_notes, shared_series_notes
from fitlib.observations.records import FileAccount, Observations
from fitlib.observations.tables import Table, read_table
from fitlib.observations.wording import listed, number, plural, quoted

if TYPE_CHECKING:  # for the reader of the code; pydantic need not be loaded to read a CSV file
    from fitlib.study import DatasetSettings, Study


@dataclass
class _Reading:
    """What is known of a dataset while it is read."""

    study: Study
    dataset: DatasetSettings
    faults: list[Faults] = field(default_factory=list)
    files: list[FileRows] = field(default_factory=list)
    problems: list[Problem] = field(default_factory=list)
    complete: bool = True  # every file could be read as a table with the declared columns

    def shown(self, file: str) -> str:
        """A data file as the user would type it: beside the study file."""
        return str(PurePosixPath(self.study.path.replace("\\", "/")).parent / file)

    def blame(self, key: str, message: str) -> None:
        """A problem of the study's text, told with the dataset's id because defaults serve many datasets."""
        full = f"{self.dataset.key}.{key}" if key else self.dataset.key
        line = self.study.line_of(full)
        text = f"dataset {quoted(self.dataset.id)}: {message}"
        self.problems.append(Problem(self.study.path, text, line=line, key=full))


def _blame_column(reading: _Reading, role: str, message: str) -> None:
    """A column that a file lacks is blamed on the key that names it, where that stands."""
    own, default = f"{reading.dataset.key}.columns.{role}", f"dataset_defaults.columns.{role}"
    key = default if own not in reading.study.lines and default in reading.study.lines else own
    reading.problems.append(Problem(reading.study.path, message, line=reading.study.line_of(key), key=key))


def _too_large(reading: _Reading) -> bool:
    total = sum(sources.size_of(reading.study.folder / file) for file in reading.dataset.files)
    if total > sources.BYTES_PER_DATASET:
        limit = sources.BYTES_PER_DATASET
        reading.blame("files", f"its files hold {total} bytes; at most {limit} per dataset can be read")
    return total > sources.BYTES_PER_DATASET


def _load_texts(reading: _Reading) -> dict[str, str]:
    """Texts of the files that can be read, by name; a file given twice, or a copy of one, is a fault."""
    texts: dict[str, str] = {}
    seen: dict[bytes, str] = {}
    for file in reading.dataset.files:
        faults = Faults(reading.shown(file), reading.dataset.key)
        reading.faults.append(faults)
        data = sources.read_bytes(reading.study.folder / file, faults)
        if data is None:
            continue
        digest = hashlib.sha256(data).digest()
        if digest in seen and data.strip():
            same = "is given twice" if seen[digest] == file else f"holds the same bytes as {seen[digest]}"
            faults.add("same file", None, f"the file {same}; its rows would count twice")
            continue
        seen[digest] = file
        text = sources.decode(data, faults)
        if text is not None:
            texts[file] = text
    return texts


def _too_many_rows(reading: _Reading, texts: dict[str, str]) -> bool:
    total = sum(sources.count_rows(text) for text in texts.values())
    if total > sources.ROWS_PER_DATASET:
        limit = sources.ROWS_PER_DATASET
        reading.blame("files", f"its files hold {total} rows; at most {limit} per dataset can be read")
    return total > sources.ROWS_PER_DATASET


def _read_files(reading: _Reading) -> None:
    """Fill `reading.files`; a file with a fault of its own stays out and marks the reading incomplete."""
    settings = reading.dataset
    texts = {} if _too_large(reading) else _load_texts(reading)
    if _too_many_rows(reading, texts):
        texts = {}
    for file, faults in zip(settings.files, reading.faults, strict=False):
        if file not in texts or len(faults):
            continue
        table = read_table(texts.pop(file), file, settings.delimiter, settings.decimal, faults)
        if table is None:
            continue
        missing = missing_columns(table, settings.columns)
        for role, message in missing.items():
            _blame_column(reading, role, message)
        if not missing and not len(faults):
            reading.files.append(read_roles(table, settings.columns, settings.decimal, faults))
            continue
        for place, (kind, message) in table.uneven.items():
            faults.add(kind, table.lines[place], message)
    reading.complete = len(reading.files) == len(settings.files)


def _claim(reading: _Reading, tables: Sequence[Table]) -> tuple[dict[Place, list[str]], set[Place]]:
    """Rows claimed by exclusions (with reasons) and by verification points."""
    settings = reading.dataset
    excluded: dict[Place, list[str]] = {}
    for which, exclusion in enumerate(settings.exclusions):
        places, fault = match(exclusion.where, tables, settings.decimal)
        if fault and reading.complete:  # an unread file may hold the row
            reading.blame(f"exclusions[{which}].where", fault)
        for place in places:
            excluded.setdefault(place, []).append(f"{exclusion.reason} ({exclusion.person}, {exclusion.date})")
    verification: set[Place] = set()
    if settings.verification_points is not None:
        places, fault = match(settings.verification_points, tables, settings.decimal)
        if fault and reading.complete:
            reading.blame("verification_points.where", fault)
        verification = set(places)
    _report_double_claims(reading, tables, sorted(verification & excluded.keys()))
    return excluded, verification


def _report_double_claims(reading: _Reading, tables: Sequence[Table], places: list[Place]) -> None:
    for which, table in enumerate(tables):
        lines = [str(table.lines[place]) for other, place in places if other == which]
        if lines:
            shown = ", ".join(lines[:20]) + (f" and {len(lines) - 20} more" if len(lines) > 20 else "")
            word = "rows" if len(lines) > 1 else "row"
            message = (
                f"{table.file}, {word} {shown}: claimed by exclusions and by verification points; only one can hold"
            )
            reading.blame("verification_points", message)


def _states(reading: _Reading, excluded: dict, verification: set) -> list[str]:
    """State of every row; faults of rows that no exclusion covers are reported now."""
    states = []
    for which, rows in enumerate(reading.files):
        for place, line in enumerate(rows.table.lines):
            found = rows.faults.get(place)
            if (which, place) in excluded:
                states.append("excluded")
                continue
            for kind, message in found or ():
                rows.collected.add(kind, line, message)
            claimed = "verification" if (which, place) in verification else "used"
            states.append("rejected" if found is not None else claimed)
    return states


def _account(reading: _Reading, states: list[str]) -> tuple[FileAccount, ...]:
    accounts, start = [], 0
    for rows in reading.files:
        own = states[start : start + len(rows.table.rows)]
        counts = [own.count(state) for state in ("used", "excluded", "verification", "rejected")]
        accounts.append(FileAccount(rows.table.file, len(rows.table.rows), *counts))
        start += len(own)
    return tuple(accounts)


def _joined(files: Sequence[FileRows], part: str) -> np.ndarray:
    return np.concatenate([getattr(rows, part) for rows in files])


def _rows(reading: _Reading, states: list[str]) -> Rows:
    files = reading.files
    return Rows(
        file=[rows.table.file for rows in files for _ in rows.table.rows],
        line=np.array([line for rows in files for line in rows.table.lines], dtype=int),
        stimulus=_joined(files, "stimulus"),
        response=_joined(files, "response"),
        label=None if files[0].level is None else _joined(files, "level"),
        series=[word for rows in files for word in rows.series],
        state=states,
    )


def _check_weights(reading: _Reading, states: list[str]) -> None:
    """Weights that divide by the stimulus need it above zero."""
    if not reading.study.weighting.startswith("inverse_stimulus"):
        return
    start = 0
    for rows in reading.files:
        for place, line in enumerate(rows.table.lines):
            value = rows.stimulus[place]
            if states[start + place] == "used" and value <= 0:
                message = f"the stimulus {number(value)} has no weight under `weighting: {reading.study.weighting}`"
                rows.collected.add("weighting", line, f"{message}; a stimulus above 0 is needed")
        start += len(rows.table.lines)


def _account_problems(reading: _Reading, accounts: Sequence[FileAccount]) -> list[Problem]:
    """For each file with rejected rows, what became of all its rows."""
    told = []
    for account in accounts:
        if account.rejected:
            message = (
                f"{plural(account.read, 'row')} read: {account.used} used, {account.excluded} excluded, "
                f"{account.verification} for verification, {account.rejected} rejected by the faults above"
            )
            told.append(Problem(reading.shown(account.file), message, key=reading.dataset.key, severity="warning"))
    return told


def _build(reading: _Reading, rows: Rows, grouped: Grouped, excluded: dict, account: tuple) -> Observations:
    files = reading.files
    places = [(which, place) for which, own in enumerate(files) for place in range(len(own.table.rows))]
    notes = blank_line_notes(files) + repeated_row_notes(files) + shared_series_notes(files) + list(grouped.notes)
    return Observations(
        file=tuple(rows.file),
        row=rows.line,
        series=tuple(rows.series),
        direction=tuple(word for own in files for word in own.direction),
        level=grouped.level,
        stimulus=rows.stimulus,
        response=_joined(files, "response"),
        state=tuple(rows.state),
        reason=tuple("; ".join(excluded.get(place, ())) for place in places),
        account=account,
        notes=tuple(notes),
        level_index=grouped.index,
        dataset=reading.dataset.id,
    )


def read_observations(study: Study, dataset: DatasetSettings) -> Observations:
    """Read the observations of one dataset.

    Parameters
    ----------
    study : fitlib.study.Study
        The study that the dataset belongs to; its folder is where the files are looked for.
    dataset : fitlib.study.DatasetSettings

    Returns
    -------
    Observations
        Every row of every file, with its state and its level; nothing is dropped.

    Raises
    ------
    fitlib.errors.InputError
        With every problem of the dataset's files, by file and row.
    """
    reading = _Reading(study, dataset)
    _read_files(reading)
    built = None
    if reading.files:
        excluded, verification = _claim(reading, [rows.table for rows in reading.files])
        states = _states(reading, excluded, verification)
        _check_weights(reading, states)
        rows = _rows(reading, states)
        settled = reading.complete and "rejected" not in states
        grouped = group_used(rows, dataset, settled, reading.blame)
        account = _account(reading, states)
        built = _build(reading, rows, grouped, excluded, account)
        built = replace(built, advice=design_advice(study, dataset, built, reading.files))
        told = _account_problems(reading, account)
    problems = [problem for faults in reading.faults for problem in faults.problems()]
    if problems or reading.problems:
        raise InputError(problems + (told if reading.files else []) + reading.problems)
    return built


def check_observations(study: Study) -> tuple[list[Problem], list[Observations]]:
    """Read all datasets of a study.

    Parameters
    ----------
    study : fitlib.study.Study

    Returns
    -------
    problems : list of fitlib.errors.Problem
        Of all datasets, in the order of the study; where there are none, warnings of what a person may want to change
        before a run.
    observations : list of Observations
        Of the datasets without problem; `Observations.dataset` says which.
    """
    problems: list[Problem] = []
    readable = []
    for dataset in study.datasets:
        try:
            readable.append(read_observations(study, dataset))
        except InputError as error:
            problems.extend(error.problems)
    return problems or _advice(study, readable), readable


def _advice(study: Study, observations: Sequence[Observations]) -> list[Problem]:
    """The advice on all datasets; the same advice on many of them is one warning."""
    groups: dict[tuple[str, str], list[DatasetSettings]] = {}
    for dataset, record in zip(study.datasets, observations, strict=True):
        for advice in record.advice:
            groups.setdefault(advice, []).append(dataset)
    warnings = []
    for (key, message), datasets in groups.items():
        full = key if key == "families" else f"{datasets[0].key}.{key}".rstrip(".")
        named = listed([quoted(dataset.id) for dataset in datasets], 5)
        text = f"dataset{'s' * (len(datasets) > 1)} {named}: {message}"
        warnings.append(Problem(study.path, text, line=study.line_of(full), key=full, severity="warning"))
    return warnings
