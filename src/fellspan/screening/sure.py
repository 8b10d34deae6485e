"""What drawn errors can do to a clear verdict: bounds first, then as many draws as it takes, then planning's own.

The draws of `design` fail where the error at any sample exceeds the height to spare there. Their share is at least that of the
worst sample, and at most the sum over all. Where the confidence asked lies between the two, the same errors are drawn on the
arrays at hand, until their share tells on which side planning's 10,000 lie. The few pairs that are left are `own_draws`'.
"""

from collections.abc import Callable
from dataclasses import dataclass
from statistics import NormalDist
from typing import Final

import numpy as np
from numpy.typing import NDArray

from fellspan.design.draws import DRAWS, MOST_POINTS, SEED
from fellspan.design.error_model import error_models
from fellspan.design.normals import KEPT, normals
from fellspan.links import clearance
from fellspan.screening.profiles import Profiles
from fellspan.screening.stand import HeightErrors, Standings

Floats = NDArray[np.float64]
Index = NDArray[np.int64]

ALLOWANCE: Final = 6.0
"""Standard errors of the share of the draws by which a bound must keep off the confidence asked: one pair in 10^9 passes."""
THINNED: Final = 0.2
"""Of what fails, so much more or less where a path has more samples than planning draws: an estimate makes up for the others
(our own rule; a twentieth was met),"""
MOST_THINNED: Final = 0.02
"""and never more than this."""
THINNED_ALIKE: Final = 0.034
"""How far the heights that planning looks for shift what it draws otherwise thinned alike, standard errors (our own rule: half
of it was met)."""

UNSURE, HOLDS, FALLS = range(3)
"""What draws say of a clear verdict."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Likely:
    """What draws say of some pairs that are clear by the quick confidence, columns (m,)."""

    verdict: NDArray[np.int8]
    """`HOLDS` where 'clear' stands, `FALLS` where it does not, `UNSURE` where only planning's own draws can tell."""
    confidence: Floats
    """The share of the draws made that holds; where bounds decide, the upper one."""
    made: Index
    """How many draws were made: 0 where bounds decide."""


def likely(
    spare_m: Floats, profiles: Profiles, stands: Standings, errors: HeightErrors, which: Index, *, confidence: float
) -> Likely:
    """Of the pairs `which`, (m,), which all are clear by the quick confidence: whether drawn errors leave them clear.

    `spare_m`, (q, n), is the height that rays have to spare over what they must clear, the least over the rules.
    """
    paths = _Paths.of(spare_m, profiles, stands, errors)
    least, most = paths.bounds(which)
    verdict = np.where(most < confidence, FALLS, np.where(least < confidence, UNSURE, HOLDS)).astype(np.int8)
    share, made = np.minimum(most, 1.0), np.zeros(which.size, dtype=np.int64)
    between = np.flatnonzero(verdict == UNSURE)
    if between.size:
        verdict[between], share[between], made[between] = paths.drawn(which[between], confidence)
    return Likely(verdict=verdict, confidence=share, made=made)


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Paths:
    """What the errors of paths are made of, as the kernels take it."""

    arrays: tuple[NDArray[np.generic], ...]
    """In the order in which `errors_kernel.bound` and `draw` take them."""
    thinned: NDArray[np.bool_]
    """Whether planning may leave samples out."""

    @classmethod
    def of(cls, spare_m: Floats, profiles: Profiles, stands: Standings, errors: HeightErrors) -> "_Paths":
        nothing = np.empty((profiles.last.size, 0))
        return cls(
            arrays=(
                profiles.last,
                profiles.distance_m,
                profiles.ground_m,
                spare_m,
                nothing if profiles.cover_m is None else profiles.cover_m,
                nothing > 0.0 if stands.bared is None else stands.bared,
                profiles.sigma_m,
                profiles.source,
                profiles.cell_m,
                errors.a_m,
                errors.b_m,
                error_models(profiles.cell_m),
            ),
            thinned=profiles.last >= MOST_POINTS,
        )

    def bounds(self, which: Index) -> tuple[Floats, Floats]:
        """The least and the most that drawn errors leave of the probability that all rules hold, and room for their scatter."""
        from fellspan.screening import errors_kernel

        worst, together = np.empty(which.size), np.empty(which.size)
        self._over(errors_kernel.bound, which, worst, together)
        least, most = (
            np.clip(fails + way * self.thinned[which] * np.minimum(THINNED * fails, MOST_THINNED), 0.0, 1.0)
            for way, fails in ((1.0, together), (-1.0, worst))
        )
        return 1.0 - least - _scatter(least), 1.0 - most + _scatter(most)

    def drawn(self, which: Index, confidence: float) -> tuple[NDArray[np.int8], Floats, Index]:
        """Verdicts, shares that hold, and how many draws were made."""
        from fellspan.screening import draws_kernel

        verdict, share = np.empty(which.size, dtype=np.int8), np.empty(which.size)
        made, samples = np.empty(which.size, dtype=np.int64), np.empty(which.size, dtype=np.int64)
        self._over(
            draws_kernel.draw,
            which,
            normals(SEED, KEPT),
            1.0 - confidence,
            ALLOWANCE,
            DRAWS,
            THINNED_ALIKE * NormalDist().pdf(NormalDist().inv_cdf(confidence)) * self.thinned[which],
            verdict,
            share,
            made,
            samples,
        )
        return verdict, share, 2 * made

    def _over(self, kernel: Callable[..., None], which: Index, *more: object) -> None:
        kernel(which, *self.arrays, clearance.TOLERANCE_M, *more)


def _scatter(fails: Floats) -> Floats:
    """How far the share of failing draws may be off its mean, (m,): Bernstein's bound.

    Half of the draws mirror the other half, so that it may scatter as that of half as many.
    """
    few = ALLOWANCE**2 / 3.0 / (0.5 * DRAWS)
    return np.asarray(ALLOWANCE * np.sqrt(fails * (1.0 - fails) / (0.5 * DRAWS)) + few)
