"""Reads `fitlib/glossary.yaml`: what each key, column and word means, and where the meaning comes from."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from importlib.resources import files

from fitlib.study.yaml_reader import read_yaml


@dataclass(frozen=True)
class GlossaryEntry:
    """The meaning of a word in one sentence, and its source."""

    meaning: str
    source: str


@cache
def load_glossary() -> dict[str, GlossaryEntry]:
    """Return the glossary: word -> `GlossaryEntry`."""
    document = read_yaml(files("fitlib").joinpath("glossary.yaml").read_text(encoding="utf-8"))
    if document.faults:
        raise ValueError(f"glossary.yaml:{document.faults[0].line}: {document.faults[0].message}")
    return {word: GlossaryEntry(**entry) for word, entry in document.data.items()}
