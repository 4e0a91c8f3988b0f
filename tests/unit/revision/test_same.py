"""Same results: rounding is forgiven, a choice, a word or a digit that counts is not."""

import json

import pytest

from fitlib.revision import same_results
from fitlib.revision.same import same_values


@pytest.fixture
def check(shop):
    """Publish, then compare with results that ``change`` altered."""

    def compare(change, rtol=1e-8):
        path = shop.publish().path
        bundle = shop.synthetic.make_bundle()
        change(bundle["results"][0], bundle)
        return same_results(path, shop.files(bundle), rtol)

    return compare


def test_the_same_results_are_the_same(check):
    assert check(lambda result, bundle: None)


@pytest.mark.parametrize("factor, same", [(1 + 1e-10, True), (1 + 1e-7, False)])
def test_a_number_counts_from_the_tolerance_on(check, factor, same):
    def change(result, bundle):
        result["selection"]["loss"] *= factor

    assert check(change) is same


def test_the_tolerance_can_be_chosen(check):
    def change(result, bundle):
        result["selection"]["loss"] *= 1 + 1e-7

    assert check(change, rtol=1e-6)


def test_rounding_of_a_small_difference_of_large_numbers_is_forgiven(check):
    def change(result, bundle):
        result["observations"]["residual"][0] += 4e-15  # one unit in the last place of a response of 20

    assert check(change)


def test_a_small_residual_that_really_differs_counts(check):
    def change(result, bundle):
        result["observations"]["residual"][0] += 1e-9

    assert not check(change)


@pytest.mark.parametrize("name", ["power_shift", "condition_number"])
def test_measures_of_rounding_are_not_compared(check, name):
    def change(result, bundle):
        result["candidates"][0][name] *= 3

    assert check(change)


def word(result, bundle):
    result["selection"]["verdict"] = "inadequate"


def choice(result, bundle):
    result["candidates"][1]["eligible"] = False


def emptied(result, bundle):
    result["selection"]["threshold"] = None


def fewer(result, bundle):
    result["levels"].pop()


def coefficient(result, bundle):
    result["function"]["scaled"]["coefficients"][0] += 1e-6


def setting(result, bundle):
    bundle["study"]["random_seed"] = 8


def no_function(result, bundle):
    result["function"] = None


@pytest.mark.parametrize("change", [word, choice, emptied, fewer, coefficient, setting, no_function])
def test_whatever_else_differs_counts(check, change):
    assert not check(change)


def test_figures_and_report_do_not_count(shop):
    path = shop.publish().path
    files = shop.files(shop.synthetic.make_bundle())
    assert same_results(path, {**files, "figures/TG-1/data.svg": b"other", "report.html": b"new"})


def test_an_altered_revision_is_never_the_same(shop):
    path = shop.publish().path
    files = shop.files(shop.synthetic.make_bundle())
    (path / "resolved.json").chmod(0o644)
    (path / "resolved.json").write_text("{}")
    assert not same_results(path, files)


@pytest.mark.parametrize(
    "old, new, same",
    [
        ([1.0, 1e-17], [1.0, -1e-17], True),
        ([[1.0, 1e-17], [0.0, 2.0]], [[1.0, 0.0], [0.0, 2.0]], True),
        ([1e-17], [-1e-17], False),
        ({"a": 1}, {"a": 1.0}, True),
        ({"a": True}, {"a": 1}, False),
        ({"a": None}, {"a": 0.0}, False),
        ({"a": 1}, {"b": 1}, False),
        ([1.0], [1.0, 2.0], False),
        ("1.0", 1.0, False),
    ],
)
def test_values_are_compared_by_kind(old, new, same):
    assert same_values(json.loads(json.dumps(old)), json.loads(json.dumps(new)), 1e-8) is same
