"""The result store: transactions, refusal of what is not ours, full disk."""

from __future__ import annotations

import sqlite3
from pathlib import Path

import pytest

from localcomp.classtable import stored_study
from localcomp.store import Row, Store, StoreError, row_of


def rows(first: int, last: int) -> list[Row]:
    return [row_of(f"key{n}", {"status": "solved", "number": n}) for n in range(first, last)]


def test_what_was_added_is_read_back_in_order(tmp_path: Path) -> None:
    with Store(tmp_path / "s.sqlite") as store:
        store.add(rows(0, 1200))
        found = list(store.results(["key7", "absent", "key1100"]))
        assert found == [{"status": "solved", "number": 7}, None, {"status": "solved", "number": 1100}]
        assert len(store.known()) == 1200


def test_a_present_key_stays_as_it_is(tmp_path: Path) -> None:
    with Store(tmp_path / "s.sqlite") as store:
        store.add([row_of("a", {"status": "solved", "number": 1})])
        store.add([row_of("a", {"status": "solved", "number": 2})])
        assert list(store.results(["a"])) == [{"status": "solved", "number": 1}]


@pytest.mark.parametrize("content", [b"not a database at all, but long enough to look like one" * 40, b"\0" * 5000])
def test_a_foreign_file_is_refused_and_left_alone(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "s.sqlite"
    path.write_bytes(content)
    with pytest.raises(StoreError, match="left as it is"):
        Store(path)
    assert path.read_bytes() == content


def test_another_sqlite_file_is_refused_and_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "s.sqlite"
    with sqlite3.connect(path) as other:
        other.execute("CREATE TABLE mine (x)")
    other.close()
    before = path.read_bytes()
    with pytest.raises(StoreError, match="not a localcomp result store"):
        Store(path)
    assert path.read_bytes() == before


def test_a_newer_store_is_refused_and_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "s.sqlite"
    Store(path).close()
    with sqlite3.connect(path) as raw:
        raw.execute("PRAGMA user_version = 99")
    raw.close()
    before = path.read_bytes()
    with pytest.raises(StoreError, match="version 99"):
        Store(path)
    assert path.read_bytes() == before


def test_a_truncated_store_is_refused_and_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "s.sqlite"
    with Store(path) as store:
        store.add(rows(0, 5000))
    content = path.read_bytes()
    cut = content[: len(content) // 2 // 4096 * 4096 + 100]
    path.write_bytes(cut)
    with pytest.raises(StoreError, match="damaged"):
        Store(path)
    assert path.read_bytes() == cut


def test_a_missing_store_is_not_made_for_a_reader(tmp_path: Path) -> None:
    with pytest.raises(StoreError, match="localcomp sweep"):
        Store(tmp_path / "s.sqlite", create=False)
    assert not (tmp_path / "s.sqlite").exists()


def test_a_full_disk_loses_nothing_already_stored(tmp_path: Path) -> None:
    path = tmp_path / "s.sqlite"
    with Store(path) as store:
        store.add(rows(0, 100))
        (pages,) = store._db.execute("PRAGMA page_count").fetchone()
        store._db.execute(f"PRAGMA max_page_count = {pages + 2}")  # SQLite's own "database or disk is full"
        with pytest.raises(StoreError, match="disk is full; what was stored is safe"):
            store.add(rows(100, 20000))
        assert len(store.known()) == 100
    with Store(path) as again:
        assert len(again.known()) == 100
        again.add(rows(100, 120))
        assert len(again.known()) == 120


def test_two_writers_do_not_disturb_each_other(tmp_path: Path) -> None:
    path = tmp_path / "s.sqlite"
    with Store(path) as one, Store(path) as two:
        for n in range(0, 200, 10):
            one.add(rows(n, n + 10))
            two.add(rows(n + 5, n + 15))
        assert set(one.known()) == set(two.known()) == {f"key{n}" for n in range(205)}


@pytest.mark.parametrize("name", ["states", "notes"])
def test_a_store_without_a_table_is_refused_and_left_alone(tmp_path: Path, name: str) -> None:
    path = tmp_path / "s.sqlite"
    Store(path).close()
    with sqlite3.connect(path) as raw:
        raw.execute(f"DROP TABLE {name}")
    raw.close()
    before = path.read_bytes()
    with pytest.raises(StoreError, match=f"damaged .no table {name}"):
        Store(path)
    assert path.read_bytes() == before


@pytest.mark.parametrize("text", ['{"status": "sol', "[1, 2]", "{}"])
def test_a_damaged_result_is_named_and_left_alone(tmp_path: Path, text: str) -> None:
    path = tmp_path / "s.sqlite"
    with Store(path) as store:
        store.add([("key", "solved", text)])
    with Store(path) as store, pytest.raises(StoreError, match="damaged"):
        list(store.results(["key"]))
    with Store(path) as store:
        assert store.known() == {"key": "solved"}


def test_a_damaged_study_names_the_store(tmp_path: Path) -> None:
    with Store(tmp_path / "s.sqlite") as store:
        store.note("study", "[conditions\n")
        with pytest.raises(StoreError, match=r"s\.sqlite: the study kept there is damaged"):
            stored_study(store, tmp_path)
