"""The SQLite file of a run: sites, finished chunks and the results of their pairs; one writer, a chunk a transaction.

A chunk is there whole or not at all, whatever ends the process. Knows nothing of how results come about.
"""

import math
import sqlite3
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any, Final

import numpy as np

from fellspan.errors import OutputError, RunError
from fellspan.runs.listing import Chunk
from fellspan.screening.pairs import (
    BASES,
    PATH_VERDICTS,
    SIGNAL_VERDICTS,
    STATUSES,
    Candidates,
    PairResults,
    SiteColumns,
)

STORE_NAME: Final = "candidates.sqlite"
SCHEMA: Final = 2
"""2: height for the confidence asked."""
APPLICATION_ID: Final = 0x46454C31
"""Marks the file as one of these runs (the four bytes read 'FEL1')."""
_WAIT_S: Final = 30.0

RESULT_COLUMNS: Final = (
    "distance_m",
    "bearing_deg",
    "verdict",
    "signal_verdict",
    "basis",
    "confidence",
    "governing",
    "worst_fraction",
    "worst_at_m",
    "extra_at_place_m",
    "extra_for_confidence_m",
    "diffraction_db",
    "received_at_hub_dbm",
    "received_at_place_dbm",
    "margin_at_hub_db",
    "margin_at_place_db",
    "availability_percent",
    "gap_from_m",
    "gap_to_m",
)
_CODED: Final[Mapping[str, Sequence[str]]] = {
    "status": STATUSES,
    "verdict": PATH_VERDICTS,
    "signal_verdict": SIGNAL_VERDICTS,
    "basis": BASES,
}
_INTEGERS: Final = ("verdict", "signal_verdict", "basis", "governing")
STATES: Final = ("clear", "clear-bare", "marginal", "obstructed")
"""State of a path, best first; 'clear-bare' is clear on bare ground only."""


def _decoded(column: str) -> str:
    cases = " ".join(f"WHEN {code} THEN '{word}'" for code, word in enumerate(_CODED[column]))
    return f"CASE r.{column} {cases} END"


def state_sql(table: str = "result") -> str:
    """SQL of a pair's place in `STATES`, 4 for what was not reached."""
    clear, marginal, obstructed = (PATH_VERDICTS.index(word) for word in ("clear", "marginal", "obstructed"))
    bare = BASES.index("bare ground only")
    return (
        f"CASE WHEN {table}.verdict = {clear} AND {table}.basis = {bare} THEN 1 WHEN {table}.verdict = {clear} THEN 0 "
        f"WHEN {table}.verdict = {marginal} THEN 2 WHEN {table}.verdict = {obstructed} THEN 3 ELSE 4 END"
    )


def _site_table(name: str) -> str:
    return (
        f"CREATE TABLE {name} (id INTEGER PRIMARY KEY, name TEXT NOT NULL UNIQUE, latitude_deg REAL NOT NULL, "
        "longitude_deg REAL NOT NULL, height_m REAL NOT NULL, height_reference TEXT NOT NULL, roof_m REAL)"
    )


def _schema() -> Iterator[str]:
    yield "CREATE TABLE run (key TEXT PRIMARY KEY, value TEXT NOT NULL) WITHOUT ROWID"
    yield _site_table("hub")
    yield _site_table("place")
    yield "CREATE TABLE sector (id INTEGER PRIMARY KEY, hub INTEGER NOT NULL REFERENCES hub, name TEXT NOT NULL)"
    yield "CREATE TABLE chunk (id INTEGER PRIMARY KEY, pairs INTEGER NOT NULL)"
    numbers = ", ".join(f"{name} {'INTEGER' if name in _INTEGERS else 'REAL'}" for name in RESULT_COLUMNS)
    yield (
        "CREATE TABLE result (hub INTEGER NOT NULL, place INTEGER NOT NULL, sector INTEGER, status INTEGER NOT NULL, "
        f"{numbers}, reason TEXT, PRIMARY KEY (hub, place)) WITHOUT ROWID"
    )
    shown = ", ".join(f"{_decoded(name)} AS {name}" if name in _CODED else f"r.{name}" for name in RESULT_COLUMNS)
    yield (
        "CREATE VIEW pair AS SELECT h.name AS hub, p.name AS place, s.name AS sector, "
        f"{_decoded('status')} AS status, {shown}, r.reason FROM result r JOIN hub h ON h.id = r.hub "
        "JOIN place p ON p.id = r.place LEFT JOIN sector s ON s.id = r.sector"
    )


class Store:
    """A run's file, open for reading and writing by one thread; use it in a `with` block."""

    def __init__(self, connection: sqlite3.Connection, path: Path) -> None:
        self._connection = connection
        self.path = path

    @classmethod
    def create(cls, path: Path, *, facts: Mapping[str, str], candidates: Candidates) -> "Store":
        """A new store; the file appears under its name only when it is whole."""
        part = path.with_name(path.name + ".part")
        with errors(path):
            for name in (part, part.with_name(part.name + "-journal")):
                name.unlink(missing_ok=True)
            connection = _connected(part)
            try:
                with connection:
                    connection.execute("BEGIN")
                    for statement in _schema():
                        connection.execute(statement)
                    connection.execute(f"PRAGMA application_id = {APPLICATION_ID}")
                    connection.execute(f"PRAGMA user_version = {SCHEMA}")
                    connection.executemany("INSERT INTO run VALUES (?, ?)", sorted(facts.items()))
                    for table, sites in (("hub", candidates.hubs), ("place", candidates.places)):
                        connection.executemany(f"INSERT INTO {table} VALUES (?, ?, ?, ?, ?, ?, ?)", _site_rows(sites))
                    connection.executemany(
                        "INSERT INTO sector VALUES (?, ?, ?)",
                        ((number, sector.hub, sector.name) for number, sector in enumerate(candidates.sectors)),
                    )
            finally:
                connection.close()
            part.replace(path)
            return cls(_connected(path), path)

    @classmethod
    def open(cls, path: Path) -> "Store":
        """The store of an earlier run.

        Raises
        ------
        RunError
            The file is none of these runs, or one of another layout.
        OutputError
            It cannot be read.
        """
        with errors(path):
            connection = _connected(path)
            found = connection.execute("PRAGMA application_id").fetchone()[0]
            version = connection.execute("PRAGMA user_version").fetchone()[0]
        if found != APPLICATION_ID:
            connection.close()
            raise RunError(f"'{path}' was not written by a run of Fellspan", "give another folder for --out")
        if version != SCHEMA:
            connection.close()
            raise RunError(
                f"'{path}' was written by another version of Fellspan (layout {version}, this one knows {SCHEMA})",
                "--fresh starts anew and drops what is there",
            )
        return cls(connection, path)

    def __enter__(self) -> "Store":
        return self

    def __exit__(self, *_: object) -> None:
        self._connection.close()

    def facts(self) -> dict[str, str]:
        """What the run rests on."""
        with errors(self.path):
            return dict(self._connection.execute("SELECT key, value FROM run"))

    def finished(self) -> set[int]:
        """Numbers of the chunks that are there."""
        with errors(self.path):
            return {number for (number,) in self._connection.execute("SELECT id FROM chunk")}

    def pairs_done(self) -> int:
        """How many pairs the finished chunks hold."""
        with errors(self.path):
            return int(self._connection.execute("SELECT COALESCE(SUM(pairs), 0) FROM chunk").fetchone()[0])

    def commit(self, chunk: Chunk, results: PairResults) -> None:
        """Put the results of a chunk in, all or none."""
        with errors(self.path):
            try:
                self._connection.execute("BEGIN IMMEDIATE")
                self._connection.executemany(
                    f"INSERT INTO result VALUES ({', '.join('?' * (5 + len(RESULT_COLUMNS)))})", _result_rows(results)
                )
                self._connection.execute("INSERT INTO chunk VALUES (?, ?)", (chunk.number, int(chunk.hub.size)))
                self._connection.execute("COMMIT")
            except BaseException:
                if self._connection.in_transaction:
                    self._connection.execute("ROLLBACK")
                raise

    def query(self, sql: str, parameters: Sequence[object] = ()) -> Iterator[tuple[Any, ...]]:
        """Rows of a question, one after the other; sorting that does not fit into memory goes to disk."""
        with errors(self.path):
            # Not `yield from`: it would close the cursor of a question that is dropped, whose store may be closed by then.
            for row in self._connection.execute(sql, parameters):  # noqa: UP028
                yield row


def _connected(path: Path) -> sqlite3.Connection:
    connection = sqlite3.connect(path, timeout=_WAIT_S, isolation_level=None)
    # A journal that is rolled back survives a killed process and a lost current, on network drives too, and leaves one file.
    connection.execute("PRAGMA journal_mode = DELETE")
    connection.execute("PRAGMA synchronous = FULL")
    connection.execute("PRAGMA temp_store = FILE")
    connection.execute("PRAGMA cache_size = -65536")
    return connection


def _site_rows(sites: SiteColumns) -> Iterator[tuple[object, ...]]:
    from fellspan.screening.pairs import HEIGHT_REFERENCES

    columns = zip(
        sites.name,
        sites.latitude_deg.tolist(),
        sites.longitude_deg.tolist(),
        sites.height_m.tolist(),
        sites.height_reference.tolist(),
        sites.roof_m.tolist(),
        strict=True,
    )
    for number, (name, latitude, longitude, height, reference, roof) in enumerate(columns):
        known_roof = None if math.isnan(roof) else roof
        yield number, name, latitude, longitude, height, HEIGHT_REFERENCES[reference], known_roof


def _result_rows(results: PairResults) -> Iterator[tuple[object, ...]]:
    """Rows of the table; what was not reached is NULL (the file has none for a number that is none)."""
    columns: list[list[object]] = []
    for name in ("hub", "place", "sector", "status", *RESULT_COLUMNS):
        values = np.asarray(getattr(results, name))
        listed = values.tolist()
        if name in (*_INTEGERS, "sector"):
            listed = [None if value < 0 else value for value in listed]
        columns.append(listed)
    columns.append([reason or None for reason in results.reason])
    return zip(*columns, strict=True)


@contextmanager
def errors(path: Path) -> Iterator[None]:
    """Turn whatever SQLite and the disk say inside into an OutputError of a few lines."""
    try:
        yield
    except (sqlite3.Error, OSError) as error:
        if isinstance(error, OutputError):
            raise
        said = str(error)
        remedy = "what is finished is kept: give the same command again to go on"
        if "full" in said or getattr(error, "errno", None) == 28:
            raise OutputError(f"the disk is full: '{path}' cannot grow", "make room", remedy) from error
        if "locked" in said:
            raise OutputError(
                f"'{path}' is in use by another program (waited {_WAIT_S:g} s)", "close it there", remedy
            ) from error
        if "malformed" in said or "not a database" in said:
            raise OutputError(
                f"'{path}' is damaged or no SQLite file: {said}",
                "--fresh starts anew and drops what is there; or give another folder",
            ) from error
        raise OutputError(f"'{path}' cannot be used: {said}", "check that you may write there", remedy) from error
