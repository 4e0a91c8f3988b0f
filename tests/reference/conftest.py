"""Published cases, and comparisons that are run a second time on disturbed values, where they must fail."""

import json
from pathlib import Path

import numpy as np
import pytest
from threadpoolctl import threadpool_limits

HERE = Path(__file__).parent


@pytest.fixture(scope="session", autouse=True)
def one_thread():
    """Numeric threads are pinned to one, as they are when a study is run."""
    with threadpool_limits(1):
        yield


@pytest.fixture(scope="session")
def case():
    """Read a case by its name."""

    def read(name: str) -> dict:
        return json.loads((HERE / "cases" / f"{name}.json").read_text(encoding="utf-8"))

    return read


@pytest.fixture(scope="session")
def published(case):
    """What the publication prints for a quantity of a case, as text."""

    def read(name: str, quantity: str) -> str:
        (text,) = [check["published"] for check in case(name)["checks"] if check["quantity"] == quantity]
        return text

    return read


@pytest.fixture(scope="session")
def data_file():
    """Numbers of a published data file, below its heading."""

    def read(name: str, skip: int, columns: int) -> np.ndarray:
        lines = (HERE / "data" / name).read_text(encoding="ascii").splitlines()[skip:]
        rows = [line.split()[:columns] for line in lines if line.strip()]
        return np.array(rows, dtype=float)

    return read


def _check(actual: np.ndarray, expected: np.ndarray, limit: np.ndarray) -> None:
    assert actual.shape == expected.shape
    assert actual.size > 0
    off = ~(np.abs(actual - expected) <= limit)
    assert not off.any(), f"{actual[off]} is not {expected[off]} within {limit[off]}"


def _twice(actual, expected, limit) -> None:
    """Compare, then disturb each number in turn by three times the limit: every comparison must then fail."""
    actual, expected = (np.atleast_1d(np.asarray(value, dtype=float)) for value in (actual, expected))
    limit = np.broadcast_to(limit, expected.shape)
    assert np.all(limit > 0)
    _check(actual, expected, limit)
    for place in np.ndindex(actual.shape):
        disturbed = actual.copy()
        disturbed[place] += 3 * limit[place]
        with pytest.raises(AssertionError):
            _check(disturbed, expected, limit)


@pytest.fixture(scope="session")
def agrees():
    """Compare with reference values to a number of digits; a reference of zero to that many decimals."""

    def compare(actual, expected, digits: float) -> None:
        expected = np.atleast_1d(np.asarray(expected, dtype=float))
        _twice(actual, expected, 10.0**-digits * np.where(expected == 0, 1.0, np.abs(expected)))

    return compare


@pytest.fixture(scope="session")
def agrees_as_printed():
    """Compare with a printed number: half a unit of its last place, and a share more for numbers rounded twice."""

    def compare(actual: float, text: str, units: float = 0.5001) -> None:
        mantissa, _, exponent = text.lower().partition("e")
        decimals = len(mantissa.partition(".")[2])
        _twice(actual, float(text), units * 10.0 ** (int(exponent or 0) - decimals))

    return compare


@pytest.fixture(scope="session")
def within():
    """Compare with an absolute limit."""
    return _twice


@pytest.fixture(scope="session")
def fit_polynomial():
    """Fit one polynomial; the residual standard deviation and the coefficients in powers come with it."""
    from types import SimpleNamespace

    from fitlib.numerics.families import make_family
    from fitlib.numerics.powers import power_form

    def fit(x, y, degree: int, fixed_points=(), root_weights=None) -> SimpleNamespace:
        x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
        root_weights = np.ones(x.size) if root_weights is None else root_weights
        family = make_family("polynomial", x, [degree], fixed_points)
        member, problem = family.members[0], family.problem(x, y, root_weights)
        fitted = problem.fit()[0]
        assert fitted.message == ""
        curve = family.curve(member, fitted.coefficients)
        variance = fitted.residual_sum_of_squares / (x.size - member.parameters)
        covariance = variance * fitted.inverse_normal
        power = power_form(curve, covariance, float(x.min()), float(x.max()))
        return SimpleNamespace(
            fit=fitted,
            curve=curve,
            covariance=covariance,
            design=problem.design[:, : member.parameters],
            parameters=member.parameters,
            deviation=float(np.sqrt(variance)),
            power=power,
        )

    return fit
