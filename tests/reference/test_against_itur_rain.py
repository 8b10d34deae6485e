"""Rain over a path against itur 0.4.0, which has edition 17 of P.530 and reads the bracket of equation (36) as our reading B.

Its `tau` is the tilt, 90 for vertical. Its other functions of P.530 are not used here.
"""

import numpy as np
import pytest

from fellspan.propagation import rain_events_per_year, rain_loss_001_db, rain_loss_db, rain_percent

CASES = [
    (km, ghz, rain, tilt)
    for km in (0.3, 1.0, 5.0, 12.0, 28.0, 45.0)
    for ghz in (6.0, 11.0, 18.0, 38.0, 80.0)
    for rain in (5.0, 30.0, 100.0)
    for tilt in (0.0, 45.0, 90.0)
]
PERCENTS = np.array([0.001, 0.003, 0.01, 0.05, 0.3, 1.0])


# itur takes a root of a negative number below 10 GHz, and then does not use it.
its_unused_root = pytest.mark.filterwarnings("ignore:invalid value encountered in scalar power:RuntimeWarning")


@its_unused_root
def test_loss_in_edition_17_with_reading_b() -> None:
    from itur.models.itu530 import rain_attenuation

    worst = 0.0
    for km, ghz, rain, tilt in CASES:
        at_001 = rain_loss_001_db(
            km * 1e3, rain_rate_001_mm_h=rain, frequency_hz=ghz * 1e9, tilt_deg=tilt, edition="17"
        )
        ours = rain_loss_db(at_001, percent=PERCENTS, frequency_hz=ghz * 1e9, reading="B")
        theirs = [rain_attenuation(0.0, 0.0, km, ghz, 0.0, p, tau=tilt, R001=rain).value for p in PERCENTS]
        worst = max(worst, float(np.max(np.abs(ours / np.array(theirs) - 1.0))))
    # Same formulas: rounding only. The requirement is 1 %.
    assert worst < 1e-9


@pytest.mark.parametrize(("loss_db", "km", "ghz"), [(3.0, 10, 11), (20.0, 10, 23), (15.0, 1, 80), (0.4, 10, 11)])
def test_percentage_for_a_loss(loss_db: float, km: float, ghz: float) -> None:
    from itur.models.itu530 import inverse_rain_attenuation, rain_event_count

    at_001 = rain_loss_001_db(
        km * 1e3, rain_rate_001_mm_h=40.0, frequency_hz=ghz * 1e9, polarization="vertical", edition="17"
    )
    ours = rain_percent(loss_db, loss_001_db=at_001, frequency_hz=ghz * 1e9, reading="B")
    theirs = inverse_rain_attenuation(0.0, 0.0, km, ghz, 0.0, loss_db, tau=90, R001=40.0).value
    assert ours == pytest.approx(float(theirs), rel=1e-6)
    events = rain_event_count(0.0, 0.0, km, ghz, 0.0, loss_db, tau=90, R001=40.0)
    assert rain_events_per_year(ours) == pytest.approx(float(getattr(events, "value", events)), rel=1e-6)
