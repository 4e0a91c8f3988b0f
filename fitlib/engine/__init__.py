"""Runs a study: store, locks, batch jobs, publication, and Snakemake as their scheduler."""

from fitlib.engine.jobs import batch_main, publish_main
from fitlib.engine.launch import dry_run, run_study
from fitlib.engine.process import InterruptedRunError
from fitlib.engine.summary import DryRun, RunSummary, SummaryRow
from fitlib.engine.workflow import prepare_workflow

__all__ = [
    "DryRun",
    "InterruptedRunError",
    "RunSummary",
    "SummaryRow",
    "batch_main",
    "dry_run",
    "prepare_workflow",
    "publish_main",
    "run_study",
]
