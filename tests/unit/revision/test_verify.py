"""Verification: every altered, missing and extra file is named, and nothing outside is touched."""

import json
import os
import shutil

import pytest

from fitlib.errors import FitlibError, InputError
from fitlib.revision import verify_revision


@pytest.fixture
def copy(shop, tmp_path):
    """A copy of a revision somewhere else, with the right to write."""
    target = tmp_path / "mail" / "attachment"
    shutil.copytree(shop.publish().path, target)
    for path in target.rglob("*"):
        path.chmod(0o755 if path.is_dir() else 0o644)
    return target


def found(path):
    return [(difference.kind, difference.path) for difference in verify_revision(path)]


def edit(path, old, new):
    data = path.read_bytes()
    assert old in data
    path.write_bytes(data.replace(old, new, 1))


def test_an_unaltered_copy_has_no_difference(copy):
    assert found(copy) == []


@pytest.mark.parametrize(
    "path",
    ["tables/chosen.csv", "inputs/data/TG-1.csv", "functions/TG-2.json", "CHANGES.md", "run.json", "resolved.json"],
)
def test_one_altered_digit_names_the_file(copy, path):
    place = copy / path
    data = bytearray(place.read_bytes())
    data[len(data) // 2] ^= 1
    place.write_bytes(bytes(data))
    assert found(copy) == [("altered", path)]


def test_a_longer_file_of_the_same_start_is_altered(copy):
    with open(copy / "tables/folds.csv", "ab") as file:
        file.write(b"\n")
    assert found(copy) == [("altered", "tables/folds.csv")]


def test_an_edited_manifest_is_itself_altered(copy):
    edit(copy / "manifest.json", b'"seed": 7', b'"seed": 8')
    assert found(copy) == [("altered", "manifest.json")]


def test_an_edited_table_with_a_matching_digest_in_the_manifest_is_still_told(copy):
    import hashlib

    table = copy / "tables/chosen.csv"
    old = hashlib.sha256(table.read_bytes()).hexdigest()
    edit(table, b"adequate", b"ADEQUATE")
    edit(copy / "manifest.json", old.encode(), hashlib.sha256(table.read_bytes()).hexdigest().encode())
    assert found(copy) == [("altered", "manifest.json")]


def test_missing_and_extra_files_are_named_together(copy):
    (copy / "tables/chosen.csv").unlink()
    (copy / "tables/chosen2.csv").write_text("x")
    (copy / "notes").mkdir()
    assert found(copy) == [("extra", "notes"), ("missing", "tables/chosen.csv"), ("extra", "tables/chosen2.csv")]


@pytest.mark.parametrize("name", ["run.json", "run.sha256"])
def test_a_missing_file_of_the_run_is_named(copy, name):
    (copy / name).unlink()
    assert ("missing", name) in found(copy)


@pytest.mark.parametrize("text", [b"", b"nonsense", b"\xff"])
def test_a_damaged_seal_is_named(copy, text):
    (copy / "run.sha256").write_bytes(text)
    assert ("altered", "run.sha256") in found(copy)


def test_an_added_line_in_the_seal_is_told(copy):
    with open(copy / "run.sha256", "ab") as file:
        file.write(b"0" * 64 + b"  tables/chosen.csv\n")
    assert ("altered", "run.sha256") in found(copy)


def test_the_seal_is_what_common_checksum_tools_read(copy):
    import hashlib

    lines = (copy / "run.sha256").read_text().splitlines()
    pairs = [line.split("  ") for line in lines]
    assert [name for _, name in pairs] == ["manifest.json", "run.json"]
    assert all(hashlib.sha256((copy / name).read_bytes()).hexdigest() == digest for digest, name in pairs)


def test_a_link_in_place_of_a_file_is_named_though_its_content_is_right(copy, tmp_path):
    place = copy / "tables/chosen.csv"
    shutil.move(place, tmp_path / "chosen.csv")
    place.symlink_to(tmp_path / "chosen.csv")
    assert found(copy) == [("link", "tables/chosen.csv")]


def test_a_link_in_place_of_a_folder_is_not_followed(copy, tmp_path):
    shutil.move(copy / "functions", tmp_path / "functions")
    (copy / "functions").symlink_to(tmp_path / "functions")
    expected = [("link", "functions"), ("missing", "functions/TG-1.json"), ("missing", "functions/TG-2.json")]
    assert found(copy) == expected


def test_an_extra_link_is_named(copy, tmp_path):
    (copy / "home").symlink_to(tmp_path)
    assert found(copy) == [("link", "home")]


def test_a_folder_in_place_of_a_file_is_named(copy):
    (copy / "resolved.json").unlink()
    (copy / "resolved.json").mkdir()
    assert found(copy) == [("altered", "resolved.json")]


def test_a_pipe_is_named_and_not_opened(copy):
    os.mkfifo(copy / "tables/pipe.csv")
    (copy / "tables/chosen.csv").unlink()
    os.mkfifo(copy / "tables/chosen.csv")
    assert found(copy) == [("altered", "tables/chosen.csv"), ("extra", "tables/pipe.csv")]


@pytest.mark.parametrize("name", ["manifest.json", "run.sha256", "run.json"])
@pytest.mark.parametrize("kind", ["link", "pipe", "folder"])
def test_a_manifest_that_is_no_file_is_named_and_not_followed(copy, tmp_path, name, kind):
    shutil.move(copy / name, tmp_path / name)
    if kind == "link":
        (copy / name).symlink_to(tmp_path / name)
    elif kind == "pipe":
        os.mkfifo(copy / name)
    else:
        (copy / name).mkdir()
    assert name in [path for _, path in found(copy)]


def test_a_folder_that_cannot_be_read_is_told(copy, monkeypatch):
    real = os.scandir

    def refuse(path):
        if str(path).endswith("tables"):
            raise PermissionError(13, "Permission denied", str(path))
        return real(path)

    monkeypatch.setattr(os, "scandir", refuse)
    with pytest.raises(FitlibError, match="tables: cannot be read: Permission denied"):
        verify_revision(copy)


def test_a_file_that_cannot_be_read_is_told(copy, monkeypatch):
    real = os.open

    def refuse(path, *arguments, **options):
        if str(path).endswith("chosen.csv"):
            raise PermissionError(13, "Permission denied", str(path))
        return real(path, *arguments, **options)

    monkeypatch.setattr(os, "open", refuse)
    assert [str(item) for item in verify_revision(copy)] == ["tables/chosen.csv: cannot be read: Permission denied"]


@pytest.mark.parametrize(
    "text",
    ["", "{", "[]", "{}", '{"format": 1}', '{"format": 1, "format": 1}', "[" * 100000, '{"format": "x"}', "\udcff"],
)
def test_a_damaged_manifest_is_told_plainly(copy, text):
    (copy / "manifest.json").write_bytes(text.encode("utf-8", "surrogateescape"))
    differences = verify_revision(copy)
    assert [(item.kind, item.path) for item in differences] == [("damaged", "manifest.json")]
    assert str(differences[0]).startswith("manifest.json: damaged: ") and "\n" not in str(differences[0])


def test_a_missing_manifest_is_told_plainly(copy):
    (copy / "manifest.json").unlink()
    assert [str(item) for item in verify_revision(copy)] == [
        "manifest.json: missing; without it the folder is no revision"
    ]


def test_a_later_format_is_told_plainly(copy):
    edit(copy / "manifest.json", b'"format": 1', b'"format": 9')
    assert "later than this program reads" in str(verify_revision(copy)[0])


@pytest.mark.parametrize(
    "path", ["../../secret.txt", "/etc/hostname", "a/../../../secret.txt", "C:\\x", "tables\\..\\x"]
)
def test_a_manifest_that_points_outside_is_refused(copy, path):
    (copy.parent.parent / "secret.txt").write_text("x")
    manifest = json.loads((copy / "manifest.json").read_text())
    manifest["outputs"][path] = {"sha256": "0" * 64, "size": 1}
    (copy / "manifest.json").write_text(json.dumps(manifest))
    [difference] = verify_revision(copy)
    assert difference.kind == "damaged" and "does not stay inside the revision" in str(difference)


def test_a_name_that_would_act_on_a_terminal_is_written_out(copy):
    (copy / "tables" / "a\x1b[31m\nb").write_text("x")
    [difference] = verify_revision(copy)
    assert str(difference) == "tables/a\\u001b[31m\\u000ab: extra: not part of the revision"


def test_a_folder_that_is_not_there_is_an_error_of_the_user(tmp_path):
    with pytest.raises(InputError, match="no such folder"):
        verify_revision(tmp_path / "rev-0001")


def test_all_differences_are_told_at_once(copy):
    for name in ("tables/chosen.csv", "tables/folds.csv"):
        with open(copy / name, "ab") as file:
            file.write(b"x")
    (copy / "resolved.json").unlink()
    assert len(found(copy)) == 3
