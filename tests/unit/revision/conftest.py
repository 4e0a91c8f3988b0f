"""Invented revisions, published into a temporary folder."""

import hashlib
import importlib.util
from pathlib import Path

import pytest

from fitlib.collect import build_tables, dump_json, function_files
from fitlib.revision import publish


@pytest.fixture(scope="session")
def synthetic():
    """The module that makes invented results."""
    place = Path(__file__).parent.parent / "collect" / "synthetic.py"
    spec = importlib.util.spec_from_file_location("synthetic_results", place)
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


class Shop:
    """Publishes bundles as an engine would."""

    def __init__(self, results_dir, synthetic):
        self.results_dir = results_dir
        self.synthetic = synthetic
        self.facts = {
            "plan_digest": "0" * 64,
            "seed": 7,
            "versions": {"fitlib": "0.1.0", "numpy": "2.0.0", "python": "3.11.7"},
            "code": {"numerics": "a" * 64, "rendering": "b" * 64},
        }
        self.run_facts = {"user": "shift lead", "started": "2026-04-03T08:00:00Z", "git_commit": None}

    @property
    def folder(self):
        return self.results_dir / "tank-gauges"

    def files(self, bundle):
        """Results as bytes by relative path."""
        files = {f"tables/{name}": text for name, text in build_tables(bundle).items()}
        files |= function_files(bundle) | {"resolved.json": dump_json(bundle["study"])}
        files |= {f"figures/{result['file_name']}/data.svg": "<svg/>" for result in bundle["results"]}
        return {path: text.encode() for path, text in files.items()}

    def inputs(self, bundle):
        """A study text and data files that follow from the bundle."""
        inputs = {"study.yaml": dump_json(bundle["study"]).encode()}
        for result in bundle["results"]:
            rows = "".join(f"{value!r}\n" for value in result["observations"]["response"])
            inputs[f"data/{result['dataset']}.csv"] = rows.encode()
        return inputs

    def digest(self, bundle):
        """A plan digest that differs whenever study or results do."""
        return hashlib.sha256(dump_json([bundle["study"], bundle["results"]]).encode()).hexdigest()

    def publish(self, bundle=None, *, files=None, inputs=None, facts=None, **options):
        """Publish a bundle; keyword arguments replace what follows from it."""
        bundle = bundle or self.synthetic.make_bundle()
        facts = {**self.facts, "plan_digest": self.digest(bundle), **(facts or {})}
        files = self.files(bundle) if files is None else files
        inputs = self.inputs(bundle) if inputs is None else inputs
        options.setdefault("run_facts", self.run_facts)
        return publish(self.results_dir, "tank-gauges", files, inputs, facts, **options)


@pytest.fixture
def shop(tmp_path, synthetic, monkeypatch):
    """A place where revisions are published; without waiting for the disk, which one test looks at."""
    monkeypatch.setattr("os.fsync", lambda descriptor: None)
    return Shop(tmp_path / "results", synthetic)


@pytest.fixture
def snapshot():
    """A function that lists every file of a folder with its bytes."""

    def take(folder):
        return {path.relative_to(folder).as_posix(): path.read_bytes() for path in folder.rglob("*") if path.is_file()}

    return take
