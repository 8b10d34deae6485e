"""Signal of a batch against one bare bilinear gather of the same samples with NumPy, on one thread, in one run.

The whole screening job may take three such gathers, of which sampling itself takes one and the criteria some; what is
left for the signal is held here. Processor time of this thread; absolute figures are printed (pytest -s).
"""

import time
from collections.abc import Callable

import numpy as np
import pytest
from signal_links import CLIMATE, radio

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.links.assess import AssessSettings
from fellspan.links.site import Aim, Antenna
from fellspan.propagation import delta_bullington_loss_db
from fellspan.screening.laid import LaidBucket
from fellspan.screening.pairs import Candidates, Sector, SiteColumns
from fellspan.screening.signal import best_sector, signal_columns

pytestmark = pytest.mark.bench

PAIRS, SAMPLES = 1000, 300
DIFFRACTION_GATHERS = 0.6
SIGNAL_GATHERS = 1.5


def quickest(work: Callable[[], object], times: int = 7) -> float:
    best = float("inf")
    for _ in range(times):
        begun = time.thread_time()
        work()
        best = min(best, time.thread_time() - begun)
    return best


def _gather(raster: np.ndarray, row: np.ndarray, column: np.ndarray) -> np.ndarray:
    i, j = np.floor(row).astype(np.int64), np.floor(column).astype(np.int64)
    u, v = row - i, column - j
    left = raster[i, j] * (1.0 - u) + raster[i + 1, j] * u
    right = raster[i, j + 1] * (1.0 - u) + raster[i + 1, j + 1] * u
    return left * (1.0 - v) + right * v


def _bucket(rough_m: float) -> LaidBucket:
    random = np.random.default_rng(1)
    length = random.uniform(2e3, 25e3, PAIRS)
    ground = 200.0 + np.cumsum(random.normal(0.0, rough_m, (PAIRS, SAMPLES)), axis=1)
    a, b = ground[:, 0] + random.uniform(20.0, 80.0, PAIRS), ground[:, -1] + random.uniform(5.0, 80.0, PAIRS)
    bearing, none = random.uniform(0.0, 360.0, PAIRS), np.zeros(PAIRS, dtype=np.int64)
    return LaidBucket(
        row=np.arange(PAIRS),
        hub=none,
        place=np.arange(PAIRS),
        sector=none,
        length_m=length,
        bearing_ab_deg=bearing,
        bearing_ba_deg=(bearing + 180.0) % 360.0,
        tilt_ab_deg=np.degrees((b - a) / length),
        tilt_ba_deg=np.degrees((a - b) / length),
        a_amsl_m=a,
        b_amsl_m=b,
        middle_latitude_deg=36.0 + random.uniform(0.0, 0.2, PAIRS),
        middle_longitude_deg=-45.0 + random.uniform(0.0, 0.2, PAIRS),
        trees_in_zone=np.zeros(PAIRS, dtype=np.bool_),
        distance_m=length[:, np.newaxis] * np.linspace(0.0, 1.0, SAMPLES),
        ground_m=ground,
        surface_m=ground,
        cover_kind=None,
        is_sea=None,
    )


def _candidates() -> Candidates:
    none = SiteColumns(
        name=(),
        latitude_deg=np.zeros(0),
        longitude_deg=np.zeros(0),
        height_m=np.zeros(0),
        height_reference=np.zeros(0, dtype=np.int8),
        roof_m=np.zeros(0),
    )
    sheet = from_data_sheet(
        name="sector",
        frequency_hz=5.8e9,
        gain_dbi=17.0,
        azimuth_width_deg=90.0,
        elevation_width_deg=8.0,
        front_to_back_db=28.0,
    )
    return Candidates(
        hubs=none,
        places=none,
        sectors=tuple(
            Sector(hub=0, name=str(at), antenna=Antenna(pattern=sheet, mounting=Aim(bearing_deg=at, tilt_deg=-1.0)))
            for at in (0.0, 90.0, 180.0, 270.0)
        ),
        place_antenna=Antenna(gain_dbi=23.0),
        radio=radio(frequency_hz=5.8e9, power_dbm=27.0),
        settings=AssessSettings(climate=CLIMATE),
    )


@pytest.mark.parametrize("rough_m", [0.3, 3.0], ids=["smooth", "rough"])
def test_signal_costs_little_beside_its_samples(rough_m: float) -> None:
    random = np.random.default_rng(2)
    raster = random.normal(0.0, 1.0, (1000, 1000)).astype(np.float32)
    ends = random.uniform(0.0, 990.0, (4, PAIRS))
    row, column = (np.linspace(ends[at], ends[at + 1], SAMPLES).T.copy() for at in (0, 2))
    asked, bucket = _candidates(), _bucket(rough_m)

    def diffraction() -> object:
        return delta_bullington_loss_db(
            bucket.distance_m,
            bucket.ground_m,
            a_amsl_m=bucket.a_amsl_m,
            b_amsl_m=bucket.b_amsl_m,
            frequency_hz=5.8e9,
        )

    def signal() -> object:
        sector = best_sector(asked, hub=bucket.hub, bearing_deg=bucket.bearing_ab_deg, tilt_deg=bucket.tilt_ab_deg)
        return signal_columns(asked, bucket, sector=sector)

    gather, loss, whole = (quickest(work) for work in (lambda: _gather(raster, row, column), diffraction, signal))
    each = 1e6 / PAIRS
    print(
        f"\na pair of {SAMPLES} samples: gather {gather * each:.1f} us, delta-Bullington {loss * each:.1f} us, "
        f"level, availability and verdict {whole * each:.1f} us"
    )
    assert loss < DIFFRACTION_GATHERS * gather
    assert whole < SIGNAL_GATHERS * gather
