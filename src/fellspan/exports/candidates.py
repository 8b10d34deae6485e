"""The files of a finished run: candidates.csv, candidates.geojson, best.csv, summary.json; written row by row.

Shows what the store holds and computes nothing. Names come from users: none can start a formula, none breaks the JSON.
"""

import csv
import json
from collections.abc import Iterator, Sequence
from math import isfinite, isinf
from typing import Any, Final, TextIO

from fellspan import __version__
from fellspan.exports.candidates_geojson import PairLines, write_lines
from fellspan.exports.text import csv_cell, utf8
from fellspan.links.words import STATE_WORDS
from fellspan.runs.store import STATES, Store
from fellspan.runs.summary import HubCount, PairRow, RunSummary, rows_in_order
from fellspan.runs.unjudged import is_unjudged, unjudged_words
from fellspan.screening.pairs import BASES, PATH_VERDICTS, SIGNAL_VERDICTS, STATUSES, Candidates

NUMBERS: Final = (
    ("distance_m", "%.1f"),
    ("bearing_deg", "%.2f"),
    ("confidence", "%.4f"),
    ("worst_fraction", "%.3f"),
    ("worst_at_m", "%.1f"),
    ("extra_at_place_m", "%.2f"),
    ("extra_for_confidence_m", "%.2f"),
    ("diffraction_db", "%.2f"),
    ("received_at_hub_dbm", "%.2f"),
    ("received_at_place_dbm", "%.2f"),
    ("margin_at_hub_db", "%.2f"),
    ("margin_at_place_db", "%.2f"),
    ("availability_percent", "%.6f"),
    ("gap_from_m", "%.1f"),
    ("gap_to_m", "%.1f"),
)
"""Numbers of a pair and how they are written."""
_MARGINAL: Final = PATH_VERDICTS.index("marginal")
_NUMBER_AT: Final = tuple((PairRow._fields.index(name), form) for name, form in NUMBERS)
CANDIDATE_COLUMNS: Final = (
    "hub",
    "place",
    "sector",
    "status",
    "state",
    "verdict",
    "basis",
    "signal_verdict",
    "criterion",
    *(name for name, _ in NUMBERS),
    "raising_the_place_helps",
    "reason",
)
BEST_COLUMNS: Final = ("place", "rank", *(name for name in CANDIDATE_COLUMNS if name != "place"))
JUDGED_ALONE: Final = (
    "Each pair is judged alone: radios that share a channel, sectors of one hub among them, are not counted here; "
    "fellspan plan counts them."
)
"""What every run must say of its signals."""
UNSURE_WORDS: Final = "not sure enough"
"""A height at the place meets all criteria, and none there with the confidence asked."""
UNKNOWN_WORDS: Final = "not known"
"""The path lacks confidence by drawn errors alone, or by what no height is known to mend: the stated bound is 0."""
NO_HUB_WORDS: Final = "no hub in reach"
STATE_OF: Final = (*(STATE_WORDS[state] for state in STATES), "")


class CandidateTable:
    """Rows of a run as cells; names are made safe once each."""

    def __init__(self, candidates: Candidates) -> None:
        self.hubs = [csv_cell(name) for name in candidates.hubs.name]
        self.places = [csv_cell(name) for name in candidates.places.name]
        self.sectors = [csv_cell(sector.name) for sector in candidates.sectors]
        self.criteria = criterion_words(candidates)
        self._candidates = candidates
        self._unjudged = f"target not judged: {unjudged_words(candidates)}"

    def cells(self, row: PairRow) -> list[str]:
        """The cells of `CANDIDATE_COLUMNS`."""
        cells = [
            self.hubs[row.hub],
            self.places[row.place],
            "" if row.sector is None else self.sectors[row.sector],
            STATUSES[row.status],
            STATE_OF[row.state],
            "" if row.verdict is None else PATH_VERDICTS[row.verdict],
            "" if row.basis is None else BASES[row.basis],
            "" if row.signal_verdict is None else SIGNAL_VERDICTS[row.signal_verdict],
            "" if row.governing is None else self.criteria[min(row.governing, len(self.criteria) - 1)],
        ]
        cells += [_number(row[index], form) for index, form in _NUMBER_AT]
        cells.append(raising_words(row))
        cells.append(self._reason(row))
        return cells

    def _reason(self, row: PairRow) -> str:
        if row.reason:
            return csv_cell(row.reason)
        unjudged = is_unjudged(
            self._candidates, signal_verdict=row.signal_verdict, availability_percent=row.availability_percent
        )
        return self._unjudged if unjudged else ""

    def best_cells(self, rank: int, row: PairRow | int) -> list[str]:
        """The cells of `BEST_COLUMNS`; for a place without a hub its name and that word."""
        if isinstance(row, int):
            return [self.places[row], "", "", "", NO_HUB_WORDS, *("" for _ in BEST_COLUMNS[5:])]
        cells = self.cells(row)
        return [cells[1], str(rank), cells[0], *cells[2:]]


def raising_words(row: PairRow) -> str:
    """Whether raising the place alone makes the path clear; empty where it is, or where nothing was judged."""
    meets, sure = row.extra_at_place_m, row.extra_for_confidence_m
    if meets is None or sure is None:
        return ""
    if isinf(meets):
        return "no"
    if isinf(sure):
        return UNSURE_WORDS
    if sure == 0.0:
        return UNKNOWN_WORDS if row.verdict == _MARGINAL else ""
    return "yes"


def criterion_words(candidates: Candidates) -> tuple[str, ...]:
    """What the rows of the criteria are called."""
    settings = candidates.settings
    if settings.criteria:
        return tuple(csv_cell(criterion.name) for criterion in settings.criteria)
    if settings.preset == "sixty-percent":
        return ("0.6 F1 at k = 4/3",)
    return ("median k", "worst-month k")


def _number(value: Any, form: str) -> str:
    return form % value if value is not None and isfinite(value) else ""


def write_csv(stream: TextIO, rows: Iterator[list[str]], columns: Sequence[str]) -> None:
    """A table, row by row."""
    writer = csv.writer(stream, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(rows)


def write_candidates_csv(stream: TextIO, store: Store, candidates: Candidates) -> None:
    """candidates.csv: every pair, by hub and place."""
    table = CandidateTable(candidates)
    write_csv(stream, map(table.cells, rows_in_order(store)), CANDIDATE_COLUMNS)


def write_candidates_geojson(stream: TextIO, store: Store, candidates: Candidates) -> None:
    """candidates.geojson: a line from hub to place for every pair."""
    write_lines(stream, map(PairLines(candidates).feature, rows_in_order(store)))


def summary_json(summary: RunSummary, *, title: str, notes: Sequence[str]) -> str:
    """summary.json: the counts, as `--json` prints them."""
    return (
        json.dumps(
            {
                "schema": 1,
                "fellspan": __version__,
                "title": utf8(title),
                "pairs": summary.pairs,
                "by_status": summary.by_status,
                "by_state": summary.by_state,
                "by_basis": summary.by_basis,
                "by_signal_verdict": summary.by_signal,
                "places": summary.places,
                "places_by_best_state": summary.by_best_state,
                "places_clear_and_signal_meets": summary.places_served,
                "target_not_judged": {
                    "pairs": summary.unjudged,
                    "why": summary.unjudged_why if summary.unjudged else "",
                },
                "chosen_not_written": utf8(summary.no_chosen),
                "hubs": [_hub(hub) for hub in summary.hubs],
                "refusals": [{"reason": utf8(reason), "pairs": count} for reason, count in summary.refusals],
                "notes": [utf8(note) for note in notes],
            },
            ensure_ascii=False,
            indent=1,
        )
        + "\n"
    )


def _hub(hub: HubCount) -> dict[str, object]:
    return {
        "name": utf8(hub.name),
        "pairs": hub.pairs,
        "by_state": hub.by_state,
        "clear_and_signal_meets": hub.clear_and_meets,
        "best_for_places": hub.best_for,
    }
