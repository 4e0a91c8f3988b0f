"""The settings that each step really reads are among those that its fingerprint counts."""

from dataclasses import fields

import pytest

from fitlib import analysis
from fitlib.observations import read_observations
from fitlib.plan import fingerprints, step_names
from fitlib.study import DatasetSettings, Study, load_study

RUN = "series: run}"
VARIANTS = (
    [
        (RUN, f"{RUN}\n  evaluation: direct"),
        ("rule:", "target_uncertainty: {expanded: 0.1, coverage_factor: 2}, rule:"),
    ],
    [(RUN, f"{RUN}\n  function: analysis\n  level_tolerance: 0.01")],
    [("loss: leave_one_level_out, rule: one_standard_error", "rule: f_test, alpha: 0.01")],
    [(RUN, f"{RUN}\n  measuring_interval: [1, 5]\n  verification_points: {{where: {{run: 2}}}}")],
    [("draws: 20}", "draws: 20, unit: observation}")],
    [("degree: 1..2}", "degree: 1..2, fixed_points: [[0, 0]]}"), ("loss: leave_one_level_out", "loss: bootstrap")],
)
"""Edits of the study, so that settings which are read only sometimes are read."""

SHOWN = set(fingerprints.ONLY_SHOWN)
UNITS = set(fingerprints.UNITS)
DECISIONS = set(fingerprints.DECISIONS)


def recording(original, used):
    """A copy of a record that notes which of its fields are read, through its methods too."""
    kind = type(original)
    names = {field.name for field in fields(kind)}

    class Recording(kind):
        def __getattribute__(self, name):
            if name in names:
                used.add(name)
            return super().__getattribute__(name)

    return Recording(**{name: getattr(original, name) for name in names})


def never_counted(step):
    """Fields of study and dataset that the fingerprint of a step leaves out."""
    of_study, of_dataset = set(fingerprints.WITHOUT_EFFECT), {"key"}
    if step == "result":
        return of_study, of_dataset
    of_study |= SHOWN
    of_dataset |= {"record"}
    if step != "selection":
        of_study |= UNITS
    if step == "fits":
        of_study |= DECISIONS
    elif step.startswith("scheme:"):
        of_study |= {"selection"}
    return of_study, of_dataset


@pytest.fixture
def study(folder):
    return load_study(str(folder.root / "study.yaml"))


def test_the_steps_are_those_of_the_analysis(study):
    assert list(step_names(study)) == [*analysis.step_names(study), "result"]


@pytest.mark.parametrize("edits", [(), *VARIANTS])
def test_no_step_reads_a_setting_that_its_fingerprint_leaves_out(folder, edits):
    for old, new in edits:
        folder.edit(old, new)
    study = load_study(str(folder.root / "study.yaml"))
    settings = study.datasets[0]
    observations = read_observations(study, settings)
    done = {}
    for step in step_names(study):
        of_study, of_dataset = set(), set()
        arguments = recording(study, of_study), recording(settings, of_dataset), observations
        if step == "result":
            done[step] = analysis.assemble(*arguments, done)
        else:
            done[step] = analysis.run_step(step, *arguments, dict(done))
        hidden_study, hidden_dataset = never_counted(step)
        assert of_study & hidden_study == set(), step
        assert of_dataset & hidden_dataset == set(), step
        assert of_study, step  # the records were read at all


def test_a_scheme_without_chance_does_not_depend_on_the_seed(folder):
    results = []
    for seed in (7, 8):
        folder.edit("random_seed: 7", f"random_seed: {seed}")
        study = load_study(str(folder.root / "study.yaml"))
        arguments = study, study.datasets[0], read_observations(study, study.datasets[0])
        fits = analysis.run_step("fits", *arguments, {})
        results.append(
            [
                analysis.run_step(step, *arguments, {"fits": fits})
                for step in ("scheme:leave_one_level_out", "scheme:bootstrap")
            ]
        )
    assert results[0][0] == results[1][0]
    assert results[0][1] != results[1][1]


def test_recording_sees_what_methods_read(study):
    """Twin of the test above: a field that is read behind a method does not slip through."""
    used = set()
    recording(study, used).requires_monotone(DatasetSettings("a", "a", "datasets[0]", (), None, evaluation="direct"))
    assert used == {"selection"}
    assert isinstance(recording(study, used), Study)
