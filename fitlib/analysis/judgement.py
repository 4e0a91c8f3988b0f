"""The verdict on the chosen candidate, with its reason in words."""

from __future__ import annotations

from fitlib.analysis.words import amount, figure, listed, probability
from fitlib.numerics.components import SIGNIFICANT

#: Fewer levels than this cannot show a smooth misfit.
FEWEST_LEVELS = 7
#: Probability below which level residuals count as serially correlated.
SERIAL_PROBABILITY = 0.01
#: Paired standard errors by which a candidate two orders higher must lower the level loss.
PROBE_STANDARD_ERRORS = 2.0


def judge(record: dict, levels: int, replicates: bool, target: float | None, unit: str) -> tuple[str, str]:
    """Verdict on one fitted candidate.

    ``inadequate`` needs a smooth misfit, significant against pure error where there are replicates, and larger than
    the target where one is declared; an irregular excess is a level deviation, not a fault of the function.

    Parameters
    ----------
    record : dict
        Of the step ``fits``.
    levels : int
    replicates : bool
    target : float or None
        Target expanded uncertainty, in the evaluated quantity's unit.
    unit : str
        Unit of the evaluated quantity.

    Returns
    -------
    verdict, reason : str
    """
    if not replicates and levels < FEWEST_LEVELS:
        return "not_evaluated", (
            f"without replicates and with {levels} levels a lack of fit could not be seen; "
            f"replicates or at least {FEWEST_LEVELS} levels are needed"
        )
    if record["exact"]:
        return "adequate", "the fit leaves nothing but rounding"
    lack = record["lack_of_fit_within_series"] or record["lack_of_fit"]
    significant = lack is not None and lack["p"] < SIGNIFICANT
    smooth = _smooth_signs(record)
    against = "" if lack is None else lack_of_fit_words(lack)
    if record["lack_of_fit_within_series"]:
        against += ", with the differences between whole series taken out"
        against += (
            f"; with them left in F = {figure(record['lack_of_fit']['f'], 5)}" if record["lack_of_fit"]["f"] else ""
        )
    if lack is not None and not significant:
        return "adequate", f"no lack of fit detected against the scatter within levels ({against})"
    size = "" if record["misfit"] is None else f"largest mean deviation of a level {amount(record['misfit'], unit)}"
    within_target = target is not None and record["misfit"] is not None and record["misfit"] <= target
    if not smooth and lack is not None and levels < FEWEST_LEVELS and not within_target:
        return "not_evaluated", (
            f"the levels scatter more than their replicates ({against}; {size}), and with {levels} levels a smooth "
            f"misfit cannot be told from deviations of single levels; at least {FEWEST_LEVELS} "
            "levels are needed"
        )
    if not smooth:
        if lack is None:
            return "adequate", "no smooth misfit detected; there are no replicates to compare it with"
        return "adequate", (
            f"the levels scatter more than their replicates ({against}), but irregularly: "
            "a deviation of the levels, not a misfit of the function"
        )
    why = listed(smooth) + (f" ({against})" if lack is not None else "") + (f"; {size}" if size else "")
    if within_target:
        return "adequate", f"a smooth misfit is seen but is smaller than the target of {amount(target, unit)}: {why}"
    return "inadequate", f"smooth misfit: {why}"


def _smooth_signs(record: dict) -> list[str]:
    signs = []
    gain = record["probe_gain"]
    if gain is not None and gain > PROBE_STANDARD_ERRORS:
        signs.append(f"two orders more lower the level loss by {figure(gain, 2)} paired standard errors")
    serial = record["serial"]
    if serial is not None and serial["p"] < SERIAL_PROBABILITY:
        signs.append(
            f"the level residuals follow one another (von Neumann ratio {serial['ratio']:.2f}, "
            f"{probability(serial['p'])})"
        )
    return signs


def lack_of_fit_words(lack: dict) -> str:
    """The F test of lack of fit in words.

    Parameters
    ----------
    lack : dict
        Keys ``f``, ``p``, ``numerator_df``, ``denominator_df``.

    Returns
    -------
    str
    """
    if lack["f"] is None:
        return (
            f"replicates agree exactly, so that there is no pure error on {lack['denominator_df']} degrees of freedom"
        )
    return (
        f"lack of fit F = {figure(lack['f'], 5)} on {lack['numerator_df']} and {lack['denominator_df']} "
        f"degrees of freedom, {probability(lack['p'])}"
    )
