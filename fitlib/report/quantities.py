"""The quantities and units of one result, and its numbers written with them."""

from __future__ import annotations

import re

from fitlib.report.rounding import NOTHING, is_number, root, rounded, squared, table_number, text_number, with_unit
from fitlib.report.table import Cell, Column

_LOSS_IN_WORDS = re.compile(r"\b(?:loss|threshold) \d")


class Quantities:
    """What the numbers of a result are numbers of.

    Parameters
    ----------
    result : dict
        The result of one dataset.
    """

    def __init__(self, result: dict):
        self.settings = result["settings"]
        self.analysis = self.settings.get("function") == "analysis"
        self.stimulus = self.settings["stimulus"]
        self.response = self.settings["response"]
        self.fitted = self.settings.get("fitted") or (self.stimulus if self.analysis else self.response)
        self.across = self.response if self.analysis else self.stimulus
        self.evaluated = self.settings.get("evaluated") or self.stimulus
        self.plain_root = self.settings.get("weighting") in (None, "none")

    def interval(self) -> str:
        """The measuring interval in words."""
        ends = self.settings.get("measuring_interval") or [None, None]
        return with_unit(f"{table_number(ends[0], 12)} to {table_number(ends[1], 12)}", self.stimulus["unit"])

    def head(self, words: str, quantity: dict) -> str:
        """A column head for numbers, with the unit."""
        unit = quantity["unit"]
        return f"#{words}" if unit in ("", "1") else f"#{words} / {unit}"

    def loss_cell(self, loss: float | None, standard_error: float | None = None, extra: str = "") -> Cell:
        """A loss for a table: its root above (where it has a meaning), the loss and its standard error below."""
        if not is_number(loss):
            return Cell(NOTHING, extra)
        below = [table_number(loss, 4)] if self.plain_root else []
        below += [table_number(standard_error, 2)] if is_number(standard_error) else []
        above = table_number(root(loss)[0] if self.plain_root else loss, 4)
        return Cell(above, "; ".join(below + ([extra] if extra else [])))

    def loss_head(self, words: str) -> Column:
        """A column head for cells of `loss_cell`, with the units of both lines."""
        unit = squared(self.fitted["unit"])
        if not self.plain_root:
            return Column(self.head(words, {"unit": unit})[1:], "n")
        below = f"below: loss / {unit}" if unit else "below: loss"
        return Column(self.head(f"root of {words}", self.fitted)[1:], "n", below)

    def reason_head(self, reasons: list[str]) -> Column:
        """A column head for reasons; the unit of the losses in them is said where there are any."""
        unit = squared(self.fitted["unit"])
        named = unit and any(_LOSS_IN_WORDS.search(reason or "") for reason in reasons)
        return Column("reason", "", f"losses in {unit}" if named else "")

    def loss_note(self) -> str:
        """What the two lines of a `loss_cell` are."""
        unit = squared(self.fitted["unit"])
        below = f"the loss{' in ' + unit if unit else ''} and its standard error, where there is one"
        if self.plain_root:
            own = self.fitted["unit"]
            return f"Above: root of the loss{' in ' + own if own not in ('', '1') else ''}. Below: {below}."
        return (
            f"Above: the loss{' in ' + unit if unit else ''}. Below: its standard error, where there is one. Weighted "
            "losses have no root with a plain meaning."
        )

    def loss_words(self, loss: float | None, standard_error: float | None = None) -> str:
        """A loss for a sentence: the rounded root in the fitted unit, or the loss itself where it is weighted."""
        if not is_number(loss):
            return "not available"
        if not self.plain_root:
            value, error = rounded(loss, standard_error)
            words = with_unit(value, squared(self.fitted["unit"]))
            return words + (f", weighted, standard error {error}" if is_number(standard_error) else ", weighted")
        value, error = root(loss, standard_error)
        if not is_number(error):
            return with_unit(text_number(value, 2), self.fitted["unit"])
        value, error = rounded(value, error)
        return f"{with_unit(value, self.fitted['unit'])}, standard error {with_unit(error, self.fitted['unit'])}"
