"""Which pairs are clear beyond what drawn errors could take away: a bound in place of thousands of draws.

The draws of `design` fail where the error at any sample exceeds the height to spare there; their share is no more than the sum
over the samples. Where even that sum stays below what the confidence allows, nothing need be drawn.
"""

import numpy as np
from numpy.typing import NDArray

from fellspan.links.assess import AssessSettings
from fellspan.screening.profiles import Profiles
from fellspan.screening.rays import Rays
from fellspan.screening.stand import HeightErrors, Standings

Index = NDArray[np.int64]


def surely_clear(
    rays: Rays,
    profiles: Profiles,
    stands: Standings,
    errors: HeightErrors,
    which: Index,
    *,
    settings: AssessSettings,
) -> NDArray[np.bool_]:
    """Of the pairs `which`, (m,), those that stay clear whatever the draws are, (m,)."""
    return np.zeros(which.size, dtype=np.bool_)
