"""The plan of a run: identity by content. Fingerprints of steps, batches of datasets, the identity of the program."""

from fitlib.plan.canonical import canonical, digest
from fitlib.plan.code import PACKAGE, CodeIdentity, code_identity, remember_trees, workflow_folder
from fitlib.plan.difference import describe_changes
from fitlib.plan.fingerprints import hash_file, step_names
from fitlib.plan.make import BATCHES, batch_of, make_plan, plan_dataset
from fitlib.plan.records import Batch, DatasetPlan, Plan, plan_from_dict
from fitlib.plan.versions import fitlib_version, numeric_versions

__all__ = [
    "BATCHES",
    "PACKAGE",
    "Batch",
    "CodeIdentity",
    "DatasetPlan",
    "Plan",
    "batch_of",
    "canonical",
    "code_identity",
    "describe_changes",
    "digest",
    "fitlib_version",
    "hash_file",
    "make_plan",
    "numeric_versions",
    "plan_dataset",
    "plan_from_dict",
    "remember_trees",
    "step_names",
    "workflow_folder",
]
