"""A study of 200 invented datasets, from the command line to the published revision, and where the time goes.

    python tests/benchmarks/whole_study.py [DATASETS]

Prints the wall time of a first run on two cores, of a run without a change and of a run with one changed file, and the
processor time of numbers, figures and imports, measured in this process, as shares of what two cores offer; what is
left is Snakemake, publishing (tables, report, hashes) and waiting.
"""

import os

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ[name] = "1"

import subprocess  # noqa: E402
import sys  # noqa: E402
import tempfile  # noqa: E402
import time  # noqa: E402
from pathlib import Path  # noqa: E402

import numpy as np  # noqa: E402

from fitlib.analysis import assemble, run_step, step_names  # noqa: E402
from fitlib.figures import draw_dataset  # noqa: E402
from fitlib.observations import read_observations  # noqa: E402
from fitlib.study import load_study  # noqa: E402

CORES = 2
STUDY = """\
format: 1
study: fleet
title: Invented fleet of level sensors
random_seed: 7
stimulus: {quantity: water level, unit: m}
response: {quantity: loop current, unit: mA}
dataset_defaults:
  columns: {stimulus: level_m, response: current_mA, series: run}
datasets:
  - {ids_from: "data/*.csv"}
families:
  - {family: polynomial, degree: 0..8}
validation:
  - {scheme: leave_one_out}
  - {scheme: leave_one_level_out}
  - {scheme: leave_one_series_out}
  - {scheme: k_fold, folds: 5, repeats: 20}
  - {scheme: bootstrap, draws: 2000}
selection:
  loss: leave_one_level_out
"""


def write_fleet(folder: Path, count: int) -> None:
    """Invented data of 11 levels and three series each."""
    (folder / "data").mkdir()
    (folder / "study.yaml").write_text(STUDY, encoding="utf-8")
    for number in range(count):
        write_sensor(folder / "data" / f"LS-{number:04d}.csv", number)


def write_sensor(path: Path, seed: int) -> None:
    """One data file."""
    rng = np.random.default_rng(seed)
    level = np.tile(np.arange(11.0), 3)
    current = 4 + 1.6 * level - rng.uniform(0, 0.01) * level**2 + rng.normal(0, 0.005, level.size)
    rows = [f"{x:g},{y:.3f},{run}" for x, y, run in zip(level, current, np.repeat([1, 2, 3], 11), strict=True)]
    path.write_text("\n".join(["level_m,current_mA,run", *rows, ""]), encoding="utf-8")


def run(folder: Path) -> float:
    """Wall time of one ``fitlib run``."""
    command = [sys.executable, "-m", "fitlib", "run", str(folder / "study.yaml"), "--cores", str(CORES), "--quiet"]
    start = time.perf_counter()
    subprocess.run([*command, "--results", str(folder / "results")], check=True, stdout=subprocess.DEVNULL)
    return time.perf_counter() - start


def shares(folder: Path, sample: int) -> tuple[float, float, float]:
    """Seconds of numbers and of figures per dataset, and of the imports of one job."""
    study = load_study(str(folder / "study.yaml"))
    numbers = figures = 0.0
    for dataset in study.datasets[:sample]:
        start, steps = time.perf_counter(), {}
        observations = read_observations(study, dataset)
        for step in step_names(study):
            steps[step] = run_step(step, study, dataset, observations, steps)
        result = assemble(study, dataset, observations, steps)
        middle = time.perf_counter()
        draw_dataset(result)
        numbers, figures = numbers + middle - start, figures + time.perf_counter() - middle
    start = time.perf_counter()
    subprocess.run([sys.executable, "-c", "import fitlib.analysis, fitlib.figures, fitlib.observations"], check=True)
    return numbers / sample, figures / sample, time.perf_counter() - start


def main() -> None:
    """Print everything."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        write_fleet(folder, count)
        first, again = run(folder), run(folder)
        write_sensor(folder / "data" / "LS-0000.csv", 99_999)
        changed = run(folder)
        numbers, figures, imports = shares(folder, min(count, 20))
    start = time.perf_counter()
    subprocess.run([sys.executable, "-m", "snakemake", "--version"], check=True, stdout=subprocess.DEVNULL)
    engine = time.perf_counter() - start
    offered = CORES * first
    parts = {"numbers": numbers * count, "figures": figures * count}
    parts |= {"imports of 16 jobs": imports * 16, "start of Snakemake": engine}
    print(f"{count} datasets of 33 observations, degrees 0 to 8, five schemes, {CORES} cores")
    print(f"  first run {first:6.1f} s   no change {again:5.2f} s   one changed file {changed:5.1f} s")
    for part, value in parts.items():
        print(f"  {part:<20} {value:6.1f} s of processor time, {value / offered:4.0%} of what {CORES} cores offer")
    rest = offered - sum(parts.values())
    print(f"  {'the rest':<20} {rest:6.1f} s, {rest / offered:4.0%}: scheduling, publishing, waiting")


if __name__ == "__main__":
    main()
