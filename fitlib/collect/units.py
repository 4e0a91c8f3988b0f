"""Units of the columns, in words for ``columns.csv``."""

from __future__ import annotations

import re
from dataclasses import dataclass

# A name that can carry an exponent as it stands; anything else is put in brackets first.
_PLAIN = re.compile(r"[^\W\d_]+|°[A-Z]|%")
# One pair of brackets around the whole, as in ``(unit not stated)``.
_BRACKETED = re.compile(r"\([^()]*\)")


@dataclass(frozen=True)
class Units:
    """Units of one study's tables.

    Attributes
    ----------
    stimulus, response : str
        As the study declares them.
    fitted, evaluated : str
        Of the quantity that is fitted and of the one that the user wants; a pointer to ``datasets.csv`` when the
        datasets of the study differ in it.
    abscissa : str
        Of the independent variable of the fit: stimulus, or response for an analysis function.
    weighted : bool
        True when the sums of squares carry weights that have a unit of their own.
    """

    stimulus: str
    response: str
    fitted: str
    evaluated: str
    abscissa: str
    weighted: bool

    def words(self, kind: str) -> str:
        """Unit of a column, in words.

        Parameters
        ----------
        kind : str
            ``stimulus``, ``response``, ``fitted``, ``evaluated``, ``abscissa``, ``fitted^2``, ``weighted``,
            ``weighted^2``, ``coefficient``; any other word stands for itself.

        Returns
        -------
        str
        """
        suffix = " x root of the weight" if self.weighted else ""
        own = {
            "stimulus": self.stimulus,
            "response": self.response,
            "fitted": self.fitted,
            "evaluated": self.evaluated,
            "abscissa": self.abscissa,
            "fitted^2": squared(self.fitted),
            "weighted": self.fitted + suffix,
            "weighted^2": squared(self.fitted) + (" x weight" if self.weighted else ""),
            "coefficient": f"T0...: {self.fitted}; x^k: {self.fitted} per k-th power of the unit of x",
        }
        return own.get(kind, kind)


def units_of(bundle: dict) -> Units:
    """Units of a study with its results.

    Parameters
    ----------
    bundle : dict
        The study with its results.

    Returns
    -------
    Units
    """
    study = bundle["study"]
    settings = [result["settings"] for result in bundle["results"]]
    return Units(
        study["stimulus"]["unit"],
        study["response"]["unit"],
        _common([item["fitted"]["unit"] for item in settings], "fitted_unit of datasets.csv"),
        _common([item["evaluated"]["unit"] for item in settings], "evaluated_unit of datasets.csv"),
        _common([_abscissa(item)["unit"] for item in settings], "stimulus_unit or, for analysis, response_unit"),
        any(item["weighting"] != "none" for item in settings),
    )


def squared(unit: str) -> str:
    """The unit to the power of two: ``mA²``, ``(m/s)²``.

    Parameters
    ----------
    unit : str

    Returns
    -------
    str
    """
    if unit in ("", "1"):
        return unit
    return f"{unit}²" if _PLAIN.fullmatch(unit) or _BRACKETED.fullmatch(unit) else f"({unit})²"


def _abscissa(settings: dict) -> dict:
    return settings["response" if settings["function"] == "analysis" else "stimulus"]


def _common(units: list[str], pointer: str) -> str:
    return units[0] if len(set(units)) == 1 else pointer
