"""Links over made profiles for the tests of the signal: heights, radios and climates that need no maps."""

from dataclasses import replace

from made_profiles import link_of, profile_of

from fellspan.climate.given import GivenClimate
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.radio import Modulation, Radio, Signature
from fellspan.links.result import LinkResult
from fellspan.links.signal_result import DirectionResult, SignalResult, Working
from fellspan.links.site import Antenna, Link
from fellspan.terrain.profile import PathProfile

CLIMATE = GivenClimate(
    rain_rate_001_mm_h=40.0,
    dn1_n_per_km=-200.0,
    terrain_roughness_m=30.0,
    gradient_median_n_per_km=-40.0,
    gradient_tail_n_per_km=30.0,
    temperature_c=15.0,
    vapour_g_m3=7.5,
    rain_height_m=6000.0,
)
TABLE = (
    Modulation(name="4-QAM", threshold_dbm=-82.0, throughput_bps=50e6, snr_db=10.0),
    Modulation(name="64-QAM", threshold_dbm=-68.0, throughput_bps=200e6, snr_db=25.0),
    Modulation(name="256-QAM", threshold_dbm=-60.0, throughput_bps=300e6, snr_db=32.0),
)
SIGNATURE = Signature(width_hz=28e6, depth_db=20.0)


def radio(**changes: object) -> Radio:
    """An 11 GHz radio with three modulations; `changes` are fields of Radio."""
    fields: dict[str, object] = {
        "frequency_hz": 11e9,
        "power_dbm": 15.0,
        "bandwidth_hz": 28e6,
        "noise_figure_db": 6.0,
        "modulations": TABLE,
    }
    return Radio(**(fields | changes))  # type: ignore[arg-type]


def over(
    profile: PathProfile,
    *,
    equipment: Radio | None = None,
    height_m: float | tuple[float, float] = 60.0,
    antenna_a: Antenna | None = None,
    antenna_b: Antenna | None = None,
    **changes: object,
) -> Link:
    """A link over a profile; antennas of 38 dBi unless given."""
    a, b = height_m if isinstance(height_m, tuple) else (height_m, height_m)
    plain = Antenna(gain_dbi=38.0)
    link = replace(
        link_of(profile, a, b),
        radio=equipment or radio(),
        antenna_a=antenna_a or plain,
        antenna_b=antenna_b or plain,
    )
    return replace(link, **changes)  # type: ignore[arg-type]


def result_of(link: Link, profile: PathProfile, *, climate: GivenClimate = CLIMATE, **settings: object) -> LinkResult:
    """The result with this climate; `settings` are those of AssessSettings."""
    asked = AssessSettings(climate=climate, **settings)  # type: ignore[arg-type]
    return assess_profile(link, profile, asked).result


def signal_over(length_m: float = 20e3, **changes: object) -> SignalResult:
    """Signal of a link over flat ground of a length; `changes` as for `over`."""
    profile = profile_of(length_m)
    return signal_of(result_of(over(profile, **changes), profile))  # type: ignore[arg-type]


def signal_of(result: LinkResult) -> SignalResult:
    """The signal of a result, which must have one."""
    assert result.signal is not None
    return result.signal


def working(direction: DirectionResult, key: str) -> Working:
    """The working of that key."""
    return next(one for one in direction.workings if one.key == key)


def outage(direction: DirectionResult, name: str) -> float:
    """Outage of a modulation over the year, %."""
    row = next(one for one in direction.modulations if one.name == name)
    assert row.year is not None
    assert row.year.total is not None
    return row.year.total
