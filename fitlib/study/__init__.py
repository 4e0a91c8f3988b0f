"""A study file and its folder, checked and turned into frozen records."""

from fitlib.study.glossary import GlossaryEntry, load_glossary
from fitlib.study.keys import study_keys
from fitlib.study.loader import load_study
from fitlib.study.names import file_name_of
from fitlib.study.resolved import resolve_dataset
from fitlib.study.schema import export_schema, schema_text
from fitlib.study.settings import (
    Columns,
    DatasetSettings,
    Exclusion,
    FamilySettings,
    Quantity,
    SchemeSettings,
    SelectionSettings,
    Study,
    Target,
)

__all__ = [
    "Columns",
    "DatasetSettings",
    "Exclusion",
    "FamilySettings",
    "GlossaryEntry",
    "Quantity",
    "SchemeSettings",
    "SelectionSettings",
    "Study",
    "Target",
    "export_schema",
    "file_name_of",
    "load_glossary",
    "load_study",
    "resolve_dataset",
    "schema_text",
    "study_keys",
]
