"""What stands together at one site: sectors, high and low ends, antennas too near each other, antennas known by their gain."""

import pytest
from made_neighbours import (
    HOME,
    at_one_mast,
    east_north,
    free_space,
    lobe,
    planned,
    radio,
    receiver,
    replace_radio,
    study,
    two_parallel,
)

from fellspan.antennas.mounting import Mounting
from fellspan.errors import LinkError
from fellspan.links.site import Aim, Antenna


def hub(sites: tuple[str, str], b, *, mounting: Aim | Mounting | None):
    sector = Antenna(pattern=lobe(gain_dbi=16.0), name="sector", mounting=mounting)
    return planned(f"Hub - {sites[1]}", HOME, b, sites=sites, antennas=(sector, Antenna(pattern=lobe(), name="dish")))


def test_links_of_one_sector_do_not_disturb_each_other() -> None:
    hung = Aim(bearing_deg=90.0, tilt_deg=0.0)
    one = hub(("Hub", "Quay"), east_north(4_000.0, 300.0), mounting=hung)
    other = hub(("Hub", "Mill"), east_north(4_000.0, -300.0), mounting=hung)
    found = study(one, other)
    assert all(not result.interferers for result in found.receivers)
    assert found.near == ()
    aimed = study(*(hub(("Hub", n), b, mounting=None) for n, b in
                    (("Quay", east_north(4_000.0, 300.0)), ("Mill", east_north(4_000.0, -300.0)))))  # fmt: skip
    assert all(result.interferers for result in aimed.receivers)


def test_a_sector_sends_once_whatever_the_number_of_its_links() -> None:
    hung = Aim(bearing_deg=90.0, tilt_deg=0.0)
    one = hub(("Hub", "Quay"), east_north(4_000.0, 300.0), mounting=hung)
    other = replace_radio(hub(("Hub", "Mill"), east_north(4_000.0, -300.0), mounting=hung), power_dbm=23.0)
    third = planned("Third", east_north(6_000.0, 0.0), east_north(9_000.0, 0.0))
    heard = [i for i in receiver(study(one, other, third), "Third", "A").interferers if i.site == "Hub"]
    assert [(i.link, i.power_dbm) for i in heard] == [("Hub - Mill", 23.0)]


def test_high_and_low_on_one_mast_are_named() -> None:
    found = study(*at_one_mast(low_first=True))
    (conflict,) = found.high_low
    assert (conflict.site, conflict.high_link, conflict.low_link) == ("Hill", "East", "West")
    assert (conflict.high_hz, conflict.low_hz, conflict.distance_m) == (6.1e9, 5.9e9, pytest.approx(4.0))
    assert any("High/low conflict at 'Hill'" in line and "'West'" in line for line in found.warnings)
    # West receives at the mast on what East sends there, 4 m above it.
    assert receiver(found, "West", "A").interferers[0].path == "same site"
    assert study(*at_one_mast(low_first=False)).high_low == ()


def test_other_bands_and_other_sites_have_no_high_low_conflict() -> None:
    one, other = at_one_mast(low_first=True)
    elsewhere = replace_radio(other, frequency_hz=11e9, frequency_a_hz=10.9e9, frequency_b_hz=11.1e9)
    assert study(one, elsewhere).high_low == ()
    away = planned(
        "West", east_north(0.0, 150.0), east_north(-5_000.0, 150.0), own_radio=other[0].radio, sites=("Hill 2", "Far")
    )
    assert study(one, away).high_low == ()


def test_antennas_on_one_mast_that_are_too_near() -> None:
    """0.6 m at 6 GHz: far field 2 * 0.36 * 20.01 = 14.4 m; keep 0.6 m + 10 wavelengths of 5.08 cm = 1.11 m."""
    (near,) = study(*at_one_mast(low_first=False, heights=(30.0, 30.5))).near
    assert near.distance_m == pytest.approx(0.5)
    assert near.far_field_m == pytest.approx(2.0 * 0.36 * 6e9 / 299_792_458.0, abs=0.01)
    assert near.keep_m == pytest.approx(0.6 + 10.0 * 299_792_458.0 / 5.9e9, abs=0.001)
    assert near.is_close
    (apart,) = study(*at_one_mast(low_first=False)).near
    assert not apart.is_close
    assert study(*at_one_mast(low_first=False, heights=(30.0, 50.0))).near == ()


def test_antennas_typed_at_one_point_are_a_metre_apart_and_never_take_in_more_than_was_sent() -> None:
    found = study(*at_one_mast(low_first=True, heights=(30.0, 30.0)))
    first = receiver(found, "West", "A").interferers[0]
    assert (first.distance_m, first.patterns_hold) == (1.0, False)
    loud = Antenna(pattern=lobe(gain_dbi=60.0, floor_db=0.0), name="loud")
    capped = study(*at_one_mast(low_first=True, heights=(30.0, 30.0), antennas=(loud, loud)))
    assert receiver(capped, "West", "A").interferers[0].level_dbm == 20.0


def test_an_antenna_of_which_only_the_gain_is_known() -> None:
    """In every direction as stated, the worst case, but 0 dBi toward its own site."""
    bare = Antenna(gain_dbi=25.0, name="bare")
    away = study(*two_parallel(antennas=(bare, bare)))
    assert {(i.transmit_gain_dbi, i.receive_gain_dbi) for i in receiver(away, "South", "B").interferers} == {
        (25.0, 25.0)
    }
    beside = receiver(study(*at_one_mast(low_first=True, antennas=(bare, bare))), "West", "A").interferers[0]
    assert (beside.transmit_gain_dbi, beside.receive_gain_dbi) == (0.0, 0.0)
    assert beside.level_dbm == pytest.approx(20.0 - free_space(4.0, 6.1e9), abs=1e-6)


def test_synchronised_links_hear_only_what_the_other_ends_send() -> None:
    houses = {"Quay": east_north(4_000.0, 300.0), "Mill": east_north(3_000.0, -2_500.0)}

    def heard(*, synchronised: bool) -> set[tuple[str, str, str]]:
        links = [
            replace_radio(hub(("Hub", name), at, mounting=None), synchronised=synchronised)
            for name, at in houses.items()
        ]
        found = study(*links, replace_radio(planned("Off", *houses.values()), synchronised=synchronised))
        return {
            (one.link.removeprefix("Hub - "), one.site, interferer.site)
            for one in found.receivers
            for interferer in one.interferers
            if "Off" not in (one.link, interferer.link)
        }

    asked = {("Quay", "Hub", "Mill"), ("Quay", "Quay", "Hub"), ("Mill", "Hub", "Quay"), ("Mill", "Mill", "Hub")}
    out_of_step = {("Quay", "Hub", "Hub"), ("Mill", "Hub", "Hub"), ("Quay", "Quay", "Mill"), ("Mill", "Mill", "Quay")}
    assert heard(synchronised=False) == asked | out_of_step
    assert heard(synchronised=True) == asked


def test_one_synchronised_link_keeps_no_step_with_one_that_is_not() -> None:
    one = hub(("Hub", "Quay"), east_north(4_000.0, 300.0), mounting=None)
    other = hub(("Hub", "Mill"), east_north(3_000.0, -2_500.0), mounting=None)
    found = study(replace_radio(one, synchronised=True), other)
    assert any(interferer.site == "Hub" for interferer in receiver(found, "Hub - Quay", "A").interferers)


def test_pairs_of_frequencies_keep_no_step() -> None:
    with pytest.raises(LinkError, match="synchronised"):
        radio(duplex="frequency", frequency_a_hz=6.1e9, frequency_b_hz=5.9e9, synchronised=True)
