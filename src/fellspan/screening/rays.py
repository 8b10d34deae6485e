"""Rays over many profiles: the minima to look at again, and the verdict with its numbers.

Criteria come from `links.criteria`; the arithmetic of `links.clearance` and its neighbours runs compiled over all paths in
`rays_kernel`. Knows no rasters and no antennas' patterns.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, ndtri

from fellspan.links import clearance
from fellspan.links.assess import AssessSettings
from fellspan.links.criteria import ISOLATED_BAND, ISOLATED_SHARE, rule_numbers
from fellspan.links.minima import MINIMA
from fellspan.propagation import inverse_k, wavelength_m
from fellspan.propagation.constants import EARTH_RADIUS_M
from fellspan.screening.pairs import BASES, PATH_VERDICTS
from fellspan.screening.profiles import Profiles
from fellspan.screening.stand import Antennas, HeightErrors, Standings, height_errors, roof_doubts
from fellspan.terrain.samples import SAME_M
from fellspan.vocabulary import COVER_KINDS

Floats = NDArray[np.float64]
Index = NDArray[np.int64]

CLEAR, MARGINAL, OBSTRUCTED = (PATH_VERDICTS.index(word) for word in ("clear", "marginal", "obstructed"))
_TREE: Final = COVER_KINDS.index("tree")
_RASTER, _BARE = BASES.index("surface raster"), BASES.index("bare ground only")


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Rules:
    """Criteria for paths of given lengths, as `links.assess` chooses them."""

    curve: Floats
    """1 / (2 k a) of each, 1/m, (q, c)."""
    fraction: Floats
    """Of the first zone, (q, c)."""
    isolated: Floats
    """What the second asks for instead where the obstruction is isolated, (q,); infinite where it asks alike of both."""
    median_curve: float
    wavelength_m: float

    @classmethod
    def of(cls, length_m: Floats, *, settings: AssessSettings, frequency_hz: float) -> "Rules":
        """For paths of lengths (q,)."""
        isolated = np.full(length_m.shape, np.inf)
        if settings.criteria:
            k = np.array([[rule.k] * length_m.size for rule in settings.criteria])
            fraction = np.array([[rule.fraction] * length_m.size for rule in settings.criteria])
        else:
            k, fraction = rule_numbers(settings.preset, distance_m=length_m, median_k=settings.median_k)
            if settings.preset == "p530-temperate":
                # rule_numbers gave the fraction for an extended obstruction.
                isolated = rule_numbers(settings.preset, distance_m=length_m, extended=False)[1][1]
        return cls(
            curve=np.ascontiguousarray((np.asarray(inverse_k(k)) / (2.0 * EARTH_RADIUS_M)).T),
            fraction=np.ascontiguousarray(fraction.T),
            isolated=np.ascontiguousarray(isolated),
            median_curve=float(inverse_k(settings.median_k)) / (2.0 * EARTH_RADIUS_M),
            wavelength_m=float(wavelength_m(frequency_hz)),
        )

    def rows(self, rows: Index | NDArray[np.bool_]) -> "Rules":
        """Some of the paths."""
        return Rules(
            curve=self.curve[rows],
            fraction=self.fraction[rows],
            isolated=self.isolated[rows],
            median_curve=self.median_curve,
            wavelength_m=self.wavelength_m,
        )


def closer_look(
    profiles: Profiles, surface_m: Floats, a: Antennas, b: Antennas, rules: Rules, *, step_m: Floats
) -> tuple[NDArray[np.int32], Index]:
    """How many samples come after each, (q, n), at distances that `step_m`, (q,), divides; and how many there are then, (q,).

    They stand round the least margins and normalised clearances of every criterion, as `links.minima` chooses them.
    """
    from fellspan.screening import rays_kernel

    more = np.empty(profiles.distance_m.shape, dtype=np.int32)
    total = np.empty(profiles.which.size, dtype=np.int64)
    rays_kernel.look(
        profiles.distance_m,
        surface_m,
        profiles.last,
        a.amsl_m,
        b.amsl_m,
        rules.curve,
        rules.fraction,
        rules.isolated,
        rules.wavelength_m,
        ISOLATED_BAND,
        ISOLATED_SHARE,
        MINIMA,
        step_m,
        SAME_M,
        more,
        total,
    )
    return more, total


JUDGED: Final = (
    "verdict",
    "basis",
    "confidence",
    "governing",
    "worst_fraction",
    "worst_at_m",
    "extra_at_place_m",
    "extra_for_confidence_m",
)
"""Columns of `Judged` that are columns of `PairResults` too."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Judged:
    """Verdicts of pairs, columns (q,), as those of the same names in `PairResults`."""

    verdict: NDArray[np.int8]
    basis: NDArray[np.int8]
    confidence: Floats
    governing: NDArray[np.int8]
    worst_fraction: Floats
    worst_at_m: Floats
    extra_at_place_m: Floats
    extra_for_confidence_m: Floats
    trees_in_zone: NDArray[np.bool_]
    middle: Floats
    """Share of the path at its sample nearest mid-path."""
    spare_m: Floats
    """(q, n): the least over criteria of what is left of the clearance, cover that was left out counted in."""
    errors: HeightErrors


def judged(
    profiles: Profiles,
    stands: Standings,
    a: Antennas,
    b: Antennas,
    rules: Rules,
    *,
    settings: AssessSettings,
    ground_is_bare: bool,
) -> Judged:
    """The verdict on every pair, and the numbers beside it."""
    from fellspan.screening import rays_kernel

    count = profiles.which.size
    errors = height_errors(profiles, stands, a, b)
    spare = np.empty(profiles.distance_m.shape)
    numbers, answers = np.empty((count, 6)), np.empty((count, 4), dtype=np.int64)
    nothing = np.empty((count, 0))
    rays_kernel.judge(
        profiles.distance_m,
        stands.surface_m,
        profiles.last,
        a.amsl_m,
        b.amsl_m,
        rules.curve,
        rules.fraction,
        rules.isolated,
        rules.median_curve,
        rules.wavelength_m,
        ISOLATED_BAND,
        ISOLATED_SHARE,
        clearance.TOLERANCE_M,
        clearance.SAME,
        errors.surface_m,
        profiles.source,
        errors.a_m,
        errors.b_m,
        profiles.cell_m,
        nothing if stands.left_out_m is None else stands.left_out_m,
        nothing > 0.0 if stands.cover_kind is None else stands.cover_kind == _TREE,
        float(ndtri(settings.confidence)),
        spare,
        numbers,
        answers,
    )
    met, cut = answers[:, 1] > 0, answers[:, 2] > 0
    doubts = roof_doubts(a, profiles, at_a=True) | roof_doubts(b, profiles, at_a=False) | (answers[:, 3] >= 2)
    confidence = ndtr(numbers[:, 4])
    sure = met & (confidence >= settings.confidence) & ~doubts
    known = profiles.known.all(axis=1) & profiles.tells
    return Judged(
        verdict=np.where(cut, OBSTRUCTED, np.where(sure, CLEAR, MARGINAL)).astype(np.int8),
        basis=np.where(known | (not ground_is_bare), _RASTER, _BARE).astype(np.int8),
        confidence=confidence,
        governing=answers[:, 0].astype(np.int8),
        worst_fraction=numbers[:, 0].copy(),
        worst_at_m=numbers[:, 1].copy(),
        extra_at_place_m=numbers[:, 2].copy(),
        extra_for_confidence_m=numbers[:, 3].copy(),
        trees_in_zone=answers[:, 3] % 2 > 0,
        middle=numbers[:, 5].copy(),
        spare_m=spare,
        errors=errors,
    )
