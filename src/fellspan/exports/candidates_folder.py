"""The files of a finished run, put into its folder whole or not at all; `summary.json` comes last.

Each is written beside its place first and moved there when all are whole. What they hold is their writers' business.
"""

import csv
import dataclasses
import os
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager, suppress
from pathlib import Path
from tempfile import TemporaryFile
from typing import Final, Literal, TextIO

from fellspan.errors import OutputError, StudyError
from fellspan.exports.candidates import (
    BEST_COLUMNS,
    CandidateTable,
    summary_json,
    write_candidates_csv,
    write_candidates_geojson,
)
from fellspan.exports.candidates_geojson import PairLines, write_lines
from fellspan.exports.text import utf8
from fellspan.report.candidates_page import render_candidates_page
from fellspan.runs.store import STATES, Store
from fellspan.runs.summary import PairRow, RunSummary, summarise
from fellspan.study.chosen import MOST_CHOSEN, chosen_text
from fellspan.study.screening_study import Screening

SUMMARY: Final = "summary.json"
CHOSEN: Final = "chosen.toml"
ALL_LINES, BEST_LINES = "candidates.geojson", "best.geojson"
NAMES: Final = ("candidates.csv", ALL_LINES, "best.csv", BEST_LINES, CHOSEN, "index.html", SUMMARY)
Lines = Literal["all", "best"]
"""Which pairs are written as lines on a map: those of `best.csv` alone, or all of them too."""
_PART: Final = ".part"

Write = Callable[[TextIO], object]
"""Writes a file; False where there is nothing to say, so that the file is left out."""


def write_run(
    folder: Path,
    store: Store,
    screening: Screening,
    *,
    keep: int,
    lines: Lines,
    notes: Sequence[str],
    tell: Callable[[str], None],
) -> RunSummary:
    """Write the files of a run whose chunks are all there; `keep` hubs are listed for each place, `tell` hears each file.

    `lines` says whether all pairs are written as lines too.

    Raises
    ------
    OutputError
        A file cannot be written; those that stood there are unchanged.
    """
    candidates, study = screening.candidates, screening.study
    table, drawn = CandidateTable(candidates), PairLines(candidates)
    found: list[RunSummary] = []

    def all_lines(stream: TextIO) -> bool:
        if lines == "all":
            write_candidates_geojson(stream, store, candidates)
        return lines == "all"

    def best(stream: TextIO) -> None:
        """The table; its lines are kept aside, so that the pairs are ranked once."""
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(BEST_COLUMNS)

        def take(rank: int, row: PairRow | int) -> None:
            writer.writerow(table.best_cells(rank, row))
            if not isinstance(row, int):
                aside.write(drawn.feature(row, rank) + "\n")

        found.append(summarise(store, candidates, keep=keep, take=take))

    def best_lines(stream: TextIO) -> None:
        aside.seek(0)
        write_lines(stream, (line.rstrip("\n") for line in aside))

    def chosen(stream: TextIO) -> bool:
        text, why = _chosen(screening, found[0], folder)
        found[0] = dataclasses.replace(found[0], no_chosen=why)
        stream.write(utf8(text))
        return bool(text)

    writers: dict[str, Write] = {
        "candidates.csv": lambda stream: write_candidates_csv(stream, store, candidates),
        ALL_LINES: all_lines,
        "best.csv": best,
        BEST_LINES: best_lines,
        CHOSEN: chosen,
        "index.html": lambda stream: stream.write(
            utf8(render_candidates_page(found[0], study, candidates, notes=notes))
        ),
        SUMMARY: lambda stream: stream.write(summary_json(found[0], title=study.title, notes=notes)),
    }
    with _aside(folder) as aside:
        write_files_of_run(folder, writers, tell=tell)
    return found[0]


@contextmanager
def _aside(folder: Path) -> Iterator[TextIO]:
    """A file without a name beside those that are written."""
    try:
        with TemporaryFile("w+", dir=folder, encoding="utf-8", newline="\n") as stream:
            yield stream
    except OSError as error:
        if isinstance(error, OutputError):
            raise
        raise OutputError(f"'{folder}' cannot be written: {error.strerror or error}", "make room") from error


def _chosen(screening: Screening, summary: RunSummary, folder: Path) -> tuple[str, str]:
    """The study of the best hubs, and ''; or '' and why there is none: no hubs, too many, or names it cannot say."""
    best = summary.best
    places = [
        place
        for place, state in enumerate(best.state.tolist())
        if state <= STATES.index("marginal") and best.hub[place] >= 0
    ]
    if not places:
        return "", "no place has a hub whose path is not obstructed"
    if len(places) > MOST_CHOSEN:
        return "", (
            f"it would hold {len(places)} links, and {MOST_CHOSEN} are the most; run a part of the places (--places), or list "
            "the pairs that matter (--pairs), with an --out of its own"
        )
    pairs = ((int(best.hub[place]), int(best.sector[place]), place) for place in places)
    try:
        return chosen_text(screening.study, screening.candidates, pairs, folder=folder), ""
    except StudyError as error:
        return "", error.what


def drop_parts(folder: Path) -> None:
    """Remove what a writer that is stopped has begun; for the run that works in the folder."""
    for name in NAMES:
        with suppress(OSError):
            _part_of(folder, name).unlink(missing_ok=True)


def _part_of(folder: Path, name: str) -> Path:
    return folder / f".{name}{_PART}"


def write_files_of_run(folder: Path, writers: Mapping[str, Write], *, tell: Callable[[str], None]) -> None:
    """Write files by their writers, in order; an old file of `NAMES` that has no writer, or nothing to say, is removed."""
    parts: dict[str, Path] = {}
    left_out: set[str] = set(NAMES) - set(writers)
    try:
        for name, write in writers.items():
            tell(name)
            parts[name] = _part_of(folder, name)
            with parts[name].open("w", encoding="utf-8", newline="\n") as stream:
                if write(stream) is False:
                    left_out.add(name)
                stream.flush()
                os.fsync(stream.fileno())
        (folder / SUMMARY).unlink(missing_ok=True)
        for name in left_out:
            (folder / name).unlink(missing_ok=True)
        for name in sorted(set(parts) - left_out, key=lambda name: name == SUMMARY):
            parts[name].replace(folder / name)
    except OSError as error:
        if isinstance(error, OutputError):
            raise
        raise OutputError(
            f"the files of the run cannot be written to '{folder}': {error.strerror or error}",
            "check that the disk has room and that you may write there",
            "what is worked out is kept: give the same command again to write them",
        ) from error
    finally:
        for part in parts.values():
            with suppress(OSError):
                part.unlink(missing_ok=True)
