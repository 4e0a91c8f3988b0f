"""Revisions whose digests are right and whose content is not: told plainly, and never in the way of publishing."""

import json

import pytest

from fitlib.errors import FitlibError, VerificationError
from fitlib.revision import compare_revisions, next_revision, read_revision, verify_revision
from fitlib.revision.disk import dump_json, sha256
from fitlib.revision.manifest import entry, seal_text
from fitlib.revision.same import same_results

NOT_READ = "holds what this program does not read"


def rewrite(path, files=(), facts=(), ledger=True):
    """Put other content into a revision and let every digest agree with it, as a later program would have published."""
    for item in path.rglob("*"):
        item.chmod(0o755 if item.is_dir() else 0o644)
    manifest = json.loads((path / "manifest.json").read_text()) | dict(facts)
    for name, data in dict(files).items():
        (path / name).write_bytes(data)
        manifest["outputs"][name] = entry(data)
    text, run = dump_json(manifest).encode(), (path / "run.json").read_bytes()
    (path / "manifest.json").write_bytes(text)
    (path / "run.sha256").write_text(seal_text(text, run))
    if ledger:
        (path.parent / ".revisions").write_text(f"{path.name}  {sha256(text)}\n")


def other(shop):
    return shop.synthetic.make_bundle([shop.synthetic.make_result("TG-1", offset=0.25)])


def function(path, **changes):
    return dump_json(json.loads((path / "functions" / "TG-1.json").read_text()) | changes).encode()


def table(path, name, old, new):
    data = (path / "tables" / f"{name}.csv").read_bytes()
    assert old in data
    return data.replace(old, new)


DEEP = ('{"a":' * 700 + "1" + "}" * 700).encode()

#: Content that no version of this program has written, by the file that is to hold it; some follow from the revision.
ODD = {
    "function null": lambda path: {"functions/TG-1.json": b"null"},
    "function list": lambda path: {"functions/TG-1.json": b"[]"},
    "function empty": lambda path: {"functions/TG-1.json": b"{}"},
    "function not UTF-8": lambda path: {"functions/TG-1.json": b'{"dataset": "\xff"}'},
    "function of a number": lambda path: {"functions/TG-1.json": b'{"dataset": 7}'},
    "function without its form": lambda path: {"functions/TG-1.json": b'{"dataset": "TG-1"}'},
    "function nested": lambda path: {"functions/TG-1.json": b"[" * 100_000},
    "no basis": lambda path: {"functions/TG-1.json": function(path, scaled=None)},
    "another basis": lambda path: {"functions/TG-1.json": function(path, scaled={"knots": [1, 2]})},
    "no coefficients": lambda path: {"functions/TG-1.json": function(path, scaled=scaled(path, coefficients=[]))},
    "words for coefficients": lambda path: {
        "functions/TG-1.json": function(path, scaled=scaled(path, coefficients="x"))
    },
    "no interval": lambda path: {"functions/TG-1.json": function(path, measuring_interval=[])},
    "words for a deviation": lambda path: {"functions/TG-1.json": function(path, reading_standard_deviation="0.1")},
    "resolved list": lambda path: {"resolved.json": b"[]"},
    "resolved null": lambda path: {"resolved.json": b"null"},
    "table not UTF-8": lambda path: {"tables/chosen.csv": b"dataset\n\xff\xfe\n"},
    "table empty": lambda path: {"tables/chosen.csv": b"x\n1\n"},
    "table with a short row": lambda path: {"tables/datasets.csv": b"dataset,fitted_unit\nTG-1\n"},
    "table with a long row": lambda path: {"tables/chosen.csv": b"dataset\nTG-1,1,2\n"},
    "table with a quote": lambda path: {"tables/chosen.csv": b'dataset\n"TG-1\n'},
    "columns of another form": lambda path: {"tables/columns.csv": b"a,b\n1,2\n"},
    "words for a loss": lambda path: {"tables/chosen.csv": b"dataset,candidate,loss\nTG-1,polynomial-1,small\n"},
    "words for an interval": lambda path: {"tables/datasets.csv": b"dataset,interval_lower,interval_upper\nTG-1,a,b\n"},
}


def scaled(path, **changes):
    return json.loads((path / "functions" / "TG-1.json").read_text())["scaled"] | changes


@pytest.mark.parametrize("name", ODD)
def test_odd_content_is_told_with_its_place(shop, name):
    first, second = shop.publish().path, shop.publish(other(shop)).path
    rewrite(first, ODD[name](first))
    assert verify_revision(first) == []
    for pair in ((first, second), (second, first)):
        with pytest.raises(VerificationError) as refused:
            compare_revisions(*pair)
        assert str(first) in str(refused.value)
        assert NOT_READ in str(refused.value) or "not readable as JSON" in str(refused.value)


@pytest.mark.parametrize("facts", [{"versions": [1]}, {"versions": "1.0"}, {"versions": 7}])
def test_odd_facts_are_told(shop, facts):
    first, second = shop.publish().path, shop.publish(other(shop)).path
    rewrite(first, facts=facts)
    with pytest.raises(VerificationError, match=NOT_READ):
        compare_revisions(first, second)


@pytest.mark.parametrize("name", ODD)
def test_odd_content_does_not_stop_publishing(shop, name):
    first = shop.publish().path
    rewrite(first, ODD[name](first))
    published = shop.publish(other(shop))
    assert published.revision == "rev-0002"
    text = (published.path / "CHANGES.md").read_text()
    assert "Could not be compared with rev-0001: it is not as it was published, or not readable here." in text
    assert verify_revision(published.path) == []


@pytest.mark.parametrize("name", ODD)
def test_odd_content_is_never_the_same(shop, name):
    """Only versions of libraries differ, so that the files are compared before a revision is made."""
    first = shop.publish().path
    rewrite(first, ODD[name](first))
    facts = {"versions": {**shop.facts["versions"], "numpy": "2.1.0"}, "plan_digest": "f" * 64}
    assert not same_results(first, shop.files(shop.synthetic.make_bundle()))
    assert shop.publish(facts=facts).revision == "rev-0002"


@pytest.mark.parametrize("facts", [{"versions": []}, {"format": 2}, {"study": None}])
def test_odd_facts_do_not_stop_publishing(shop, facts):
    rewrite(shop.publish().path, facts=facts)
    assert shop.publish(other(shop)).revision == "rev-0002"


def test_settings_of_any_depth_are_compared_or_told(shop):
    first, second = shop.publish().path, shop.publish(other(shop)).path
    rewrite(first, {"resolved.json": DEEP})
    try:
        assert compare_revisions(first, second).changed
    except VerificationError as error:
        assert NOT_READ in str(error)


@pytest.mark.parametrize("name", ["chosen", "datasets", "observations"])
def test_a_table_read_as_a_frame_tells_odd_content(shop, name):
    path = shop.publish().path
    rewrite(path, {f"tables/{name}.csv": b"dataset\n\xff\xfe\n"})
    with pytest.raises(VerificationError, match=f"tables/{name}.csv: {NOT_READ}"):
        read_revision(path).table(name)


class TestLedger:
    """The list of revisions holds the digest of each manifest."""

    @pytest.fixture
    def rewritten(self, shop):
        """A revision whose files agree with each other, but not with the list."""
        path = shop.publish().path
        rewrite(path, {"tables/chosen.csv": table(path, "chosen", b"adequate", b"inadequate")}, ledger=False)
        return path

    def test_a_rewritten_manifest_is_told(self, rewritten):
        told = [(difference.kind, difference.path, difference.message) for difference in verify_revision(rewritten)]
        assert told == [("altered", "manifest.json", "altered: its SHA-256 is not the one in .revisions")]

    def test_it_is_told_when_nothing_is_new(self, shop, rewritten):
        again = shop.publish()
        assert not again.new
        assert "manifest.json: altered" in again.note

    def test_it_is_no_base_of_a_comparison(self, shop, rewritten):
        published = shop.publish(other(shop))
        assert "Could not be compared with rev-0001" in (published.path / "CHANGES.md").read_text()

    def test_an_edited_manifest_is_told_once(self, shop):
        path = shop.publish().path / "manifest.json"
        path.chmod(0o644)
        path.write_text(path.read_text().replace('"seed": 7', '"seed": 8'))
        assert [difference.path for difference in verify_revision(path.parent)] == ["manifest.json"]

    @pytest.mark.parametrize("line", ["", "rev-0001  -\n", "rev-0002  " + "0" * 64 + "\n"])
    def test_a_list_that_does_not_know_tells_nothing(self, shop, line):
        path = shop.publish().path
        (shop.folder / ".revisions").write_text(line)
        assert verify_revision(path) == []

    def test_a_revision_found_from_inside_its_folder_is_checked_too(self, shop, rewritten, monkeypatch):
        monkeypatch.chdir(rewritten)
        assert [difference.path for difference in verify_revision(".")] == ["manifest.json"]


class TestLastNumber:
    """A number that no name can hold is refused before anything is made."""

    @pytest.mark.parametrize("known", ["folder", "list"])
    def test_no_number_is_left(self, shop, snapshot, known):
        shop.publish()
        if known == "folder":
            (shop.folder / "rev-999999999").mkdir()
        else:
            (shop.folder / ".revisions").write_text("rev-999999999  -\n")
        before = snapshot(shop.folder)
        refused = "no number is left for another revision: move rev-999999999 away"
        with pytest.raises(FitlibError, match=refused):
            shop.publish(other(shop))
        with pytest.raises(FitlibError, match=refused):
            next_revision(shop.results_dir, "tank-gauges")
        assert snapshot(shop.folder) == before
        assert not [path for path in shop.folder.iterdir() if path.name.startswith(".new-")]

    def test_the_last_number_is_used(self, shop):
        shop.publish()
        (shop.folder / "rev-999999998").mkdir()
        published = shop.publish(other(shop))
        assert published.revision == "rev-999999999"
        assert read_revision(published.path).name == "rev-999999999"
