"""The budget closes: workings, losses and levels agree in both directions, for every link of the sample and by hand."""

import json
from pathlib import Path

import pytest
from made_profiles import profile_of
from signal_links import CLIMATE, SIGNATURE, over, radio, result_of, signal_of, working

import fellspan
from fellspan.exports.results_json import link_result_dict, link_result_from_dict
from fellspan.links.budget import line_loss_db
from fellspan.links.feeders import Feeder, feeder_db_per_100_m
from fellspan.links.radio import CoChannel, Modulation
from fellspan.links.result import LinkResult
from fellspan.links.signal_result import DirectionResult
from fellspan.links.site import Antenna, Diversity, Link
from fellspan.propagation import SOURCES

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"
DOCS = Path(__file__).resolve().parents[2] / "docs" / "results.md"


@pytest.fixture(scope="module")
def sample() -> list[tuple[Link, LinkResult]]:
    plan = fellspan.plan_study(fellspan.load_study(SAMPLE))
    assert not plan.failures
    return [(linked.link, linked.result) for linked in plan.links]


def total_of(direction: DirectionResult) -> float:
    return sum(one.in_level_db for one in direction.workings if one.in_level_db is not None)


def by_losses(link: Link, result: LinkResult) -> float:
    """The level from the radio, the gains and the losses of the result, apart from the workings."""
    assert result.antennas is not None
    losses = result.losses_db
    gains = [result.antennas.a.gain_dbi, result.antennas.b.gain_dbi]
    power = link.radio.power_dbm
    assert power is not None
    counted = (
        losses.free_space, losses.diffraction, losses.polarization, losses.vegetation, losses.gases,
        losses.feeders, losses.branching, losses.pointing,
    )  # fmt: skip
    return power + sum(gain for gain in gains if gain is not None) - sum(loss or 0.0 for loss in counted)


def test_the_budget_of_every_sample_link_closes_both_ways(sample: list[tuple[Link, LinkResult]]) -> None:
    assert len(sample) >= 10
    for link, result in sample:
        signal = signal_of(result)
        for direction, level in ((signal.a_to_b, result.received_dbm.at_b), (signal.b_to_a, result.received_dbm.at_a)):
            assert level is not None
            assert total_of(direction) == pytest.approx(level, abs=0.01)
            assert direction.received_dbm == level
            if direction.frequency_hz == link.radio.transmit_hz[0]:  # losses are given at what A transmits on
                assert by_losses(link, result) == pytest.approx(level, abs=0.01)


def test_every_working_of_the_sample_is_whole(sample: list[tuple[Link, LinkResult]]) -> None:
    for _, result in sample:
        signal = signal_of(result)
        for direction in (signal.a_to_b, signal.b_to_a):
            keys = [one.key for one in direction.workings]
            assert len(keys) == len(set(keys))
            assert {"free_space", "diffraction", "vegetation", "gases", "rain_001", "multipath_occurrence"} <= set(keys)
            for one in direction.workings:
                assert one.label
                assert one.formula
                assert not one.source_key or one.source_key in SOURCES


def test_results_round_trip_and_hold_no_infinity(sample: list[tuple[Link, LinkResult]]) -> None:
    for _, result in sample:
        plain = json.loads(json.dumps(link_result_dict(result), allow_nan=False))
        assert link_result_from_dict(plain) == result


def test_a_result_without_the_signal_can_be_read_still(sample: list[tuple[Link, LinkResult]]) -> None:
    plain = link_result_dict(sample[0][1])
    for key in ("signal", "modulation", "availability_percent"):
        del plain[key]
    for key in ("vegetation", "gases", "feeders", "branching", "pointing", "rain_001", "radomes_wet", "radomes_iced"):
        del plain["losses_db"][key]
    read = link_result_from_dict(plain)
    assert read.signal is None
    assert read.losses_db.gases is None


def _keys(value: object) -> set[str]:
    if isinstance(value, dict):
        return set(value).union(*(_keys(item) for item in value.values()))
    if isinstance(value, list):
        return set().union(*(_keys(item) for item in value)) if value else set()
    return set()


def test_every_key_is_named_in_the_docs(sample: list[tuple[Link, LinkResult]]) -> None:
    page = DOCS.read_text(encoding="utf-8")
    missing = sorted(key for key in _keys(link_result_dict(sample[0][1])) if f"`{key}`" not in page)
    assert not missing, missing


def everything() -> Link:
    """A link that states all there is to state."""
    profile = profile_of(30e3)
    antenna = Antenna(
        gain_dbi=40.0,
        feeder_loss_db=0.4,
        feeder=Feeder(kind="waveguide 11 GHz", length_m=30.0),
        branching_loss_db=1.2,
        radome_wet_db=1.0,
        radome_iced_db=3.0,
        diversity=Diversity(spacing_m=10.0, gain_dbi=38.0),
    )
    table = (
        Modulation(name="low", threshold_dbm=-85.0, throughput_bps=40e6, snr_db=8.0, signature=SIGNATURE),
        Modulation(name="high", throughput_bps=160e6, snr_db=28.0, power_dbm=18.0, signature=SIGNATURE),
    )
    equipment = radio(
        power_dbm=None, power_per_chain_dbm=20.0, chains=2, dual_polarization=True, co_channel=CoChannel(canceller_db=20.0),
        duplex="frequency", frequency_hz=11e9, frequency_a_hz=10.9e9, frequency_b_hz=11.4e9, modulations=table,
        usable_share=0.7, power_control_db=10.0,
    )  # fmt: skip
    return over(
        profile,
        equipment=equipment,
        height_m=(90.0, 120.0),
        antenna_a=antenna,
        antenna_b=antenna,
        target_availability_percent=99.9,
    )


def test_a_link_that_states_everything_closes_and_round_trips() -> None:
    link = everything()
    result = result_of(link, profile_of(30e3))
    signal = signal_of(result)
    for direction in (signal.a_to_b, signal.b_to_a):
        assert direction.received_dbm is not None
        assert total_of(direction) == pytest.approx(direction.received_dbm, abs=0.01)
        assert direction.modulations[0].availability_percent.year is not None
    assert by_losses(link, result) == pytest.approx(signal.a_to_b.received_dbm, abs=0.01)
    assert link_result_from_dict(json.loads(json.dumps(link_result_dict(result), allow_nan=False))) == result


def test_a_budget_by_hand() -> None:
    profile = profile_of(30e3)
    link = everything()
    signal = signal_of(result_of(link, profile))
    there = signal.a_to_b
    # 2 x 20 dBm is 23.0103 dBm; 92.4478 + 20 log(30.000015 km) + 20 log(10.9 GHz) = 142.739 dB (hand calculation, P.525).
    assert working(there, "power").value == pytest.approx(23.0103, abs=1e-4)
    assert working(there, "free_space").value == pytest.approx(142.739, abs=1e-3)
    feeder = 0.4 + 0.3 * feeder_db_per_100_m("waveguide 11 GHz", frequency_hz=10.9e9)
    assert working(there, "transmit_feeder").value == pytest.approx(feeder)
    assert line_loss_db(link.antenna_a, frequency_hz=10.9e9) == pytest.approx(feeder)
    assert there.eirp_dbm == pytest.approx(23.0103 - 1.2 - feeder + 40.0, abs=1e-4)
    gases = working(there, "gases").value
    diffraction = working(there, "diffraction").value
    assert gases is not None
    assert diffraction is not None
    assert there.received_dbm == pytest.approx(
        23.0103 + 80.0 - 2 * (1.2 + feeder) - 142.739 - gases - diffraction, abs=2e-3
    )


def test_each_modulation_has_its_power_level_and_margin() -> None:
    low, high = signal_of(result_of(everything(), profile_of(30e3))).a_to_b.modulations
    assert (low.name, high.name) == ("low", "high")
    assert low.received_dbm is not None
    assert high.received_dbm == pytest.approx(low.received_dbm - 5.0103, abs=1e-4)  # 18 dBm instead of 23.0103
    # kTB in 28 MHz is -99.503 dBm (definition, 290 K); with 6 dB of noise figure and 28 dB of ratio -65.503 dBm.
    assert high.threshold_dbm == pytest.approx(-65.503, abs=1e-3)
    assert high.margin_db == pytest.approx((high.received_dbm or 0.0) - high.threshold_dbm)
    assert (low.throughput_bps, high.throughput_bps) == pytest.approx((28e6, 112e6))


def test_without_a_power_there_is_no_level_but_losses() -> None:
    profile = profile_of(20e3)
    result = result_of(over(profile, equipment=radio(power_dbm=None)), profile, climate=CLIMATE)
    signal = signal_of(result)
    assert signal.a_to_b.received_dbm is None
    assert result.signal_verdict is None
    assert result.losses_db.gases is not None
    assert signal.availability_percent.year is None
    assert link_result_from_dict(json.loads(json.dumps(link_result_dict(result), allow_nan=False))) == result
