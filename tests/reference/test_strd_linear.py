"""NIST Statistical Reference Datasets (StRD), linear regression: coefficients, their standard deviations, residual SD.

The digits required are stored with each case. Where a quintic in 0..20 has deviations of 1e5 and 1e7 (Wampler4,
Wampler5) coefficients of 1 in powers are the small difference of large numbers, so that fewer digits can be had.
"""

import re

import numpy as np
import pytest

from fitlib.numerics.families import make_family

#: Degree of the model of each set.
SETS = {
    "strd_norris": 1,
    "strd_wampler1": 5,
    "strd_wampler2": 5,
    "strd_wampler3": 5,
    "strd_wampler4": 5,
    "strd_wampler5": 5,
    "strd_filip": 10,
}


def _certified(case: dict, prefix: str, count: int) -> np.ndarray | None:
    found = {check["quantity"]: check["published"] for check in case["checks"]}
    names = [f"{prefix}{k}" for k in range(count)]
    if not any(name in found for name in names):
        return None
    return np.array([float(found[name]) for name in names])


def test_the_number_of_sets_is_known():
    assert len(SETS) == 7


@pytest.mark.parametrize("name", SETS)
def test_coefficients(name, case, fit_polynomial, agrees):
    data = case(name)
    result = fit_polynomial(data["data"]["x"], data["data"]["y"], SETS[name])
    agrees(result.power.coefficients, _certified(data, "B", SETS[name] + 1), data["digits_required"])


@pytest.mark.parametrize("name", ["strd_norris", "strd_wampler4", "strd_wampler5", "strd_filip"])
def test_standard_deviations_of_coefficients(name, case, fit_polynomial, agrees):
    data = case(name)
    result = fit_polynomial(data["data"]["x"], data["data"]["y"], SETS[name])
    agrees(result.power.standard_uncertainties, _certified(data, "sd B", SETS[name] + 1), 12)


@pytest.mark.parametrize("name", ["strd_norris", "strd_wampler3", "strd_wampler4", "strd_wampler5", "strd_filip"])
def test_residual_standard_deviation(name, case, published, fit_polynomial, agrees):
    data = case(name)["data"]
    result = fit_polynomial(data["x"], data["y"], SETS[name])
    agrees(result.deviation, float(published(name, "residual SD")), 12)


@pytest.mark.parametrize("name", ["strd_wampler1", "strd_wampler2"])
def test_exact_sets_leave_nothing_but_rounding(name, case, fit_polynomial, within):
    data = case(name)["data"]
    result = fit_polynomial(data["x"], data["y"], SETS[name])
    within(result.deviation, 0.0, 64 * np.finfo(float).eps * max(data["y"]))


def test_no_intercept_is_a_line_through_the_origin(case, published, fit_polynomial, agrees, within):
    """NoInt1: one parameter, so that the residual SD has n - 1 degrees of freedom."""
    data = case("strd_noint1")
    result = fit_polynomial(data["data"]["x"], data["data"]["y"], 1, [(0.0, 0.0)])
    digits = data["digits_required"]
    assert result.parameters == 1
    agrees(result.power.coefficients[1], float(published("strd_noint1", "B0")), digits)
    agrees(result.power.standard_uncertainties[1], float(published("strd_noint1", "sd B0")), digits)
    agrees(result.deviation, float(published("strd_noint1", "residual SD")), digits)
    within(result.power.coefficients[0], 0.0, 1e-13)


def _pontius(data_file) -> tuple[np.ndarray, np.ndarray]:
    table = data_file("PONTIUS.DAT", 25, 2)
    return table[:, 1], table[:, 0]


def test_load_cell_quadratic(case, published, data_file, fit_polynomial, agrees):
    """StRD Pontius: deflection against load, coefficients down to 1e-15."""
    x, y = _pontius(data_file)
    assert x.size == 40
    result = fit_polynomial(x, y, 2)
    digits = case("nist_pmd61_pontius")["digits_required"]
    values = (result.power.coefficients, result.power.standard_uncertainties)
    for prefix, actual in zip(("StRD B", "StRD sd B"), values, strict=True):
        agrees(actual, [float(published("nist_pmd61_pontius", f"{prefix}{k}")) for k in range(3)], digits)
    agrees(result.deviation, float(published("nist_pmd61_pontius", "StRD residual SD")), digits)


def test_load_cell_file_and_case_hold_the_same_numbers(case, data_file):
    x, y = _pontius(data_file)
    data = case("nist_pmd61_pontius")["data"]
    assert data["x_load"] == x.tolist()
    assert data["y_deflection"] == y.tolist()


def test_load_cell_line(published, data_file, fit_polynomial, agrees_as_printed, agrees):
    """NIST/SEMATECH e-Handbook 4.6.1.4, printed in single precision: the residual SD to 5 digits."""
    name = "nist_pmd61_pontius"
    result = fit_polynomial(*_pontius(data_file), 1)
    for k in range(2):
        agrees_as_printed(result.power.coefficients[k], published(name, f"linear B{k}"), 1.0)
        agrees_as_printed(result.power.standard_uncertainties[k], published(name, f"linear sd B{k}"), 1.0)
    agrees(result.deviation, float(published(name, "linear residual SD")), 5)


def test_a_line_to_a_check_standard(case, published, data_file, fit_polynomial, agrees_as_printed):
    """e-Handbook 2.3.6.7.3: coefficients, standard errors and the covariance of a linewidth calibration."""
    name = "nist_mpc3673_linewidth"
    table = data_file("CALIBRATIONLINE.DAT", 25, 2)
    data = case(name)["data"]
    assert [sorted(column) for column in table.T.tolist()] == [sorted(data["x"]), sorted(data["y"])]
    result = fit_polynomial(data["x"], data["y"], 1)
    for k, letter in enumerate("ab"):
        agrees_as_printed(result.power.coefficients[k], published(name, letter), 1.0)
        agrees_as_printed(result.power.standard_uncertainties[k], published(name, f"se {letter}"), 1.0)


def test_ordinary_regression_output(case, published, fit_polynomial, agrees_as_printed):
    """R datasets::cars, the summary of a line of stopping distance on speed."""
    data = case("r_cars")["data"]
    result = fit_polynomial(data["x"], data["y"], 1)
    for k in range(2):
        agrees_as_printed(result.power.coefficients[k], published("r_cars", f"b{k}"))
        agrees_as_printed(result.power.standard_uncertainties[k], published("r_cars", f"se b{k}"))
    agrees_as_printed(result.deviation, published("r_cars", "s"))


def test_four_data_sets_with_the_same_line(case, published, fit_polynomial, agrees_as_printed):
    """Anscombe, Am. Stat. 27 (1973) 17."""
    data = case("anscombe_quartet")["data"]
    for number in range(1, 5):
        result = fit_polynomial(data[f"x{number}"], data[f"y{number}"], 1)
        for k in range(2):
            text = published("anscombe_quartet", f"set {number} b{k}")
            agrees_as_printed(result.power.coefficients[k], text, 1.0)


def test_leverage_one_has_no_held_out_residual(case):
    """Anscombe's fourth set: without its eighth point the slope is not determined, and this is said by name."""
    data = case("anscombe_quartet")["data"]
    x, y = np.array(data["x4"]), np.array(data["y4"])
    family = make_family("polynomial", x, [1], ())
    held = family.problem(x, y, np.ones(11)).held_out([np.array([k]) for k in range(11)])
    line = [member.order for member in family.members].index(1)
    assert [part.shape for part in held] == [(len(family.members), 1)] * 11
    assert [bool(np.isnan(part[line, 0])) for part in held] == [k == 7 for k in range(11)]


def test_raw_powers_are_refused(case):
    """A design of raw powers of Filip's x has a condition number above 1e12 and is refused, not silently wrong."""
    from fitlib.numerics.least_squares import LinearProblem

    data = case("strd_filip")["data"]
    x = np.array(data["x"])
    fit = LinearProblem(np.vander(x, 11, increasing=True), np.array(data["y"]), np.ones(x.size), [11]).fit()[0]
    assert re.search("rank deficient", fit.message)
    assert np.isnan(fit.coefficients).all()
