"""What README.md prints of the demonstration is what the program prints."""

import re
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def _fitlib(*arguments):
    command = [sys.executable, "-m", "fitlib", *arguments]
    return subprocess.run(command, capture_output=True, text=True, check=False, cwd=ROOT)


@pytest.fixture(scope="module")
def results(tmp_path_factory):
    folder = tmp_path_factory.mktemp("readme") / "results"
    done = _fitlib("run", "configs/level-sensors/study.yaml", "--results", str(folder), "--quiet")
    assert done.returncode == 0, done.stderr
    return folder, done.stdout


def _block(kind):
    return re.search(rf"```{kind}\n(.*?)```", README, re.DOTALL)[1]


def test_the_table_of_the_demonstration_is_as_printed(results):
    printed = _block("text").rstrip().splitlines()
    assert len(printed) == 9
    assert results[1].splitlines()[: len(printed)] == printed


def test_the_conversion_is_as_printed(results):
    command, *answers = _block("console").rstrip().splitlines()
    words = command.removeprefix("$ fitlib ").replace("results/", f"{results[0]}/").split()
    done = _fitlib(*words)
    assert done.returncode == 4  # one reading lies beyond the interval
    assert done.stdout.splitlines() == answers
