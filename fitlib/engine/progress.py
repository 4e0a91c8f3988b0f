"""What a person sees while the workflow runs: stage, done of total, time left; read from Snakemake's log."""

from __future__ import annotations

import re
import sys
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import TextIO

_STARTED = re.compile(r"^\s*(?:local)?rule (\w+):")
_JOB = re.compile(r"^\s+jobid: (\d+)$")
_BATCH = re.compile(r"^\s+wildcards: .*\bbatch=(\d+)")
_FINISHED = re.compile(r"^Finished jobid: (\d+) \(Rule: (\w+)\)")
_PLANNED = re.compile(r"^(fit_batch)\s+(\d+)$")


@dataclass
class Events:
    """What Snakemake's log has told so far.

    Attributes
    ----------
    planned : int
        Batch jobs that this run will do.
    started, finished : list of str
        Batches in the order in which they were started and finished.
    stage : {"waiting", "fitting", "publishing", "published"}
    """

    planned: int = 0
    started: list[str] = field(default_factory=list)
    finished: list[str] = field(default_factory=list)
    stage: str = "waiting"
    _rule: str = ""
    _job: str = ""
    _batch_of_job: dict[str, str] = field(default_factory=dict)

    def read(self, line: str) -> bool:
        """Take one line of the log; return whether it told something new.

        Parameters
        ----------
        line : str

        Returns
        -------
        bool
        """
        if match := _STARTED.match(line):
            self._rule = match[1]
            return self._enter("publishing") if self._rule == "publish" else False
        if match := _JOB.match(line):
            self._job = match[1]
        elif match := _BATCH.match(line):
            self._batch_of_job[self._job] = match[1]
            self.started.append(match[1])
            return self._enter("fitting")
        elif match := _FINISHED.match(line):
            return self._finish(match[1], match[2])
        elif match := _PLANNED.match(line):
            self.planned = int(match[2])
        return False

    def _enter(self, stage: str) -> bool:
        new = self.stage != stage
        self.stage = stage
        return new

    def _finish(self, job: str, rule: str) -> bool:
        if rule == "publish":
            return self._enter("published")
        if job not in self._batch_of_job:
            return False
        self.finished.append(self._batch_of_job[job])
        return True


class Progress:
    """Shows events: one line that is written again on a terminal, few plain lines elsewhere.

    Parameters
    ----------
    sizes : dict of str to int
        How many datasets each batch has.
    stream : text stream, optional
        Standard error by default.
    clock : callable, optional
        Returns seconds; for tests.
    """

    def __init__(
        self, sizes: Mapping[str, int], stream: TextIO | None = None, clock: Callable[[], float] = time.monotonic
    ):
        self.sizes = sizes
        self.stream = sys.stderr if stream is None else stream
        self.events = Events()
        self._clock, self._begin = clock, clock()
        self._terminal = bool(getattr(self.stream, "isatty", lambda: False)())
        self._open_line = False
        self._told = -1

    def line(self, text: str) -> None:
        """Take one line of Snakemake's log."""
        if self.events.read(text.rstrip("\n")):
            self._show()

    def close(self) -> None:
        """End the line that is written again."""
        if self._open_line:
            self.stream.write("\n")
            self.stream.flush()
        self._open_line = False

    def message(self) -> str:
        """Return the present state in words."""
        events = self.events
        if events.stage == "publishing":
            return "publishing tables, functions, figures and report"
        if events.stage == "published":
            return "published"
        done = sum(self.sizes.get(name, 0) for name in events.finished)
        total = self._total()
        counted = f"{len(events.finished)} of {max(events.planned, len(events.started))} batches done"
        return f"fitting and validating: {counted} ({done} of {total} datasets){self._time_left(done, total)}"

    def _total(self) -> int:
        """Which batches will run is known by number only until all have started; the mean size fills the gap."""
        known = sum(self.sizes.get(name, 0) for name in self.events.started)
        missing = max(0, self.events.planned - len(self.events.started))
        if self.events.planned >= len(self.sizes):
            return sum(self.sizes.values())
        mean = sum(self.sizes.values()) / max(1, len(self.sizes))
        return max(known, round(known + missing * mean))

    def _time_left(self, done: int, total: int) -> str:
        if not done or done >= total:
            return ""
        seconds = (self._clock() - self._begin) * (total - done) / done
        return f", about {seconds_in_words(seconds)} left"

    def _show(self) -> None:
        if self._terminal:
            self.stream.write(f"\r\x1b[K  {self.message()}")
            self._open_line = True
        elif self._is_worth_a_line():
            self.stream.write(f"  {self.message()}\n")
        self.stream.flush()

    def _is_worth_a_line(self) -> bool:
        """Away from a terminal a line for each tenth is enough."""
        if self.events.stage == "published":
            return False
        if self.events.stage != "fitting":
            return True
        tenth = 10 * len(self.events.finished) // max(1, self.events.planned)
        new = tenth != self._told
        self._told = tenth
        return new


def seconds_in_words(seconds: float) -> str:
    """Return a duration as a person says it: ``40 s``, ``5 min``, ``2 h 10 min``."""
    if seconds < 90:
        return f"{max(1, round(seconds))} s"
    minutes = round(seconds / 60)
    return f"{minutes} min" if minutes < 90 else f"{minutes // 60} h {minutes % 60} min"
