"""One dataset: every step from the store where it is there, computed and stored where it is not."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, field
from typing import Any

from fitlib.engine.store import Store, content_digest
from fitlib.plan import DatasetPlan, Plan, digest


@dataclass
class Account:
    """How much was computed and how much was there already.

    Attributes
    ----------
    computed, kept : Counter of str
        Steps by name; the schemes, the assembled ``result`` and the ``figures`` count too.
    """

    computed: Counter = field(default_factory=Counter)
    kept: Counter = field(default_factory=Counter)

    def to_dict(self) -> dict[str, dict[str, int]]:
        """Return the account as JSON has it."""
        return {"computed": dict(self.computed), "kept": dict(self.kept)}

    def add(self, content: dict[str, dict[str, int]]) -> None:
        """Add what another account recorded."""
        self.computed.update(content["computed"])
        self.kept.update(content["kept"])


def dataset_result(study, settings, planned: DatasetPlan, store: Store, account: Account) -> dict[str, Any]:
    """Return the result of one dataset.

    Parameters
    ----------
    study : Study
    settings : DatasetSettings
        Of this dataset.
    planned : DatasetPlan
        Of this dataset.
    store : Store
    account : Account
        Is added to.

    Returns
    -------
    dict
        As :func:`fitlib.analysis.assemble` returns it.
    """
    result = store.get(Store.key("result", planned.fingerprint))
    if result is not None:
        account.kept.update(list(planned.steps))
        return result
    return _compute(study, settings, planned, store, account)


def _compute(study, settings, planned: DatasetPlan, store: Store, account: Account) -> dict[str, Any]:
    from fitlib.analysis import assemble, run_step
    from fitlib.observations import read_observations

    observations = read_observations(study, settings)
    done: dict[str, dict] = {}
    for step, fingerprint in planned.steps.items():
        key = Store.key(step, fingerprint)
        value = store.get(key)
        if value is None:
            account.computed[step] += 1
            if step == "result":
                value = store.put(key, assemble(study, settings, observations, done))
            else:
                value = store.put(key, run_step(step, study, settings, observations, dict(done)))
        else:
            account.kept[step] += 1
        done[step] = value
    return done["result"]


def dataset_figures(result: dict[str, Any], plan: Plan, store: Store, account: Account) -> dict[str, str]:
    """Return the figures of one dataset.

    Parameters
    ----------
    result : dict
        As :func:`dataset_result` returns it.
    plan : Plan
        Names the drawing code and the versions.
    store : Store
    account : Account
        Is added to.

    Returns
    -------
    dict of str to str
        SVG text by the figure's name.
    """
    drawn_by = {"code": plan.code["drawing"], "versions": dict(plan.versions)}
    key = Store.key("figures", digest({"result": content_digest(result), "drawn by": drawn_by}))
    figures = store.get(key)
    if figures is None:
        from fitlib.figures import draw_dataset

        account.computed["figures"] += 1
        return store.put(key, draw_dataset(result))
    account.kept["figures"] += 1
    return figures
