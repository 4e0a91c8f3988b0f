"""The store: what was put in comes out, or nothing does."""

import json
import threading

import pytest

from fitlib.engine.files import TEMPORARY, write_atomic
from fitlib.engine.store import Store

VALUE = {"b": [1, 0.1, None, True], "a": "é <b>"}


@pytest.fixture
def store(tmp_path):
    return Store(tmp_path / "store")


def test_a_value_comes_back_equal_with_sorted_keys(store):
    key = Store.key("fits", "f")
    put = store.put(key, VALUE)
    assert put == store.get(key) == VALUE
    assert list(put) == list(store.get(key)) == ["a", "b"]


def test_step_and_fingerprint_both_make_the_key():
    assert len({Store.key("a", "1"), Store.key("a", "2"), Store.key("b", "1")}) == 3


def test_a_missing_entry_is_none(store):
    assert store.get(Store.key("fits", "f")) is None
    assert not store.has(Store.key("fits", "f"))


@pytest.mark.parametrize(
    ("old", "new"), [("0.1", "0.2"), ("true", "false"), ('"key":"', '"key":"0'), ("null", ""), ("}", "")]
)
def test_a_damaged_entry_is_none(store, old, new):
    key = Store.key("fits", "f")
    store.put(key, VALUE)
    path = store.path(key)
    text = path.read_text()
    assert old in text
    path.write_text(text.replace(old, new, 1))
    assert store.get(key) is None


def test_an_entry_under_another_name_is_none(store):
    one, other = Store.key("fits", "1"), Store.key("fits", "2")
    store.put(one, VALUE)
    store.path(other).parent.mkdir(exist_ok=True)
    store.path(one).rename(store.path(other))
    assert store.get(other) is None


@pytest.mark.parametrize("value", [float("nan"), float("inf"), {1: "a"}, {1, 2}, object()])
def test_what_json_would_change_is_refused(store, value):
    with pytest.raises((TypeError, ValueError)):
        store.put(Store.key("fits", "f"), value)
    assert not list(store.folder.rglob("*"))


def test_floats_come_back_bit_for_bit(store):
    numbers = [0.1 + 0.2, 5e-324, 1.7976931348623157e308, -0.0]
    key = Store.key("fits", "f")
    store.put(key, numbers)
    assert list(map(repr, store.get(key))) == list(map(repr, numbers))


def test_readers_never_see_a_part(tmp_path):
    path, texts = tmp_path / "file.json", [json.dumps("a" * 200_000), json.dumps("b" * 300_000)]
    write_atomic(path, texts[0])
    stop = threading.Event()

    def write():
        while not stop.is_set():
            for text in texts:
                write_atomic(path, text)

    writer = threading.Thread(target=write)
    writer.start()
    try:
        for _ in range(200):
            assert path.read_text() in texts
    finally:
        stop.set()
        writer.join()
    assert not list(tmp_path.glob(f"{TEMPORARY}*"))


def test_a_failed_write_leaves_the_old_content_and_nothing_else(tmp_path, monkeypatch):
    path = tmp_path / "file.json"
    write_atomic(path, "old")

    def replace(source, target):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("os.replace", replace)
    with pytest.raises(OSError, match="No space"):
        write_atomic(path, "new")
    assert path.read_text() == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["file.json"]
