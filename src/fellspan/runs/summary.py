"""What a finished run says in all: counts, the best hubs of each place, what each hub would carry.

Reads the store row by row and keeps columns of places and hubs only, whatever the number of pairs.
"""

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any, Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from fellspan.runs.store import RESULT_COLUMNS, STATES, Store, state_sql
from fellspan.runs.unjudged import UNJUDGED_SQL, unjudged_words
from fellspan.screening.pairs import BASES, SIGNAL_VERDICTS, STATUSES, Candidates

NOT_REACHED: Final = len(STATES)
"""Code of a pair without a verdict: a gap, a refusal, one place."""
NO_HUB: Final = NOT_REACHED + 1
"""Code of a place without any pair."""
STATE_CODES: Final = (*STATES, "no answer", "no hub in reach")
_COLUMNS: Final = ", ".join(("hub", "place", "sector", "status", *RESULT_COLUMNS, "reason"))
_LESSER_MARGIN: Final = (
    "MIN(COALESCE(margin_at_hub_db, margin_at_place_db), COALESCE(margin_at_place_db, margin_at_hub_db))"
)
_RANKED: Final = (
    f"SELECT {state_sql()} AS state, {_COLUMNS} FROM result ORDER BY place, state, signal_verdict IS NULL, signal_verdict, "
    f"{_LESSER_MARGIN} IS NULL, {_LESSER_MARGIN} DESC, distance_m, hub"
)
_IN_ORDER: Final = f"SELECT {state_sql()} AS state, {_COLUMNS} FROM result ORDER BY hub, place"
MOST_REASONS: Final = 5
MOST_OTHERS: Final = 5
"""Further hubs that reach a place clear and are kept by number."""


class PairRow(NamedTuple):
    """One row of the store: codes and numbers as `PairResults` has them, None where not reached."""

    state: int
    hub: int
    place: int
    sector: int | None
    status: int
    distance_m: float | None
    bearing_deg: float | None
    verdict: int | None
    signal_verdict: int | None
    basis: int | None
    confidence: float | None
    governing: int | None
    worst_fraction: float | None
    worst_at_m: float | None
    extra_at_place_m: float | None
    extra_for_confidence_m: float | None
    diffraction_db: float | None
    received_at_hub_dbm: float | None
    received_at_place_dbm: float | None
    margin_at_hub_db: float | None
    margin_at_place_db: float | None
    availability_percent: float | None
    gap_from_m: float | None
    gap_to_m: float | None
    reason: str | None

    @property
    def margin_db(self) -> float | None:
        """The lesser of both ends."""
        known = [value for value in (self.margin_at_hub_db, self.margin_at_place_db) if value is not None]
        return min(known) if known else None


@dataclass(frozen=True, slots=True, kw_only=True)
class HubCount:
    """What became of the pairs of one hub: by state, and those whose signal meets too.

    `best_for` counts the places that it is the best hub of, by a path that is not obstructed.
    """

    name: str
    pairs: int
    by_state: dict[str, int]
    clear_and_meets: int
    best_for: int


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class BestHubs:
    """The first choice of each place, columns of shape (places,): hub -1 and codes of `STATE_CODES` where there is none."""

    hub: NDArray[np.int64]
    sector: NDArray[np.int64]
    state: NDArray[np.int8]
    signal: NDArray[np.int8]
    margin_db: NDArray[np.float64]
    distance_m: NDArray[np.float64]
    extra_m: NDArray[np.float64]
    """Height to add at the place so that all criteria are met; infinite where none does."""
    extra_sure_m: NDArray[np.float64]
    """The same for the confidence asked."""
    clear_hubs: NDArray[np.int64]
    """How many hubs reach the place clear, on whatever basis."""
    bearing_deg: NDArray[np.float64]
    """From the hub to the place."""
    others: NDArray[np.int64]
    """Further hubs that reach the place clear, in their rank, shape (places, `MOST_OTHERS`); -1 where there is none."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class RunSummary:
    """Counts of a finished run; keys of the dictionaries are the words of statuses, states, bases and verdicts."""

    pairs: int
    by_status: dict[str, int]
    by_state: dict[str, int]
    by_basis: dict[str, int]
    by_signal: dict[str, int]
    places: int
    by_best_state: dict[str, int]
    """Places by the state of their best hub."""
    places_served: int
    """Places with a hub that is clear, on whatever basis, and whose signal meets what is asked."""
    hubs: tuple[HubCount, ...]
    refusals: tuple[tuple[str, int], ...]
    """The most frequent reasons of refusals, and how many pairs each holds."""
    best: BestHubs
    unjudged: int = 0
    """Pairs with a margin whose availability target cannot be judged."""
    unjudged_why: str = ""
    no_chosen: str = ""
    """Why `chosen.toml` was not written; empty where it was."""


def rows_in_order(store: Store) -> Iterator[PairRow]:
    """All pairs, by hub and place."""
    return map(_row, store.query(_IN_ORDER))


def _row(values: tuple[Any, ...]) -> PairRow:
    return PairRow(*values)


def summarise(
    store: Store, candidates: Candidates, *, keep: int, take: Callable[[int, PairRow | int], None]
) -> RunSummary:
    """Count what the run found.

    `take` is called with the rank, from 1, and the row of the `keep` best hubs of each place, places in their order; with 0
    and its number for a place that has none.
    """
    best = _best(store, candidates, keep=keep, take=take)
    hubs = _hubs(store, candidates, best)
    by_status = dict.fromkeys(STATUSES, 0)
    for code, count in store.query("SELECT status, COUNT(*) FROM result GROUP BY status"):
        by_status[STATUSES[int(code)]] = int(count)
    reasons = store.query(
        "SELECT reason, COUNT(*) AS n FROM result WHERE reason IS NOT NULL GROUP BY reason ORDER BY n DESC, reason LIMIT ?",
        (MOST_REASONS,),
    )
    states = np.bincount(best.state, minlength=len(STATE_CODES)).tolist()
    clear = best.state <= STATES.index("clear-bare")
    return RunSummary(
        pairs=sum(by_status.values()),
        by_status=by_status,
        by_state={word: sum(hub.by_state[word] for hub in hubs) for word in STATES},
        by_basis=_by_word(store, "basis", BASES),
        by_signal=_by_word(store, "signal_verdict", SIGNAL_VERDICTS),
        places=len(candidates.places.name),
        by_best_state=dict(zip(STATE_CODES, states, strict=True)),
        places_served=int(np.sum(clear & (best.signal == SIGNAL_VERDICTS.index("meets")))),
        hubs=hubs,
        refusals=tuple((str(reason), int(count)) for reason, count in reasons),
        best=best,
        unjudged=_unjudged(store, candidates),
        unjudged_why=unjudged_words(candidates),
    )


def _unjudged(store: Store, candidates: Candidates) -> int:
    if candidates.target_availability_percent is None:
        return 0
    return sum(int(count) for (count,) in store.query(f"SELECT COUNT(*) FROM result WHERE {UNJUDGED_SQL}"))


def _by_word(store: Store, column: str, words: tuple[str, ...]) -> dict[str, int]:
    found = dict.fromkeys(words, 0)
    rows = store.query(f"SELECT {column}, COUNT(*) FROM result WHERE {column} IS NOT NULL GROUP BY {column}")
    for code, count in rows:
        found[words[int(code)]] = int(count)
    return found


def _best(store: Store, candidates: Candidates, *, keep: int, take: Callable[[int, PairRow | int], None]) -> BestHubs:
    count = len(candidates.places.name)
    best = BestHubs(
        hub=np.full(count, -1, dtype=np.int64),
        sector=np.full(count, -1, dtype=np.int64),
        state=np.full(count, NO_HUB, dtype=np.int8),
        signal=np.full(count, -1, dtype=np.int8),
        margin_db=np.full(count, np.nan),
        distance_m=np.full(count, np.nan),
        extra_m=np.full(count, np.nan),
        extra_sure_m=np.full(count, np.nan),
        clear_hubs=np.zeros(count, dtype=np.int64),
        bearing_deg=np.full(count, np.nan),
        others=np.full((count, MOST_OTHERS), -1, dtype=np.int64),
    )
    following, rank = 0, 0
    for row in map(_row, store.query(_RANKED)):
        if row.place >= following:
            for alone in range(following, row.place):
                take(0, alone)
            following, rank = row.place + 1, 0
            _first(best, row)
        rank += 1
        if row.state <= STATES.index("clear-bare"):
            best.clear_hubs[row.place] += 1
            if 2 <= rank <= MOST_OTHERS + 1:
                best.others[row.place, rank - 2] = row.hub
        if rank <= keep:
            take(rank, row)
    for alone in range(following, count):
        take(0, alone)
    return best


def _first(best: BestHubs, row: PairRow) -> None:
    at = row.place
    best.state[at] = row.state
    if row.distance_m is not None:
        best.distance_m[at] = row.distance_m
    if row.state == NOT_REACHED:
        return
    best.hub[at], best.sector[at] = row.hub, -1 if row.sector is None else row.sector
    best.signal[at] = -1 if row.signal_verdict is None else row.signal_verdict
    for column, value in (
        (best.margin_db, row.margin_db),
        (best.bearing_deg, row.bearing_deg),
        (best.extra_m, row.extra_at_place_m),
        (best.extra_sure_m, row.extra_for_confidence_m),
    ):
        if value is not None:
            column[at] = value


def _hubs(store: Store, candidates: Candidates, best: BestHubs) -> tuple[HubCount, ...]:
    meets = SIGNAL_VERDICTS.index("meets")
    counts = np.zeros((len(candidates.hubs.name), len(STATES) + 1), dtype=np.int64)
    good = np.zeros(len(candidates.hubs.name), dtype=np.int64)
    rows = store.query(
        f"SELECT hub, {state_sql()} AS state, COUNT(*), SUM(signal_verdict IS {meets}) FROM result GROUP BY hub, state"
    )
    for hub, state, count, met in rows:
        counts[hub, state] = count
        if state <= STATES.index("clear-bare"):
            good[hub] += met
    carried = best.hub[(best.hub >= 0) & (best.state <= STATES.index("marginal"))]
    first = np.bincount(carried, minlength=len(candidates.hubs.name))
    return tuple(
        HubCount(
            name=name,
            pairs=int(counts[number].sum()),
            by_state=dict(zip(STATES, counts[number].tolist(), strict=False)),
            clear_and_meets=int(good[number]),
            best_for=int(first[number]),
        )
        for number, name in enumerate(candidates.hubs.name)
    )
