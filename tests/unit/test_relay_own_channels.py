"""Channels of their own for the hops of a relay: within the band of the rule, past what sites cannot use, or none at all."""

from dataclasses import replace

import pytest
from made_neighbours import east_north, radio

from fellspan.links.rules import find_rule, load_rules
from fellspan.links.site import Channel, Link, NoiseFloor, Site
from fellspan.planning.relay_channels import on_own_channels, own_channels_hz

RULE = find_rule("fcc-15.247-5g8-ptp", load_rules(None))  # 5725 to 5850 MHz, 47 CFR 15.247
SITES = [Site(name=name, position=east_north(1e3 * at, 0.0), height_m=10.0) for at, name in enumerate("ABCD")]
RADIO = radio(frequency_hz=5.775e9)


def hops(count: int = 2, **changes: object) -> list[Link]:
    first = Link(name="hop", a=SITES[0], b=SITES[1], radio=RADIO, power_rule=RULE)
    return [
        replace(first, name=f"hop {number}", a=SITES[number], b=SITES[number + 1], **changes)  # type: ignore[arg-type]
        for number in range(count)
    ]


def mhz(links: list[Link]) -> tuple[float, ...] | None:
    found = own_channels_hz(links)
    return None if found is None else tuple(round(at / 1e6, 6) for at in found)


def test_one_and_a_half_widths_away_then_one() -> None:
    assert mhz(hops()) == (5775.0, 5805.0)
    assert mhz(hops(3)) == (5775.0, 5805.0, 5745.0)
    # 40 MHz at the lower edge: 60 MHz up ends at 5825; no lower one; three channels fit side by side only.
    wide = radio(frequency_hz=5.745e9, bandwidth_hz=40e6)
    assert mhz(hops(radio=wide)) == (5745.0, 5805.0)
    assert mhz(hops(3, radio=wide)) == (5745.0, 5785.0, 5825.0)
    assert mhz(hops(radio=radio(frequency_hz=5.7875e9, bandwidth_hz=80e6))) is None


def test_what_a_site_cannot_use_is_left_alone() -> None:
    links = hops()
    taken = replace(SITES[1], unusable_channels=(Channel(low_hz=5.814e9, high_hz=5.82e9),))
    assert mhz([replace(links[0], b=taken), replace(links[1], a=taken)]) == (5775.0, 5745.0)
    heard = replace(SITES[1], noise_floors=(NoiseFloor(level_dbm=-90.0, low_hz=5.7e9, high_hz=5.78e9),))
    assert mhz([replace(links[0], b=heard), replace(links[1], a=heard)]) is None


@pytest.mark.parametrize(
    "changes",
    [
        {"power_rule": None},
        {"power_rule": replace(RULE, status="unconfirmed")},
        {"radio": radio(frequency_hz=5.775e9, bandwidth_hz=None)},
        {"radio": radio(frequency_hz=5.9e9)},
        {"radio": radio(frequency_hz=5.775e9, duplex="frequency", frequency_a_hz=5.76e9, frequency_b_hz=5.79e9)},
    ],
)
def test_none_where_nothing_is_known_to_fit(changes: dict[str, object]) -> None:
    links = hops(**changes)
    assert own_channels_hz(links) is None
    assert on_own_channels(links) == tuple(links)
