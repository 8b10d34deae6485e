"""Pairs whose paths come near obstacles or surveyed points, in batches: rasters as arrays, what stands on each path over them.

A `Batch` of another kind of pair. Obstacles and crossings are found for all at once; what is left path by path is what a path
has of its own. The answers are those of planning, as for all pairs of this room.
"""

from collections.abc import Sequence
from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.geodesy.geodesic import GeodesicPath
from fellspan.geodesy.position import Position
from fellspan.screening.batch import SHORE_STEPS, Batch, Block, Setting
from fellspan.screening.columns import Columns
from fellspan.screening.laid import LaidBucket
from fellspan.screening.near_answers import SURVEYED, Beside, Laid, count_beside, over_beside_m, surveyed_rows
from fellspan.screening.near_ends import Outlines, near_antennas, near_roof_doubts, near_standings
from fellspan.screening.near_index import Nearby, greatest_share
from fellspan.screening.near_overlay import OnPath, Overlaid, ground_at, overlaid
from fellspan.screening.profiles import Profiles, closer, regular, width_of
from fellspan.screening.rays import CLEAR, JUDGED, MARGINAL, Rules, closer_look, judged
from fellspan.screening.single import name_of
from fellspan.screening.stand import Antennas
from fellspan.terrain.alongpath import Floats
from fellspan.terrain.beside import passed_by, tops_m
from fellspan.terrain.many_obstacles import Starts
from fellspan.terrain.obstacle_tops import EDGE_M, Standing, nodes, settled_on
from fellspan.terrain.samples import merged
from fellspan.terrain.support_ground import SupportGround
from fellspan.terrain.survey_hits import SurveyHits, chord_m

Index = NDArray[np.int64]

NEAR_BATCH: Final = 4096
"""Pairs whose obstacles are kept in memory at once."""
NEAR_PER_OCTAVE: Final = 2
"""Widths of arrays between a number and its double: few, since fewer pairs of this kind stand side by side."""


class NearBatch(Batch):
    """Some rows of the columns, all of them near something."""

    per_octave = NEAR_PER_OCTAVE

    def __init__(self, setting: Setting, columns: Columns, rows: Index, near: Nearby) -> None:
        super().__init__(setting, columns, rows)
        candidates, layers = setting.candidates, setting.many.layers
        self._supports = SupportGround(layers.ground)
        self._starts = Starts(
            latitude_deg=candidates.hubs.latitude_deg[self._hub],
            longitude_deg=candidates.hubs.longitude_deg[self._hub],
            bearing_deg=columns.bearing_deg[rows],
            length_m=columns.distance_m[rows],
        )
        self._surveyed = near.surveyed
        obstacles = layers.obstacles
        touched = obstacles.laid(self._starts, near.path, near.obstacle, near.shift_deg)
        self._crossed = obstacles.crossed(touched, self._starts)
        self._beside: dict[int, list[Beside]] = {}
        passed = passed_by(
            touched,
            obstacles.obstacles,
            self._crossed,
            self._starts.length_m,
            most_share=greatest_share(candidates),
        )
        tops = tops_m(
            passed,
            self._starts,
            ground_at=lambda latitude, longitude: layers.ground.sample_positions(latitude, longitude).value_m,
            growth_years=layers.growth_years,
        )
        for one, top in zip(passed, tops, strict=True):
            self._beside.setdefault(one.path, []).append((one, top))

    def _near_others(self) -> Nearby:
        return Nearby.nothing(self._rows.size)

    def _geodesic(self, path: int) -> GeodesicPath:
        hubs, places = self._setting.candidates.hubs, self._setting.candidates.places
        hub, place = int(self._hub[path]), int(self._place[path])
        ends = (
            Position(latitude_deg=float(sites.latitude_deg[one]), longitude_deg=float(sites.longitude_deg[one]))
            for sites, one in ((hubs, hub), (places, place))
        )
        return GeodesicPath.between(*ends)

    def _geometry(self, which: Index, width: int, block: Block) -> list[LaidBucket]:
        """As of any batch, with more samples where things stand, and these laid over the rasters."""
        coarse, doubtful = regular(self._laid, which, length_m=self._ways.length_m, steps=self._steps, width=width)
        hits = self._hits(coarse)
        doubtful = doubtful | self._beyond_arrays(coarse, hits)
        self._leave(coarse.which[doubtful], block)
        kept = np.flatnonzero(~doubtful)
        if kept.size == 0:
            return []
        coarse, hits = coarse.rows(kept), [hits[row] for row in kept.tolist()]
        places = self._places(coarse)
        on = self._stand(coarse, hits, places)
        own = [self._distances(coarse, row, one, places[row]) for row, one in enumerate(on)]
        widths = width_of(np.array([one.size for one in own]), per_octave=NEAR_PER_OCTAVE)
        found: list[LaidBucket] = []
        for one in np.unique(widths).tolist():
            rows = np.flatnonzero(widths == one)
            profiles, doubtful = self._sampled(coarse, rows, [own[row] for row in rows.tolist()], one)
            gap = ~np.isfinite(profiles.ground_m).all(axis=1)
            # A survey may fill it, or stand on a shore.
            doubtful = doubtful | (self._surveyed[profiles.which] & (gap | self._at_sea(profiles)))
            self._note_gaps(profiles.rows(gap & ~doubtful))
            self._leave(profiles.which[doubtful], block)
            fit = np.flatnonzero(~gap & ~doubtful)
            if fit.size:
                found += self._looked_at(profiles.rows(fit), [on[row] for row in rows[fit].tolist()], block)
        return found

    def _looked_at(self, raw: Profiles, on: list[OnPath], block: Block) -> list[LaidBucket]:
        """Profiles of one width looked at more closely and judged."""
        setting, candidates = self._setting, self._setting.candidates
        over = overlaid(raw, on, setting.many.layers)
        outlines = Outlines.of(over, on)
        a, b = self._on_outlines(over, outlines)
        refused = a.refused | b.refused
        if refused.any():
            self._refuse(raw.which[refused], a.rows(refused), b.rows(refused), block)
            some = np.flatnonzero(~refused)
            raw, over, outlines, a, b = raw.rows(some), over.rows(some), outlines.rows(some), a.rows(some), b.rows(some)
            on = [on[row] for row in some.tolist()]
        if raw.which.size == 0:
            return []
        rules = Rules.of(raw.length_m, settings=candidates.settings, frequency_hz=candidates.radio.frequency_hz)
        surface = near_standings(over, on, outlines)[0].surface_m
        step = self._fine_m[raw.which]
        more, total = closer_look(over.profiles, surface, a, b, rules, step_m=step)
        widths = width_of(total, per_octave=NEAR_PER_OCTAVE)
        found: list[LaidBucket] = []
        for one in np.unique(widths).tolist():
            rows = np.flatnonzero(widths == one)
            fine, doubtful = closer(self._laid, raw, rows, more=more, total=total, width=one, step_m=step)
            doubtful = doubtful | ~np.isfinite(fine.ground_m).all(axis=1)
            doubtful |= self._surveyed[fine.which] & self._at_sea(fine)
            if doubtful.any():
                self._leave(fine.which[doubtful], block)
                fine, rows = fine.rows(~doubtful), rows[~doubtful]
            if rows.size:
                few = [on[row] for row in rows.tolist()]
                fine_over = overlaid(fine, few, setting.many.layers)
                found.append(
                    self._judge_near(
                        fine_over, few, outlines.rows(rows), a.rows(rows), b.rows(rows), rules.rows(rows), block
                    )
                )
        return found

    def _judge_near(
        self,
        over: Overlaid,
        on: Sequence[OnPath],
        outlines: Outlines,
        a: Antennas,
        b: Antennas,
        rules: Rules,
        block: Block,
    ) -> LaidBucket:
        """The path verdict of pairs of one width, and what their signal is worked out from."""
        setting, columns, profiles = self._setting, self._columns, over.profiles
        bare = setting.many.layers.is_bare
        stands, own = near_standings(over, on, outlines)
        # Typed roofs are held against outlines here, not against rasters alone.
        at_a, at_b = (replace(end, roof_m=np.full(end.roof_m.shape, np.nan)) for end in (a, b))
        found = judged(profiles, stands, at_a, at_b, rules, settings=setting.candidates.settings, ground_is_bare=bare)
        laid = Laid(over=over, stands=stands, a=a, b=b, rules=rules)
        doubts = np.zeros(profiles.which.size, dtype=np.bool_)
        if bare:
            doubts = near_roof_doubts(a, over, outlines, at_a=True) | near_roof_doubts(b, over, outlines, at_a=False)
        beside = over_beside_m(laid, lambda row: self._beside.get(int(profiles.which[row]), ()))
        over_m = np.zeros(doubts.size)
        over_m[list(beside)] = list(beside.values())
        doubts[list(beside)] = True
        found = replace(
            found,
            extra_for_confidence_m=np.maximum(found.extra_for_confidence_m, over_m),
            verdict=np.where(doubts & (found.verdict == CLEAR), MARGINAL, found.verdict).astype(np.int8),
            basis=np.where(surveyed_rows(laid, own, found), SURVEYED, found.basis).astype(np.int8),
        )
        rows = self._rows[profiles.which]
        for name in JUDGED:
            getattr(columns, name)[rows] = getattr(found, name)
        clear = np.flatnonzero(found.verdict == CLEAR).tolist()
        count_beside(laid, clear, lambda row: self._beside.get(int(profiles.which[row]), ()), found.spare_m)
        block.unsure.append(self._after_draws(profiles, stands, found))
        return self._bucket(profiles, stands.surface_m, stands.cover_kind, a, b, found)

    def _on_outlines(self, over: Overlaid, outlines: Outlines) -> tuple[Antennas, Antennas]:
        candidates, bare = self._setting.candidates, self._setting.many.layers.is_bare
        hub, place = self._hub[over.profiles.which], self._place[over.profiles.which]
        return (
            near_antennas(candidates.hubs, hub, over, outlines, at_a=True, ground_is_bare=bare),
            near_antennas(candidates.places, place, over, outlines, at_a=False, ground_is_bare=bare),
        )

    def _leave(self, which: Index, block: Block) -> None:
        """Leave pairs to be taken one by one."""
        if which.size:
            block.one_by_one.append(self._rows[which])

    def _hits(self, coarse: Profiles) -> list[SurveyHits | None]:
        """What was surveyed on each path; None where nothing was."""
        survey, candidates = self._setting.many.layers.survey, self._setting.candidates
        found: list[SurveyHits | None] = [None] * coarse.which.size
        for row in np.flatnonzero(self._surveyed[coarse.which]).tolist():
            path = int(coarse.which[row])
            name = name_of(candidates, int(self._hub[path]), int(self._place[path]))
            longest = chord_m(float(coarse.cell_m[row]))
            hits = survey.on_path(self._geodesic(path), name, longest_m=longest)
            if hits.points or hits.segments or hits.wide:
                found[row] = hits
        return found

    def _beyond_arrays(self, coarse: Profiles, hits: Sequence[SurveyHits | None]) -> NDArray[np.bool_]:
        """Paths that only planning itself can tell of: where shores or survey are more than arrays know."""
        layers = self._setting.many.layers
        surveyed = np.array([one is not None for one in hits])
        left = surveyed & (layers.surface is not None)
        if layers.gaps == "sea":
            open_ = ~np.isfinite(coarse.ground_m).all(axis=1) | self._at_sea(coarse)
            at_shores = (coarse.last >= SHORE_STEPS) & (self._setting.candidates.settings.step_m is None)
            left |= open_ & (surveyed | ~at_shores)
        return np.asarray(left)

    def _at_sea(self, profiles: Profiles) -> NDArray[np.bool_]:
        """Paths with samples that were taken as sea."""
        return np.asarray((profiles.source == self._setting.many.layers.sea).any(axis=1))

    def _places(self, coarse: Profiles) -> list[list[Floats]]:
        """The nodes of the crossings of each path."""
        return [
            [nodes(crossing, max(0.5 * cell, 0.05)) for crossing in self._crossed.get(path, ())]
            for path, cell in zip(coarse.which.tolist(), coarse.cell_m.tolist(), strict=True)
        ]

    def _stand(
        self, coarse: Profiles, hits: Sequence[SurveyHits | None], places: Sequence[Sequence[Floats]]
    ) -> list[OnPath]:
        """What stands on each path, with tops settled; ground is asked for once, for all of them."""
        flat = [(row, place) for row, some in enumerate(places) for place in some]
        if not flat:
            return [OnPath(hits=one) for one in hits]
        at = np.concatenate([place for _, place in flat])
        row_of = np.repeat(np.array([row for row, _ in flat]), [place.size for _, place in flat])
        ground = self._ground(coarse, row_of, at)
        growth = self._setting.many.layers.growth_years
        on: list[OnPath] = []
        begin = 0
        for row, path in enumerate(coarse.which.tolist()):
            standing: list[Standing] = []
            for crossing, place in zip(self._crossed.get(path, ()), places[row], strict=True):
                under = ground[begin : begin + place.size]
                begin += place.size
                laid = hits[row]
                if laid is not None:
                    under = ground_at(laid, place, under)
                standing.append(settled_on(crossing, place, under, self._supports, growth))
            on.append(OnPath(standing=tuple(standing), hits=hits[row]))
        return on

    def _ground(self, coarse: Profiles, row_of: Index, at_m: Floats) -> Floats:
        """Ground of the rasters, or the sea, at distances (m,) along paths (m,) of some profiles."""
        t = 2.0 * (at_m / coarse.length_m[row_of]) - 1.0
        wet = None
        if coarse.wet is not None:
            wet = coarse.wet[row_of, _interval(coarse, row_of, at_m)][:, np.newaxis]
        return self._laid.sample(t[:, np.newaxis], coarse.which[row_of], wet=wet).ground_m[:, 0]

    def _distances(self, coarse: Profiles, row: int, on: OnPath, places: Sequence[Floats]) -> Floats:
        """Regular distances of one path with the nodes of obstacles and survey among them, as `PathWork.distances`."""
        exact = list(places)
        outside = [(one.crossing.from_m - EDGE_M, one.crossing.to_m + EDGE_M) for one in on.standing]
        beside = [np.array(outside, dtype=np.float64).ravel()]
        if on.hits is not None:
            exact.insert(0, on.hits.nodes())
            beside.insert(0, on.hits.edges())
        regular_m = coarse.distance_m[row, : int(coarse.last[row]) + 1]
        nothing = np.zeros(0)
        return merged(np.concatenate([nothing, *exact]), np.concatenate(beside), regular_m, float(coarse.length_m[row]))

    def _sampled(
        self, coarse: Profiles, rows: Index, distances: Sequence[Floats], width: int
    ) -> tuple[Profiles, NDArray[np.bool_]]:
        """Some paths sampled at distances of their own, filled up with repeats of the last; and which are in doubt."""
        length = coarse.length_m[rows]
        distance = np.repeat(length[:, np.newaxis], width, axis=1)
        for row, own in enumerate(distances):
            distance[row, : own.size] = own
        wet = None
        if coarse.wet is not None:
            row_of = np.repeat(rows, width)
            wet = coarse.wet[row_of, _interval(coarse, row_of, distance.reshape(-1))].reshape(distance.shape)
        found = self._laid.sample(2.0 * (distance / length[:, np.newaxis]) - 1.0, coarse.which[rows], wet=wet)
        profiles = Profiles(
            which=coarse.which[rows],
            last=np.array([own.size for own in distances]) - 1,
            length_m=length,
            cell_m=coarse.cell_m[rows],
            distance_m=distance,
            ground_m=found.ground_m,
            cover_m=found.cover_m,
            cover_kind=found.cover_kind,
            sigma_m=found.sigma_m,
            ground_sigma_m=found.ground_sigma_m,
            source=found.source,
            known=found.known,
            wet=wet,
            tells=coarse.tells[rows],
        )
        return profiles, found.doubtful


def _interval(coarse: Profiles, row_of: Index, at_m: Floats) -> Index:
    """The regular sample at or before places (m,) of paths (m,)."""
    step = coarse.length_m[row_of] / coarse.last[row_of]
    place = np.clip(np.floor(at_m / step).astype(np.int64), 0, coarse.last[row_of])
    place -= (coarse.distance_m[row_of, place] > at_m) & (place > 0)
    after = np.minimum(place + 1, coarse.last[row_of])
    return np.where(coarse.distance_m[row_of, after] <= at_m, after, place)
