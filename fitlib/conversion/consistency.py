"""Does the stored function agree with itself? A digit changed by hand or by a bad copy is found here."""

from __future__ import annotations

import numpy as np

from fitlib.conversion.record import WITHIN
from fitlib.errors import InputError, Problem
from fitlib.numerics.families import Curve

AGREEMENT = 1e-8  # relative to the largest number compared: the agreement promised between machines


def require_consistent(record: dict, curve: Curve, path: str) -> None:
    """Stop when the curve does not reproduce the responses at the ends or the test vectors.

    Parameters
    ----------
    record : dict
        Checked key by key.
    curve : Curve
        Restored from it.
    path : str
        For messages.

    Raises
    ------
    InputError
    """
    problems = [*_ends(record, curve, path), *_vectors(record, curve, path)]
    if problems:
        raise InputError(problems)


def _ends(record: dict, curve: Curve, path: str) -> list[Problem]:
    """An analysis function is bounded by responses that were observed: only their order can be checked."""
    if record["function"] == "analysis":
        return []
    found = curve.evaluate(np.array(record["measuring_interval"], dtype=float))
    stored = np.array(record["response_at_ends"], dtype=float)
    if np.all(np.abs(found - stored) <= AGREEMENT * np.max(np.abs(stored))):
        return []
    message = f"{stored.tolist()} is not what the coefficients give, {found.tolist()}: the file is damaged"
    return [Problem(file=path, key="response_at_ends", message=message)]


def _usable(record: dict) -> list[tuple[int, float, float]]:
    return [
        (number, float(vector["stimulus"]), float(vector["response"]))
        for number, vector in enumerate(record["test_vectors"])
        if vector["verdict"] == WITHIN
    ]


def _vectors(record: dict, curve: Curve, path: str) -> list[Problem]:
    vectors = _usable(record)
    if not vectors:
        return [Problem(file=path, key="test_vectors", message="has none within the measuring interval")]
    swapped = record["function"] == "analysis"
    x = np.array([vector[2 if swapped else 1] for vector in vectors])
    y = np.array([vector[1 if swapped else 2] for vector in vectors])
    wrong = np.abs(curve.evaluate(x) - y) > AGREEMENT * np.max(np.abs(y))
    return [
        Problem(file=path, key=f"test_vectors[{vectors[i][0]}]", message="is not what the coefficients give: damaged")
        for i in np.flatnonzero(wrong)
    ][:3]
