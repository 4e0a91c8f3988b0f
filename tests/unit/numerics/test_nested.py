"""Many nested normal equations at once: every member of every problem against numpy's own solver."""

import numpy as np
import pytest

from fitlib.numerics.nested import solve_nested

SIZE, PROBLEMS = 6, 25


def _solve(normal, right, z=None):
    """Solutions without a fit to start from, pivots relative to each problem's own diagonal."""
    size = right.shape[0]
    return solve_nested(normal, right, np.zeros(size) if z is None else z, normal[np.diag_indices(size)])


def _problems(seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Symmetric positive definite matrices with a diagonal of ones, and right-hand sides."""
    rng = np.random.default_rng(seed)
    rows = rng.normal(size=(PROBLEMS, 3 * SIZE, SIZE))
    rows /= np.linalg.norm(rows, axis=1, keepdims=True)
    normal = np.einsum("kni,knj->ijk", rows, rows)
    normal[np.arange(SIZE), np.arange(SIZE)] = 1.0
    return normal, rng.normal(size=(SIZE, PROBLEMS))


def _assert_members_agree(solved, normal, right, members, numbers) -> None:
    for p in members:
        for k in numbers:
            expected = np.linalg.solve(normal[:p, :p, k], right[:p, k])
            np.testing.assert_allclose(solved.changes[p - 1, :p, k], expected, rtol=1e-10, atol=1e-12)
            assert not solved.changes[p - 1, p:, k].any()


@pytest.mark.parametrize("seed", range(3))
def test_every_leading_block_is_solved(seed):
    normal, right = _problems(seed)
    solved = _solve(normal, right)
    assert solved.changes.shape == (SIZE, SIZE, PROBLEMS)
    _assert_members_agree(solved, normal, right, range(1, SIZE + 1), range(PROBLEMS))


def test_the_comparison_sees_a_difference():
    normal, right = _problems(0)
    solved = _solve(normal, right)
    with pytest.raises(AssertionError):
        _assert_members_agree(solved, normal, right + 1e-8, [SIZE], [0])


def test_one_parameter():
    solved = _solve(np.array([[[4.0, 0.5]]]), np.array([[2.0, 3.0]]))
    np.testing.assert_allclose(solved.changes, [[[0.5, 6.0]]], rtol=1e-15)


def test_the_smallest_pivot_is_that_of_the_worst_column_so_far():
    """A pivot is what is left of a column beside those before it: one over a diagonal element of the inverse."""
    normal, right = _problems(1)
    pivots = np.array(
        [[1 / np.linalg.inv(normal[:p, :p, k])[-1, -1] for k in range(PROBLEMS)] for p in range(1, SIZE + 1)]
    )
    expected = np.minimum.accumulate(pivots, axis=0)
    np.testing.assert_allclose(_solve(normal, right).smallest_pivot, expected, rtol=1e-10)
    assert np.unique(expected[-1]).size == PROBLEMS


def _singular() -> dict[str, np.ndarray]:
    """Matrices whose third column adds nothing, in numbers without rounding; the first two columns are sound."""
    copied = np.eye(SIZE)
    copied[:3, :3] = [[1.0, 0.0, 1.0], [0.0, 1.0, 0.0], [1.0, 0.0, 1.0]]
    empty = np.eye(SIZE)
    empty[2, 2] = 0.0
    below = copied.copy()
    below[2, 2] -= 2.0**-50  # rounding can leave a pivot below zero
    negative = np.eye(SIZE)
    negative[2, 2] = -(2.0**-50)
    return {"copied": copied, "empty": empty, "below zero": below, "negative": negative}


@pytest.mark.parametrize("kind", _singular())
def test_a_zero_pivot_gives_finite_numbers_and_says_so(kind):
    """No warning of the machine either: every RuntimeWarning is an error in this suite."""
    normal, right = _problems(2)
    normal[:, :, 7] = _singular()[kind]
    solved = _solve(normal, right)
    assert np.isfinite(solved.changes).all()
    assert (solved.smallest_pivot[:2, 7] > 0.1).all()
    assert (solved.smallest_pivot[2:, 7] <= 0.0).all()
    _assert_members_agree(solved, normal, right, [1, 2], [7])
    # The others of the batch are none the worse
    others = np.delete(np.arange(PROBLEMS), 7)
    _assert_members_agree(solved, normal, right, range(1, SIZE + 1), others)
    assert (solved.smallest_pivot[:, others] > 0.0).all()


def test_nothing_at_all_is_finite_and_says_so():
    solved = _solve(np.zeros((3, 3, 2)), np.zeros((3, 2)))
    assert np.isfinite(solved.changes).all()
    assert (solved.smallest_pivot <= 0.0).all()


def test_problems_do_not_touch_each_other():
    normal, right = _problems(0)
    whole = _solve(normal, right)
    for part in (slice(0, 1), slice(3, 10)):
        alone = _solve(normal[:, :, part], right[:, part])
        np.testing.assert_allclose(alone.changes, whole.changes[:, :, part], rtol=1e-13, atol=1e-15)


def test_columns_that_a_member_lacks_are_part_of_its_residual():
    """With coefficients z of the whole, member p is changed by G_pp^-1 (right_p + G[:p, p:] z[p:])."""
    normal, right = _problems(1)
    size = right.shape[0]
    z = np.linspace(-2.0, 3.0, size)
    solved = _solve(normal, right, z)
    for p in range(1, size + 1):
        for k in range(right.shape[1]):
            expected = np.linalg.solve(normal[:p, :p, k], right[:p, k] + normal[:p, p:, k] @ z[p:])
            np.testing.assert_allclose(solved.changes[p - 1, :p, k], expected, rtol=1e-9, atol=1e-12)
            assert not solved.changes[p - 1, p:, k].any()
