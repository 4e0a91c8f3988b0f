"""The working folder of a study, and the one way in which a file is written there: whole or not at all."""

from __future__ import annotations

import json
import os
import shutil
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from fitlib.errors import FitlibError
from fitlib.plan import Plan, digest

WORK = ".work"
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
        The disk is full, or the folder cannot be written; the error names a file, and the temporary one is removed.
    """
    _clear_the_way(path)
    path.parent.mkdir(parents=True, exist_ok=True)
    data = content.encode("utf-8") if isinstance(content, str) else content
    with named_errors(path):
        _write_beside(path, data)


def _write_beside(path: Path, data: bytes) -> None:
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


def _clear_the_way(path: Path) -> None:
    """Below ``.work`` nothing is anybody's own: a folder in place of the file goes, and a file in place of a folder."""
    above = list(path.absolute().parents)
    names = [place.name for place in above]
    if WORK in names:
        for place in above[: names.index(WORK)]:
            remove_file(place)
        remove_folder(path)


def remove_file(path: Path) -> None:
    """Remove a file that stands where a folder belongs; a folder, or a link to one, is left alone."""
    if not path.is_dir() and os.path.lexists(path):
        path.unlink()


def remove_folder(path: Path) -> None:
    """Remove a folder that stands where a file belongs; anything else is left alone."""
    if path.is_dir() and not path.is_symlink():
        shutil.rmtree(path)


@contextmanager
def named_errors(path: Path) -> Iterator[None]:
    """Let errors of the system name a file: a full disk is told without one."""
    try:
        yield
    except OSError as error:
        if error.filename is None:
            error.filename = os.fspath(path)
        raise


def write_json(path: Path, content: Any) -> None:
    """Write JSON with sorted keys, whole or not at all."""
    write_atomic(path, json.dumps(content, sort_keys=True, indent=1, allow_nan=False) + "\n")


def read_json(path: Path) -> Any:
    """Return the content of a JSON file; None when it is missing or damaged."""
    try:
        return json.loads(path.read_bytes())
    except (OSError, ValueError, RecursionError):
        return None


def write_sealed(path: Path, content: dict[str, Any]) -> None:
    """Write a JSON object together with its digest, whole or not at all."""
    write_json(path, {**content, "sha256": digest(content)})


def read_sealed(path: Path) -> dict[str, Any] | None:
    """Return what :func:`write_sealed` wrote; None when it is missing or anything in it is not as it was written."""
    content = read_json(path)
    if not isinstance(content, dict):
        return None
    told = content.pop("sha256", None)
    try:
        return content if told == digest(content) else None
    except (ValueError, RecursionError):  # not a number, or nested too deep for a digest
        return None


def remove(path: Path) -> None:
    """Remove a file, or a folder in its place; one that is gone already is as good."""
    remove_folder(path)
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
        if not ignore.is_file():
            write_atomic(ignore, "*\n")
        for folder in (self.store, self.batches, self.published, self.logs, self.logs / "batches", self.root / "plans"):
            remove_file(folder)

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
    return WorkFolder(Path(os.path.abspath(results_dir)) / study_name / WORK)


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
