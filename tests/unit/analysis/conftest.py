"""Studies made in memory."""

import importlib.util
from pathlib import Path

import pytest
from threadpoolctl import threadpool_limits


@pytest.fixture(scope="session", autouse=True)
def one_thread():
    """Numeric threads are pinned to one, as they are when a study is run."""
    with threadpool_limits(1):
        yield


@pytest.fixture(scope="session")
def made():
    """The module that makes studies and runs the steps on them."""
    place = Path(__file__).with_name("made.py")
    spec = importlib.util.spec_from_file_location("made_studies", place)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module
