"""What is offered for a link: antennas of a catalogue or a study, each able to say what it is at a frequency.

Knows no paths, levels or ranking.
"""

from dataclasses import dataclass, replace
from typing import Final

from fellspan.antennas.catalogue import Catalogue, CatalogueAntenna
from fellspan.errors import AntennaError
from fellspan.links.site import Antenna, Link, PatternOrigin

SAME_FREQUENCY: Final = 1e-9
NEAR_FREQUENCY: Final = 0.1
"""A pattern of which no model is known serves up to this share from where it was stated (common practice, no source)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Offer:
    """One antenna on offer.

    Parameters
    ----------
    name
        As people call it.
    model
        Its entry in a catalogue, which knows size and mass; None where there is none.
    antenna
        As a study states it, with gain, pattern and aim; None for one of the catalogue alone.
    frequency_hz
        Where `antenna` was stated for, Hz.
    """

    name: str
    model: CatalogueAntenna | None = None
    antenna: Antenna | None = None
    frequency_hz: float | None = None

    def at(self, frequency_hz: float) -> Antenna:
        """The antenna at a frequency.

        Raises
        ------
        AntennaError
            It is not for that frequency.
        """
        stated = self.antenna
        if stated is not None and (stated.pattern is None or _within(frequency_hz, self.frequency_hz, SAME_FREQUENCY)):
            return stated
        if self.model is None:
            if stated is not None and _within(frequency_hz, self.frequency_hz, NEAR_FREQUENCY):
                return stated
            raise AntennaError(f"antenna '{self.name}' is stated for another frequency than {frequency_hz / 1e9:g} GHz")
        pattern = self.model.pattern(frequency_hz)
        if stated is not None:
            return replace(stated, pattern=pattern)
        return Antenna(name=self.name, pattern=pattern, origin=PatternOrigin(model=self.model.name))


def _within(one_hz: float, other_hz: float | None, share: float) -> bool:
    return other_hz is not None and abs(one_hz / other_hz - 1.0) <= share


def offers_named(names: tuple[str, ...], *, catalogue: Catalogue, links: tuple[Link, ...] = ()) -> tuple[Offer, ...]:
    """The antennas of these names: those that links of a study use go before those of the catalogue.

    Raises
    ------
    AntennaError
        Neither has the name; names that are close are said.
    """
    stated = _stated(links, catalogue)
    found = [
        stated[name] if name in stated else Offer(name=(entry := catalogue.find(name)).name, model=entry)
        for name in names
    ]
    return tuple({offer.name: offer for offer in found}.values())


def offers_for(frequencies_hz: tuple[float, ...], *, catalogue: Catalogue) -> tuple[Offer, ...]:
    """Every antenna of the catalogue that covers one of the frequencies, Hz."""
    return tuple(
        Offer(name=entry.name, model=entry)
        for entry in catalogue.antennas
        if any(entry.covers(frequency) for frequency in frequencies_hz)
    )


def on_the_line(antenna: Antenna, end: Antenna) -> Antenna:
    """An antenna with the line, radome, sway and second antenna of an end of a link, which stay whatever hangs there."""
    return replace(
        antenna,
        feeder_loss_db=end.feeder_loss_db,
        feeder=end.feeder,
        branching_loss_db=end.branching_loss_db,
        radome_wet_db=end.radome_wet_db,
        radome_iced_db=end.radome_iced_db,
        sway=end.sway,
        diversity=end.diversity,
    )


def _stated(links: tuple[Link, ...], catalogue: Catalogue) -> dict[str, Offer]:
    found: dict[str, Offer] = {}
    for link in links:
        for antenna in (link.antenna_a, link.antenna_b):
            if antenna.peak_gain_dbi is None or antenna.name in found:
                continue
            model = None if antenna.origin is None or antenna.origin.model is None else antenna.origin.model
            found[antenna.name] = Offer(
                name=antenna.name,
                model=None if model is None else catalogue.find(model),
                antenna=antenna,
                frequency_hz=link.radio.frequency_hz,
            )
    return found
