"""What differs between two revisions, as records and as plain sentences."""

from __future__ import annotations

import json
import math
from collections.abc import Iterable, Iterator
from dataclasses import asdict, dataclass

from fitlib.revision.curves import Shift
from fitlib.revision.data import DataChange, RowChange
from fitlib.revision.names import printable
from fitlib.revision.settings import SettingChange

_LONGEST_VALUE = 300
_LONGEST_LIST = 10
_RTOL = 1e-8
_DEVIATIONS = {
    "standard deviation of a reading": "reading_standard_deviation",
    "standard deviation that averaging does not divide": "level_standard_deviation",
}


@dataclass(frozen=True)
class FactChange:
    """A version, or another fact of the run, that differs; None where it is absent."""

    name: str
    before: object
    after: object


@dataclass(frozen=True)
class Choice:
    """What one revision chose for a dataset.

    Attributes
    ----------
    candidate, runner_up : str
        Empty when there is none.
    verdict, choice : str
    scheme : str
        Scheme of the loss; empty for a rule without one.
    loss : float or None
    interval : tuple of float, or None
        Measuring interval.
    reading_standard_deviation, level_standard_deviation : float or None
        Of the issued function, in the unit of the fitted quantity: of a reading, and what averaging readings does not
        divide.
    unit, stimulus_unit : str
        Of the fitted quantity and of the stimulus.
    use : str
        ``calibration, inverse`` and the like.
    """

    candidate: str
    runner_up: str
    verdict: str
    choice: str
    scheme: str
    loss: float | None
    interval: tuple[float, float] | None
    reading_standard_deviation: float | None
    level_standard_deviation: float | None
    unit: str
    stimulus_unit: str
    use: str


@dataclass(frozen=True)
class DatasetChange:
    """A dataset whose outcome differs; None on the side where it is absent."""

    dataset: str
    kind: str
    before: Choice | None
    after: Choice | None
    shift: Shift | None


@dataclass(frozen=True)
class Comparison:
    """What differs between two revisions.

    Attributes
    ----------
    before, after : str
        Names of the revisions.
    versions, facts : tuple of FactChange
        Versions of program and libraries; other facts, such as digests of the program's code.
    data : tuple of DataChange
    settings : tuple of SettingChange
    study_text : bool
        Whether the study's text differs, be it only in a comment.
    datasets : tuple of DatasetChange
    unchanged : int
        Datasets of both revisions whose outcome is the same.
    """

    before: str
    after: str
    versions: tuple[FactChange, ...]
    facts: tuple[FactChange, ...]
    data: tuple[DataChange, ...]
    settings: tuple[SettingChange, ...]
    study_text: bool
    datasets: tuple[DatasetChange, ...]
    unchanged: int

    @property
    def changed(self) -> bool:
        """Whether anything differs."""
        return any((self.versions, self.facts, self.data, self.settings, self.study_text, self.datasets))

    def causes(self) -> list[str]:
        """One sentence for each difference in program, data and settings."""
        lines = [_version_line(change) for change in self.versions]
        lines += [_fact_line(change) for change in self.facts]
        lines += [_data_line(change) for change in self.data]
        lines += _setting_lines(self.settings)
        if self.study_text and not self.settings:
            lines.append("The study's text changed, its settings did not.")
        return lines

    def effects(self) -> list[str]:
        """One sentence for each dataset whose outcome differs, and one for all others."""
        if not self.changed:
            return []
        lines = [_dataset_line(change) for change in self.datasets]
        if self.unchanged:
            count = "1 dataset has" if self.unchanged == 1 else f"{self.unchanged} datasets have"
            lines.append(f"{count} the same choice, verdict, loss and function as before.")
        return lines

    def lines(self) -> list[str]:
        """Plain sentences; none when nothing differs."""
        return self.causes() + self.effects()

    def to_dict(self) -> dict:
        """The same as a JSON-able dict."""
        return {**asdict(self), "changed": self.changed}


def _text(text: object) -> str:
    return printable(str(text))


def _value(value: object) -> str:
    """A setting as short text."""
    text = printable(value if isinstance(value, str) else json.dumps(value, ensure_ascii=False, sort_keys=True))
    return text if len(text) <= _LONGEST_VALUE else text[:_LONGEST_VALUE] + "..."


def _fact_line(change: FactChange) -> str:
    part = _text(change.name)
    if part.startswith("code."):
        return f"The program's code changed: {part.removeprefix('code.')}."
    return f"Of the facts in the manifest, {part} changed."


def _version_line(change: FactChange) -> str:
    name = "fitlib" if change.name == "fitlib" else f"Version of {_text(change.name)}"
    return f"{name} changed from {_version(change.before)} to {_version(change.after)}."


def _version(version: object) -> str:
    return "none" if version is None else _text(version)


def _data_line(change: DataChange) -> str:
    rows = ", ".join(_rows(change.kind, item) for item in change.rows)
    verb = "changed" if change.kind == "changed" else f"was {change.kind}"
    return f"Data file {_text(change.file)} {verb}{': ' if rows else ''}{rows}."


def _rows(kind: str, item: RowChange) -> str:
    name = _text(item.dataset)
    if kind != "changed":
        return f"{_counted(item.after if kind == 'added' else item.before)} of {name}"
    series = "; ".join(f"series {_text(label)} from {old} to {new}" for label, old, new in item.series)
    detail = f" ({series})" if series else ""
    if item.before == item.after:
        return f"{_counted(item.after)} of {name} as before, other content{detail}"
    return f"rows of {name} from {item.before} to {item.after}{detail}"


def _counted(rows: int) -> str:
    return "1 row" if rows == 1 else f"{rows} rows"


def _setting_lines(changes: Iterable[SettingChange]) -> list[str]:
    """One line for each change; the same change of many datasets is one."""
    groups: dict[tuple[str, str], list[SettingChange]] = {}
    for change in changes:
        key = change.key if change.is_dataset else change.general_key
        groups.setdefault((key, _setting_text(change)), []).append(change)
    return [_setting_line(text, group) for (_, text), group in groups.items()]


def _setting_line(text: str, group: list[SettingChange]) -> str:
    first = group[0]
    if first.is_dataset:
        return (
            f"Dataset {_text(first.dataset)} was {'added to' if first.kind == 'added' else 'taken out of'} the study."
        )
    if len(group) == 1:
        return f"Setting {_text(first.key)} {text}."
    names = ", ".join(_text(change.dataset) for change in group[:_LONGEST_LIST])
    more = ", ..." if len(group) > _LONGEST_LIST else ""
    return f"Setting {_text(first.general_key)} {text} ({len(group)} datasets: {names}{more})."


def _setting_text(change: SettingChange) -> str:
    if change.kind == "changed":
        return f"changed from {_value(change.before)} to {_value(change.after)}"
    return f"was {change.kind}: {_value(change.after if change.kind == 'added' else change.before)}"


def _dataset_line(change: DatasetChange) -> str:
    name = _text(change.dataset)
    if change.before is None:
        return f"Dataset {name} is new: {_outcome(change.after)}."
    if change.after is None:
        return f"Dataset {name} is gone; it had: {_outcome(change.before)}."
    return f"Dataset {name}: {'; '.join(_differences(change))}."


def _outcome(choice: Choice) -> str:
    loss = "" if choice.loss is None else f", loss {choice.loss:.3g} ({_text(choice.unit)} squared)"
    tie = " (tie)" if choice.choice == "tie" else ""
    return f"{_text(choice.candidate) or 'no candidate'} chosen{tie}, verdict {_text(choice.verdict)}{loss}"


def _differences(change: DatasetChange) -> Iterator[str]:
    old, new = change.before, change.after
    unit = f" {_text(new.unit)}" if new.unit else ""
    yield _pair("candidate", _text(old.candidate) or "none", _text(new.candidate) or "none")
    yield _pair("verdict", _text(old.verdict), _text(new.verdict))
    if old.choice != new.choice:
        yield _pair("choice", _text(old.choice) or "none", _text(new.choice) or "none")
    if old.use != new.use:
        yield _pair("use", _text(old.use), _text(new.use))
    yield from _loss_difference(old, new)
    if old.interval != new.interval:
        yield f"measuring interval from {_interval(old)} to {_interval(new)}"
    for label, name in _DEVIATIONS.items():
        yield from _number_difference(label, getattr(old, name), getattr(new, name), unit)
    if change.shift is not None and change.shift.amount > 0:
        yield _shift_text(change.shift)


def _pair(label: str, before: str, after: str) -> str:
    return f"{label} {after} as before" if before == after else f"{label} from {before} to {after}"


def _loss_difference(old: Choice, new: Choice) -> Iterator[str]:
    if old.scheme == new.scheme:
        yield from _number_difference("loss", old.loss, new.loss, f" ({_text(new.unit)} squared)")
    else:
        parts = [f"{_number(item.loss)} by {_text(item.scheme) or 'no scheme'}" for item in (old, new)]
        yield f"loss from {parts[0]} to {parts[1]}, which cannot be compared"


def _number_difference(label: str, before: float | None, after: float | None, unit: str) -> Iterator[str]:
    if not same_number(before, after):
        first, second = distinct(before, after)
        yield f"{label} from {first} to {second}{unit}"


def same_number(before: float | None, after: float | None) -> bool:
    """Whether two numbers agree to 1e-8 relative."""
    if before is None or after is None:
        return before is after
    return math.isclose(before, after, rel_tol=_RTOL)


def distinct(before: float | None, after: float | None) -> tuple[str, str]:
    """Two numbers with as many digits as it takes to tell them apart, three at least."""
    texts = "none", "none"
    for digits in range(3, 18):
        texts = _number(before, digits), _number(after, digits)
        if texts[0] != texts[1]:
            break
    return texts


def _number(value: float | None, digits: int = 3) -> str:
    return "none" if value is None else f"{value:.{digits}g}"


def _interval(choice: Choice) -> str:
    if choice.interval is None:
        return "none"
    lower, upper = choice.interval
    return f"{lower:g} to {upper:g} {_text(choice.stimulus_unit)}".rstrip()


def _shift_text(shift: Shift) -> str:
    unit, at_unit = _text(shift.unit), _text(shift.at_unit)
    text = f"the chosen function shifts by at most {shift.amount:.3g} {unit} (at {shift.at:.4g} {at_unit})"
    if shift.amount_evaluated is None:
        return text
    return f"{text}, which is at most {shift.amount_evaluated:.3g} {_text(shift.unit_evaluated)} in a converted value"
