"""How a dataset stands: chosen candidate, choice, whether the function may be used, whether the target is met."""

from __future__ import annotations

from fitlib.report.rounding import NOTHING, is_number, percent, place_number, text_number, with_unit
from fitlib.report.table import Cell
from fitlib.report.words import UNUSABLE

LEAST_SHARE = 0.5  # of the bootstrap draws; a choice that the rule repeats more rarely is called not stable
NOT_STABLE = "decided by the rule, not stable"


def chosen_row(result: dict) -> dict | None:
    """The entry of the chosen candidate."""
    chosen = result["selection"].get("candidate")
    return next((row for row in result["candidates"] if row["candidate"] == chosen), None)


def unusable(result: dict) -> str:
    """What stands beside a function that must not be used; nothing where it is adequate."""
    return UNUSABLE.get(result["selection"]["verdict"], "")


def is_unstable(result: dict) -> bool:
    """True where the rule decided, but takes the chosen candidate in fewer than half of the draws."""
    share = (chosen_row(result) or {}).get("bootstrap_share")
    return result["selection"].get("choice") == "decided" and is_number(share) and share < LEAST_SHARE


def choice_words(result: dict) -> str:
    """The choice in words."""
    return NOT_STABLE if is_unstable(result) else result["selection"].get("choice") or ""


def choice_cell(result: dict) -> Cell:
    """The choice for a table."""
    choice, unstable = result["selection"].get("choice"), is_unstable(result)
    small = NOT_STABLE.removeprefix("decided ") if unstable else ""
    return Cell(choice or NOTHING, small, kind="tie" if choice == "tie" or unstable else "")


def target_cell(result: dict) -> Cell:
    """Whether the target is met."""
    met = result["selection"].get("target_met")
    if met is None:
        return Cell(NOTHING)
    return Cell("✓ met", kind="adequate") if met else Cell("✗ not met", kind="inadequate")


def expanded_cell(result: dict, evaluated: dict, across: dict) -> Cell:
    """The largest expanded uncertainty and its place; nothing where the function is inadequate: it does not hold."""
    largest = result["selection"].get("largest_expanded_uncertainty")
    if not largest or result["selection"]["verdict"] == "inadequate":
        return Cell(NOTHING)
    place = with_unit(place_number(largest.get("at")), across["unit"])
    return Cell(with_unit(text_number(largest.get("value"), 2), evaluated["unit"]), f"at {place}")


def stability_words(result: dict) -> str:
    """How often the rule takes the chosen candidate, and which one it takes most often."""
    shares = {row["candidate"]: row.get("bootstrap_share") or 0.0 for row in result["candidates"]}
    chosen = result["selection"]["candidate"]
    words = f"The rule takes {chosen} in {percent(shares[chosen])} of the bootstrap draws"
    most = max(shares, key=shares.get)
    return words + (f", {most} in {percent(shares[most])}." if most != chosen else ".")
