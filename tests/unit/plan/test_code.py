"""The identity of the program: what counts as a change of a module."""

import json
import shutil

import pytest

from fitlib.plan import code
from fitlib.plan.code import code_identity, remember_trees, tree_hash

SOURCE = '''
"""A module."""

LIMIT = 3  # of something


def half(x):
    """Return the half."""
    return x / 2
'''


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("# of something", "# of another thing"),
        ('"""A module."""', '"""Another text."""'),
        ('    """Return the half."""\n', ""),
        ("x / 2", "(x / 2)"),
        ("LIMIT = 3", "LIMIT   =   3"),
    ],
)
def test_comments_docstrings_and_layout_do_not_count(old, new):
    assert old in SOURCE
    assert tree_hash(SOURCE.replace(old, new)) == tree_hash(SOURCE)


@pytest.mark.parametrize(
    ("old", "new"),
    [("x / 2", "x / 3"), ("x / 2", "x / 2.0"), ("x / 2", "2 / x"), ("LIMIT = 3", "LIMIT = '3'"), ("half", "halve")],
)
def test_every_other_change_counts(old, new):
    assert tree_hash(SOURCE.replace(old, new)) != tree_hash(SOURCE)


@pytest.mark.parametrize(("one", "other"), [("x = 1", "x = True"), ("x = None", "x = 'None'"), ("f(a)", "f(*a)")])
def test_values_of_another_kind_differ(one, other):
    assert tree_hash(one) != tree_hash(other)


@pytest.fixture
def package(tmp_path, monkeypatch):
    """A copy of the package that a test can edit, in the layout of an installed wheel."""
    root = tmp_path / "fitlib"
    shutil.copytree(code.PACKAGE, root, ignore=shutil.ignore_patterns("__pycache__"))
    shutil.copytree(code.workflow_folder(), root / "_workflow", ignore=shutil.ignore_patterns(".*"))
    monkeypatch.setattr(code, "PACKAGE", root)
    return root


def append(path, text):
    path.parent.mkdir(exist_ok=True)
    with open(path, "a", encoding="utf-8") as stream:
        stream.write(text)


def test_a_wheel_and_a_checkout_agree(package, monkeypatch):
    wheel = code_identity()
    monkeypatch.undo()
    assert package != code.PACKAGE
    assert code_identity() == wheel


@pytest.mark.parametrize("name", ["numerics/new.py", "analysis/new.py", "study/new.py", "plan/new.py", "errors.py"])
def test_numeric_code_changes_results(package, name):
    before = code_identity()
    append(package / name, "\nADDED = 1\n")
    after = code_identity()
    assert after.numerics != before.numerics
    assert (after.drawing, after.rendering) == (before.drawing, before.rendering)


@pytest.mark.parametrize(
    ("name", "drawing"),
    [
        ("figures/new.py", True),
        ("report/page.html", False),
        ("_workflow/Snakefile", False),
        ("unheard_of/new.py", True),
    ],
)
def test_rendering_code_changes_no_results(package, name, drawing):
    before = code_identity()
    append(package / name, "\nADDED = 1\n")
    after = code_identity()
    assert after.numerics == before.numerics
    assert after.rendering != before.rendering
    assert (after.drawing != before.drawing) == drawing


@pytest.mark.parametrize("name", ["start/new.py", "study/study.schema.json", "__pycache__/x.pyc", ".hidden"])
def test_what_no_result_depends_on_does_not_count(package, name):
    before = code_identity()
    append(package / name, "\n")
    assert code_identity() == before


def test_the_cache_gives_the_same_identity_and_a_damaged_one_is_ignored(package, tmp_path):
    cache = tmp_path / "trees.json"
    before = code_identity(cache)
    cache.write_text(remember_trees(cache))
    assert code_identity(cache) == before
    assert remember_trees(cache) is None
    append(package / "errors.py", "\nADDED = 1\n")
    assert code_identity(cache).numerics != before.numerics
    assert remember_trees(cache) is not None
    for text in ("{", "null", "[]", "{}", "[" * 100_000):
        cache.write_text(text)
        assert code_identity(cache) == code_identity()
    cache.unlink()
    cache.mkdir()
    assert code_identity(cache) == code_identity()


def test_the_cache_is_used(package, tmp_path):
    cache = tmp_path / "trees.json"
    content = json.loads(remember_trees(cache))
    content["trees"] = {raw: "0" * 64 for raw in content["trees"]}
    cache.write_text(json.dumps(content))
    assert code_identity(cache) != code_identity()
