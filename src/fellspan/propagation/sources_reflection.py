"""The citation registry's entries for reflections from ground and water; `sources` merges them. Data only."""

from typing import Final

from fellspan.propagation.source_types import Source, Validity

_P530 = "Rec. ITU-R P.530"

REFLECTION_SOURCES: Final = (
    Source(
        key="p530-19-reflection-point",
        title="Point of reflection on a curved Earth, grazing angle, divergence and path difference",
        document=_P530,
        edition="19",
        clause="section 6.1.2, equations (121) to (132)",
        status="text",
        note="Earth radius 6371 km as everywhere here; the text prints 6375 km. Rays as straight lines: not near the horizon.",
    ),
    Source(
        key="p530-19-reflection",
        title="Reflection coefficient of a smooth surface",
        document=_P530,
        edition="19",
        clause="section 6.1.2, equations (127) to (131)",
        status="text",
        note="Kept complex, so that its phase counts too; the constant printed as 18 is 17.975.",
    ),
    Source(
        key="p530-19-reflecting-surface",
        title="First Fresnel zone on the ground, partial and rough surfaces",
        document=_P530,
        edition="19",
        clause="section 6.1.2, equations (133) to (138)",
        status="text",
    ),
    Source(
        key="p530-19-reflection-antennas",
        title="Angle of the reflected ray, discrimination by the antennas, deepest fade",
        document=_P530,
        edition="19",
        clause="section 6.1.2, equations (140) to (148)",
        status="text",
        note="The Gaussian main lobe only where no pattern is known.",
    ),
    Source(
        key="p530-19-reflection-spacing",
        title="Spacing of antennas and of frequencies against reflections",
        document=_P530,
        edition="19",
        clause="section 6.2.1, equations (151) to (153)",
        status="text",
    ),
    Source(
        key="two-ray-sphere",
        title="Level of a direct and a mirrored ray over a smooth sphere",
        document="law of cosines, sum of two phasors",
        edition="",
        clause="",
        status="derived",
        note="Path difference from chords of the circle of radius k * 6371 km.",
    ),
    Source(
        key="p527-ground",
        title="Permittivity and conductivity of water and ground below about 1 GHz",
        document="Rec. ITU-R P.527",
        edition="",
        clause="constants below about 1 GHz",
        status="code",
        note="From independent programs; the text was not read. The conductivity of fresh water is unconfirmed (from memory).",
        ranges=(Validity(quantity="frequency_hz", label="frequency", unit="GHz", high=1e9, scale=1e9),),
    ),
    Source(
        key="p527-6-water",
        title="Permittivity of water by its two relaxations",
        document="Rec. ITU-R P.527",
        edition="6",
        clause="pure water",
        status="code",
        note="From independent programs; the text was not read. Sea water: a conductivity of 5 S/m beside it, approximate.",
    ),
    Source(
        key="p2040-3-ground",
        title="Permittivity and conductivity of ground",
        document="Rec. ITU-R P.2040",
        edition="3",
        clause="very dry, medium dry and wet ground",
        status="code",
        note="From independent programs; the text was not read.",
        ranges=(Validity(quantity="frequency_hz", label="frequency", unit="GHz", low=1e9, high=10e9, scale=1e9),),
    ),
)
