"""Signal on columns: every pair equals what planning makes of it alone, whatever the equipment and the weather."""

from dataclasses import replace

import numpy as np
import pytest
from made_pairs import Spot, bucket_of, directions_of, planned, sites_of, spots
from signal_links import CLIMATE, SIGNATURE, TABLE, radio

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.mounting import Mounting
from fellspan.antennas.wires import collinear
from fellspan.climate.given import GivenClimate
from fellspan.links.assess import Assessment, AssessSettings
from fellspan.links.radio import CoChannel, Modulation, Radio
from fellspan.links.site import Aim, Antenna, Diversity, Feeder, Sway
from fellspan.screening.laid import LaidBucket
from fellspan.screening.pairs import SIGNAL_VERDICTS, UNKNOWN, Candidates, Sector
from fellspan.screening.signal import SignalColumns, best_sector, signal_columns

EQUAL_DB, EQUAL_PERCENT = 1e-6, 1e-6
SPOTS = spots(30, seed=3)

SHEET = from_data_sheet(
    name="sector",
    frequency_hz=5.8e9,
    gain_dbi=17.0,
    azimuth_width_deg=90.0,
    elevation_width_deg=8.0,
    front_to_back_db=28.0,
    cross_polar_db=25.0,
)
DISH = dish(frequency_hz=11e9, diameter_m=0.6)
TDD = Radio(
    frequency_hz=5.8e9,
    power_dbm=27.0,
    bandwidth_hz=40e6,
    noise_figure_db=5.0,
    polarization="vertical",
    greatest_distance_m=30e3,
    modulations=(Modulation(name="slow", snr_db=4.0, throughput_bps=20e6), Modulation(name="fast", snr_db=27.0)),
    wanted="slow",
)


def sectors(count: int = 3, *, polarization: str | None = None, **fields: object) -> tuple[Sector, ...]:
    """Sectors that share the horizon, tilted down a little."""
    return tuple(
        Sector(
            hub=0,
            name=f"sector {number}",
            antenna=Antenna(
                pattern=SHEET,
                feeder_loss_db=0.5,
                mounting=Aim(bearing_deg=360.0 / count * number + 10.0, tilt_deg=-1.5, polarization=polarization),  # type: ignore[arg-type]
                **fields,  # type: ignore[arg-type]
            ),
        )
        for number in range(count)
    )


def one_sector(antenna: Antenna) -> tuple[Sector, ...]:
    return (Sector(hub=0, name="all round", antenna=antenna),)


PLAIN = Antenna(gain_dbi=38.0)
DUPLEX = radio(
    duplex="frequency", frequency_hz=11.2e9, frequency_a_hz=10.9e9, frequency_b_hz=11.4e9, polarization="vertical"
)


def candidates(made: list[Spot] = SPOTS, **changes: object) -> Candidates:
    hubs, places = sites_of(made)
    fields: dict[str, object] = {
        "hubs": hubs,
        "places": places,
        "sectors": one_sector(PLAIN),
        "place_antenna": PLAIN,
        "radio": radio(),
        "settings": AssessSettings(climate=CLIMATE),
    }
    return Candidates(**(fields | changes))  # type: ignore[arg-type]


def settings(climate: GivenClimate = CLIMATE, **changes: object) -> AssessSettings:
    return AssessSettings(climate=climate, **changes)  # type: ignore[arg-type]


CASES: dict[str, Candidates] = {
    "plain gains": candidates(),
    "sectors": candidates(sectors=sectors(), place_antenna=Antenna(pattern=SHEET, feeder_loss_db=1.0), radio=TDD),
    "sectors with a target": candidates(
        sectors=sectors(4), place_antenna=Antenna(gain_dbi=23.0), radio=TDD, target_availability_percent=99.99
    ),
    "a target and hardly any margin wanted": candidates(target_availability_percent=99.9, wanted_margin_db=1.0),
    "slant against vertical": candidates(
        sectors=sectors(2, polarization="slant+45"),
        place_antenna=Antenna(pattern=SHEET, mounting=Aim(polarization="vertical", roll_deg=4.0)),
        radio=TDD,
    ),
    "an omni": candidates(
        sectors=one_sector(Antenna(pattern=collinear(frequency_hz=5.8e9, elements=8))),
        place_antenna=Antenna(pattern=SHEET, sway=Sway(azimuth_sigma_deg=1.0)),
        radio=TDD,
    ),
    "two frequencies": candidates(radio=DUPLEX, place_antenna=Antenna(pattern=DISH)),
    "a dish that hangs still": candidates(
        sectors=one_sector(Antenna(pattern=DISH, mounting=Mounting(bearing_deg=70.0, tilt_deg=0.3)))
    ),
    "lines, radomes, second antennas": candidates(
        radio=DUPLEX,
        sectors=(
            *sectors(1, diversity=Diversity(spacing_m=8.0), radome_wet_db=2.0),
            Sector(hub=0, name="other", antenna=Antenna(gain_dbi=8.0, branching_loss_db=1.0)),
        ),
        place_antenna=Antenna(
            gain_dbi=38.0,
            feeder=Feeder(kind="coaxial 13 mm", length_m=12.0),
            diversity=Diversity(spacing_m=5.0, gain_dbi=33.0),
            radome_wet_db=1.0,
        ),
    ),
    "both polarizations on one channel": candidates(
        radio=radio(dual_polarization=True, co_channel=CoChannel(canceller_db=20.0)),
        place_antenna=Antenna(pattern=DISH),
        sectors=one_sector(Antenna(pattern=DISH)),
    ),
    "signatures": candidates(
        radio=radio(modulations=tuple(replace(row, signature=SIGNATURE) for row in TABLE), wanted="256-QAM")
    ),
    "edition 19 of multipath": candidates(
        settings=settings(replace(CLIMATE, log_k=-5.5, dn75=10.0), rain_edition="17", rain_reading="B")
    ),
    "the quick method, no tail": candidates(
        settings=settings(replace(CLIMATE, terrain_roughness_m=None, gradient_tail_n_per_km=None))
    ),
    "dry snow": candidates(settings=settings(replace(CLIMATE, rain_height_m=-900.0))),
    "another k": candidates(settings=settings(median_k=0.9)),
    "power unknown": candidates(radio=radio(power_dbm=None)),
    "power of one row unknown": candidates(
        radio=radio(power_dbm=None, modulations=(replace(TABLE[0], power_dbm=20.0), *TABLE[1:]))
    ),
    "no threshold": candidates(radio=Radio(frequency_hz=7e9, power_dbm=20.0), wanted_margin_db=3.0),
    "one threshold": candidates(radio=Radio(frequency_hz=7e9, power_dbm=20.0, threshold_dbm=-75.0)),
    "gain unknown": candidates(place_antenna=Antenna(), target_availability_percent=99.0),
}


def _or_nan(values: list[float | None]) -> np.ndarray:
    return np.array([np.nan if value is None else value for value in values])


def assert_equal(found: SignalColumns, assessments: list[Assessment]) -> None:
    results = [one.result for one in assessments]
    for name, values, tolerance in (
        ("diffraction_db", [one.losses_db.diffraction for one in results], EQUAL_DB),
        ("received_at_hub_dbm", [one.received_dbm.at_a for one in results], EQUAL_DB),
        ("received_at_place_dbm", [one.received_dbm.at_b for one in results], EQUAL_DB),
        ("margin_at_hub_db", [one.margin_db.at_a for one in results], EQUAL_DB),
        ("margin_at_place_db", [one.margin_db.at_b for one in results], EQUAL_DB),
        ("availability_percent", [one.availability_percent.year for one in results], EQUAL_PERCENT),
    ):
        np.testing.assert_allclose(getattr(found, name), _or_nan(values), rtol=0.0, atol=tolerance, err_msg=name)
    codes = [UNKNOWN if one.signal_verdict is None else SIGNAL_VERDICTS.index(one.signal_verdict) for one in results]
    np.testing.assert_array_equal(found.signal_verdict, codes)


def _laid(asked: Candidates, made: list[Spot] = SPOTS) -> tuple[LaidBucket, np.ndarray, list[Assessment]]:
    """The bucket, the sector of each pair by `best_sector`, and what planning makes of the pairs with it."""
    bearing, tilt = directions_of(made, k=asked.settings.median_k)
    sector = best_sector(asked, hub=np.zeros(len(made), dtype=np.int64), bearing_deg=bearing, tilt_deg=tilt)
    assessments = planned(asked, made, sector)
    return bucket_of(assessments, sector), sector, assessments


@pytest.mark.parametrize("name", CASES)
def test_each_pair_equals_its_plan(name: str) -> None:
    asked = CASES[name]
    bucket, sector, assessments = _laid(asked)
    assert_equal(signal_columns(asked, bucket, sector=sector), assessments)


def test_the_cases_hold_what_they_should() -> None:
    # Otherwise equality would prove little: obstructed and free paths, all verdicts, availabilities between the ends.
    asked = CASES["sectors with a target"]
    bucket, sector, assessments = _laid(asked)
    found = signal_columns(asked, bucket, sector=sector)
    assert set(sector.tolist()) == {0, 1, 2, 3}
    assert np.count_nonzero(found.diffraction_db == 0.0) > 3
    assert np.count_nonzero(found.diffraction_db > 20.0) > 3
    assert {one.result.signal_verdict for one in assessments} == {"meets", "marginal", "below"}
    assert np.count_nonzero((found.availability_percent > 90.0) & (found.availability_percent < 99.999)) > 3
    assert np.count_nonzero(found.availability_percent == 0.0) > 3
    assert any(one.result.losses_db.vegetation > 0.0 for one in assessments)
    assert bucket.is_sea is not None
    assert bucket.is_sea.any()
