"""Results of a sweep in one SQLite file: a row per state, a transaction per batch, nothing overwritten.

Write-ahead logging lets a reader or a second writer work at the same time. A file that is not ours,
from another schema, or damaged is refused and left alone.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterable, Iterator
from pathlib import Path
from typing import Any

from localcomp.errors import LocalcompError

APPLICATION_ID = 0x6C636D70
"""Marks the file as ours (SQLite's application_id)."""
STORE_VERSION = 1
BUSY_SECONDS = 60.0
CHUNK = 500

TABLES = """
CREATE TABLE states (
    key TEXT PRIMARY KEY,
    status TEXT NOT NULL,
    result TEXT NOT NULL
) WITHOUT ROWID;
CREATE TABLE notes (
    name TEXT PRIMARY KEY,
    value TEXT NOT NULL
) WITHOUT ROWID;
"""


Row = tuple[str, str, str]
"""Key, status, result as text."""


def row_of(key: str, result: dict[str, Any]) -> Row:
    """What is stored of a result (a dictionary of plain values with a "status")."""
    return key, str(result["status"]), json.dumps(result, allow_nan=False)


class StoreError(LocalcompError):
    """The store cannot be used or written; the message says why and what is safe."""


class Store:
    """The result file of one sweep directory.

    Parameters
    ----------
    path : Path
        Created when missing, unless `create` is False.

    Raises
    ------
    StoreError
        If the file is not a store, has another version, or is damaged.
    """

    def __init__(self, path: Path, *, create: bool = True) -> None:
        self.path = path
        fresh = not path.exists()
        if fresh and not create:
            raise StoreError(f"{path}: no results here; run `localcomp sweep STUDY --out {path.parent}` first")
        try:
            self._db = sqlite3.connect(path, timeout=BUSY_SECONDS, isolation_level=None)
            if fresh or (path.stat().st_size == 0 and create):
                self._create()
            self._check()
            self._db.execute("PRAGMA journal_mode = WAL")
            self._db.execute("PRAGMA synchronous = NORMAL")
        except sqlite3.Error as error:
            raise self._problem(error) from None

    def _create(self) -> None:
        self._db.execute("BEGIN IMMEDIATE")
        try:
            (tables,) = self._db.execute("SELECT count(*) FROM sqlite_master").fetchone()
            if tables == 0:  # another process may have been faster
                for statement in TABLES.split(";"):
                    self._db.execute(statement)
                self._db.execute(f"PRAGMA application_id = {APPLICATION_ID}")
                self._db.execute(f"PRAGMA user_version = {STORE_VERSION}")
            self._db.execute("COMMIT")
        except sqlite3.Error:
            if self._db.in_transaction:
                self._db.execute("ROLLBACK")
            raise

    def _check(self) -> None:
        (ours,) = self._db.execute("PRAGMA application_id").fetchone()
        (version,) = self._db.execute("PRAGMA user_version").fetchone()
        if ours != APPLICATION_ID:
            raise StoreError(f"{self.path}: is not a localcomp result store; it is left as it is")
        if version != STORE_VERSION:
            raise StoreError(
                f"{self.path}: was written with store version {version}, this program uses {STORE_VERSION}; "
                "it is left as it is, use another --out directory"
            )
        missing = {"states", "notes"} - {name for (name,) in self._db.execute("SELECT name FROM sqlite_master")}
        if missing:
            raise StoreError(
                f"{self.path}: is damaged (no table {', '.join(sorted(missing))}); it is left as it is, "
                "use another --out directory"
            )
        (verdict,) = self._db.execute("PRAGMA quick_check(1)").fetchone()
        if verdict != "ok":
            raise StoreError(f"{self.path}: is damaged ({verdict}); it is left as it is, use another --out directory")

    def _problem(self, error: sqlite3.Error) -> StoreError:
        text = str(error)
        if "full" in text:
            return StoreError(f"{self.path}: the disk is full; what was stored is safe, free space and run again")
        if "not a database" in text or "malformed" in text:
            return StoreError(
                f"{self.path}: is not a SQLite file or is damaged ({text}); it is left as it is, "
                "use another --out directory"
            )
        return StoreError(f"{self.path}: {text}; what was stored is safe")

    def add(self, rows: Iterable[Row]) -> None:
        """Store results in one transaction; present keys stay as they are.

        Raises
        ------
        StoreError
            If they could not be written (full disk, lost file, ...); nothing stored before is lost.
        """
        try:
            self._db.execute("BEGIN IMMEDIATE")
            self._db.executemany("INSERT OR IGNORE INTO states VALUES (?, ?, ?)", rows)
            self._db.execute("COMMIT")
        except sqlite3.Error as error:
            try:
                if self._db.in_transaction:
                    self._db.execute("ROLLBACK")
            except sqlite3.Error:  # the first error is the one to tell
                pass
            raise self._problem(error) from None

    def known(self) -> dict[str, str]:
        """Status of every stored state, by key."""
        try:
            return dict(self._db.execute("SELECT key, status FROM states"))
        except sqlite3.Error as error:
            raise self._problem(error) from None

    def results(self, keys: list[str]) -> Iterator[dict[str, Any] | None]:
        """Stored results in the order of the keys; None where there is none."""
        for start in range(0, len(keys), CHUNK):
            part = keys[start : start + CHUNK]
            marks = ",".join("?" * len(part))
            try:
                found = dict(self._db.execute(f"SELECT key, result FROM states WHERE key IN ({marks})", part))
            except sqlite3.Error as error:
                raise self._problem(error) from None
            for key in part:
                yield self._read(key, found[key]) if key in found else None

    def _read(self, key: str, text: str) -> dict[str, Any]:
        try:
            result = json.loads(text)
        except ValueError:
            result = None
        if not isinstance(result, dict) or "status" not in result:
            raise StoreError(f"{self.path}: is damaged (state {key[:12]}...); it is left as it is, use another --out")
        return result

    def note(self, name: str, value: str) -> None:
        """Remember a line of text, e.g. the study file."""
        try:
            self._db.execute("INSERT OR REPLACE INTO notes VALUES (?, ?)", (name, value))
        except sqlite3.Error as error:
            raise self._problem(error) from None

    def read_note(self, name: str) -> str | None:
        """A remembered text."""
        row = self._db.execute("SELECT value FROM notes WHERE name = ?", (name,)).fetchone()
        return None if row is None else str(row[0])

    def close(self) -> None:
        """Close the file."""
        self._db.close()

    def __enter__(self) -> Store:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()
