"""Leave-one-out losses that were published."""

import itertools

import numpy as np
import pytest
import statsmodels.api as sm
from statsmodels.stats.outliers_influence import OLSInfluence

from fitlib.numerics.evidence import Evidence
from fitlib.numerics.families import make_family
from fitlib.numerics.least_squares import LinearProblem
from fitlib.numerics.selection import choose
from fitlib.numerics.validation import level_means, scheme_errors, summarise, unit_folds


def _leave_one_out(x, y, degrees):
    """Problem, members and losses under leave-one-out, every observation a level of its own."""
    x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
    family = make_family("polynomial", x, degrees, ())
    rows, ones = np.arange(x.size), np.ones(x.size)
    folds = unit_folds(rows, [str(row) for row in rows])
    parameters = [member.parameters for member in family.members]
    errors = scheme_errors(family.problem(x, y, ones), parameters, folds, ones, rows)
    keep = [k for k, member in enumerate(family.members) if not member.probe]
    return errors.squared[keep]


def test_fuel_consumption_by_power(case, published, agrees, agrees_as_printed):
    """James, Witten, Hastie & Tibshirani, lab 5.3.2: leave-one-out loss of degrees 1 to 5."""
    data = case("isl_auto_loocv")["data"]
    loss = _leave_one_out(data["horsepower"], data["mpg"], range(1, 11)).mean(axis=1)
    assert loss.size == 10
    for degree in range(1, 6):
        agrees_as_printed(loss[degree - 1], published("isl_auto_loocv", f"LOOCV MSE degree {degree}"))
    computed = {check["quantity"]: check["computed"] for check in case("isl_auto_loocv")["checks"]}
    agrees(loss[:5], [computed[f"LOOCV MSE degree {degree}"] for degree in range(1, 6)], 11)


def test_fuel_consumption_higher_degrees(case, agrees):
    """Degrees 6 to 10 against the residuals left out by statsmodels in an orthonormal basis."""
    data = case("isl_auto_loocv")["data"]
    x, y = np.array(data["horsepower"]), np.array(data["mpg"])
    basis = np.linalg.qr(np.vander((x - x.mean()) / np.ptp(x), 11, increasing=True))[0]
    loss = _leave_one_out(x, y, range(1, 11)).mean(axis=1)
    for degree in range(6, 11):
        fit = sm.OLS(y, basis[:, : degree + 1]).fit()
        agrees(loss[degree - 1], np.mean(OLSInfluence(fit).resid_press ** 2), 9)


def test_one_standard_error_rule_keeps_the_quadratic(case):
    """The gain from degree 1 to 2 is large, beyond it the loss is flat; power values repeat and are the levels."""
    data = case("isl_auto_loocv")["data"]
    level_index = np.unique(data["horsepower"], return_inverse=True)[1]
    squared = _leave_one_out(data["horsepower"], data["mpg"], range(1, 11))
    loss = summarise(squared, np.ones(392), level_index, int(level_index.max()) + 1)
    evidence = Evidence(np.arange(2, 12), loss.levels, np.bincount(level_index).astype(float), np.full(10, np.nan))
    choice = choose(evidence, "one_standard_error", np.ones(10, dtype=bool))
    assert choice.chosen == 1
    assert choice.smallest > 1


def test_stopping_distance(case, agrees):
    """R datasets::cars, degrees 1 to 5; losses recomputed for the case (no print)."""
    data = case("r_cars")
    loss = _leave_one_out(data["data"]["x"], data["data"]["y"], range(1, 6)).mean(axis=1)
    agrees(loss, list(data["reference_values_computed_here"]["loocv_mse"].values()), 9)


def _press(design: np.ndarray, y: np.ndarray) -> float:
    problem = LinearProblem(design, y, np.ones(y.size), [design.shape[1]])
    held = problem.held_out([np.array([row]) for row in range(y.size)])
    return float(sum(part.item() ** 2 for part in held))


SUBSETS = ["".join(chosen) for size in range(1, 5) for chosen in itertools.combinations("1234", size)]


@pytest.mark.parametrize("subset", SUBSETS)
def test_hald_cement(subset, case, data_file, agrees, agrees_as_printed):
    """PRESS of all subsets of four regressors (Hald 1952; Montgomery, Peck & Vining ch. 10): any nested design."""
    table = data_file("HALD647.DAT", 25, 5)
    assert table.shape == (13, 5)
    design = np.column_stack([np.ones(13), *(table[:, int(k)] for k in subset)])
    press = _press(design, table[:, 0])
    data = case("hald_cement_press")
    agrees(press, data["reference_values_computed_here"]["all_subsets"][subset]["PRESS"], 10)
    names = {"1234": "PRESS full", **{chosen: f"PRESS x{chosen}" for chosen in ("12", "14", "123", "124", "134")}}
    if subset in names:
        (text,) = [check["published"] for check in data["checks"] if check["quantity"] == names[subset]]
        agrees_as_printed(press, text)
    fit = sm.OLS(table[:, 0], design).fit()
    agrees(press, np.sum(OLSInfluence(fit).resid_press ** 2), 9)


def test_hald_full_model(published, data_file, agrees_as_printed):
    """Coefficients in the order of the file, the last column being the one taken up last."""
    table = data_file("HALD647.DAT", 25, 5)
    design = np.column_stack([np.ones(13), table[:, 1:]])
    fit = LinearProblem(design, table[:, 0], np.ones(13), [5]).fit()[0]
    for k in range(5):
        agrees_as_printed(fit.coefficients[k], published("hald_cement_press", f"full b{k}"))


def test_level_means_are_plain_means_of_their_rows():
    squared = np.array([[1.0, 2.0, 6.0]])
    assert level_means(squared, np.ones(3), np.array([0, 1, 1]), 2).tolist() == [[1.0, 4.0]]
