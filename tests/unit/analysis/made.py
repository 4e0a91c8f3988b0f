"""Studies and observations made in memory, and the analysis steps run on them one after another."""

import json
from pathlib import Path

import numpy as np

from fitlib.analysis import assemble, run_step, step_names
from fitlib.numerics.selection import LOSS_RULES
from fitlib.observations.records import FileAccount, Observations
from fitlib.study.settings import (
    Columns,
    DatasetSettings,
    FamilySettings,
    Quantity,
    SchemeSettings,
    SelectionSettings,
    Study,
    Target,
)


def family(degrees, fixed_points=()) -> FamilySettings:
    """One families entry of polynomials."""
    degrees = tuple(degrees)
    ending = "-fixed" if fixed_points else ""
    return FamilySettings("polynomial", degrees, tuple(fixed_points), tuple(f"polynomial-{d}{ending}" for d in degrees))


def scheme(name: str, unit: str | None = None, **keys) -> SchemeSettings:
    """One validation entry, with the id that a study gives it."""
    if name in ("k_fold", "bootstrap"):
        unit = unit or "level"
    ending = f"_{unit}" if unit in ("series", "observation") else ""
    return SchemeSettings(name + ending, name, unit=unit, **keys)


def study(
    families=None,
    validation=("leave_one_level_out",),
    rule="one_standard_error",
    loss="leave_one_level_out",
    weighting="none",
    seed=None,
    target=None,
    degrees_of_freedom=3,
    monotone=True,
    **dataset,
) -> Study:
    """A study of one dataset; further keys are those of the dataset."""
    schemes = tuple(scheme(item) if isinstance(item, str) else item for item in validation)
    settings = DatasetSettings(
        id="LC-1",
        file_name="LC-1",
        key="datasets[0]",
        files=("data/LC-1.csv",),
        columns=Columns("force_kN", "ratio_mV_V", "run"),
        **dataset,
    )
    return Study(
        path="study.yaml",
        folder=Path("."),
        text=b"",
        format=1,
        name="made",
        title="Made in memory",
        purpose="Tests",
        random_seed=seed,
        stimulus=Quantity("force", "kN"),
        response=Quantity("ratio", "mV/V"),
        datasets=(settings,),
        families=tuple(families) if families else (family(range(1, 5)),),
        weighting=weighting,
        validation=schemes,
        selection=SelectionSettings(
            loss=loss if rule in LOSS_RULES else None,
            rule=rule,
            monotone=monotone,
            degrees_of_freedom=degrees_of_freedom,
            target=None if target is None else Target(target, 2.0),
        ),
    )


def observations(x, y, series=None, level=None, state=None) -> Observations:
    """Observations as they are read: levels are the different values of the stimulus unless given."""
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    n = x.size
    state = np.array(["used"] * n) if state is None else np.asarray(state)
    label = x if level is None else np.asarray(level, dtype=float)
    index = np.full(n, -1)
    index[state == "used"] = np.unique(label[state == "used"], return_inverse=True)[1]
    used, excluded, kept = (int(np.sum(state == name)) for name in ("used", "excluded", "verification"))
    return Observations(
        file=("data/LC-1.csv",) * n,
        row=np.arange(2, n + 2),
        series=("1",) * n if series is None else tuple(str(s) for s in series),
        direction=("",) * n,
        level=label,
        stimulus=x,
        response=y,
        state=tuple(state.tolist()),
        reason=tuple("cable moved (shift lead, 2026-04-03)" if s == "excluded" else "" for s in state),
        account=(FileAccount("data/LC-1.csv", n, used, excluded, kept, 0),),
        notes=(),
        level_index=index,
        dataset="LC-1",
    )


def run_steps(made: Study, rows: Observations) -> dict[str, dict]:
    """All steps; each must survive JSON without nan, as the store of the workflow demands."""
    steps: dict[str, dict] = {}
    for name in step_names(made):
        steps[name] = json.loads(json.dumps(run_step(name, made, made.datasets[0], rows, steps), allow_nan=False))
    return steps


def run(made: Study, rows: Observations) -> dict:
    """The whole result, as JSON gives it back."""
    return json.loads(json.dumps(assemble(made, made.datasets[0], rows, run_steps(made, rows)), allow_nan=False))


def load_cell(rng, deviation=3e-4, repeatability=1e-4, levels=11, series=3, readings=3, shape="bowed"):
    """Force, ratio and series of an invented load cell: 0 to 50 kN, a deviation of each level shared by all series."""
    force = np.linspace(0.0, 50.0, levels)
    curve = 0.0400 * force
    curve = {
        "bowed": curve + 8.0e-6 * force * (50 - force),
        "line": curve,
        "s": curve + 0.005 * np.sin(2 * np.pi * force / 50),
    }[shape]
    level = np.tile(np.repeat(np.arange(levels), readings), series)
    run_number = np.repeat(np.arange(1, series + 1), levels * readings)
    ratio = (curve + rng.normal(0, deviation, levels))[level] + rng.normal(0, repeatability, level.size)
    return force[level], ratio, run_number
