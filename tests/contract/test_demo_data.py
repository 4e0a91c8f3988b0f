"""The data that ship with the repository are what their descriptions say."""

from __future__ import annotations

import csv
import runpy
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

ROOT = Path(__file__).parents[2]
LEVEL_SENSORS = ROOT / "configs" / "level-sensors"
LOAD_CELL = ROOT / "configs" / "reference-load-cell" / "data" / "pontius.csv"
PUBLISHED = ROOT / "tests" / "reference" / "data" / "PONTIUS.DAT"


@pytest.fixture(scope="module")
def rewritten(tmp_path_factory) -> Path:
    """A folder into which the generator has written the data once more, in a process of its own."""
    folder = tmp_path_factory.mktemp("data")
    subprocess.run([sys.executable, LEVEL_SENSORS / "make_data.py", folder], check=True)
    return folder


def test_the_generator_writes_the_shipped_files_byte_for_byte(rewritten):
    written = {path.name: path.read_bytes() for path in rewritten.iterdir()}
    shipped = {path.name: path.read_bytes() for path in (LEVEL_SENSORS / "data").iterdir()}
    assert written.keys() == shipped.keys()
    assert len(shipped) == 9
    assert [name for name in shipped if written[name] != shipped[name]] == []


def test_the_seed_of_a_sensor_decides_its_observations():
    """The twin of the test above: another seed must give other readings, else the comparison could not fail."""
    made = runpy.run_path(str(LEVEL_SENSORS / "make_data.py"))
    sensor = made["SENSORS"]["LS-101"]
    other = type(sensor)(sensor.seed + 1, sensor.shape, sensor.levels)
    assert made["read_sensor"](sensor) == made["read_sensor"](sensor)
    assert made["read_sensor"](sensor) != made["read_sensor"](other)


def read_published() -> list[list[str]]:
    """Deflection and load as printed: the file says ``SKIP 25``, then one observation per line."""
    return [line.split() for line in PUBLISHED.read_text(encoding="ascii").splitlines()[25:]]


def read_ours() -> list[dict[str, str]]:
    with LOAD_CELL.open(encoding="ascii", newline="") as file:
        return list(csv.DictReader(file))


def test_the_load_cell_data_are_those_of_nist_digit_for_digit():
    # Source: NIST file PONTIUS.DAT (e-Handbook 4.6.1), shipped untouched in tests/reference/data.
    published = read_published()
    ours = [[row["deflection"].removeprefix("0"), row["load"]] for row in read_ours()]
    assert len(published) == 40  # "Number of observations = 40" in the file's own head
    assert ours == published


def test_each_run_of_the_load_cell_is_one_set_of_increasing_loads():
    # Source: the head of PONTIUS.DAT: "collected in two sets in order of increasing load".
    rows = read_ours()
    assert [row["run"] for row in rows] == ["1"] * 20 + ["2"] * 20
    for run in ("1", "2"):
        loads = np.array([float(row["load"]) for row in rows if row["run"] == run])
        assert (np.diff(loads) > 0).all()
