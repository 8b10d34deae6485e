"""Pairs of a run as lines from hub to place: candidates.geojson and best.geojson, written line by line (RFC 7946).

A file of a million lines must stay small enough to open: nothing is said twice, and what is not known is left out.
"""

import json
from collections.abc import Iterator, Sequence
from math import isfinite
from typing import Any, Final, TextIO

from fellspan.exports.places import Place, split_at_antimeridian
from fellspan.exports.text import utf8
from fellspan.links.words import STATE_WORDS
from fellspan.runs.store import STATES
from fellspan.runs.summary import PairRow
from fellspan.screening.pairs import BASES, SIGNAL_VERDICTS, STATUSES, Candidates, SiteColumns

HEAD: Final = '{"type":"FeatureCollection","features":['
TAIL: Final = "\n]}\n"
DECIMALS: Final = 6
"""Of a degree: 0.1 m, as RFC 7946, section 11.2, advises."""
_DONE: Final = STATUSES.index("done")
_NUMBERS: Final = (
    ("distance_m", "%.1f"),
    ("margin_db", "%.2f"),
    ("worst_fraction", "%.3f"),
    ("extra_at_place_m", "%.2f"),
    ("extra_for_confidence_m", "%.2f"),
)


class PairLines:
    """Rows of a run as features; what a hub, place or sector is called and where it stands is put into words once."""

    def __init__(self, candidates: Candidates) -> None:
        self._hubs, self._places = _spots(candidates.hubs), _spots(candidates.places)
        self._from = [f'"hub":{_text(name)}' for name in candidates.hubs.name]
        self._to = [f',"place":{_text(name)}' for name in candidates.places.name]
        self._sectors = [f',"sector":{_text(one.name)}' if one.name else "" for one in candidates.sectors]
        self._states = [f',"state":"{STATE_WORDS[state]}"' for state in STATES] + [""]
        self._bases = [f',"basis":"{word}"' for word in BASES]
        self._signals = [f',"signal_verdict":"{word}"' for word in SIGNAL_VERDICTS]

    def feature(self, row: PairRow, rank: int | None = None) -> str:
        """One line; `status` only where the pair has no answer, `verdict` not at all, since the state tells it."""
        words = self._from[row.hub] + self._to[row.place]
        if rank is not None:
            words += f',"rank":{rank}'
        if row.sector is not None:
            words += self._sectors[row.sector]
        if row.status != _DONE:
            words += f',"status":"{STATUSES[row.status]}"'
        words += self._states[row.state]
        if row.basis is not None:
            words += self._bases[row.basis]
        if row.signal_verdict is not None:
            words += self._signals[row.signal_verdict]
        for name, form in _NUMBERS:
            words += _number(name, getattr(row, name), form)
        geometry = _geometry(self._hubs[row.hub], self._places[row.place])
        return f'{{"type":"Feature","geometry":{geometry},"properties":{{{words}}}}}'


def write_lines(stream: TextIO, features: Iterator[str]) -> None:
    """A collection of features, one a line of the file."""
    stream.write(HEAD)
    mark = "\n"
    for feature in features:
        stream.write(mark + feature)
        mark = ",\n"
    stream.write(TAIL)


def _text(name: str) -> str:
    return json.dumps(utf8(name), ensure_ascii=False)


def _number(name: str, value: Any, form: str) -> str:
    if value is None or not isfinite(value):
        return ""
    text = form % value
    return f',"{name}":{text.rstrip("0").rstrip(".") if "." in text else text}'


def _spots(sites: SiteColumns) -> list[tuple[float, float]]:
    columns = (sites.longitude_deg.tolist(), sites.latitude_deg.tolist())
    return [(round(x, DECIMALS) + 0.0, round(y, DECIMALS) + 0.0) for x, y in zip(*columns, strict=True)]


def _geometry(a: tuple[float, float], b: tuple[float, float]) -> str:
    if abs(a[0] - b[0]) <= 180.0:
        return f'{{"type":"LineString","coordinates":{_listed((a, b))}}}'
    ends = tuple(Place(distance_m=0.0, latitude_deg=y, longitude_deg=x, ray_amsl_m=0.0) for x, y in (a, b))
    parts = [_listed([place.lonlat for place in part]) for part in split_at_antimeridian(ends)]
    return f'{{"type":"MultiLineString","coordinates":[{",".join(parts)}]}}'


def _listed(spots: Sequence[Sequence[float]]) -> str:
    return f"[{','.join(f'[{spot[0]!r},{spot[1]!r}]' for spot in spots)}]"
