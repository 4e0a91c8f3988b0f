"""A result of one dataset as the figures see it: arrays with nan for what is missing, and who plays which part."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from fitlib.figures.words import clean


@dataclass(frozen=True)
class Drawn:
    """A candidate that is drawn as a curve: its id, its foremost part, and all its parts in words."""

    candidate: str
    role: str
    label: str


def as_array(values: list | None, size: int | None = None) -> np.ndarray:
    """Floats, with nan for None; an absent list gives `size` times nan."""
    if values is None:
        return np.full(size or 0, np.nan)
    return np.array([np.nan if value is None else float(value) for value in values], dtype=float)


class View:
    """Read access to a result dict.

    Parameters
    ----------
    result : dict
        The result of one dataset.
    """

    def __init__(self, result: dict):
        self.result = result
        self.settings = result["settings"]
        self.selection = result.get("selection") or {}
        self.schemes = result.get("schemes") or []
        self.candidates = {row["candidate"]: row for row in result.get("candidates") or []}

    @cached_property
    def name(self) -> str:
        """The dataset's id, for titles."""
        return clean(self.result["dataset"], 46)

    @cached_property
    def analysis(self) -> bool:
        """True for a function from response to stimulus."""
        return self.settings.get("function") == "analysis"

    @cached_property
    def across(self) -> dict:
        """Quantity and unit along the horizontal axis of a function."""
        return self.settings["response" if self.analysis else "stimulus"]

    @cached_property
    def fitted(self) -> dict:
        """Quantity and unit of the fit."""
        return self.settings.get("fitted") or self.settings["stimulus" if self.analysis else "response"]

    @cached_property
    def observations(self) -> dict:
        """Columns of the observations read."""
        return self.result.get("observations") or {}

    @cached_property
    def size(self) -> int:
        """Number of observations read."""
        return len(self.observations.get("state") or [])

    def column(self, name: str) -> np.ndarray:
        """A column of numbers, shape (n_read,)."""
        return as_array(self.observations.get(name), self.size)

    def words(self, name: str) -> np.ndarray:
        """A column of text, shape (n_read,)."""
        values = self.observations.get(name) or [""] * self.size
        return np.array(["" if value is None else str(value) for value in values], dtype=object)

    @cached_property
    def x(self) -> np.ndarray:
        """Abscissa of the fit for each observation read."""
        return self.column("response" if self.analysis else "stimulus")

    @cached_property
    def y(self) -> np.ndarray:
        """Fitted quantity of each observation read."""
        return self.column("stimulus" if self.analysis else "response")

    def is_state(self, state: str) -> np.ndarray:
        """True for the observations in a state."""
        return self.words("state") == state

    @cached_property
    def suspect(self) -> np.ndarray:
        """True for flagged observations."""
        return self.words("flag") == "suspect"

    @cached_property
    def grid(self) -> np.ndarray:
        """Abscissa of the curves."""
        curves = self.result.get("curves") or {}
        return as_array(curves.get("stimulus") or curves.get("response"))

    def curve(self, candidate: str | None) -> np.ndarray | None:
        """Values of a candidate on the grid, or None where it was not fitted."""
        values = ((self.result.get("curves") or {}).get("candidates") or {}).get(candidate)
        return None if values is None or len(values) != self.grid.size else as_array(values)

    def interval(self, name: str) -> tuple[np.ndarray, np.ndarray, float] | None:
        """Lower and upper curve of a band and its coverage probability; none where the function is inadequate."""
        band = (self.result.get("curves") or {}).get(name)
        if not band or self.grid.size == 0 or self.verdict == "inadequate":
            return None
        return as_array(band["lower"]), as_array(band["upper"]), float(band["coverage_probability"])

    @cached_property
    def chosen(self) -> str | None:
        """Id of the chosen candidate."""
        return self.selection.get("candidate")

    @cached_property
    def verdict(self) -> str | None:
        """Verdict on the chosen function."""
        return self.selection.get("verdict")

    @cached_property
    def mark(self) -> str:
        """What is said beside the chosen function wherever it is named: nothing where it is adequate."""
        unusable = {"inadequate": "verdict inadequate", "not_evaluated": "verdict not evaluated"}
        return unusable.get(self.verdict, "") if self.chosen is not None else ""

    @cached_property
    def chosen_words(self) -> str:
        """The chosen candidate with its mark."""
        return ", ".join(part for part in (clean(self.chosen or "none", 40), self.mark) if part)

    def title(self, words: str) -> str:
        """Title of a figure: the dataset, what is shown, and the mark of a function that must not be used."""
        return f"{self.name}: {words}" + (f" – {self.mark}" if self.mark else "")

    @cached_property
    def most_parameters(self) -> str | None:
        """The fitted candidate with most parameters (the first such one in study order)."""
        fitted = [row for row in self.candidates.values() if row.get("status") == "fitted"]
        return max(fitted, key=lambda row: row["parameters"] or 0)["candidate"] if fitted else None

    @cached_property
    def drawn(self) -> list[Drawn]:
        """The candidates drawn as curves: at most four, each once, in order of their part."""
        parts = {
            "chosen": self.chosen,
            "runner-up": self.selection.get("runner_up"),
            "smallest loss": self.selection.get("smallest_loss_candidate"),
            "most parameters": self.most_parameters,
        }
        roles: dict[str, list[str]] = {}
        for role, candidate in parts.items():
            if candidate is not None:
                roles.setdefault(candidate, []).append(role)
        if self.chosen in roles and self.mark:
            roles[self.chosen].insert(1, self.mark)
        return [
            Drawn(candidate, own[0], f"{clean(candidate, 40)} ({', '.join(own)})") for candidate, own in roles.items()
        ]

    @cached_property
    def deciding(self) -> dict | None:
        """The scheme whose loss decides, else None."""
        return next((scheme for scheme in self.schemes if scheme["scheme"] == self.settings.get("loss")), None)

    @cached_property
    def shown_scheme(self) -> dict | None:
        """The scheme shown per level: the deciding one, else the first that was evaluated."""
        evaluated = [scheme for scheme in self.schemes if scheme.get("status") == "evaluated"]
        if self.deciding in evaluated:
            return self.deciding
        grouped = [scheme for scheme in evaluated if scheme.get("unit") == "level"]
        return (grouped or evaluated or [None])[0]

    @cached_property
    def weighted(self) -> bool:
        """True where a loss is weighted, so that its root has no plain meaning."""
        return self.settings.get("weighting") not in (None, "none")

    def shown_loss(self, losses: object) -> np.ndarray:
        """What is drawn of a loss: its root in the fitted unit, or the loss itself where it is weighted."""
        losses = np.asarray(losses, dtype=float)
        return losses if self.weighted else np.sqrt(np.clip(losses, 0, None))

    def counts(self) -> str:
        """Numbers of observations in words."""
        design = self.result.get("design") or {}
        words = [f"n = {int(self.is_state('used').sum())} observations used"]
        words += [f"{design[key]} {key}" for key in ("levels", "series") if design.get(key)]
        for state in ("excluded", "verification"):
            number = int(self.is_state(state).sum())
            words += [f"{number} {state}"] if number else []
        suspects = int(self.suspect.sum())
        return ", ".join(words + ([f"{suspects} suspect"] if suspects else []))
