"""What a run came to, as records that a command can print."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

from fitlib.errors import Problem


@dataclass(frozen=True)
class SummaryRow:
    """The outcome for one dataset.

    Attributes
    ----------
    dataset : str
    candidate : str or None
        The chosen candidate.
    verdict : str
        ``adequate``, ``inadequate`` or ``not_evaluated``.
    choice : str or None
        ``decided`` or ``tie``.
    loss, outer_loss : float or None
        Of the chosen candidate, and of the whole selection repeated; square of the unit of the fitted quantity where
        the weights are 1.
    runner_up : str or None
    margin : float or None
        Of the runner-up's loss over the chosen one's, relative to the latter.
    warnings : int
        How many warnings stand on the first page of the dataset.
    target_met : bool or None
        Whether the target of the study is met; None without a target, or where nothing was judged.
    reason : str
        Why the verdict is what it is.
    """

    dataset: str
    candidate: str | None
    verdict: str
    choice: str | None
    loss: float | None
    outer_loss: float | None
    runner_up: str | None
    margin: float | None
    warnings: int = 0
    target_met: bool | None = None
    reason: str = ""

    @classmethod
    def of(cls, result: Mapping[str, Any]) -> SummaryRow:
        """Return the row of a dataset's result."""
        chosen = result["selection"]
        names = ("candidate", "verdict", "choice", "loss", "outer_loss", "runner_up", "margin")
        found = (chosen.get(name) for name in names)
        told = (len(result["warnings"]), chosen.get("target_met"), chosen.get("verdict_reason") or "")
        return cls(result["dataset"], *found, *told)

    def to_dict(self) -> dict[str, Any]:
        """Return the row as JSON has it."""
        return asdict(self)


@dataclass(frozen=True)
class RunSummary:
    """The outcome of a run.

    Attributes
    ----------
    study : str
    revision : str
        Name of the revision that holds the results.
    path : str
        Its folder.
    new : bool
        Whether this run made it.
    note : str
        A plain sentence: what became of the results.
    rows : tuple of SummaryRow
        One for each dataset.
    computed, kept : int
        Steps that this run computed, and those that were there already.
    reasons : tuple of str
        Why this run had something to do.
    warnings : tuple of Problem
        Of the check.
    log : str
        The file with everything that was said; empty when the workflow was not started.
    altered : str
        What is wrong with the revision before the new one; empty when it is as it was published.
    """

    study: str
    revision: str
    path: str
    new: bool
    note: str
    rows: tuple[SummaryRow, ...]
    computed: int = 0
    kept: int = 0
    reasons: tuple[str, ...] = ()
    warnings: tuple[Problem, ...] = ()
    log: str = ""
    altered: str = ""

    @property
    def not_adequate(self) -> tuple[str, ...]:
        """Datasets with a verdict that needs a person."""
        return tuple(row.dataset for row in self.rows if row.verdict != "adequate")


@dataclass(frozen=True)
class DryRun:
    """What a run would do.

    Attributes
    ----------
    study : str
    unchanged : bool
        The latest revision holds the results already.
    revision : str or None
        That revision.
    steps : dict of str to tuple of str
        The steps that would be computed, by dataset; datasets with nothing to compute are left out.
    reasons : tuple of str
    warnings : tuple of Problem
    altered : str
        What is wrong with the latest revision, and what a run makes of it; empty when it is as it was published.
    blocked : bool
        It is altered and nothing else has changed, so that a run would publish nothing.
    """

    study: str
    unchanged: bool
    revision: str | None
    steps: Mapping[str, tuple[str, ...]]
    reasons: tuple[str, ...] = ()
    warnings: tuple[Problem, ...] = ()
    altered: str = ""
    blocked: bool = False
