"""The starter of a measured file: every blank of the crew sheet as a key, with what the study plans beside it. Gives text.

No key holds a figure: one that nobody measured must never be taken for one that was. Beside each stands what is planned, and is
called so, or how such a value is written.
"""

from typing import Final

from fellspan.geodesy.coordinates import format_position
from fellspan.links.site import Antenna, Link, Site
from fellspan.quantities import format_frequency, format_height
from fellspan.study.toml_text import quoted

_HEAD: Final = """\
# What was measured of a link as built. Nothing here is filled in: take away the # before a key and write what was measured;
# what nobody measured stays as it is. Behind each key stands what the study plans, "planned: ...", or, where it plans none,
# how a value is written, "such as ..."; these are no figures of this link.
# Then: fellspan accept STUDY --link NAME --measured THIS_FILE
"""
_COLUMN: Final = 30
"""Where the words behind a key begin."""
_EMPTY: Final = '""'


def blank_text(link: Link) -> str:
    """TOML to fill in: what is not known stays behind its hash sign."""
    radio = link.radio
    wanted = radio.wanted or (radio.modulations[0].name if radio.modulations else None)
    chains = f"{radio.chains} chains" if radio.chains > 1 else "one chain"
    lines = [
        _HEAD,
        "[measured]",
        f"link = {quoted(_line(link.name))}",
        _blank("date", "day of the measurement, such as 2026-05-20", value=""),
        _blank("by", "names"),
        _blank("weather", 'such as "clear, light wind"'),
        _blank("modulation", f"as fixed while the levels were read; {_planned(wanted, such_as='64-QAM 5/6')}"),
        _blank("power_control", '"on" or "off"; with it on, a low level says nothing'),
        _blank("adaptive_modulation", '"on" or "off"'),
        _blank("levels_are", f'"all chains" or "each chain"; the radio has {chains}'),
        _blank("level_error", 'standard error of a level that the radio shows; left out: "1.5 dB"'),
        _blank("band", 'accepted either way; left out: "3 dB"'),
        _blank("note", "anything else"),
        "",
        *_end("a", link.a, link.antenna_a, link),
        "",
        *_end("b", link.b, link.antenna_b, link),
        "",
        "# Levels over time, where a link changes with the hour or the tide; one [[reading]] for each.",
        "# [[reading]]",
        _blank("at", 'the end that receives, "A" or "B"'),
        _blank("level", 'such as "-61.5 dBm"'),
        _blank("chain", 'such as "1"; left out: all chains together'),
        _blank("date", "such as 2026-05-21; left out: the day of [measured]", value=""),
        _blank("time", 'such as "14:20"'),
        _blank("water", 'level of tide or water then, such as "0.4 m"'),
        _blank("note", "anything else"),
        "",
    ]
    return "\n".join(lines)


def _end(letter: str, site: Site, antenna: Antenna, link: Link) -> list[str]:
    power = link.radio.power_dbm
    sent = 'such as "23 dBm"' if power is None else f'planned: "{power:g} dBm" of all chains'
    hz = link.radio.transmit_hz[0 if letter == "a" else 1]
    return [
        f"[{letter}]".ljust(_COLUMN) + f"# {_line(site.name)}, transmits {format_frequency(hz)}",
        _blank("level", 'received here, such as "-61.5 dBm"'),
        _blank("level_chains", 'received here by each chain, such as ["-64.5 dBm", "-64.4 dBm"]', value="[]"),
        _blank(
            "height",
            f"centre of the antenna; {_planned(format_height(site.height_m, site.height_reference), such_as='')}",
        ),
        _blank("roof", 'roof above ground, where height is above roof; such as "8.2 m"'),
        _blank("ground", 'ground level measured, above the datum of the study; such as "23.4 m"'),
        _blank("at", f"position by receiver; {_planned(format_position(site.position), such_as='')}"),
        _blank("bearing", "degrees, such as 231.5; the planned one stands on the crew sheet", value=""),
        _blank("bearing_is", '"magnetic" where a compass was read, else "true"'),
        _blank("tilt", "degrees, up is positive, such as -0.4; the planned one stands on the crew sheet", value=""),
        _blank("polarization", f"by the marks on the antenna; {_planned(link.radio.polarization, such_as='')}"),
        _blank("power", f"that the radio shows; {sent}"),
        _blank("power_is", '"all chains" or "each chain"'),
        _blank("feeder_loss", 'line and connectors as measured, such as "1.5 dB"'),
        _blank("antenna", f"by its label; {_planned(_line(antenna.name) or None, such_as='dish 0.6 m')}"),
        _blank("radio", "by its label"),
        _blank("serial", "serial numbers"),
        _blank("note", "anything else of this end"),
    ]


def _blank(key: str, words: str, *, value: str = _EMPTY) -> str:
    return f"# {key} = {value}".rstrip().ljust(_COLUMN) + f"# {words}"


def _planned(value: str | None, *, such_as: str) -> str:
    return f"planned: {quoted(_line(value))}" if value is not None else f"such as {quoted(such_as)}"


def _line(text: str) -> str:
    """A user's text on one line: it stands in comments too."""
    return " ".join("".join(char if char.isprintable() else " " for char in text).split())
