"""Reads one YAML document strictly, keeping the line of every key.

Built on parser events, not on PyYAML's own construction: duplicate keys, anchors, aliases and tags are refused, depth
is limited, nothing recurses, and scalars mean what `fitlib.study.scalars` says.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import yaml

from fitlib.study.positions import child
from fitlib.study.scalars import ScalarFault, plain_scalar
from fitlib.study.shown import printable, shown
from fitlib.study.unknown import UNKNOWN

DEEPEST = 20  # the study format itself needs seven
TOO_DEEP = f"nested more than {DEEPEST} levels deep; a study needs fewer"
PARSER = getattr(yaml, "CSafeLoader", yaml.SafeLoader)  # the C parser is ten times faster and gives the same events


class YamlFault(ValueError):
    """The text cannot be read as one YAML document; nothing more can be said about it."""

    def __init__(self, message: str, line: int | None = None, column: int | None = None):
        super().__init__(message)
        self.message, self.line, self.column = message, line, column


@dataclass(frozen=True)
class Fault:
    """Something refused that does not hide the rest; `hides` when the value under the key is unknown."""

    key: str
    line: int
    message: str
    hides: bool = False


@dataclass
class Document:
    """The plain data of a document, the line of each dotted key, and what was refused on the way."""

    data: Any = None
    lines: dict[str, int] = field(default_factory=dict)
    faults: list[Fault] = field(default_factory=list)


@dataclass
class _Open:
    """A mapping or list that is being read; `kept` is false under a key that was refused."""

    values: dict[str, Any] | list[Any]
    key: str
    kept: bool = True
    pending: str | None = None
    pending_kept: bool = True


def read_yaml(text: str) -> Document:
    """Read one document.

    Raises
    ------
    YamlFault
        Syntax, a second document, a list or mapping as key, or more than `DEEPEST` levels.
    """
    builder = _Builder()
    try:
        for event in yaml.parse(text, Loader=PARSER):
            builder.take(event)
    except yaml.MarkedYAMLError as fault:
        raise _syntax(fault, text) from None
    except (yaml.YAMLError, RecursionError) as fault:
        raise YamlFault(f"YAML syntax: {printable(str(fault).splitlines()[0])}") from None
    return builder.document


class _Builder:
    def __init__(self) -> None:
        self.document = Document()
        self.open: list[_Open] = []
        self.documents = 0

    def take(self, event: yaml.Event) -> None:
        if isinstance(event, yaml.DocumentStartEvent):
            self._start_document(event)
        elif isinstance(event, yaml.NodeEvent):
            self._start_node(event)
        elif isinstance(event, yaml.CollectionEndEvent):
            self.open.pop()

    def _start_document(self, event: yaml.DocumentStartEvent) -> None:
        self.documents += 1
        line = event.start_mark.line + 1
        if self.documents > 1:
            raise YamlFault("a second document starts here; a study file holds one", line)
        if event.tags:
            raise YamlFault("a %TAG line is not allowed in a study", line)

    def _start_node(self, event: yaml.NodeEvent) -> None:
        line = event.start_mark.line + 1
        frame = self.open[-1] if self.open else None
        if frame and isinstance(frame.values, dict) and frame.pending is None:
            self._take_key(frame, event, line)
            return
        key, kept = self._place(frame, line)
        value = self._value(event, key, line)
        if isinstance(event, yaml.CollectionStartEvent):
            if len(self.open) >= DEEPEST:
                raise YamlFault(TOO_DEEP, line)
            self.open.append(_Open(value, key, kept))
        self._attach(frame, value)

    def _place(self, frame: _Open | None, line: int) -> tuple[str, bool]:
        """Return the dotted key of the value that starts now, and whether it is kept."""
        if frame is None:
            self.document.lines[""] = line
            return "", True
        if isinstance(frame.values, dict):
            return child(frame.key, frame.pending), frame.kept and frame.pending_kept
        key = child(frame.key, len(frame.values))
        self.document.lines.setdefault(key, line)
        return key, frame.kept

    def _attach(self, frame: _Open | None, value: Any) -> None:
        if frame is None:
            self.document.data = value
        elif isinstance(frame.values, list):
            frame.values.append(value)
        else:
            if frame.pending_kept:
                frame.values[frame.pending] = value
            frame.pending = None

    def _take_key(self, frame: _Open, event: yaml.NodeEvent, line: int) -> None:
        if not isinstance(event, yaml.ScalarEvent):
            raise YamlFault("a key is a single word; found a list, a group of keys or an alias in its place", line)
        word, name = self._scalar(event), event.value
        key = child(frame.key, name)
        self._refuse_marks(event, key, line)
        frame.pending, frame.pending_kept = name, False
        if not isinstance(word, str):
            what = "an empty key" if name == "" else f"the key {shown(name)} is not text"
            self._fault(key, line, f"{what}; put it in quotes if it is meant as a name", hides=True)
        elif name in frame.values:
            first = self.document.lines[key]
            self._fault(key, line, f"the key is given twice; first in line {first}")
        else:
            frame.pending_kept = True
            self.document.lines.setdefault(key, line)

    def _value(self, event: yaml.NodeEvent, key: str, line: int) -> Any:
        if isinstance(event, yaml.AliasEvent):
            name = printable(event.anchor)
            return self._hide(key, line, f"the alias *{name} is not allowed; write the value out")
        tagged = self._refuse_marks(event, key, line)
        if isinstance(event, yaml.MappingStartEvent):
            return {}
        if isinstance(event, yaml.SequenceStartEvent):
            return []
        value = self._scalar(event)
        if value is None:
            return self._hide(key, line, "no value is given; write one or leave the key out")
        if isinstance(value, ScalarFault):
            return self._hide(key, line, str(value))
        return UNKNOWN if tagged else value

    def _scalar(self, event: yaml.ScalarEvent) -> Any:
        if event.style:
            return event.value
        try:
            return plain_scalar(event.value)
        except ScalarFault as fault:
            return fault

    def _refuse_marks(self, event: yaml.NodeEvent, key: str, line: int) -> bool:
        """Refuse an anchor and a tag; return whether there is a tag on a scalar, whose value is then not known."""
        if event.anchor is not None:
            name = printable(event.anchor)
            self._fault(key, line, f"the anchor &{name} is not allowed; write the value out where it is needed")
        if event.tag is None:
            return False
        scalar = isinstance(event, yaml.ScalarEvent)
        self._fault(key, line, f"the tag {printable(event.tag)} is not allowed; write the plain value", hides=scalar)
        return scalar

    def _hide(self, key: str, line: int, message: str) -> Any:
        self._fault(key, line, message, hides=True)
        return UNKNOWN

    def _fault(self, key: str, line: int, message: str, hides: bool = False) -> None:
        self.document.faults.append(Fault(key, line, message, hides))


def _syntax(fault: yaml.MarkedYAMLError, text: str) -> YamlFault:
    mark = fault.problem_mark or fault.context_mark
    problem = printable(fault.problem or fault.context or "cannot be read")
    if mark is None:
        return YamlFault(f"YAML syntax: {problem}")
    if "nesting depth" in problem:  # the C parser reads ahead of its events and has a limit of its own
        return YamlFault(TOO_DEEP, mark.line + 1)
    lines = text.splitlines()
    here = lines[mark.line] if mark.line < len(lines) else ""
    hint = "; indent with spaces, not with a tab" if here[: mark.column + 1].strip(" ").startswith("\t") else ""
    if not hint and here[mark.column : mark.column + 1] in tuple("%@`"):
        hint = f"; put text that starts with {here[mark.column]} in quotes"
    since = fault.context_mark
    began = f" ({fault.context}, line {since.line + 1})" if fault.context and since else ""
    return YamlFault(f"YAML syntax: {problem}{began}{hint}", mark.line + 1, mark.column + 1)
