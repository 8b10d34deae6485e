"""Writes the radio side of a study: radios with their modulations, lines, noise floors, climate, rules.

Makes text only; `writing` puts the file together.
"""

from collections.abc import Iterable, Iterator
from dataclasses import replace

from fellspan.climate.given import GivenClimate
from fellspan.errors import StudyError
from fellspan.links.feeders import Feeder
from fellspan.links.radio import CoChannel, Modulation, Radio, Signature
from fellspan.links.site import Antenna, Diversity, Link, Site, Sway
from fellspan.planning.inputs import Study
from fellspan.study.toml_text import decibels, hertz, inline, metres, number, plain, table, with_unit, worded

Pairs = tuple[tuple[str, str | None], ...]


def radio_text(radio: Radio) -> str:
    """[[radio]] with its modulations."""
    each = radio.power_per_chain_dbm
    blocks = [
        table(
            "[[radio]]",
            ("name", worded(radio.name)),
            ("frequency", hertz(radio.frequency_hz)),
            # Worked out from the power of each chain where that is given: written once.
            ("power", with_unit(radio.power_dbm, "dBm") if each is None else None),
            ("power_per_chain", with_unit(each, "dBm")),
            ("chains", str(radio.chains) if radio.chains != 1 else None),
            ("threshold", with_unit(radio.threshold_dbm, "dBm")),
            ("polarization", worded(radio.polarization)),
            ("dual_polarization", "true" if radio.dual_polarization else None),
            ("co_channel", None if radio.co_channel is None else _co_channel(radio.co_channel)),
            ("channel_width", hertz(radio.bandwidth_hz)),
            ("emission", worded(radio.emission_class)),
            ("power_control", decibels(radio.power_control_db)),
            ("duplex", worded(radio.duplex) if radio.duplex != "time" else None),
            ("synchronised", "true" if radio.synchronised else None),
            ("transmit_a", hertz(radio.frequency_a_hz)),
            ("transmit_b", hertz(radio.frequency_b_hz)),
            ("usable_share", number(radio.usable_share) if radio.usable_share != 1.0 else None),
            ("greatest_distance", metres(radio.greatest_distance_m)),
            ("noise_figure", with_unit(radio.noise_figure_db, "dB")),
            ("implementation_loss", decibels(radio.implementation_loss_db)),
            ("wanted", worded(radio.wanted)),
        ),
        *(_modulation(row) for row in radio.modulations),
    ]
    return "\n".join(blocks)


def _co_channel(stated: CoChannel) -> str:
    return inline(
        ("canceller", with_unit(stated.canceller_db, "dB")),
        ("required_ratio", with_unit(stated.required_ratio_db, "dB")),
        ("discrimination", with_unit(stated.antenna_discrimination_db, "dB")),
    )


def _modulation(row: Modulation) -> str:
    return table(
        "[[radio.modulation]]",
        ("name", worded(row.name)),
        ("threshold", with_unit(row.threshold_dbm, "dBm")),
        ("snr", with_unit(row.snr_db, "dB")),
        ("throughput", with_unit(row.throughput_bps, "bit/s")),
        ("power", with_unit(row.power_dbm, "dBm")),
        ("signature", None if row.signature is None else _signature(row.signature)),
    )


def _signature(signature: Signature) -> str:
    delay_ns = signature.delay_s * 1e9
    for digits in range(3, 18):
        # The fewest digits that read back to the same float.
        if float(f"{delay_ns:.{digits}g}") * 1e-9 == signature.delay_s:
            delay_ns = float(f"{delay_ns:.{digits}g}")
            break
    return inline(
        ("width", hertz(signature.width_hz)),
        ("depth", with_unit(signature.depth_db, "dB")),
        ("delay", with_unit(delay_ns, "ns")),
    )


def line_pairs(link: Link) -> Pairs:
    """Keys of a link for the lines, radomes, masts and second antennas of both ends, its target and its rule."""
    return (
        *(pair for end, antenna in (("a", link.antenna_a), ("b", link.antenna_b)) for pair in _end(antenna, end)),
        ("target_availability", with_unit(link.target_availability_percent, "%")),
        ("rule", None if link.power_rule is None else worded(link.power_rule.id)),
    )


def _end(antenna: Antenna, end: str) -> Iterator[tuple[str, str | None]]:
    yield f"feeder_{end}", None if antenna.feeder is None else _feeder(antenna.feeder)
    yield f"branching_loss_{end}", decibels(antenna.branching_loss_db)
    yield f"radome_wet_{end}", decibels(antenna.radome_wet_db)
    yield f"radome_iced_{end}", decibels(antenna.radome_iced_db)
    yield f"sway_{end}", None if antenna.sway is None else _sway(antenna.sway)
    yield f"diversity_{end}", None if antenna.diversity is None else _diversity(antenna.diversity)


def _feeder(feeder: Feeder) -> str:
    return inline(
        ("kind", worded(feeder.kind)),
        ("length", metres(feeder.length_m)),
        ("loss", with_unit(feeder.db_per_100_m, "dB per 100 m")),
    )


def _sway(sway: Sway) -> str:
    return inline(
        ("azimuth", plain(sway.azimuth_sigma_deg)),
        ("elevation", plain(sway.elevation_sigma_deg)),
        ("azimuth_offset", plain(sway.azimuth_offset_deg)),
        ("elevation_offset", plain(sway.elevation_offset_deg)),
    )


def _diversity(second: Diversity) -> str:
    return inline(
        ("spacing", metres(second.spacing_m)),
        ("gain", with_unit(second.gain_dbi, "dBi")),
        ("feeder_loss", with_unit(second.feeder_loss_db, "dB")),
    )


def heard_text(site: Site) -> Iterator[str]:
    """[[site.noise_floor]] and [[site.unusable]] of a site."""
    for floor in site.noise_floors:
        yield table(
            "[[site.noise_floor]]",
            ("level", with_unit(floor.level_dbm, "dBm")),
            ("width", hertz(floor.bandwidth_hz)),
            ("bearing", plain(floor.bearing_deg)),
            ("sector", number(floor.width_deg)),
            ("low", hertz(floor.low_hz)),
            ("high", hertz(floor.high_hz)),
        )
    for channel in site.unusable_channels:
        yield table(
            "[[site.unusable]]",
            ("low", hertz(channel.low_hz)),
            ("high", hertz(channel.high_hz)),
            ("reason", worded(channel.reason)),
        )


def study_tables(study: Study, *, rules_file: str | None) -> Iterator[str]:
    """[climate], [signal], [rules] and [exposure], as far as they say anything."""
    if study.climate != GivenClimate():
        yield _climate(study.climate)
    if (study.rain_edition, study.rain_reading) != ("19", "A"):
        yield table(
            "[signal]", ("rain_edition", worded(study.rain_edition)), ("rain_reading", worded(study.rain_reading))
        )
    if rules_file is not None:
        yield table("[rules]", ("file", rules_file))
    if study.exposure_rule != "stricter":
        yield table("[exposure]", ("rule", worded(study.exposure_rule)))


def _climate(given: GivenClimate) -> str:
    return table(
        "[climate]",
        ("rain_rate", with_unit(given.rain_rate_001_mm_h, "mm/h")),
        ("monthly_rain", _months(given.monthly_rain_mm)),
        ("monthly_temperature", _months(given.monthly_temperature_c)),
        ("dn1", plain(given.dn1_n_per_km)),
        ("dn75", plain(given.dn75)),
        ("log_k", plain(given.log_k)),
        ("terrain_roughness", metres(given.terrain_roughness_m)),
        ("gradient_median", plain(given.gradient_median_n_per_km)),
        ("gradient_tail", plain(given.gradient_tail_n_per_km)),
        ("temperature", with_unit(given.temperature_c, "C")),
        ("pressure", with_unit(given.total_pressure_hpa, "hPa")),
        ("vapour", with_unit(given.vapour_g_m3, "g/m3")),
        ("rain_height", metres(given.rain_height_m)),
        ("altitude", metres(given.altitude_m)),
    )


def _months(values: Iterable[float] | None) -> str | None:
    return None if values is None else f"[{', '.join(map(number, values))}]"


def one_radio_each(links: Iterable[Link]) -> dict[str, Radio]:
    """Radios by name; links may turn the pair of one and the same radio, or use it on a channel of their own.

    Raises
    ------
    StudyError
        Two different radios bear the same name.
    """
    found: dict[str, Radio] = {}
    for link in links:
        first = found.setdefault(link.radio.name, link.radio)
        retuned = replace(link.radio, frequency_hz=first.frequency_hz)
        if first not in (link.radio, turned(link.radio)) and (first.duplex == "frequency" or first != retuned):
            raise StudyError(f"two different radios are called '{link.radio.name}'", "give each one a name of its own")
    return found


def turned(radio: Radio) -> Radio:
    """The radio with its pair of frequencies the other way about."""
    return replace(radio, frequency_a_hz=radio.frequency_b_hz, frequency_b_hz=radio.frequency_a_hz)


def channel_of(link: Link, radios: dict[str, Radio]) -> float | None:
    """The link's own frequency, Hz, where it is not that of its radio."""
    return None if link.radio.frequency_hz == radios[link.radio.name].frequency_hz else link.radio.frequency_hz


def high_end_of(link: Link, radios: dict[str, Radio]) -> str | None:
    """The end with the higher frequency, where the link turns the pair of its radio."""
    end = link.radio.high_end
    return None if link.radio == radios[link.radio.name] or end is None else worded(end.lower())
