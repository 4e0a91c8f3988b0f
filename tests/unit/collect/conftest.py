"""Invented results for the tests of tables."""

import importlib.util
from pathlib import Path

import pytest


@pytest.fixture(scope="session")
def synthetic():
    """The module that makes invented results."""
    spec = importlib.util.spec_from_file_location("synthetic_results", Path(__file__).with_name("synthetic.py"))
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module
