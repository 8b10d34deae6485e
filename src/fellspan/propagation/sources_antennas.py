"""The citation registry's entries for antennas; `sources` merges them. Data only."""

from typing import Final

from fellspan.propagation.source_types import Source, Validity


def _frequency(low_ghz: float, high_ghz: float) -> Validity:
    return Validity(
        quantity="frequency_hz", label="frequency", unit="GHz", low=low_ghz * 1e9, high=high_ghz * 1e9, scale=1e9
    )


ANTENNA_SOURCES: Final = (
    Source(
        key="antenna-currents",
        title="Dipole, collinear omni, patch and aperture from their currents and fields",
        document="antenna textbooks",
        edition="",
        clause="sinusoidal current, two-slot patch, tapered circular aperture",
        status="derived",
        note="Integrated over the sphere here; coupling between the elements of arrays is left out.",
    ),
    Source(
        key="yagi-moments",
        title="Currents of Yagi-Uda antennas by a moment method",
        document="antenna textbooks",
        edition="",
        clause="induced-EMF impedances, piecewise-sinusoidal modes",
        status="derived",
        note="21 modes a rod; 31 change the gain of the tabled designs by less than 0.07 dB.",
    ),
    Source(
        key="nbs-688",
        title="Measured Yagi-Uda designs",
        document="NBS Technical Note 688",
        edition="1976",
        clause="table 1",
        status="code",
        note="The table was seen in copies. Our computed gains lie within 0.5 dB of those measured.",
    ),
    Source(
        key="f699-8",
        title="Peak envelope of a dish's side lobes",
        document="Rec. ITU-R F.699",
        edition="8",
        clause="recommends 2",
        status="code",
        note="The text was not read; a later edition exists. For interference only.",
        ranges=(_frequency(0.1, 86),),
    ),
    Source(
        key="f1245-3",
        title="Average side lobes of a dish",
        document="Rec. ITU-R F.1245",
        edition="3",
        clause="recommends 2",
        status="code",
        note="The text was not read. For sums over many interferers.",
        ranges=(_frequency(1, 86),),
    ),
    Source(
        key="f1336-5",
        title="Envelopes of omnis, sectors and low-gain antennas",
        document="Rec. ITU-R F.1336",
        edition="5",
        clause="recommends 2 to 4",
        status="code",
        note="The text was read in quotation only.",
        ranges=(_frequency(0.4, 70),),
    ),
    Source(
        key="cuts-combined",
        title="Two cuts combined into gain in any direction",
        document="Gil, Claro, Ferreira, Pardelinha, Correia, IEEE Antennas and Propagation Magazine",
        edition="2001",
        clause="horizontal projection interpolation",
        status="practice",
        note="From memory.",
    ),
)
