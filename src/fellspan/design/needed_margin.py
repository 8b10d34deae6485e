"""The margin that a target of availability asks of one direction: the outage of `links.fading`, solved for the margin.

Holds no formula of fading itself; knows no antennas by name, no ranking and no pages.
"""

from dataclasses import replace
from typing import Final

import numpy as np

from fellspan.links.fading import Fading, Receiver
from fellspan.links.radio import Radio
from fellspan.links.receivers import receiver_of, rows_of, wanted_index
from fellspan.links.site import Antenna

MOST_DB: Final = 100.0
"""Margins beyond this are not looked for."""
_COARSE: Final = 401
_FINE: Final = 101


def wanted_receiver(
    radio: Radio, antenna: Antenna, *, discrimination_db: float, gain_dbi: float | None, line_loss_db: float
) -> Receiver | None:
    """What the wanted modulation alone asks of fading, arrays of shape (1,); None where the radio has no threshold."""
    rows = rows_of(radio)
    wanted = wanted_index(radio, rows)
    if wanted is None:
        return None
    return receiver_of(
        radio,
        (rows[wanted],),
        antenna,
        discrimination_db=discrimination_db,
        gain_dbi=gain_dbi,
        line_loss_db=line_loss_db,
    )


def unpowered(radio: Radio) -> Radio:
    """A radio without its power: two that are the same then ask the same of fading."""
    return replace(radio, power_dbm=None, power_per_chain_dbm=None)


def needed_margin_db(fading: Fading, receiver: Receiver, *, target_percent: float, exact: bool = True) -> float | None:
    """Least margin in clear air at which a direction is there for a share of the average year.

    Parameters
    ----------
    fading, receiver
        Of the direction; the receiver with arrays of shape (1,).
    target_percent
        Share of the average year, %, above 0 and below 100.
    exact
        False interpolates on quarters of a dB (off by a few thousandths of a dB); True solves to 0.0001 dB.

    Returns
    -------
    margin_db
        0 or more; None where availability is not computed, or where no margin up to `MOST_DB` reaches the target (selective
        fading and cross polarization, for instance, do not go away with margin).
    """
    margins = np.linspace(0.0, MOST_DB, _COARSE)
    unavailable = 100.0 - target_percent
    outage = _outage(fading, receiver, margins)
    above = np.flatnonzero(~(outage <= unavailable))
    if np.isnan(outage).any() or (above.size and above[-1] == margins.size - 1):
        return None
    if above.size == 0:
        return 0.0
    low = int(above[-1])
    if not exact:
        x = np.log(np.maximum(outage[low : low + 2], 1e-12))
        share = float((x[0] - np.log(unavailable)) / (x[0] - x[1])) if x[0] > x[1] else 1.0
        return float(margins[low] + min(max(share, 0.0), 1.0) * (margins[1] - margins[0]))
    between = margins[low], margins[low + 1]
    for _ in range(2):
        fine = np.linspace(*between, _FINE)
        good = np.flatnonzero(_outage(fading, receiver, fine) <= unavailable)
        first = int(good[0])
        if first == 0:
            return float(fine[0])
        between = fine[first - 1], fine[first]
    return float(between[1])


def _outage(fading: Fading, receiver: Receiver, margins: np.ndarray) -> np.ndarray:
    year, _ = fading.outage(margins, receiver)
    return np.asarray(year.total_percent, dtype=np.float64)
