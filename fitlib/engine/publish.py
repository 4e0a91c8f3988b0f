"""The last job of the workflow: the results of the plan become the files of a revision."""

from __future__ import annotations

import time
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from fitlib.engine.batch import read_batch_output
from fitlib.engine.compute import Account, dataset_figures, dataset_result
from fitlib.engine.files import WorkFolder, remove, write_sealed
from fitlib.engine.locks import take_lock
from fitlib.engine.planfile import Assignment, plan_study, read_plan_file, write_latest_plan
from fitlib.engine.runfacts import run_facts
from fitlib.engine.store import Store
from fitlib.engine.summary import SummaryRow
from fitlib.errors import FitlibError
from fitlib.plan import Plan, fitlib_version

Figures = dict[str, dict[str, str]]


def run_publish(plan_file: Path, marker: Path) -> dict[str, Any]:
    """Publish the results of a plan as a revision, unless the latest one holds them already.

    Parameters
    ----------
    plan_file : Path
        Written by the run.
    marker : Path
        Is written last, and says that the plan is published.

    Returns
    -------
    dict
        What the marker says: the revision, whether it is new, and the outcome for each dataset.

    Raises
    ------
    FitlibError
        A dataset failed, or a batch is not what was planned; nothing is published then.
    """
    from fitlib.study import load_study

    begin = time.monotonic()
    task = read_plan_file(plan_file)
    outputs = planned_outputs(task.plan, task.work)
    require_all(outputs)
    study = load_study(task.study_file)
    if plan_study(study, task.work, 1).digest != task.plan.digest:
        raise FitlibError("the study, its data or the program changed while the run was going on: run again")
    bundle, figures = _gather(study, task)
    published = _publish(study, task, bundle, figures, _durations(outputs, begin))
    content = {
        "plan": task.plan.digest,
        "revision": published.revision,
        "new": published.new,
        "note": published.note,
        "rows": [SummaryRow.of(result).to_dict() for result in bundle["results"]],
    }
    _record(task, marker, content)
    return content


def planned_outputs(plan: Plan, work: WorkFolder) -> list[dict[str, Any]]:
    """Return the output of every batch of a plan.

    Parameters
    ----------
    plan : Plan
    work : WorkFolder

    Returns
    -------
    list of dict

    Raises
    ------
    FitlibError
        A batch has no sound output with the fingerprints that were planned.
    """
    outputs = []
    for batch in plan.batches:
        output = read_batch_output(work.batches / batch.file_name, batch)
        if output is None or not _as_planned(output, plan, batch.members):
            raise FitlibError(f"batch {batch.name} is missing, damaged or not what was planned: run again")
        outputs.append(output)
    return outputs


def _as_planned(output: Mapping[str, Any], plan: Plan, members: tuple[str, ...]) -> bool:
    """Every member has its planned fingerprint, or is among the failures."""
    failed = {each["dataset"] for each in output["failures"]}
    expected = {name: plan.dataset(name).fingerprint for name in members if name not in failed}
    return dict(output["members"]) == expected


def require_all(outputs: list[dict[str, Any]]) -> None:
    """Refuse to go on when a dataset failed.

    Raises
    ------
    FitlibError
        Names every dataset that failed, and why.
    """
    failures = [each for output in outputs for each in output["failures"]]
    if failures:
        lines = [f"{each['dataset']}: {each['message']}" for each in failures]
        count = f"{len(failures)} dataset{'s' if len(failures) > 1 else ''} failed"
        raise FitlibError("\n".join([f"{count}, nothing is published, and the results of the others are kept", *lines]))


def _gather(study, task: Assignment) -> tuple[dict[str, Any], Figures]:
    """From the store; what has gone missing there since its batch ended is computed again."""
    store, account = Store(task.work.store), Account()
    settings = {each.id: each for each in study.datasets}
    results, figures = [], {}
    for planned in task.plan.datasets:
        result = dataset_result(study, settings[planned.id], planned, store, account)
        results.append(result)
        figures[planned.file_name] = dataset_figures(result, task.plan, store, account)
    results.sort(key=lambda result: (result["dataset"].casefold(), result["dataset"]))
    return {"study": study.resolved(), "results": results, "failures": []}, figures


def _publish(study, task: Assignment, bundle: dict[str, Any], figures: Figures, durations: dict[str, float]):
    from fitlib.report import render_report
    from fitlib.revision import publish

    def render(revision: str, changes: list[str]) -> dict[str, bytes]:
        return {"report.html": render_report(bundle, figures, revision, changes).encode("utf-8")}

    return publish(
        task.work.results_dir,
        study.name,
        _files(bundle, figures),
        _inputs(study),
        _facts(task.plan),
        run_facts(study.folder, durations),
        render=render,
        input_digests={name: digest for each in task.plan.datasets for name, digest in each.files.items()},
        lock=take_lock(task.work.publish_lock, "another publication of this study", wait=True),
    )


def _files(bundle: dict[str, Any], figures: Figures) -> dict[str, bytes]:
    from fitlib.collect import build_tables, dump_json, function_files

    texts = {"resolved.json": dump_json(bundle["study"]), **function_files(bundle)}
    texts |= {f"tables/{name}": text for name, text in build_tables(bundle).items()}
    texts |= {f"figures/{folder}/{name}.svg": svg for folder, drawn in figures.items() for name, svg in drawn.items()}
    return {path: text.encode("utf-8") for path, text in texts.items()}


def _inputs(study) -> dict[str, Path | bytes]:
    """The study stands as ``study.yaml`` whatever it was called, so that the folder runs."""
    files = {name: Path(study.folder) / name for dataset in study.datasets for name in dataset.files}
    if "study.yaml" in files:
        raise FitlibError("study.yaml: a data file cannot have the name of the study in the revision: rename it")
    return {**files, "study.yaml": study.text}


def _facts(plan: Plan) -> dict[str, Any]:
    return {
        "plan_digest": plan.digest,
        "plan_content_digest": plan.content_digest,
        "seed": plan.random_seed,
        "code": dict(plan.code),
        "versions": {"fitlib": fitlib_version(), **plan.versions},
    }


def _durations(outputs: list[dict[str, Any]], begin: float) -> dict[str, float]:
    return {
        "batches_seconds": round(sum(output["seconds"] for output in outputs), 1),
        "gathering_seconds": round(time.monotonic() - begin, 1),
    }


def _record(task: Assignment, marker: Path, content: dict[str, Any]) -> None:
    """The marker last: without it the plan counts as not published, and publishing again does no harm."""
    for path in task.work.of_other_plans(task.plan):
        remove(path)
    write_latest_plan(task.plan, task.work)
    write_sealed(marker, content)
