"""Entries of the citation registry for multipath, availability and the figures of a place; `sources` merges them. Data only."""

from typing import Final

from fellspan.propagation.source_types import Source, Validity

_P530: Final = "Rec. ITU-R P.530"
_P2001: Final = "Rec. ITU-R P.2001"
_ITUR: Final = "As the package itur 0.4.0 computes it; the text was not read."
_OURS: Final = "our own rule, no source"


def _km(low: float, high: float) -> Validity:
    return Validity(quantity="distance_m", label="path length", unit="km", low=low * 1e3, high=high * 1e3, scale=1000.0)


def _ghz(low: float, high: float) -> Validity:
    return Validity(quantity="frequency_hz", label="frequency", unit="GHz", low=low * 1e9, high=high * 1e9, scale=1e9)


FADING_SOURCES: Final = (
    Source(
        key="p530-19-multipath",
        title="Occurrence of multipath, edition -19",
        document=_P530,
        edition="19",
        clause="section 2.3.1, equations (5) to (11)",
        status="text",
        note="Standard error 5.2 dB. Fitted up to 37 GHz, expected to hold to 45; dN75 above 54 explodes. None up to 5 km. "
        "Not below about 15 GHz divided by the length in km.",
        ranges=(
            _km(7.5, 300.0),
            _ghz(0.45, 45.0),
            Validity(quantity="inclination_mrad", label="slope between the antennas", unit="mrad", high=37.0),
            Validity(
                quantity="lower_amsl_m",
                label="height of the lower antenna above sea level",
                unit="m",
                low=17,
                high=2300,
            ),
            Validity(
                quantity="clearance_m", label="height of mid-path over the mean ground", unit="m", low=26, high=1180
            ),
            Validity(quantity="dn75", label="dN75", unit="N-units", low=0.0, high=54.0),
            Validity(
                quantity="distance_frequency_m_hz",
                label="path length times frequency",
                unit="GHz km",
                low=15e12,
                scale=1e12,
            ),
        ),
    ),
    Source(
        key="p530-17-multipath-detailed",
        title="Occurrence of multipath, edition -17, detailed",
        document=_P530,
        edition="17",
        clause="section 2.3.1, with terrain roughness",
        status="code",
        note="Taken from an independent implementation; the text, and so its range, was not read. None up to 5 km.",
    ),
    Source(
        key="p530-17-multipath-quick",
        title="Occurrence of multipath, edition -17, quick",
        document=_P2001,
        edition="6",
        clause="equations (B.1) and (B.6)",
        status="text",
        note="The quick form of P.530-17, for want of a terrain roughness. None up to 5 km.",
    ),
    Source(
        key="p530-19-fade-depths",
        title="Multipath at every fade depth",
        document=_P530,
        edition="19",
        clause="section 2.3.2, equations (12) to (18)",
        status="text",
        note="Unchanged since edition -16. Below 0 dB it says nothing; we take 100 %.",
        ranges=(Validity(quantity="occurrence_percent", label="occurrence factor p0", unit="%", high=2000.0),),
    ),
    Source(
        key="p530-19-enhancement",
        title="Enhancement of the level by multipath",
        document=_P530,
        edition="19",
        clause="equation (19)",
        status="text",
        ranges=(Validity(quantity="enhancement_db", label="enhancement", unit="dB", low=10.0),),
    ),
    Source(
        key="p530-19-worst-month",
        title="Worst month to average year",
        document=_P530,
        edition="19",
        clause="equation (24), with the power law of Rec. ITU-R P.841, Q1 = 2.85 and beta = 0.13",
        status="text",
        note="The text of P.841 was not read. Outside the span of the power law the branches are ours.",
        ranges=(
            Validity(quantity="worst_month_percent", label="outage of the worst month", unit="%", low=1.9e-4, high=7.4),
        ),
    ),
    Source(
        key="p2001-6-worst-month",
        title="Worst month to average year, older form by latitude",
        document=_P2001,
        edition="6",
        clause="equation (B.7)",
        status="text",
        note="In P.530 up to edition -18.",
    ),
    Source(
        key="p530-19-shorter-periods",
        title="Worst periods shorter than a month",
        document=_P530,
        edition="19",
        clause="equations (25) to (27)",
        status="text",
        ranges=(Validity(quantity="hours", label="period", unit="h", low=1.0, high=720.0),),
    ),
    Source(
        key="p530-19-fade-events",
        title="Multipath fades of 10 s or longer in a year",
        document=_P530,
        edition="19",
        clause="equation (31)",
        status="text",
    ),
    Source(
        key="p530-19-tandem",
        title="Multipath on hops in a row",
        document=_P530,
        edition="19",
        clause="equations (29) and (30)",
        status="text",
    ),
    Source(
        key="p530-19-selective",
        title="Selective fading of a wide channel, by the signature of the radio",
        document=_P530,
        edition="19",
        clause="sections 4.1 and 5.1, equations (102) and (116) to (118)",
        status="text",
        note="Signatures are usually measured at a delay of 6.3 ns: common practice, no source.",
    ),
    Source(
        key="p530-19-clear-air-outage",
        title="Flat, selective and cross-polar outage together",
        document=_P530,
        edition="19",
        clause="section 7, equation (177)",
        status="text",
    ),
    Source(
        key="composite-margin",
        title="Composite fade margin",
        document="common practice, no source",
        edition="",
        clause="",
        status="practice",
        note="Powers of the margins added; for comparing data sheets, not for our availability.",
    ),
    Source(
        key="p530-19-space-diversity",
        title="Space diversity",
        document=_P530,
        edition="19",
        clause="sections 6.2.4 and 6.2.5.1, equations (155) to (162)",
        status="text",
        note="Deep fades only. Paths from 25 km perhaps; a spacing above 23 m counts as 23 m.",
        ranges=(
            _km(43.0, 240.0),
            _ghz(2.0, 11.0),
            Validity(quantity="spacing_m", label="spacing of the antennas", unit="m", low=3.0, high=23.0),
        ),
    ),
    Source(
        key="p530-older-space-diversity",
        title="Space diversity, older form",
        document=_P530,
        edition="",
        clause="editions before -19",
        status="derived",
        note="Remembered, and the newer form with eta = p0/100 and its small term dropped; no text was read.",
    ),
    Source(
        key="p530-19-frequency-diversity",
        title="Frequency diversity, one protection channel for one",
        document=_P530,
        edition="19",
        clause="equation (163)",
        status="text",
        ranges=(
            _km(30.0, 70.0),
            _ghz(2.0, 11.0),
            Validity(quantity="separation_hz", label="separation", unit="GHz", high=0.5e9, scale=1e9),
        ),
    ),
    Source(
        key="p530-19-cross-polar-clear-air",
        title="Cross-polar outage in clear air",
        document=_P530,
        edition="19",
        clause="section 4.1",
        status="text",
    ),
    Source(
        key="p530-19-cross-polar-rain",
        title="Cross-polar outage in rain",
        document=_P530,
        edition="19",
        clause="section 4.2",
        status="text",
        ranges=(_ghz(8.0, 35.0),),
    ),
    Source(
        key="p530-19-sum-of-outages",
        title="Rain and multipath add as percentages of time",
        document=_P530,
        edition="19",
        clause="sections 2.4 and 7",
        status="text",
        note="Of rain attenuation and cross-polar loss in rain the larger counts.",
    ),
    Source(
        key="outage-rules",
        title="Diffraction fading in the sum, and both directions at once",
        document=_OURS,
        edition="",
        clause="",
        status="practice",
        note="Rain and low k are common to both directions; multipath is independent on two frequencies, common on one.",
    ),
    Source(
        key="gradient-normal-law",
        title="Spread of the refractivity gradient",
        document=_OURS,
        edition="",
        clause="",
        status="practice",
        note="A normal law through the median and one point of the tail. Point gradients are pessimistic beyond some 20 km.",
    ),
    Source(
        key="p837-7-rain-map",
        title="Rain rate from the map",
        document="Rec. ITU-R P.837",
        edition="7",
        clause="map of the rain rate exceeded for 0.01 % of an average year",
        status="code",
        note=_ITUR + " Local one-minute statistics are better.",
    ),
    Source(
        key="p453-13-gradient-map",
        title="Refractivity gradient of the lowest 65 m from the map",
        document="Rec. ITU-R P.453",
        edition="13",
        clause="map of the gradient not exceeded for a percentage of an average year",
        status="code",
        note=_ITUR + " A point gradient, not averaged over a path.",
    ),
    Source(
        key="p530-17-roughness-map",
        title="Terrain roughness from the map",
        document=_P530,
        edition="17",
        clause="map of the standard deviation of terrain heights in 110 km",
        status="code",
        note=_ITUR,
    ),
    Source(
        key="p839-4-rain-height-map",
        title="Mean rain height from the map",
        document="Rec. ITU-R P.839",
        edition="4",
        clause="map of the height of the 0 degree isotherm, plus 0.36 km",
        status="text",
        note="The map is that of the package itur 0.4.0.",
    ),
    Source(
        key="p1510-1-temperature-map",
        title="Annual mean temperature near the ground from the map",
        document="Rec. ITU-R P.1510",
        edition="1",
        clause="map of the annual mean surface temperature",
        status="code",
        note=_ITUR,
    ),
    Source(
        key="p836-6-vapour-map",
        title="Water vapour near the ground from the map",
        document="Rec. ITU-R P.836",
        edition="6",
        clause="map of the density exceeded for 50 % of an average year, brought to the height of the place",
        status="code",
        note=_ITUR,
    ),
)
"""In the order of the methods page."""
