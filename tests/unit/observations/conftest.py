"""Studies in a temporary folder, written as a user would write them and loaded by the real loader."""

from __future__ import annotations

import pytest

from fitlib.errors import InputError
from fitlib.observations import read_observations
from fitlib.study import load_study

HEAD = """\
format: 1
study: bench
title: Bench
stimulus: {quantity: level, unit: m}
response: {quantity: current, unit: mA}
datasets:
  - id: A-1
    files: [%s]
    columns: {%s}
"""
TAIL = """\
families:
  - {family: polynomial, degree: 1..2}
weighting: %s
validation:
  - {scheme: leave_one_level_out}
selection: {loss: leave_one_level_out, rule: one_standard_error}
"""


@pytest.fixture
def load(tmp_path, monkeypatch):
    """Write data files and a study into `bench/`, and load it under the relative path a user would type."""
    monkeypatch.chdir(tmp_path)

    def make(files, extra="", columns="stimulus: x, response: y", weighting="none"):
        (tmp_path / "bench").mkdir(exist_ok=True)
        for name, content in files.items():
            data = content if isinstance(content, bytes) else content.encode("utf-8")
            (tmp_path / "bench" / name).write_bytes(data)
        more = "".join(f"    {line}\n" for line in extra.splitlines())
        text = HEAD % (", ".join(files), columns) + more + TAIL % weighting
        (tmp_path / "bench" / "study.yaml").write_text(text, encoding="utf-8")
        return load_study("bench/study.yaml")

    return make


@pytest.fixture
def read(load):
    """Observations of the one dataset of such a study."""

    def run(*arguments, **keywords):
        study = load(*arguments, **keywords)
        return read_observations(study, study.datasets[0])

    return run


@pytest.fixture
def problems(read):
    """The problems of such a study's dataset, of which there must be some."""

    def run(*arguments, **keywords):
        with pytest.raises(InputError) as caught:
            read(*arguments, **keywords)
        return caught.value.problems

    return run
