"""Hubs and places over small made rasters, and what planning says of each pair, for the tests of screening geometry."""

from dataclasses import fields, replace
from pathlib import Path

import numpy as np
from made_terrain import NORTH, TO_DEGREES, WEST, raster
from numpy.typing import NDArray
from signal_links import CLIMATE

from fellspan.links.assess import AssessSettings
from fellspan.links.radio import Radio
from fellspan.links.site import Antenna
from fellspan.screening.columns import Columns
from fellspan.screening.pairs import HEIGHT_REFERENCES, Candidates, PairResults, Sector, SiteColumns
from fellspan.screening.single import screen_single
from fellspan.terrain.terrain import Terrain

RADIO = Radio(name="five", frequency_hz=5.8e9, power_dbm=20.0, threshold_dbm=-72.0, bandwidth_hz=20e6)
CLOSE = {
    "distance_m": 1e-6,
    "bearing_deg": 1e-9,
    "worst_fraction": 1e-6,
    "worst_at_m": 1e-6,
    "extra_at_place_m": 1e-4,
    "extra_for_confidence_m": 1e-4,
    "diffraction_db": 1e-6,
    "received_at_hub_dbm": 1e-6,
    "received_at_place_dbm": 1e-6,
    "margin_at_hub_db": 1e-6,
    "margin_at_place_db": 1e-6,
    "availability_percent": 1e-6,
    "gap_from_m": 1e-6,
    "gap_to_m": 1e-6,
}
"""How near the arrays come to planning: positions are worked out by other series, some micrometres apart."""
CODES = ("hub", "place", "sector", "status", "verdict", "signal_verdict", "basis", "governing")


def hills(size: tuple[int, int] = (300, 600), *, seed: int = 1, height_m: float = 60.0) -> NDArray[np.float64]:
    """Ground that is rough at every scale, about 100 m above sea level."""
    random = np.random.default_rng(seed)
    across, down = np.fft.fftfreq(size[1]), np.fft.fftfreq(size[0])
    wave = np.hypot(*np.meshgrid(across, down))
    wave[0, 0] = 1.0
    ground = np.fft.ifft2(np.fft.fft2(random.standard_normal(size)) * wave**-1.7).real
    return 100.0 + height_m * (ground - ground.mean()) / ground.std()


def ground_file(folder: Path, **changes: object) -> Path:
    """The hills as a raster, 6 km by 3 km of 10 m cells."""
    return raster(folder / "ground.tif", hills(), **changes)  # type: ignore[arg-type]


def sites(
    letter: str,
    count: int,
    *,
    seed: int,
    height_m: float = 15.0,
    reference: str = "ground",
    roof_m: float = np.nan,
    inset_m: float = 30.0,
    extent_m: tuple[float, float] = (6000.0, 3000.0),
) -> SiteColumns:
    """Sites spread over the rasters."""
    random = np.random.default_rng(seed)
    east = random.uniform(inset_m, extent_m[0] - inset_m, count)
    south = random.uniform(inset_m, extent_m[1] - inset_m, count)
    longitude, latitude = TO_DEGREES.transform(WEST + east, NORTH - south)
    return SiteColumns(
        name=tuple(f"{letter}{number}" for number in range(count)),
        latitude_deg=np.asarray(latitude),
        longitude_deg=np.asarray(longitude),
        height_m=np.full(count, height_m) + np.arange(count) % 5 * 4.0,
        height_reference=np.full(count, HEIGHT_REFERENCES.index(reference), dtype=np.int8),  # type: ignore[arg-type]
        roof_m=np.full(count, roof_m),
    )


def candidates(hubs: SiteColumns, places: SiteColumns, **changes: object) -> Candidates:
    """Hubs with one plain sector each."""
    made = Candidates(
        hubs=hubs,
        places=places,
        sectors=tuple(
            Sector(hub=number, name="all round", antenna=Antenna(gain_dbi=15.0)) for number in range(len(hubs.name))
        ),
        place_antenna=Antenna(gain_dbi=22.0),
        radio=RADIO,
        settings=AssessSettings(climate=CLIMATE),
        target_availability_percent=99.9,
    )
    return replace(made, **changes)  # type: ignore[arg-type]


def every_pair(made: Candidates) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Each hub with each place."""
    hubs, places = len(made.hubs.name), len(made.places.name)
    return np.repeat(np.arange(hubs), places), np.tile(np.arange(places), hubs)


def one_by_one(made: Candidates, hub: NDArray[np.int64], place: NDArray[np.int64], terrain: Terrain) -> PairResults:
    """What planning says of each pair."""
    columns = Columns(hub.copy(), place.copy())
    for row in range(hub.size):
        screen_single(made, columns, row, terrain=terrain)
    return columns.results()


def assert_as_planned(found: PairResults, planned: PairResults, *, confidence: float = 0.9) -> None:
    """Every column of the arrays as planning has it; where draws were spared, on the same side of what is asked."""
    for name in CODES:
        np.testing.assert_array_equal(getattr(found, name), getattr(planned, name), err_msg=name)
    assert found.reason == planned.reason
    for name, tolerance in CLOSE.items():
        got, wanted = getattr(found, name), getattr(planned, name)
        if name in ("distance_m", "bearing_deg"):
            got = np.where(np.isnan(wanted), np.nan, got)  # the way is known of pairs that are refused, too
        np.testing.assert_allclose(got, wanted, rtol=1e-9, atol=tolerance, err_msg=name)
    drawn = np.abs(found.confidence - planned.confidence) > 1e-6
    above = planned.confidence >= confidence
    np.testing.assert_array_equal(found.confidence[drawn] >= confidence, above[drawn])
    # Where bounds decide it is an upper one; where few draws do, it is their share: 512 scatter by 0.013 at most.
    assert (found.confidence[drawn] >= planned.confidence[drawn] - 0.05).all()


def same_bytes(one: PairResults, other: PairResults) -> bool:
    """Whether two sets of columns are the same to the last bit."""
    for field in fields(PairResults):
        first, second = getattr(one, field.name), getattr(other, field.name)
        if field.name == "reason":
            if first != second:
                return False
        elif first.tobytes() != second.tobytes():
            return False
    return True
