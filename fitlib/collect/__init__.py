"""Gather results into tables and JSON documents, the same bytes for the same results."""

from fitlib.collect.documents import dump_json, function_files
from fitlib.collect.tables import build_tables

__all__ = ["build_tables", "dump_json", "function_files"]
