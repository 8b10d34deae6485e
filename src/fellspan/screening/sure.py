"""What drawn errors can do to a clear verdict, bounded from both sides in place of ten thousand draws a pair.

The draws of `design` fail where the error at any sample exceeds the height to spare there. Their share is at least that of the
worst sample, and at most the sum along a chain of what each sample adds to the one before it. Draws are needed only where the
confidence asked lies between the two. The errors are those of `design.draws`, their formulas written for arrays of paths.
"""

from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr, owens_t

from fellspan.design.draws import DRAWS, MOST_POINTS
from fellspan.design.error_model import GRADIENT_UNIT, error_model
from fellspan.links import clearance
from fellspan.screening.profiles import Profiles
from fellspan.screening.stand import HeightErrors, Standings

Floats = NDArray[np.float64]
Index = NDArray[np.int64]

ALLOWANCE: Final = 6.0
"""Standard errors of the share of the draws by which a bound must keep off the confidence asked: one pair in 10^9 passes."""
THINNED: Final = 0.02
"""And so much more where a path has more samples than are drawn: an estimate makes up for the others (our own rule)."""


def likely_clear(
    spare_m: Floats,
    profiles: Profiles,
    stands: Standings,
    errors: HeightErrors,
    which: Index,
    *,
    confidence: float,
) -> tuple[Floats, Floats]:
    """Of the pairs `which`, (m,), which all are clear by the quick confidence: the least and the most that drawn errors leave.

    `spare_m`, (q, n), is the height that rays have to spare over what they must clear, the least over the rules.

    Returns
    -------
    least, most
        Bounds of the probability that all rules hold, by the draws, (m,), and room for their scatter: 'clear' stands
        where `least` is at least the confidence asked, and falls where `most` is below it.
    """
    part = _Part.of(spare_m, profiles, stands, errors, which)
    sigma = np.sqrt(np.maximum(part.variance(), 0.0))
    z = np.where(part.spare_m >= -clearance.TOLERANCE_M, np.inf, -np.inf)
    np.divide(part.spare_m, sigma, out=z, where=sigma > 0.0)
    fails = ndtr(-z)
    allowed = 1.0 - confidence
    # Half of the draws mirror the other half, so that their share may scatter by up to the root of two more.
    scatter = ALLOWANCE * np.sqrt(2.0 * allowed * confidence / DRAWS)
    off = scatter + np.where(profiles.last[which] >= MOST_POINTS, THINNED, 0.0)
    most = 1.0 - fails.max(axis=1) + off
    least = 1.0 - fails.sum(axis=1) - off
    between = np.flatnonzero((least < confidence) & (most >= confidence))
    if between.size:
        few = part.rows(between)
        least[between] = 1.0 - few.chained(z[between], sigma[between], fails[between]) - off[between]
    least[~part.is_plain] = -np.inf
    most[~part.is_plain] = np.inf
    return least, most


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class _Part:
    """Some pairs with what their errors are made of: (m, n), and (m, 1) for what holds all along."""

    reach_m: Floats
    cover_reach_m: Floats
    position_m: Floats
    gradient: float
    distance_m: Floats
    length_m: Floats
    spare_m: Floats
    ground_m: Floats
    cover_m: Floats
    slope: Floats
    curve: Floats
    a_m: Floats
    b_m: Floats
    is_plain: NDArray[np.bool_]
    """Pairs on which cover stands on one source only, bare somewhere: else errors of ground and cover are not told apart so."""

    @classmethod
    def of(cls, spare_m: Floats, profiles: Profiles, stands: Standings, errors: HeightErrors, which: Index) -> "_Part":
        distance = profiles.distance_m[which]
        length = profiles.length_m[which, np.newaxis]
        curve = clearance.bulge_m(distance, k=1.0)
        sigma = profiles.sigma_m[which]
        ground = np.minimum(profiles.ground_sigma_m[which], sigma)
        total = sigma if stands.bared is None else np.where(stands.bared[which], ground, sigma)
        source = profiles.source[which]
        plain = np.ones(which.size, dtype=np.bool_)
        if profiles.cover_m is not None:
            one = source == source[:, :1]
            bare = profiles.cover_m[which] == 0.0
            plain = (bare & one).any(axis=1) & (bare | one).all(axis=1)
        models = [error_model(cell) for cell in profiles.cell_m[which].tolist()]
        return cls(
            reach_m=np.array([[one.ground_reach_m] for one in models]),
            cover_reach_m=np.array([[one.cover_reach_m] for one in models]),
            position_m=np.array([[one.position_error_m] for one in models]),
            gradient=models[0].gradient_error,
            distance_m=distance,
            length_m=length,
            spare_m=spare_m[which],
            ground_m=ground,
            cover_m=np.sqrt(np.maximum(total**2 - ground**2, 0.0)),
            # What is known exactly does not move with a shift along the path.
            slope=np.where(total > 0.0, _slopes(profiles, which), 0.0),
            curve=curve,
            a_m=errors.a_m[which, np.newaxis],
            b_m=errors.b_m[which, np.newaxis],
            is_plain=plain,
        )

    def rows(self, rows: Index) -> "_Part":
        """Some of them."""
        return _Part(
            gradient=self.gradient,
            reach_m=self.reach_m[rows],
            cover_reach_m=self.cover_reach_m[rows],
            position_m=self.position_m[rows],
            distance_m=self.distance_m[rows],
            length_m=self.length_m[rows],
            spare_m=self.spare_m[rows],
            ground_m=self.ground_m[rows],
            cover_m=self.cover_m[rows],
            slope=self.slope[rows],
            curve=self.curve[rows],
            a_m=self.a_m[rows],
            b_m=self.b_m[rows],
            is_plain=self.is_plain[rows],
        )

    def _levers(self) -> tuple[Floats, Floats, Floats]:
        """What the errors at A and at B do to the clearance, and what the ground under the sample shares with them, (m, n)."""
        share = self.distance_m / self.length_m
        a, b = (1.0 - share) * self.a_m, share * self.b_m
        to_a, to_b = np.exp(-self.distance_m / self.reach_m), np.exp(-(self.length_m - self.distance_m) / self.reach_m)
        return a, b, a * to_a + b * to_b

    def variance(self) -> Floats:
        """Variance of the clearance at each sample, m2: `design.draws.marginal_m` squared."""
        a, b, shared = self._levers()
        between_ends = np.exp(-self.length_m / self.reach_m)
        variance = self.ground_m**2 + a**2 + b**2 - 2.0 * self.ground_m * shared + 2.0 * a * b * between_ends
        variance += self.cover_m**2 + 2.0 * (self.slope * self.position_m) ** 2
        return np.asarray(variance + (self.curve * GRADIENT_UNIT * self.gradient) ** 2)

    def _with_next(self) -> Floats:
        """Covariance of the clearance at each sample and the next one, m2, (m, n - 1)."""
        a, b, _ = self._levers()
        apart = np.diff(self.distance_m, axis=1)
        alike, alike_cover = np.exp(-apart / self.reach_m), np.exp(-apart / self.cover_reach_m)
        ground = np.broadcast_to(self.ground_m, a.shape)
        to_a, to_b = np.exp(-self.distance_m / self.reach_m), np.exp(-(self.length_m - self.distance_m) / self.reach_m)
        one, two = slice(None, -1), slice(1, None)
        joint = ground[:, one] * ground[:, two] * alike + a[:, one] * a[:, two] + b[:, one] * b[:, two]
        joint += (a[:, one] * b[:, two] + a[:, two] * b[:, one]) * np.exp(-self.length_m / self.reach_m)
        for here, there in ((one, two), (two, one)):
            joint -= ground[:, here] * (a[:, there] * to_a[:, here] + b[:, there] * to_b[:, here])
        cover = np.broadcast_to(self.cover_m, a.shape)
        joint += cover[:, one] * cover[:, two] * alike_cover
        joint += self.slope[:, one] * self.slope[:, two] * self.position_m**2 * (alike + 1.0)
        return np.asarray(joint + self.curve[:, one] * self.curve[:, two] * (GRADIENT_UNIT * self.gradient) ** 2)

    def chained(self, z: Floats, sigma_m: Floats, fails: Floats) -> Floats:
        """The most of the probability that any sample fails: what each adds to the one before it, (m,).

        Hunter's bound along a chain (D. Hunter, Journal of Applied Probability 13, 1976; from memory), the joint probability of
        two samples by Owen's function.
        """
        scale = np.maximum(sigma_m[:, :-1] * sigma_m[:, 1:], 1e-30)
        alike = np.clip(self._with_next() / scale, -1.0, 1.0)
        spread = np.sqrt(np.maximum(1.0 - alike**2, 1e-18))
        one, two = np.clip(z[:, :-1], 1e-6, 40.0), np.clip(z[:, 1:], 1e-6, 40.0)
        joint = 0.5 * (fails[:, :-1] + fails[:, 1:])
        joint -= owens_t(one, (two - alike * one) / (one * spread))
        joint -= owens_t(two, (one - alike * two) / (two * spread))
        joint = np.clip(joint, 0.0, np.minimum(fails[:, :-1], fails[:, 1:]))
        return np.asarray(fails[:, 0] + np.maximum(fails[:, 1:] - joint, 0.0).sum(axis=1))


def _slopes(profiles: Profiles, which: Index) -> Floats:
    """Slope of the ground along paths over about one cell each way, as `design.draws` takes it, (m, n)."""
    found = np.empty((which.size, profiles.distance_m.shape[1]))
    for place, row in enumerate(which.tolist()):
        distance, ground = profiles.distance_m[row], profiles.ground_m[row]
        half = max(0.5 * float(profiles.cell_m[row]), 1e-6)
        before, after = np.maximum(distance - half, 0.0), np.minimum(distance + half, distance[-1])
        found[place] = (np.interp(after, distance, ground) - np.interp(before, distance, ground)) / (after - before)
    return found
