"""Random streams are named after dataset, scheme and outer fold, so that no two of them draw the same."""

import pytest

from fitlib.analysis import choice, schemes

SEED = 20260401


@pytest.fixture
def streams(monkeypatch):
    """Seed and names of each stream that is opened."""
    opened = []

    def watched(original):
        def act(seed, names, *rest):
            opened.append((seed, names))
            return original(seed, names, *rest)

        return act

    monkeypatch.setattr(schemes, "permutations", watched(schemes.permutations))
    for module in (schemes, choice):
        monkeypatch.setattr(module, "draw_counts", watched(module.draw_counts))
    return opened


@pytest.fixture
def rows(made):
    import numpy as np

    x, y, run = made.load_cell(np.random.default_rng(1), levels=8, readings=1)
    return made.observations(x, y, run)


def test_k_fold_has_one_stream_for_the_dataset_and_one_for_each_outer_fold(made, streams, rows):
    scheme = made.scheme("k_fold", folds=5, repeats=2)
    study = made.study((made.family([1, 2]),), (scheme,), loss="k_fold", seed=SEED)
    made.run(study, rows)
    assert {seed for seed, _ in streams} == {SEED}
    outer = {("LC-1", "k_fold", "outer", f"outer {number}") for number in range(1, 9)}
    assert {names for _, names in streams} == {("LC-1", "k_fold")} | outer


def test_schemes_of_one_kind_have_streams_of_their_own(made, streams, rows):
    units = ("level", "series", "observation")
    declared = [made.scheme("bootstrap", unit, draws=10) for unit in units]
    declared += [made.scheme("k_fold", unit, folds=3, repeats=1) for unit in units]
    made.run(made.study((made.family([1, 2]),), ("leave_one_level_out", *declared), seed=SEED), rows)
    assert {names for _, names in streams} == {("LC-1", scheme.id) for scheme in declared}
    assert len({scheme.id for scheme in declared}) == 6
