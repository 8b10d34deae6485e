"""A batch of pairs from positions to columns: laid on the rasters, looked at more closely, judged, and its signal worked out.

Puts the pieces of this room together for pairs on whose paths rasters alone count, and says which pairs are not of that kind.
"""

from collections.abc import Iterator
from dataclasses import dataclass, field, fields
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.errors import FellspanError
from fellspan.links.assess import REFINE_PARTS
from fellspan.links.budget import tilts_deg
from fellspan.links.ends import no_roof
from fellspan.screening.columns import Columns
from fellspan.screening.laid import LaidBucket, pair_columns
from fellspan.screening.near_index import Nearby, nearby
from fellspan.screening.own_draws import own_share
from fellspan.screening.pairs import HEIGHT_REFERENCES, Candidates, SiteColumns
from fellspan.screening.profiles import FINE_PER_OCTAVE, PER_OCTAVE, Profiles, closer, regular, steps_of, width_of
from fellspan.screening.rays import CLEAR, JUDGED, MARGINAL, Judged, Rules, closer_look, judged
from fellspan.screening.signal import SignalColumns, best_sector, signal_columns
from fellspan.screening.stand import Antennas, Standings, antennas_at, standings
from fellspan.screening.sure import HOLDS, UNSURE, likely
from fellspan.screening.ways import Ways
from fellspan.terrain.many import ManyPaths
from fellspan.terrain.units import is_ellipsoidal

Floats = NDArray[np.float64]
Index = NDArray[np.int64]

NEAR_SAMPLES: Final = 131_072
"""Samples of pairs that are worked on at once: their arrays stay near the processor's caches."""
BLOCK_SAMPLES: Final = 1_000_000
"""Samples of a block: what a thread takes at a time."""
LONGEST_STEPS: Final = 30_000
"""Paths of more steps are taken one by one."""
FEWEST_STEPS: Final = 4
SHORE_STEPS: Final = 16
"""Fewer than these are not enough to tell the shores of a gap by: `terrain.assemble` then looks closer."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Setting:
    """What all batches of a run share."""

    candidates: Candidates
    many: ManyPaths
    vertical_datum: str | None
    wrong_hubs: NDArray[np.bool_]
    """Sites that cannot be as given: their pairs are taken one by one, which says why."""
    wrong_places: NDArray[np.bool_]


def wrong_sites(sites: SiteColumns, *, vertical_datum: str | None) -> NDArray[np.bool_]:
    """Sites (m,) that `links` would refuse or cannot be told at once to be right."""
    above_sea = sites.height_reference == HEIGHT_REFERENCES.index("sea")
    wrong = ~np.isfinite(sites.height_m) | (~above_sea & (sites.height_m < 0.0))
    wrong |= (sites.roof_m < 0.0) | np.isinf(sites.roof_m)
    wrong |= ~(np.abs(sites.latitude_deg) <= 90.0) | ~(np.abs(sites.longitude_deg) <= 360.0)
    return np.asarray(wrong | (above_sea & is_ellipsoidal(vertical_datum)))


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """Rows that a block could not decide on: those to be taken one by one, and clear ones on which draws must decide."""

    one_by_one: list[Index] = field(default_factory=list)
    unsure: list[Index] = field(default_factory=list)


class Batch:
    """Some rows of the columns, laid on the rasters; `blocks` are to be run in any order and on any thread."""

    per_octave = PER_OCTAVE
    """Of widths, as `profiles.width_of` has it."""

    def __init__(self, setting: Setting, columns: Columns, rows: Index) -> None:
        self._setting, self._columns, self._rows = setting, columns, rows
        candidates = setting.candidates
        hubs = candidates.hubs
        hub, place = columns.hub[rows], columns.place[rows]
        self._hub, self._place = hub, place
        self._ways = Ways(
            hubs.latitude_deg[hub],
            hubs.longitude_deg[hub],
            columns.bearing_deg[rows],
            columns.back_bearing_deg[rows],
            columns.distance_m[rows],
        )
        self._laid = setting.many.lay(self._ways)
        length, cell = columns.distance_m[rows], self._laid.cell_m
        stated = candidates.settings.step_m
        step = 0.5 * cell if stated is None else np.full(cell.shape, stated)
        self._steps = steps_of(length, step)
        self._fine_m = length / steps_of(length, cell / REFINE_PARTS)
        fit = self._laid.usable & (self._steps >= FEWEST_STEPS) & (self._steps <= LONGEST_STEPS)
        fit &= ~(setting.wrong_hubs[hub] | setting.wrong_places[place])
        self._nearby = self._near_others()
        self.others: Index = rows[~fit]
        """Rows of the columns that must be taken one by one."""
        near = self._nearby.paths()
        self._near, self._fit = np.flatnonzero(fit & near), fit & ~near

    def near(self, most: int) -> Iterator[tuple[Index, Nearby]]:
        """Rows that `NearBatch` takes, and what they are near, so many at a time."""
        for start in range(0, self._near.size, most):
            some = self._near[start : start + most]
            yield self._rows[some], self._nearby.of(some)

    def blocks(self) -> list[list[Index]]:
        """The pairs that fit, in parts of one width each, and these in blocks, each for a thread to take."""
        fit = np.flatnonzero(self._fit)
        width = width_of(self._steps[fit] + 1, per_octave=self.per_octave)
        order = np.argsort(width, kind="stable")
        fit, width = fit[order], width[order]
        cells = 2.0 * self._ways.length_m / self._laid.cell_m
        blocks: list[list[Index]] = [[]]
        held = 0
        for some in np.split(fit, np.flatnonzero(np.diff(width)) + 1):
            one = int(width_of(self._steps[some[:1]] + 1, per_octave=self.per_octave)[0]) if some.size else 1
            # Where a study states its step, samples stand far apart; what is read of the rasters goes by cells.
            most = max(1, NEAR_SAMPLES // max(one, int(cells[some].max(initial=0.0))))
            for start in range(0, some.size, most):
                part = some[start : start + most]
                if held and held + part.size * one > BLOCK_SAMPLES:
                    blocks.append([])
                    held = 0
                blocks[-1].append(part)
                held += part.size * one
        return [block for block in blocks if block]

    def _near_others(self) -> Nearby:
        """The obstacles and surveyed points that paths come near."""
        setting = self._setting
        return nearby(setting.candidates, setting.many.layers, self._ways, self._hub, self._place)

    def run(self, parts: list[Index]) -> Block:
        """Fill the rows of a block; give those that it could not decide on."""
        block = Block()
        laid: list[LaidBucket] = []
        for which in parts:
            with self._setting.many.in_use():
                width = width_of(self._steps[which] + 1, per_octave=self.per_octave)
                laid += self._geometry(which, int(width.max()), block)
        if laid:
            # What is worked out for pairs as a whole is worked out for many at once.
            self._signal(laid, block)
        return block

    def _geometry(self, which: Index, width: int, block: Block) -> list[LaidBucket]:
        """Everything but the signal of a few pairs of one width, and what their signals are to be worked out from."""
        setting, settings = self._setting, self._setting.candidates.settings
        coarse, doubtful = regular(self._laid, which, length_m=self._ways.length_m, steps=self._steps, width=width)
        gap = ~np.isfinite(coarse.ground_m).all(axis=1)
        # A profile's own samples are those that tell the shores, but for few or at a step of the study's.
        by_shores = setting.many.layers.gaps == "sea"
        if by_shores:
            at_shores = (coarse.last >= SHORE_STEPS) & (settings.step_m is None)
            doubtful = doubtful | (~at_shores & (gap | (coarse.source == setting.many.layers.sea).any(axis=1)))
        self._note_gaps(coarse.rows(gap & ~doubtful))
        block.one_by_one.append(self._rows[which[doubtful]])
        if gap.any() or doubtful.any():
            coarse = coarse.rows(~gap & ~doubtful)
        a, b = self._antennas(coarse)
        refused = a.refused | b.refused
        if refused.any():
            self._refuse(coarse.which[refused], a.rows(refused), b.rows(refused), block)
            coarse, a, b = coarse.rows(~refused), a.rows(~refused), b.rows(~refused)
        if coarse.which.size == 0:
            return []
        rules = Rules.of(coarse.length_m, settings=settings, frequency_hz=setting.candidates.radio.frequency_hz)
        step = self._fine_m[coarse.which]
        more, total = closer_look(coarse, standings(coarse).surface_m, a, b, rules, step_m=step)
        width_own = width_of(total, per_octave=FINE_PER_OCTAVE)
        found: list[LaidBucket] = []
        for one in np.unique(width_own).tolist():
            rows = np.flatnonzero(width_own == one)
            fine, doubtful = closer(self._laid, coarse, rows, more=more, total=total, width=one, step_m=step)
            doubtful |= ~np.isfinite(fine.ground_m).all(axis=1)
            if doubtful.any():
                block.one_by_one.append(self._rows[fine.which[doubtful]])
                fine, rows = fine.rows(~doubtful), rows[~doubtful]
            if rows.size:
                found.append(self._judge(fine, a.rows(rows), b.rows(rows), rules.rows(rows), block))
        return found

    def _refuse(self, which: Index, a: Antennas, b: Antennas, block: Block) -> None:
        """Refuse pairs without a roof, as planning does; why others are refused, planning says of each."""
        candidates, rows = self._setting.candidates, self._rows[which]
        unroofed = a.unroofed | (b.unroofed & ~a.refused)
        for row, path, at_a in zip(rows[unroofed], which[unroofed], a.unroofed[unroofed], strict=True):
            sites, index = (candidates.hubs, self._hub[path]) if at_a else (candidates.places, self._place[path])
            self._columns.refuse(int(row), no_roof(sites.name[int(index)]).what)
        block.one_by_one.append(rows[~unroofed])

    def _antennas(self, profiles: Profiles) -> tuple[Antennas, Antennas]:
        candidates, bare = self._setting.candidates, self._setting.many.layers.is_bare
        hub, place = self._hub[profiles.which], self._place[profiles.which]
        return (
            antennas_at(candidates.hubs, hub, profiles, at_a=True, ground_is_bare=bare),
            antennas_at(candidates.places, place, profiles, at_a=False, ground_is_bare=bare),
        )

    def _note_gaps(self, profiles: Profiles) -> None:
        """The first stretch without data, as `gaps_of` tells it of one path."""
        missing = ~np.isfinite(profiles.ground_m)
        first = missing.argmax(axis=1)
        place = np.arange(missing.shape[1])
        ended = ~missing & (place > first[:, np.newaxis])
        after = np.where(ended.any(axis=1), ended.argmax(axis=1), missing.shape[1])
        last = np.minimum(after - 1, profiles.last)
        for row, index, start, stop in zip(self._rows[profiles.which], range(first.size), first, last, strict=True):
            self._columns.gap(
                int(row), float(profiles.distance_m[index, start]), float(profiles.distance_m[index, stop])
            )

    def _judge(self, profiles: Profiles, a: Antennas, b: Antennas, rules: Rules, block: Block) -> LaidBucket:
        """The path verdict of pairs of one width, and what their signal is worked out from."""
        setting, columns = self._setting, self._columns
        stands = standings(profiles)
        bare = setting.many.layers.is_bare
        found = judged(profiles, stands, a, b, rules, settings=setting.candidates.settings, ground_is_bare=bare)
        rows = self._rows[profiles.which]
        for name in JUDGED:
            getattr(columns, name)[rows] = getattr(found, name)
        block.unsure.append(self._after_draws(profiles, stands, found, rasters_alone=True))
        return self._bucket(profiles, stands.surface_m, stands.cover_kind, a, b, found)

    def _signal(self, buckets: list[LaidBucket], block: Block) -> None:
        """Fill the columns of the signal."""
        candidates, columns = self._setting.candidates, self._columns
        pairs = pair_columns(buckets)
        try:
            sector = best_sector(
                candidates, hub=pairs.hub, bearing_deg=pairs.bearing_ab_deg, tilt_deg=pairs.tilt_ab_deg
            )
            signal = signal_columns(candidates, *buckets, sector=sector)
        except FellspanError:
            # What one of them cannot have, planning says of each.
            block.one_by_one.append(pairs.row)
            return
        columns.sector[pairs.row] = sector
        for column in fields(SignalColumns):
            getattr(columns, column.name)[pairs.row] = getattr(signal, column.name)

    def _after_draws(
        self, profiles: Profiles, stands: Standings, found: Judged, *, rasters_alone: bool = False
    ) -> Index:
        """Let bounds of what draws would say, or draws, decide on the clear ones; the rows that planning itself must decide."""
        candidates, columns = self._setting.candidates, self._columns
        clear = np.flatnonzero(found.verdict == CLEAR)
        rows = self._rows[profiles.which[clear]]
        if clear.size == 0:
            return np.asarray(rows)
        asked = candidates.settings.confidence
        said = likely(found.spare_m, profiles, stands, found.errors, clear, confidence=asked)
        holds, share = said.verdict == HOLDS, said.confidence
        left = said.verdict == UNSURE
        if rasters_alone:
            bare = self._setting.many.layers.is_bare
            for one in np.flatnonzero(left).tolist():
                hub, place = int(self._hub[profiles.which[clear[one]]]), int(self._place[profiles.which[clear[one]]])
                own = own_share(candidates, hub, place, profiles, int(clear[one]), is_bare=bare)
                if own is not None:
                    share[one], holds[one], left[one] = own, own >= asked, False
        columns.verdict[rows[~holds & ~left]] = MARGINAL
        columns.confidence[rows] = np.minimum(columns.confidence[rows], share)
        return np.asarray(rows[left])

    def _sea(self, profiles: Profiles) -> NDArray[np.bool_] | None:
        sea = profiles.source == self._setting.many.layers.sea
        return np.broadcast_to(sea, profiles.distance_m.shape) if sea.any() else None

    def _bucket(
        self,
        profiles: Profiles,
        surface_m: Floats,
        cover_kind: NDArray[np.int8] | None,
        a: Antennas,
        b: Antennas,
        found: Judged,
    ) -> LaidBucket:
        which, length = profiles.which, profiles.length_m
        k = self._setting.candidates.settings.median_k
        latitude, longitude = self._ways.positions_of(which, found.middle)
        return LaidBucket(
            row=self._rows[which],
            hub=self._hub[which],
            place=self._place[which],
            sector=np.full(which.size, -1, dtype=np.int64),
            length_m=length,
            bearing_ab_deg=self._ways.bearing_ab_deg[which],
            bearing_ba_deg=self._ways.bearing_ba_deg[which],
            tilt_ab_deg=tilts_deg(distance_m=length, from_amsl_m=a.amsl_m, to_amsl_m=b.amsl_m, k=k),
            tilt_ba_deg=tilts_deg(distance_m=length, from_amsl_m=b.amsl_m, to_amsl_m=a.amsl_m, k=k),
            a_amsl_m=a.amsl_m,
            b_amsl_m=b.amsl_m,
            middle_latitude_deg=latitude,
            middle_longitude_deg=longitude,
            trees_in_zone=found.trees_in_zone,
            distance_m=profiles.distance_m,
            ground_m=profiles.ground_m,
            surface_m=surface_m,
            cover_kind=cover_kind,
            is_sea=self._sea(profiles),
        )
