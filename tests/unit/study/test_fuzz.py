"""Whatever stands in the file, loading ends with a study or with plain problems, never otherwise. Seeded."""

from __future__ import annotations

import random

from fitlib.errors import InputError
from fitlib.study import load_study, study_keys

WORDS = ["no", "~", "true", "1e-6", ".nan", ".inf", "0..8", "8..0", "[]", "{}", "''", '"\\u202e"', "&a 1", "*a"]
WORDS += [
    "!!str x",
    "[1, [2]]",
    "{a: {b: c}}",
    "-1",
    "9" * 40,
    "polynomial",
    "k_fold",
    "bootstrap",
    "inverse",
    "f_test",
]
WORDS += ["data/fm-1.csv", "../x", "C:\\x", "2026-02-30", "|\n", ">-\n", "- x", "? y", ": :", "#", "%", "@", "`", "\t"]
WORDS += ["é", "𝛼", "<<", "__class__"]


def must_end_plainly(path) -> int:
    """Load a file and return the number of its problems; anything but an InputError fails the test."""
    try:
        load_study(path)
    except InputError as fault:
        assert fault.problems and all(str(problem).isprintable() for problem in fault.problems)
        return len(fault.problems)
    return 0


def test_studies_with_passages_cut_doubled_or_replaced(bench, full):
    chance, seen = random.Random(11), set()
    for _ in range(400):
        text = full
        for _ in range(chance.randint(1, 4)):
            start = chance.randrange(len(text))
            end = min(len(text), start + chance.randint(0, 12))
            text = text[:start] + chance.choice([*WORDS, "", text[start:end] * 2]) + text[end:]
        bench.path.write_text(text)
        seen.add(min(must_end_plainly(bench.path), 3))
    assert seen == {0, 1, 2, 3}


def test_studies_with_any_value_under_any_key(bench, full):
    chance, seen = random.Random(12), set()
    lines = full.splitlines()
    for _ in range(400):
        changed = list(lines)
        for _ in range(chance.randint(1, 5)):
            place = chance.randrange(len(changed))
            indent = len(changed[place]) - len(changed[place].lstrip(" -"))
            changed[place] = changed[place][:indent] + f"{chance.choice(study_keys())}: {chance.choice(WORDS)}"
        bench.path.write_text("\n".join(changed) + "\n")
        seen.add(min(must_end_plainly(bench.path), 3))
    assert seen >= {1, 2, 3}


def _written(chance: random.Random, depth: int = 0) -> str:
    if depth > 5 or chance.random() < 0.3:
        return chance.choice(["1", "no", "~", "'x'", "1.5", "true", "data/fm-1.csv", "0..3", "polynomial", "k_fold"])
    if chance.random() < 0.4:
        return "[" + ", ".join(_written(chance, depth + 1) for _ in range(chance.randrange(4))) + "]"
    keys = [chance.choice(study_keys()) for _ in range(chance.randrange(5))]
    return "{" + ", ".join(f"{key}: {_written(chance, depth + 1)}" for key in keys) + "}"


def test_random_trees_of_known_keys_in_the_right_places(bench):
    chance, found = random.Random(13), 0
    tops = ["dataset_defaults", "datasets", "families", "validation", "selection", "stimulus", "random_seed", "format"]
    for _ in range(600):
        body = "".join(f"{key}: {_written(chance)}\n" for key in tops if chance.random() < 0.9)
        bench.path.write_text(f"study: a\ntitle: t\n{body}")
        found += must_end_plainly(bench.path)
    assert found > 600


def test_random_bytes(bench):
    chance = random.Random(14)
    for _ in range(200):
        bench.path.write_bytes(chance.randbytes(chance.randint(1, 60)))
        assert must_end_plainly(bench.path) == 1


def test_two_thousand_datasets_with_a_fault_each_are_all_reported(bench, full):
    entry = "  - {{id: D{0}, files: [data/fm-1.csv], measuring_interval: [1, 0]}}\n"
    entries = "".join(entry.format(n) for n in range(2000))
    assert len(bench.problems(full, ("families:", f"{entries}families:"))) == 2000
