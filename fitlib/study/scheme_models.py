"""Validation schemes that a study may declare, one model each."""

from __future__ import annotations

from fitlib.study.kinds import choice, whole
from fitlib.study.model_base import Model
from fitlib.study.settings import SchemeSettings

MOST_REPEATS = 10_000
LEAST_DRAWS, MOST_DRAWS = 10, 100_000
DEFAULT_UNIT = "level"

Folds = whole(2)
Repeats = whole(1, MOST_REPEATS)
Draws = whole(LEAST_DRAWS, MOST_DRAWS)
Unit = choice("level", "series", "observation")


class _WithoutSettings(Model):
    def settings(self) -> SchemeSettings:
        """Return the scheme; it has no settings of its own."""
        return SchemeSettings(id=self.scheme, scheme=self.scheme)  # type: ignore[attr-defined]


class LeaveOneLevelOut(_WithoutSettings):
    """Every level is held out once, over all series."""

    scheme: choice("leave_one_level_out")  # type: ignore[valid-type]


class LeaveOneSeriesOut(_WithoutSettings):
    """Every series is held out once."""

    scheme: choice("leave_one_series_out")  # type: ignore[valid-type]


class LeaveOneOut(_WithoutSettings):
    """Every observation is held out once."""

    scheme: choice("leave_one_out")  # type: ignore[valid-type]


class KFold(Model):
    """Units are dealt at random into folds, `repeats` times."""

    scheme: choice("k_fold")  # type: ignore[valid-type]
    folds: Folds  # type: ignore[valid-type]
    repeats: Repeats = 1  # type: ignore[valid-type]
    unit: Unit = DEFAULT_UNIT  # type: ignore[valid-type]

    def settings(self) -> SchemeSettings:
        """Return the scheme with its id."""
        return SchemeSettings(
            id=scheme_id(self.scheme, self.unit),
            scheme=self.scheme,
            folds=self.folds,
            repeats=self.repeats,
            unit=self.unit,
        )


class Bootstrap(Model):
    """Units are drawn with replacement, `draws` times."""

    scheme: choice("bootstrap")  # type: ignore[valid-type]
    draws: Draws  # type: ignore[valid-type]
    unit: Unit = DEFAULT_UNIT  # type: ignore[valid-type]

    def settings(self) -> SchemeSettings:
        """Return the scheme with its id."""
        return SchemeSettings(
            id=scheme_id(self.scheme, self.unit), scheme=self.scheme, unit=self.unit, draws=self.draws
        )


def scheme_id(scheme: str, unit: str) -> str:
    """Return the scheme's name, with the unit appended where it is not the default."""
    return scheme if unit == DEFAULT_UNIT else f"{scheme}_{unit}"


KNOWN_SCHEMES: dict[str, type[Model]] = {
    "leave_one_level_out": LeaveOneLevelOut,
    "leave_one_series_out": LeaveOneSeriesOut,
    "leave_one_out": LeaveOneOut,
    "k_fold": KFold,
    "bootstrap": Bootstrap,
}
RANDOM_SCHEMES = frozenset({"k_fold", "bootstrap"})
