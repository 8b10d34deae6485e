"""The starter of a measured file: every blank of the crew sheet as a key, with what the study plans beside it. Gives text."""

from fellspan.geodesy.coordinates import format_position
from fellspan.links.site import Antenna, Link, Site
from fellspan.quantities import format_frequency, format_height
from fellspan.study.toml_text import quoted


def blank_text(link: Link) -> str:
    """TOML to fill in: what is not known stays behind its hash sign."""
    radio = link.radio
    wanted = radio.wanted or (radio.modulations[0].name if radio.modulations else "64-QAM")
    chains = (
        f"{radio.chains} chains: say whether a level is of all together or of each" if radio.chains > 1 else "one chain"
    )
    return f"""\
# What was measured of a link as built. Take away the # before a key and fill it in; what nobody measured stays as it is.
# Levels, bearings, tilts, roofs and ground levels here are examples of how to write them, not this link's; what is planned
# is called so.
# Then: fellspan accept STUDY --link NAME --measured THIS_FILE

[measured]
link = {quoted(_line(link.name))}
# date = 2026-05-20
# by = "names"
# weather = "clear, light wind"
# modulation = {quoted(_line(wanted))}             # as fixed while the levels were read
# power_control = "off"                # "on" or "off"; with it on, a low level says nothing
# adaptive_modulation = "off"
# levels_are = "all chains"            # or "each chain": {chains}
# level_error = "1.5 dB"               # standard error of a level that the radio shows
# band = "3 dB"                        # accepted either way
# note = ""

{_end("a", link.a, link.antenna_a, link)}
{_end("b", link.b, link.antenna_b, link)}
# Levels over time, where a link changes with the hour or the tide; one [[reading]] for each.
# [[reading]]
# at = "A"                             # the end that receives
# level = "-61.5 dBm"
# chain = "1"                          # left out: all chains together
# date = 2026-05-21                    # left out: the day of [measured]
# time = "14:20"
# water = "0.4 m"                      # level of tide or water then
# note = ""
"""


def _end(letter: str, site: Site, antenna: Antenna, link: Link) -> str:
    planned = format_height(site.height_m, site.height_reference)
    power = link.radio.power_dbm
    sent = "not stated" if power is None else f"{power:g} dBm, all chains"
    hz = link.radio.transmit_hz[0 if letter == "a" else 1]
    return f"""\
[{letter}]                                    # {_line(site.name)}, transmits {format_frequency(hz)}
# level = "-61.5 dBm"                  # received here
# level_chains = ["-64.5 dBm", "-64.4 dBm"]
# height = "{planned}"    # centre of the antenna; this is the planned one
# roof = "8.2 m"                       # roof above ground, where height is above roof
# ground = "23.4 m"                    # ground level measured, above the datum of the study
# at = "{format_position(site.position)}"  # position by receiver; this is the planned one
# bearing = 231.5                      # degrees
# bearing_is = "magnetic"              # "magnetic" where a compass was read, else "true"
# tilt = -0.4                          # degrees, up is positive
# polarization = "{link.radio.polarization}"            # by the marks on the antenna
# power = "23 dBm"                     # that the radio shows; planned: {sent}
# power_is = "all chains"              # or "each chain"
# feeder_loss = "0 dB"                 # line and connectors as measured
# antenna = {quoted(_line(antenna.name))}               # by its label
# radio = ""
# serial = ""
# note = ""
"""


def _line(text: str) -> str:
    """A user's text on one line: it stands in comments too."""
    return " ".join("".join(char if char.isprintable() else " " for char in text).split())
