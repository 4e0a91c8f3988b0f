"""Loads a study: text, YAML, values, rules between keys, files; every problem at once."""

from __future__ import annotations

from collections.abc import Iterable
from os import PathLike, fspath
from pathlib import Path

from pydantic import ValidationError

from fitlib.errors import InputError, Problem
from fitlib.study.build import build_datasets, build_quantity, build_selection
from fitlib.study.cross_rules import STUDY_RULES, Draft, warnings_of
from fitlib.study.dataset_merge import merge
from fitlib.study.dataset_rules import DATASET_RULES
from fitlib.study.expansion import Found, expand
from fitlib.study.messages import misspelt_keys, plain_sentences
from fitlib.study.model_base import TOLERANT
from fitlib.study.models import StudyModel
from fitlib.study.paths import StudyFolder
from fitlib.study.positions import line_of
from fitlib.study.settings import Study
from fitlib.study.shown import printable, shown
from fitlib.study.text_file import decode, read_bytes
from fitlib.study.unknown import UNKNOWN, Finding, attempt
from fitlib.study.yaml_reader import Document, YamlFault, read_yaml


def load_study(path: str | PathLike[str]) -> Study:
    """Read and check a study.

    Parameters
    ----------
    path : str or path-like
        The study file. Messages name it as it is given here.

    Returns
    -------
    Study
        With `ids_from` expanded, `dataset_defaults` merged into each dataset key by key (`columns` and `record` are
        merged inside; every other value is replaced as a whole) and datasets sorted by id.

    Raises
    ------
    InputError
        With every problem of the study's text and file names at once; a file that cannot be read as text or YAML is the
        one problem reported. The data files are looked for, not read.
    """
    path = str(fspath(path))
    text = read_bytes(path)
    document = _read(path, decode(path, text))
    model, findings, misspelt = _validate(document)
    draft, found, more = _check_rules(model, StudyFolder(Path(path).parent, Path(path)))
    told = misspelt | {key for key, _ in findings}
    findings += [(key, message) for key, message in more if key not in told]
    if findings or document.faults:
        raise InputError(_in_order([*_refused(path, document), *_problems(path, document, findings)]))
    return _study(path, text, document, draft, found)


def _read(path: str, text: str) -> Document:
    try:
        document = read_yaml(text)
    except YamlFault as fault:
        raise InputError([Problem(printable(path), fault.message, fault.line, fault.column)]) from None
    if not isinstance(document.data, dict):
        found = "the file is empty" if not document.lines or document.data is UNKNOWN else shown(document.data)
        message = f"{found}; a study is a group of keys, beginning with format: 1"
        raise InputError([Problem(printable(path), message, document.lines.get(""))])
    return document


def _validate(document: Document) -> tuple[StudyModel, list[Finding], set[str]]:
    """Return the model, with `UNKNOWN` in place of faulty values, what is wrong with them, and the keys misspelt."""
    try:
        return StudyModel.model_validate(document.data), [], set()
    except ValidationError as fault:
        errors = fault.errors(include_url=False)
    hidden = [fault.key for fault in document.faults if fault.hides]
    findings = plain_sentences(errors, document.data, hidden)
    return StudyModel.model_validate(document.data, context=TOLERANT), findings, misspelt_keys(errors, document.data)


def _check_rules(model: StudyModel, folder: StudyFolder) -> tuple[Draft, list[Found], list[Finding]]:
    entries = [] if model.datasets is UNKNOWN else model.datasets
    merged = [
        merge(model.dataset_defaults, entry, f"datasets[{number}]")
        for number, entry in enumerate(entries)
        if entry is not UNKNOWN
    ]
    draft = Draft(model, merged)
    found, findings = expand(entries, folder)
    for dataset in merged:
        for rule in DATASET_RULES:
            findings += attempt(rule, dataset)
    for rule in STUDY_RULES:
        findings += attempt(rule, draft)
    return draft, found, findings


def _problems(path: str, document: Document, findings: Iterable[Finding], severity: str = "error") -> list[Problem]:
    """Return each finding once, with its line."""
    return [
        Problem(printable(path), message, line_of(document.lines, key), None, key, severity)
        for key, message in dict.fromkeys(findings)
    ]


def _refused(path: str, document: Document) -> list[Problem]:
    """Return what the YAML reader refused; it knows the line of a key that is given twice."""
    return [Problem(printable(path), fault.message, fault.line, None, fault.key) for fault in document.faults]


def _in_order(problems: Iterable[Problem]) -> list[Problem]:
    """Return problems in the order of the file."""
    return sorted(problems, key=lambda problem: (problem.line or 0, problem.key))


def _study(path: str, text: bytes, document: Document, draft: Draft, found: list[Found]) -> Study:
    model = draft.model
    return Study(
        path=path,
        folder=Path(path).parent,
        text=text,
        format=model.format,
        name=model.study,
        title=model.title,
        purpose=model.purpose,
        random_seed=model.random_seed,
        stimulus=build_quantity(model.stimulus),
        response=build_quantity(model.response),
        datasets=build_datasets(found, draft.merged),
        families=tuple(draft.families),
        weighting=model.weighting,
        validation=tuple(draft.schemes),
        selection=build_selection(draft),
        warnings=tuple(_in_order(_problems(path, document, warnings_of(draft), "warning"))),
        lines=document.lines,
    )
