"""The working folder of a study, and the one way in which a file is written there: whole or not at all."""

from __future__ import annotations

import json
import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from fitlib.errors import FitlibError
from fitlib.plan import Plan

TEMPORARY = ".new-"
KEPT_LOGS = 20


def write_atomic(path: Path, content: str | bytes) -> None:
    """Write a file so that every reader finds the old content, the new one, or no file; never a part.

    Parameters
    ----------
    path : Path
        Its folder is made when missing; the temporary file stands beside it, on the same file system.
    content : str or bytes
        Text is written as UTF-8.

    Raises
    ------
    OSError
        The disk is full, or the folder cannot be written; the temporary file is removed.
    """
    path.parent.mkdir(parents=True, exist_ok=True)
    data = content.encode("utf-8") if isinstance(content, str) else content
    descriptor, temporary = tempfile.mkstemp(prefix=TEMPORARY, dir=path.parent)
    try:
        with open(descriptor, "wb") as stream:
            stream.write(data)
            stream.flush()
            os.fsync(stream.fileno())
        os.chmod(temporary, 0o644)
        os.replace(temporary, path)
    except BaseException:
        with suppress(OSError):
            os.unlink(temporary)
        raise


def write_json(path: Path, content: Any) -> None:
    """Write JSON with sorted keys, whole or not at all."""
    write_atomic(path, json.dumps(content, sort_keys=True, indent=1, allow_nan=False) + "\n")


def read_json(path: Path) -> Any:
    """Return the content of a JSON file; None when it is missing or damaged."""
    try:
        return json.loads(path.read_bytes())
    except (OSError, ValueError):
        return None


def remove(path: Path) -> None:
    """Remove a file; one that is gone already is as good."""
    with suppress(FileNotFoundError):
        path.unlink()


@dataclass(frozen=True)
class WorkFolder:
    """``results/<study>/.work``: everything in it can be deleted and is computed again.

    Attributes
    ----------
    root : Path
        Absolute.
    """

    root: Path

    @property
    def results_dir(self) -> Path:
        """The folder that holds all studies' results."""
        return self.root.parent.parent

    @property
    def study_name(self) -> str:
        """The name of the study."""
        return self.root.parent.name

    @property
    def store(self) -> Path:
        """Results of single steps, by content."""
        return self.root / "store"

    @property
    def batches(self) -> Path:
        """Outputs of batch jobs."""
        return self.root / "batches"

    @property
    def published(self) -> Path:
        """Markers: which plan is in which revision."""
        return self.root / "published"

    @property
    def logs(self) -> Path:
        """What was said while running."""
        return self.root / "logs"

    @property
    def trees(self) -> Path:
        """Hashes of the program's syntax trees."""
        return self.root / "trees.json"

    @property
    def latest_plan(self) -> Path:
        """The plan of the last run that went to its end."""
        return self.root / "latest-plan.json"

    @property
    def run_lock(self) -> Path:
        """Held by the run of this study."""
        return self.root / "run.lock"

    @property
    def publish_lock(self) -> Path:
        """Held while a revision is published."""
        return self.root / "publish.lock"

    def plan_file(self, digest: str) -> Path:
        """Return the file of one plan."""
        return self.root / "plans" / f"{digest[:16]}.json"

    def marker(self, digest: str) -> Path:
        """Return the marker of a plan that is published."""
        return self.published / f"{digest[:16]}.json"

    def batch_log(self, output_name: str) -> Path:
        """Return the log of the job that writes a batch output."""
        return self.logs / "batches" / f"{Path(output_name).stem}.log"

    def publish_log(self, digest: str) -> Path:
        """Return the log of the job that publishes a plan."""
        return self.logs / f"publish-{digest[:16]}.log"

    def create(self) -> None:
        """Make the folder, with its own ``.gitignore``: nothing of it belongs in version control."""
        ignore = self.root / ".gitignore"
        if not ignore.exists():
            write_atomic(ignore, "*\n")

    def of_other_plans(self, plan: Plan) -> list[Path]:
        """Return the files that only other plans have; from the store they are made again in no time."""
        present = {Path(batch.file_name).stem for batch in plan.batches}
        outputs = [*self.batches.glob("*.json"), *(self.logs / "batches").glob("*.log")]
        markers = [*self.published.glob("*.json"), *(self.root / "plans").glob("*.json"), *self.logs.glob("publish-*")]
        return [
            *(path for path in outputs if path.stem not in present),
            *(path for path in markers if path.stem.removeprefix("publish-") != plan.digest[:16]),
            *sorted(self.logs.glob("run-*.log"))[:-KEPT_LOGS],
        ]

    def leftovers(self) -> Iterator[Path]:
        """Yield the temporary files that killed processes left behind."""
        return self.root.rglob(f"{TEMPORARY}*")


def work_folder(results_dir: Path | str, study_name: str) -> WorkFolder:
    """Return the working folder of a study; nothing is made yet."""
    return WorkFolder(Path(os.path.abspath(results_dir)) / study_name / ".work")


@contextmanager
def plain_os_errors(what: str) -> Iterator[None]:
    """Turn a failure of disk or folder into a plain sentence.

    Parameters
    ----------
    what : str
        What was tried, for the message.

    Raises
    ------
    FitlibError
        In place of an ``OSError``.
    """
    try:
        yield
    except OSError as error:
        place = f"{error.filename}: " if error.filename else ""
        raise FitlibError(f"{what}: {place}{error.strerror or error}") from error
