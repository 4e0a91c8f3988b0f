"""What a reader of page one has to know about a dataset, in plain sentences."""

from __future__ import annotations

from fitlib.analysis.words import amount, counted, figure, listed

#: Excursions beyond the neighbouring observations larger than this many residual standard deviations are told.
LARGE_EXCURSION = 3.0
#: A candidate that the rule takes in a smaller share of the resamples is called unstable.
SMALL_SHARE = 0.5


def collect_warnings(result: dict, study, dataset, observations) -> list[str]:
    """All warnings of one dataset.

    Parameters
    ----------
    result : dict
        The result without its warnings.
    study : fitlib.study.Study
    dataset : fitlib.study.DatasetSettings
    observations : fitlib.observations.Observations

    Returns
    -------
    list of str
    """
    warnings = list(observations.notes)
    warnings += _row_wise(result)
    warnings += _schemes(result)
    chosen = next((item for item in result["candidates"] if item["chosen"]), None)
    if chosen is not None:
        warnings += _exact(chosen)
        warnings += _suspects(result)
        warnings += _levels(result, chosen)
        warnings += _series(result)
        warnings += _direction(result)
        warnings += _need(result)
        warnings += _verification(result)
        warnings += _shape(result, chosen)
        warnings += _rivals(result, chosen)
    return warnings


def _row_wise(result: dict) -> list[str]:
    if not result["design"]["replicates"]:
        return []
    deciding = result["settings"]["loss"]
    found = [scheme for scheme in result["schemes"] if scheme["row_wise"] and scheme["scheme"] == deciding]
    return [
        f"{scheme['scheme']} decides although it separates observations of one level: replicates are then on both "
        "sides, and the loss favours functions that follow the deviations of single levels"
        for scheme in found
    ]


def _schemes(result: dict) -> list[str]:
    lines = [
        f"{scheme['scheme']} was not evaluated: {scheme['message']}"
        for scheme in result["schemes"]
        if scheme["status"] != "evaluated"
    ]
    without = result["selection"]["draws_without_choice"]
    if without:
        lines.append(f"in {counted(without, 'bootstrap draw')} the rule could not take any candidate")
    if result["selection"]["outer_message"]:
        lines.append(f"no outer loss: {result['selection']['outer_message']}")
    return lines


def _exact(chosen: dict) -> list[str]:
    if not chosen["exact"]:
        return []
    return ["the chosen candidate passes through every observation to rounding: the data look computed, not measured"]


def _suspects(result: dict) -> list[str]:
    rows = result["observations"]
    found = [
        f"{rows['file'][k]} row {rows['row'][k]} (studentized residual {figure(rows['studentized_residual'][k], 3)})"
        for k, flag in enumerate(rows["flag"])
        if flag
    ]
    if not found:
        return []
    return [f"{counted(len(found), 'observation')} flagged as suspect, and kept: {listed(found)}"]


def _levels(result: dict, chosen: dict) -> list[str]:
    parts = result["selection"]["components"]
    if not parts["level_deviation_found"] or result["selection"]["verdict"] == "inadequate":
        return []
    unit = result["settings"]["fitted"]["unit"]
    text = f"levels carry their own deviation: standard deviation {amount(parts['level_deviation'], unit, 2)}"
    if parts["level_deviation_evaluated"] is not None and unit != result["settings"]["evaluated"]["unit"]:
        text += f", or {amount(parts['level_deviation_evaluated'], result['settings']['evaluated']['unit'], 2)}"
    text += f", against a scatter within levels of {amount(parts['pure_error'], unit, 2)}"
    return [text + "; it is not explained by the replicates and enters the uncertainty"]


def _series(result: dict) -> list[str]:
    parts = result["selection"]["components"]
    if not parts["series_deviation_found"]:
        return []
    unit = result["settings"]["fitted"]["unit"]
    text = f"whole series differ: standard deviation of a series {amount(parts['series_deviation'], unit, 2)}"
    if parts["series_deviation_evaluated"] is not None and unit != result["settings"]["evaluated"]["unit"]:
        text += f", or {amount(parts['series_deviation_evaluated'], result['settings']['evaluated']['unit'], 2)}"
    count = result["design"]["series"]
    return [f"{text}, from {count} series; it enters the uncertainty and does not shrink with more levels"]


def _direction(result: dict) -> list[str]:
    found = result["selection"]["components"]["direction_difference"]
    if found is None or not found["found"]:
        return []
    place = amount(found["at"], result["settings"]["stimulus"]["unit"])
    size = amount(found["largest"], result["settings"]["evaluated"]["unit"], 2)
    return [
        f"rising and falling observations differ, by up to {size} at {place}; the function runs between them, and the "
        "difference counts as scatter that averaging does not divide"
    ]


def _need(result: dict) -> list[str]:
    target, largest = result["settings"]["target"], result["selection"]["largest_expanded_uncertainty"]
    chosen = next(item for item in result["candidates"] if item["chosen"])
    if target is None or result["selection"]["target_met"] is not False or largest is None:
        return []
    unit = result["settings"]["evaluated"]["unit"]
    parts = [
        f"{name} {amount(value, unit, 2)}"
        for name, value in (
            ("expanded uncertainty of one converted reading up to", largest["value"]),
            ("largest mean deviation of a level", chosen["misfit"]),
        )
        if value is not None and value > target["expanded"]
    ]
    return [f"the target of {amount(target['expanded'], unit)} is not met: {listed(parts)}"]


def _verification(result: dict) -> list[str]:
    points, lines = result["verification"], []
    beyond = [point for point in points if point["verdict"] != "within_interval"]
    if beyond:
        lines.append(f"not evaluated, as outside the measuring interval: {counted(len(beyond), 'verification point')}")
    outside = [point for point in points if point["within_prediction_interval"] is False]
    if outside:
        named = listed([f"{point['file']} row {point['row']}" for point in outside[:5]])
        more = f" and {len(outside) - 5} more" if len(outside) > 5 else ""
        share = f"{len(outside)} of {len(points)} verification points"
        lines.append(f"{share} lie outside the 95 % prediction interval: {named}{more}")
    return lines


def _shape(result: dict, chosen: dict) -> list[str]:
    beyond = chosen["excursion"]
    if chosen["exact"] or beyond["in_residual_sd"] is None or beyond["in_residual_sd"] <= LARGE_EXCURSION:
        return []
    place = amount(beyond["stimulus"], result["curves"]["abscissa"]["unit"])
    return [
        f"near {place} the chosen function leaves the neighbouring observations by "
        f"{figure(beyond['in_residual_sd'], 2)} residual standard deviations"
    ]


def _stability(result: dict, chosen: dict) -> list[str]:
    """Say so when most resamples take another candidate."""
    shares = {item["candidate"]: item["bootstrap_share"] for item in result["candidates"]}
    share = shares[chosen["candidate"]]
    if share is None or share >= SMALL_SHARE:
        return []
    rival = max(shares, key=lambda name: shares[name] or 0.0)
    return [
        f"the choice is not stable: the rule takes {chosen['candidate']} in {share * 100:.0f} % of the resamples"
        + (f", {rival} in {shares[rival] * 100:.0f} %" if rival != chosen["candidate"] else "")
    ]


def _rivals(result: dict, chosen: dict) -> list[str]:
    selection, lines = result["selection"], []
    if selection["choice"] == "tie":
        lines.append(f"the choice is a tie with {listed(selection['tied'])}; the simplest is issued")
    inner = selection["interior_candidate"]
    if inner is not None and inner != chosen["candidate"]:
        lines.append(f"without the losses of the first and last level the rule would take {inner}")
    others = {name: count for name, count in selection["outer_choices"].items() if name != chosen["candidate"]}
    if others:
        named = listed([f"{name} in {count}" for name, count in others.items()])
        lines.append(
            f"the selection repeated without one level takes another candidate: {named} of {selection['outer_folds']}"
        )
    lines += _stability(result, chosen)
    by_series = selection["rankings"].get("leave_one_series_out")
    parameters = {item["candidate"]: item["parameters"] for item in result["candidates"]}
    found = selection["components"]["level_deviation_found"]
    if found and by_series is not None and parameters[by_series] > parameters[chosen["candidate"]]:
        lines.append(
            f"leave_one_series_out has its smallest loss with {by_series}: a series left out shares its levels, and "
            "their deviations, with those kept in, so that it favours more parameters; it does not decide"
        )
    return lines
