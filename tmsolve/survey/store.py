"""Results of a scan kept in a file, so that one that was killed goes on where it stopped."""

from __future__ import annotations

import json
import os
import sqlite3
from types import TracebackType

import numpy as np

from .outputs import OutputError, check_writable

__all__ = ["Record", "Store"]

#: Values of one reading over a block, and its failures as (offset, message).
Record = tuple[np.ndarray, list[tuple[int, str]]]


class Store:
    """A key-value file of readings over blocks of points; only the parent process writes it.

    SQLite with a write-ahead log: a record is either whole or absent, also after the
    process or the machine was stopped. Not for network file systems.

    Parameters
    ----------
    path : path-like
        Created when it does not exist.
    """

    def __init__(self, path: str | os.PathLike[str]) -> None:
        self.path = check_writable(path)
        try:
            self._file = sqlite3.connect(self.path)
            self._file.execute("PRAGMA journal_mode=WAL")
            self._file.execute("PRAGMA synchronous=NORMAL")
            self._file.execute(
                "CREATE TABLE IF NOT EXISTS blocks (key TEXT PRIMARY KEY, data BLOB, failed TEXT) WITHOUT ROWID"
            )
        except sqlite3.DatabaseError as cause:
            raise OutputError(f"cannot use {str(self.path)!r} as a store: {cause}; give a new file name") from cause

    def __enter__(self) -> Store:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._file.close()

    def get(self, key: str) -> Record | None:
        """Return what was stored under a key, or None."""
        row = self._file.execute("SELECT data, failed FROM blocks WHERE key = ?", (key,)).fetchone()
        if row is None:
            return None
        failed = [(point, message) for point, message in json.loads(row[1])]
        return np.frombuffer(row[0], dtype="<f8").astype(np.float64), failed

    def put(self, key: str, record: Record) -> None:
        """Keep a record; it is on disk when this returns."""
        data = record[0].astype("<f8").tobytes()
        with self._file:
            self._file.execute(
                "INSERT OR REPLACE INTO blocks VALUES (?, ?, ?)",
                (key, data, json.dumps(record[1], ensure_ascii=False)),
            )
