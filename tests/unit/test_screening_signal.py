"""Signal on columns: every pair equals what planning makes of it alone, whatever the equipment and the weather."""

from dataclasses import replace

import numpy as np
import pytest
from made_pairs import HUB, Spot, bucket_of, directions_of, planned, sites_of, spots
from signal_links import CLIMATE, SIGNATURE, TABLE, radio

from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.mounting import Mounting
from fellspan.antennas.wires import collinear
from fellspan.climate.assembling import figures_for
from fellspan.climate.columns import ClimateColumns, climate_columns
from fellspan.climate.given import GivenClimate
from fellspan.errors import AntennaError
from fellspan.geodesy.position import Position
from fellspan.links.antenna_gains import antennas_of
from fellspan.links.assess import Assessment, AssessSettings
from fellspan.links.radio import CoChannel, Modulation, Radio
from fellspan.links.site import Aim, Antenna, Diversity, Feeder, Link, Site, Sway
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


@pytest.mark.parametrize("power_dbm", [-12.0, 0.0, 10.0])
def test_low_k_counts_where_it_can_use_a_margin_up(power_dbm: float) -> None:
    # Long smooth paths near grazing at 2 GHz: without rain, and little multipath at the margins that are left.
    low = spots(24, seed=8, longest_m=60e3, shortest_m=25e3, rough_m=(0.05, 0.3))
    still = replace(CLIMATE, rain_rate_001_mm_h=0.0, dn1_n_per_km=-1.0)
    asked = candidates(
        low,
        radio=Radio(frequency_hz=2e9, power_dbm=power_dbm, threshold_dbm=-90.0, polarization="vertical"),
        settings=settings(still),
        wanted_margin_db=0.0,
    )
    sector = np.zeros(len(low), dtype=np.int64)
    assessments = planned(asked, low, sector)
    assert_equal(signal_columns(asked, bucket_of(assessments, sector), sector=sector), assessments)
    years = [one.result.signal.a_to_b.modulations[0].year for one in assessments if one.result.signal is not None]
    taken = [year.diffraction for year in years if year is not None and year.diffraction is not None]
    assert sum(1e-6 < one < 50.0 for one in taken) > 2


def test_a_target_that_three_decibels_would_reach_is_nearly_met() -> None:
    free = CASES["a target and hardly any margin wanted"]
    bucket, sector, assessments = _laid(free)
    shares = np.array([one.result.availability_percent.year or 0.0 for one in assessments])
    margin = np.array([one.result.margin_db.at_a or 0.0 for one in assessments])
    row = int(np.flatnonzero((shares > 90.0) & (shares < 99.999) & (margin > 2.0))[0])
    asked = replace(free, target_availability_percent=float(shares[row] + 0.2 * (100.0 - shares[row])))
    assessments = planned(asked, SPOTS, sector)
    found = signal_columns(asked, bucket, sector=sector)
    assert_equal(found, assessments)
    assert SIGNAL_VERDICTS[int(found.signal_verdict[row])] == "marginal"


def test_maps_are_read_as_for_one_link() -> None:
    pytest.importorskip("itur")
    # Only the rain is said; a sector of unknown gain needs no weather, and then its air is the standard one.
    asked = candidates(
        SPOTS[:12],
        settings=settings(GivenClimate(rain_rate_001_mm_h=45.0)),
        sectors=(*one_sector(PLAIN), Sector(hub=0, name="nobody knows", antenna=Antenna())),
        radio=radio(frequency_hz=23e9),
    )
    sector = np.arange(12) % 2
    assessments = planned(asked, SPOTS[:12], sector)
    found = signal_columns(asked, bucket_of(assessments, sector), sector=sector)
    assert_equal(found, assessments)
    assert np.array_equal(np.isnan(found.received_at_hub_dbm), sector == 1)


def test_the_sector_that_gives_most_serves_and_the_first_of_equals() -> None:
    asked = candidates(sectors=sectors(4), radio=TDD)
    bearing, tilt = np.array([10.0, 55.0, 100.1, 190.0, 280.0, 359.0, 144.9]), np.full(7, -1.0)
    hub = np.zeros(7, dtype=np.int64)
    # 55 degrees lies in the middle between the first two, which give the same there.
    np.testing.assert_array_equal(
        best_sector(asked, hub=hub, bearing_deg=bearing, tilt_deg=tilt), [0, 0, 1, 2, 3, 0, 1]
    )
    gains = [
        [
            antennas_of(
                Link(
                    name="one",
                    a=Site(name="a", position=HUB, height_m=1.0),
                    b=Site(name="b", position=HUB, height_m=1.0),
                    radio=TDD,
                    antenna_a=sector.antenna,
                ),
                bearings_deg=(at, (at + 180.0) % 360.0),
                tilts_deg=(-1.0, 1.0),
            ).a.gain_dbi
            for sector in asked.sectors
        ]
        for at in bearing.tolist()
    ]
    chosen = best_sector(asked, hub=hub, bearing_deg=bearing, tilt_deg=tilt)
    for one, row in zip(chosen.tolist(), gains, strict=True):
        assert row[one] == pytest.approx(max(row), abs=1e-9)  # type: ignore[type-var]


def test_sectors_of_many_hubs_keep_to_their_hub() -> None:
    first, second = sectors(2)
    unknown = Sector(hub=2, name="unknown", antenna=Antenna())
    asked = candidates(
        sectors=(
            replace(first, hub=1),
            unknown,
            replace(second, hub=1),
            Sector(hub=0, name="only", antenna=PLAIN),
            replace(unknown, name="unknown too"),
        )
    )
    hub = np.array([1, 0, 1, 2, 1])
    bearing = np.array([10.0, 190.0, 190.0, 0.0, 20.0])
    found = best_sector(asked, hub=hub, bearing_deg=bearing, tilt_deg=np.zeros(5))
    np.testing.assert_array_equal(found, [0, 3, 2, 1, 0])


def test_an_antenna_that_cannot_hang_so_is_refused_as_in_planning() -> None:
    omni = Antenna(pattern=collinear(frequency_hz=5.8e9, elements=8), mounting=Aim(polarization="horizontal"))
    asked = candidates(SPOTS[:2], sectors=one_sector(omni), radio=TDD)
    sector = np.zeros(2, dtype=np.int64)
    bucket = bucket_of(planned(replace(asked, sectors=one_sector(PLAIN)), SPOTS[:2], sector), sector)
    with pytest.raises(AntennaError, match="cannot be mounted"):
        signal_columns(asked, bucket, sector=sector)


def test_a_batch_does_not_depend_on_what_else_is_in_it() -> None:
    asked = CASES["two frequencies"]
    bucket, sector, _ = _laid(asked)
    whole = signal_columns(asked, bucket, sector=sector)
    rows = np.arange(3, 9)
    part = replace(
        bucket, **{name: getattr(bucket, name)[rows] for name in bucket.__slots__ if getattr(bucket, name) is not None}
    )
    alone = signal_columns(asked, part, sector=sector[rows])
    for name in whole.__slots__:
        np.testing.assert_array_equal(getattr(whole, name)[rows], getattr(alone, name), err_msg=name)


@pytest.mark.parametrize(
    "given",
    [
        GivenClimate(),
        CLIMATE,
        GivenClimate(
            monthly_rain_mm=(60.0,) * 12,
            monthly_temperature_c=(12.0,) * 12,
            gradient_median_n_per_km=60.0,
            vapour_g_m3=9.0,
        ),
    ],
    ids=["maps", "given", "months"],
)
@pytest.mark.parametrize("maps", [True, False])
def test_climate_columns_are_the_figures_of_each_place(given: GivenClimate, maps: bool) -> None:
    if maps:
        pytest.importorskip("itur")
    random = np.random.default_rng(4)
    latitude, longitude = random.uniform(-60.0, 70.0, 8), random.uniform(-180.0, 180.0, 8)
    altitude = random.uniform(0.0, 900.0, 8)
    found = climate_columns(latitude_deg=latitude, longitude_deg=longitude, altitude_m=altitude, given=given, maps=maps)
    for row in range(8):
        place = Position(latitude_deg=float(latitude[row]), longitude_deg=float(longitude[row]))
        one = ClimateColumns.of(figures_for(place, given=replace(given, altitude_m=float(altitude[row])), maps=maps))
        for name in found.__slots__:
            np.testing.assert_allclose(getattr(found, name)[row], getattr(one, name), rtol=1e-12, err_msg=name)
