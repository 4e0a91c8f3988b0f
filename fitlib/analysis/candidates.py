"""All candidates of a study on one dataset, side by side, with the probes that judge lack of fit."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from fitlib.analysis.dataset import DatasetArrays
from fitlib.numerics.bootstrap import BootstrapErrors, bootstrap_errors
from fitlib.numerics.exact import as_written
from fitlib.numerics.families import Family, Member, make_family, parameter_count
from fitlib.numerics.families.protocol import Problem
from fitlib.numerics.validation import Fold, SchemeErrors, scheme_errors
from fitlib.numerics.weighting import exact_weights


@dataclass(frozen=True)
class Declared:
    """One candidate as the study declares it."""

    candidate: str
    family: str
    group: int
    order: int
    parameters: int


@dataclass(frozen=True)
class Entry:
    """One fitted member: a candidate, or a probe (then ``candidate`` is empty)."""

    candidate: str
    group: int
    member: Member


@dataclass(frozen=True)
class _Group:
    family: Family
    problem: Problem
    parameters: tuple[int, ...]


class CandidateSet:
    """Candidates that the data can support, ready to be fitted.

    Parameters
    ----------
    data : DatasetArrays
    declared : sequence of Declared
        Those to be fitted; the others are kept in the table with their reason.
    families : sequence of FamilySettings
    made : sequence of Family or None
        Families made before (for a part of the data the scale of the whole is kept).
    """

    def __init__(self, data: DatasetArrays, declared: Sequence[Declared], families, made=None):
        self.data = data
        self.declared = tuple(declared)
        self._families = families
        self.made: dict[int, Family] = dict(made or {})
        self._groups: dict[int, _Group] = {}
        self._exact: dict[int, dict] = {}
        entries: list[Entry] = []
        for number in sorted({item.group for item in declared}):
            entries += self._add_group(number, [item for item in declared if item.group == number])
        self.entries = tuple(entries)
        self.parameters = np.array([entry.member.parameters for entry in entries], dtype=int)

    def _add_group(self, number: int, items: list[Declared]) -> list[Entry]:
        if number not in self.made:
            settings = self._families[number]
            orders = [item.order for item in items]
            points = [point[::-1] if self.data.swapped else point for point in settings.fixed_points]
            self.made[number] = make_family(settings.family, self.data.x, orders, points)
        family = self.made[number]
        problem = family.problem(self.data.x, self.data.y, self.data.root_weights)
        self._groups[number] = _Group(family, problem, tuple(member.parameters for member in family.members))
        names = {item.order: item.candidate for item in items}
        return [Entry("" if m.probe else names[m.order], number, m) for m in family.members]

    def part(self, keep: np.ndarray) -> CandidateSet:
        """The same candidates on a part of the observations."""
        return CandidateSet(self.data.part(keep), self.declared, self._families, self.made)

    def is_candidate(self) -> np.ndarray:
        """True for candidates, False for probes, shape (entries,)."""
        return np.array([bool(entry.candidate) for entry in self.entries], dtype=bool)

    def position(self, candidate: str) -> int | None:
        """Number of a candidate among the entries; None when it was not fitted."""
        return next((k for k, entry in enumerate(self.entries) if entry.candidate == candidate), None)

    def probe_of(self, position: int) -> int | None:
        """Number of the member two orders higher of the same group."""
        entry = self.entries[position]
        higher = self._groups[entry.group].family.two_orders_higher(entry.member)
        if higher is None:
            return None
        return next(k for k, e in enumerate(self.entries) if e.group == entry.group and e.member == higher)

    def fit(self) -> list:
        """One fit for each entry."""
        return [fit for group in self._groups.values() for fit in group.problem.fit()]

    def exact(self, position: int):
        """The exact fit of one entry; None where its family has none."""
        entry = self.entries[position]
        if entry.group not in self._exact:
            x, y = as_written(self.data.x), as_written(self.data.y)
            weights = exact_weights(self.data.weighting, as_written(self.data.stimulus))
            self._exact[entry.group] = self._groups[entry.group].family.exact(x, y, weights)
        return self._exact[entry.group].get(entry.member.order)

    def curve(self, position: int, coefficients: np.ndarray):
        """The function of one entry with given coefficients."""
        entry = self.entries[position]
        return self._groups[entry.group].family.curve(entry.member, coefficients)

    def errors(self, folds: Sequence[Fold]) -> SchemeErrors:
        """Held-out errors of all entries under the same folds."""
        data = self.data
        parts = [
            scheme_errors(group.problem, group.parameters, folds, data.root_weights, data.level_index)
            for group in self._groups.values()
        ]
        return SchemeErrors(
            *(np.concatenate([getattr(p, n) for p in parts]) for n in ("squared", "fold_loss", "failed"))
        )

    def bootstrap(self, counts: Callable[[], Iterable[np.ndarray]], units: np.ndarray) -> BootstrapErrors:
        """Bootstrap errors of all entries for the same draws; ``counts`` starts the draws anew for each family."""
        parts = [
            bootstrap_errors(group.problem, group.parameters, counts(), units, self.data.level_index)
            for group in self._groups.values()
        ]
        return BootstrapErrors(
            np.concatenate([part.squared for part in parts]),
            np.concatenate([part.rank_deficient for part in parts]),
            parts[0].left_out,
            parts[0].draws,
        )

    def resampled_held_out(self, counts: np.ndarray, blocks: Sequence[np.ndarray]) -> np.ndarray:
        """Held-out residuals within resamples, shape (entries, n, draws)."""
        return np.concatenate([group.problem.resampled_held_out(counts, blocks) for group in self._groups.values()])

    def residuals(self) -> np.ndarray:
        """Residuals on the fitted points, shape (entries, n); nan without a fit."""
        return np.concatenate([group.problem.residuals() for group in self._groups.values()])

    def refit(self, counts: np.ndarray) -> np.ndarray:
        """Residuals of fits to resamples, shape (entries, n, draws)."""
        return np.concatenate([group.problem.refit(counts) for group in self._groups.values()])


def declared_candidates(families) -> list[Declared]:
    """Every candidate of a study, in its order.

    Parameters
    ----------
    families : sequence of FamilySettings

    Returns
    -------
    list of Declared
    """
    return [
        Declared(name, entry.family, group, degree, parameter_count(entry.family, degree, entry.fixed_points))
        for group, entry in enumerate(families)
        for degree, name in zip(entry.degrees, entry.candidate_ids, strict=True)
    ]


def supported(declared: Sequence[Declared], data: DatasetArrays) -> list[Declared]:
    """Candidates with at least two levels more than parameters; none where the independent variable is constant."""
    levels = data.levels.size
    if levels < 2 or not np.ptp(data.x) > 0:
        return []
    return [item for item in declared if levels >= item.parameters + 2]
