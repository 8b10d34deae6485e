"""The links of chosen.toml: each sector on a channel of its own where the rule's band has room, and the file says so."""

from dataclasses import replace

from made_neighbours import east_north, radio

from fellspan.links.rules import find_rule, load_rules
from fellspan.links.site import Link, Site
from fellspan.study.chosen import _on_channels

RULE = find_rule("fcc-15.247-5g8-ptp", load_rules(None))  # 5725 to 5850 MHz, 47 CFR 15.247
HUB = Site(name="Hub", position=east_north(0.0, 0.0), height_m=20.0)


def links(count: int, **changes: object) -> tuple[Link, ...]:
    first = Link(name="one", a=HUB, b=HUB, radio=radio(frequency_hz=5.775e9), power_rule=RULE)
    houses = [Site(name=f"H{one}", position=east_north(1e3, 200.0 * one), height_m=5.0) for one in range(count)]
    return tuple(replace(first, name=house.name, b=house, **changes) for house in houses)  # type: ignore[arg-type]


def test_links_of_one_sector_share_its_channel_and_sectors_do_not() -> None:
    moved, said = _on_channels(links(5), [4, 2, 4, 7, 2])
    assert [one.radio.frequency_hz for one in moved] == [5.775e9, 5.805e9, 5.775e9, 5.745e9, 5.805e9]
    assert "judged at 5.775 GHz" in said
    assert all(line.startswith("# ") for line in said.splitlines())


def test_one_sector_stays_where_it_is_and_needs_no_words() -> None:
    made = links(3)
    assert _on_channels(made, [1, 1, 1]) == (made, "")


def test_without_a_band_all_stay_and_the_file_asks_for_channels() -> None:
    made = links(2, power_rule=None)
    moved, said = _on_channels(made, [0, 1])
    assert moved == made
    assert "a `frequency` of their own" in said
