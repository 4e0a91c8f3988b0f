"""Publishing a revision: written beside its final place, renamed in one step, never changed again."""

from __future__ import annotations

import os
import secrets
import shutil
from collections.abc import Callable, Mapping, Sequence
from contextlib import AbstractContextManager, nullcontext, suppress
from dataclasses import dataclass
from pathlib import Path

from fitlib.errors import FitlibError
from fitlib.revision.changes import History, changes_text
from fitlib.revision.compare import compare_revisions
from fitlib.revision.disk import copy_new, digest_of, dump_json, sha256, sync_folder, sync_tree, write_new
from fitlib.revision.ledger import differs_from_ledger, next_number, numbers_in, read_ledger, write_ledger
from fitlib.revision.manifest import (
    HISTORY_FILES,
    MANIFEST,
    RESERVED_FILES,
    RUN,
    SEAL,
    entry,
    make_manifest,
    seal_text,
    with_history,
)
from fitlib.revision.names import is_safe, printable, revision_name, study_folder
from fitlib.revision.read import Revision, latest_revision, read_revision
from fitlib.revision.same import same_results
from fitlib.revision.verify import verify_revision

_STAGING = ".new-"
Render = Callable[[str, list[str]], Mapping[str, bytes]]


@dataclass(frozen=True)
class Published:
    """Where the results are.

    Attributes
    ----------
    revision : str
        Name of the revision that holds them.
    path : Path
        Its folder.
    new : bool
        False when an earlier revision holds the same results.
    note : str
        One plain sentence or two for the user.
    """

    revision: str
    path: Path
    new: bool
    note: str


def publish(
    results_dir: str | Path,
    study_name: str,
    files: Mapping[str, bytes],
    inputs: Mapping[str, Path | bytes],
    facts: Mapping,
    run_facts: Mapping,
    *,
    render: Render | None = None,
    input_digests: Mapping[str, str] | None = None,
    lock: AbstractContextManager | None = None,
) -> Published:
    """Publish results as the next revision, unless the latest one holds them already.

    No revision is made when the plan digest is that of the latest revision; nor when only versions of libraries differ
    from it (same ``inputs`` and resolved study, same other facts, ``code`` among them) and every choice, verdict and
    number is the same to 1e-8. A number is never used twice. After any error nothing is left behind.

    Parameters
    ----------
    results_dir : str or Path
        Folder of all results.
    study_name : str
        Name of the study: the folder of its revisions.
    files : mapping of str to bytes
        Results by path relative to the revision: ``resolved.json``, ``tables/...``, ``functions/...``, ``figures/...``.
    inputs : mapping of str to Path or bytes
        ``study.yaml`` and data files by path relative to the study; they are copied byte for byte to ``inputs/``.
    facts : mapping
        JSON-able facts that follow from the inputs: ``plan_digest``, ``seed``, ``versions`` (by name, ``fitlib`` and
        libraries), ``code`` (digests of the program's code by part), and any other. What depends on the versions of
        libraries must stand in ``versions`` or ``plan_digest`` only.
    run_facts : mapping
        JSON-able facts of this run, for ``run.json``: who, when, where, durations, git commit.
    render : callable, optional
        ``render(revision, changes) -> files`` makes the files that name the revision or tell its history, such as
        ``report.html``; called once, with the name and the sentences on what changed.
    input_digests : mapping of str to str, optional
        SHA-256 of inputs, as they were when the results were computed.
    lock : context manager, optional
        Held while publishing (``publish.lock``); without one the caller holds it already.

    Returns
    -------
    Published

    Raises
    ------
    FitlibError
        If the name of the study cannot name a folder, an input cannot be read or changed since ``input_digests`` was
        taken, or the revision cannot be written.
    ValueError
        If a path leaves the revision or a fact has a reserved name: a fault of the program.
    """
    folder = study_folder(results_dir, study_name)
    _check_paths(files, inputs)
    with lock if lock is not None else nullcontext():
        try:
            folder.mkdir(parents=True, exist_ok=True)
            _sweep(folder)
            latest = _latest(results_dir, study_name)
            if isinstance(latest, Revision) and _same_plan(latest, facts):
                return _standing(latest, "holds these results already")
            staged = _Staged(folder / f"{_STAGING}{secrets.token_hex(8)}", study_name, dict(files), render)
            return staged.publish(inputs, input_digests or {}, facts, run_facts, latest)
        except OSError as error:
            reason = error.strerror or error
            raise FitlibError(f"{folder}: no revision was published: {reason}; nothing was left behind") from error


def next_revision(results_dir: str | Path, study_name: str) -> str:
    """Name that the next revision of a study will have.

    Parameters
    ----------
    results_dir : str or Path
        Folder of all results.
    study_name : str

    Returns
    -------
    str

    Raises
    ------
    FitlibError
        If the name of the study cannot name a folder, or no number is left.
    """
    folder = study_folder(results_dir, study_name)
    taken = numbers_in(folder) | set(read_ledger(folder)) if folder.is_dir() else set()
    return revision_name(next_number(folder, taken))


def _check_paths(files: Mapping, inputs: Mapping) -> None:
    unsafe = [path for path in [*files, *inputs] if not is_safe(path)]
    reserved = [path for path in files if path in RESERVED_FILES or path.startswith("inputs/")]
    if unsafe or reserved:
        raise ValueError(f"not a place in a revision: {', '.join(map(repr, unsafe + reserved))}")


def _sweep(folder: Path) -> None:
    """Remove what a killed publication left behind."""
    for item in folder.glob(f"{_STAGING}*"):
        if item.is_symlink() or not item.is_dir():
            item.unlink()
        else:
            shutil.rmtree(item)


def _latest(results_dir: str | Path, study_name: str) -> Revision | str | None:
    """The latest revision; only its name when its manifest is damaged."""
    path = latest_revision(results_dir, study_name)
    if path is None:
        return None
    try:
        return read_revision(path)
    except FitlibError:
        return path.name


def _same_plan(latest: Revision, facts: Mapping) -> bool:
    return facts.get("plan_digest") is not None and latest.manifest.get("plan_digest") == facts["plan_digest"]


def _standing(latest: Revision, why: str) -> Published:
    """The latest revision stands; say so if it was altered."""
    note = f"{latest.path.name} {why}; no new revision."
    differences = verify_revision(latest.path)
    if differences:
        note += (
            f" But it is not as it was published ({differences[0]}{', and more' if len(differences) > 1 else ''}):"
            " see fitlib verify; to publish the results again, move it away and run again."
        )
    return Published(latest.path.name, latest.path, False, note)


@dataclass
class _Staged:
    """A revision in the making, in a hidden folder beside its final place."""

    path: Path
    study: str
    files: dict[str, bytes]
    render: Render | None

    def publish(self, inputs, digests, facts, run_facts, latest: Revision | str | None) -> Published:
        """Write, compare, seal, rename; whatever happens, the hidden folder does not stay."""
        self.path.mkdir()
        try:
            manifest = self._write_results(inputs, digests, facts)
            if self._only_libraries_differ(latest, manifest) and same_results(latest.path, self.files):
                return _standing(latest, _why_the_same(latest, manifest))
            return self._finish(manifest, run_facts, latest)
        finally:
            shutil.rmtree(self.path, ignore_errors=True)  # after the rename there is none

    def _only_libraries_differ(self, latest: Revision | str | None, manifest: Mapping) -> bool:
        """Whether only versions of libraries are new; without digests of the code nobody knows."""
        if not isinstance(latest, Revision) or not manifest.get("code"):
            return False
        return _of_inputs_and_program(latest.manifest) == _of_inputs_and_program(manifest)

    def _write_results(self, inputs, digests: Mapping[str, str], facts: Mapping) -> dict:
        entries = {path: self._write_input(path, source, digests.get(path)) for path, source in inputs.items()}
        outputs = {path: data for path, data in self.files.items() if path not in HISTORY_FILES}
        for path, data in outputs.items():
            write_new(self.path, path, data)
        return make_manifest(self.study, facts, entries, {path: entry(data) for path, data in outputs.items()})

    def _write_input(self, path: str, source: Path | bytes, expected: str | None) -> dict:
        place = f"inputs/{path}"
        if isinstance(source, bytes):
            write_new(self.path, place, source)
            record = entry(source)
        else:
            record = self._copy_input(path, source)
        if expected is not None and record["sha256"] != expected:
            raise FitlibError(f"{printable(path)}: changed while the study ran; nothing was published; run again")
        return record

    def _copy_input(self, path: str, source: Path) -> dict:
        try:
            source.open("rb").close()
        except OSError as error:
            message = f"{printable(path)}: cannot be read: {error.strerror or error}; nothing was published"
            raise FitlibError(message) from error
        return copy_new(source, self.path, f"inputs/{path}")

    def _finish(self, manifest: dict, run_facts: Mapping, latest: Revision | str | None) -> Published:
        folder = self.path.parent
        ledger = read_ledger(folder)
        present = numbers_in(folder)
        number = next_number(folder, present | set(ledger))
        name = revision_name(number)
        missing = [revision_name(item) for item in sorted(set(ledger) - present)]
        history = self._history(manifest, name, latest, missing)
        text = self._write_history(manifest, name, history, latest, run_facts)
        sync_tree(self.path)
        os.rename(self.path, folder / name)
        sync_folder(folder)
        with suppress(OSError):  # published all the same; the next publication puts it right
            write_ledger(folder, dict.fromkeys(present, "-") | ledger | {number: sha256(text)})
        return Published(name, folder / name, True, f"{name} was published.")

    def _history(self, manifest: dict, name: str, latest: Revision | str | None, missing: Sequence[str]) -> History:
        if not isinstance(latest, Revision):
            return History(latest or "", None, tuple(missing))
        staged = Revision(self.path, name, self.study, with_history(manifest, name, None, {}))
        try:  # a manifest that was rewritten is no base, nor are files that were altered or written by another program
            comparison = None if differs_from_ledger(latest.path) else compare_revisions(latest, staged)
        except FitlibError:
            comparison = None
        return History(latest.path.name, comparison, tuple(missing))

    def _write_history(self, manifest, name: str, history: History, latest, run_facts: Mapping) -> bytes:
        files = {path: data for path, data in self.files.items() if path in HISTORY_FILES}
        files["CHANGES.md"] = changes_text(self.study, name, history).encode()
        if self.render is not None:
            rendered = self.render(name, history.lines())
            _check_paths(rendered, {})
            files |= rendered
        for path, data in files.items():
            write_new(self.path, path, data)
        return self._seal(with_history(manifest, name, _previous(latest), files), run_facts)

    def _seal(self, manifest: dict, run_facts: Mapping) -> bytes:
        text, run = dump_json(manifest).encode(), dump_json(dict(run_facts)).encode()
        write_new(self.path, MANIFEST, text)
        write_new(self.path, RUN, run)
        write_new(self.path, SEAL, seal_text(text, run).encode())
        return text


def _why_the_same(latest: Revision, manifest: Mapping) -> str:
    other = latest.manifest.get("versions") != manifest.get("versions")
    return "holds the same results" + (", though versions of libraries differ" if other else "")


def _of_inputs_and_program(manifest: Mapping) -> dict:
    """What must be the same when only libraries differ."""
    apart = ("versions", "plan_digest", "content_digest", "outputs", "history")
    rest = {name: value for name, value in manifest.items() if name not in apart}
    versions = manifest.get("versions")
    return rest | {"fitlib": versions.get("fitlib") if isinstance(versions, dict) else versions}


def _previous(latest: Revision | str | None) -> dict | None:
    if not isinstance(latest, Revision):
        return None
    return {"revision": latest.path.name, "manifest_sha256": digest_of(latest.path / MANIFEST)[0]}
