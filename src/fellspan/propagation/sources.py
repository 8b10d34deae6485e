"""The citation registry: where each formula comes from, how far it holds, and how sure we are of it.

Workings, the methods page and cautions read it, so a source is written once. Data only: it computes no physics.
"""

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from fellspan.propagation.constants import K_FORMULA_HIGH_M, K_FORMULA_LOW_M
from fellspan.propagation.source_types import Source, Validity
from fellspan.propagation.sources_antennas import ANTENNA_SOURCES
from fellspan.propagation.sources_fading import FADING_SOURCES
from fellspan.propagation.sources_reflection import REFLECTION_SOURCES
from fellspan.propagation.sources_weather import WEATHER_SOURCES


def _frequency(low_hz: float, unit: str = "MHz") -> Validity:
    return Validity(
        quantity="frequency_hz", label="frequency", unit=unit, low=low_hz, scale=1e9 if unit == "GHz" else 1e6
    )


_P526 = "Rec. ITU-R P.526"
_P530 = "Rec. ITU-R P.530"
_P452 = "Rec. ITU-R P.452"
_P453 = "Rec. ITU-R P.453"

_ALL: Final = (
    Source(
        key="p525-free-space",
        title="Free-space basic transmission loss",
        document="Rec. ITU-R P.525",
        edition="5",
        clause="free-space basic transmission loss",
        status="derived",
        note="Exact form, derived from the definition; the text of this edition was not read. Far field of both antennas only.",
    ),
    Source(
        key="p453-13-refractivity",
        title="Radio refractivity of air",
        document=_P453,
        edition="13",
        clause="refractivity from pressure, temperature and vapour pressure",
        status="code",
        note="Taken from an independent implementation; the text was not read.",
    ),
    Source(
        key="p453-13-saturation",
        title="Saturation vapour pressure over water",
        document=_P453,
        edition="13",
        clause="saturation vapour pressure, liquid water",
        status="code",
        note="Taken from an independent implementation; the text was not read. Over ice it is another fit, not included.",
    ),
    Source(
        key="p452-18-k",
        title="Effective Earth radius factor from the refractivity gradient",
        document=_P452,
        edition="18",
        clause="equation (5)",
        status="text",
        note="Our sign: dN/dh, negative in normal air. 1/k is used throughout, so any gradient is legal.",
    ),
    Source(
        key="p530-19-k999",
        title="k exceeded for 99.9 % of the worst month, for the path length",
        document=_P530,
        edition="19",
        clause="section 2.2.2.1, equation (4)",
        status="text",
        note="Continental temperate climate. Below 18 km, where the printed figure ends, the 18 km value is held: our rule.",
        ranges=(
            Validity(
                quantity="distance_m",
                label="path length",
                unit="km",
                low=K_FORMULA_LOW_M,
                high=K_FORMULA_HIGH_M,
                scale=1000.0,
            ),
        ),
    ),
    Source(
        key="p526-16-fresnel",
        title="Radius of a Fresnel zone",
        document=_P526,
        edition="16",
        clause="equation (2)",
        status="text",
        note="Self-consistent units; the rounded 17.3 of the practical form is 17.3146.",
    ),
    Source(
        key="earth-bulge",
        title="Earth bulge above the chord",
        document=_P526,
        edition="16",
        clause="section 4.5.1, equation (49)",
        status="text",
        note="Parabola in place of the circle; Earth radius 6371 km.",
    ),
    Source(
        key="p526-16-knife-edge",
        title="Single knife edge, approximation",
        document=_P526,
        edition="16",
        clause="section 4.1, equations (26) and (31)",
        status="text",
        note="Within 0.123 dB of the Fresnel integrals for -0.7 < nu < 30. Nothing at and below nu = -0.78.",
        ranges=(_frequency(30e6), Validity(quantity="nu", label="nu", unit="", low=-0.78)),
    ),
    Source(
        key="p526-16-knife-edge-exact",
        title="Single knife edge, Fresnel integrals",
        document=_P526,
        edition="16",
        clause="section 4.1, equation (30)",
        status="text",
        ranges=(_frequency(30e6),),
    ),
    Source(
        key="p526-16-double-edge",
        title="Two knife edges",
        document=_P526,
        edition="16",
        clause="section 4.3",
        status="text",
        note="For edges that each cost more than about 15 dB.",
        ranges=(_frequency(30e6), Validity(quantity="edge_loss_db", label="loss of each edge", unit="dB", low=15.0)),
    ),
    Source(
        key="p526-16-rounded",
        title="Rounded obstacle",
        document=_P526,
        edition="16",
        clause="section 4.2, equations (5) and (32) to (38)",
        status="text",
        note="Jumps at m n = 4, where its two branches do not meet.",
        ranges=(_frequency(30e6),),
    ),
    Source(
        key="p530-19-average-diffraction",
        title="Diffraction loss over average terrain",
        document=_P530,
        edition="19",
        clause="equation (2)",
        status="text",
        note="Strictly above about 15 dB; Fig. 1 draws the line down to 6 dB.",
        ranges=(Validity(quantity="loss_db", label="loss", unit="dB", low=15.0),),
    ),
    Source(
        key="p526-16-first-residue",
        title="Smooth Earth beyond the horizon, first residue term",
        document=_P526,
        edition="16",
        clause="section 3.1.1, equations (11) to (18a)",
        status="text",
        ranges=(_frequency(10e6),),
    ),
    Source(
        key="p526-16-spherical",
        title="Smooth Earth at any distance",
        document=_P526,
        edition="16",
        clause="section 3.2, equations (21) to (25)",
        status="text",
        note="Undefined where k is negative; the complete method then goes without it.",
        ranges=(_frequency(10e6), Validity(quantity="inverse_k", label="1/k", unit="", low=0.0)),
    ),
    Source(
        key="p452-18-ground",
        title="Electrical constants of land and sea",
        document=_P452,
        edition="18",
        clause="section 4.2",
        status="text",
        note="Land 22 and 0.003 S/m, sea 80 and 5 S/m; for diffraction, not for reflection.",
        ranges=(Validity(quantity="sea_fraction", label="fraction of sea", unit="", low=0.0, high=1.0),),
    ),
    Source(
        key="p526-16-bullington",
        title="Bullington construction over a profile",
        document=_P526,
        edition="16",
        clause="section 4.5.1, equations (49) to (57)",
        status="text",
        ranges=(_frequency(30e6),),
    ),
    Source(
        key="p526-16-delta-bullington",
        title="Complete delta-Bullington method for a general path",
        document=_P526,
        edition="16",
        clause="section 4.5.2, equations (58) to (66)",
        status="text",
        note="Where k is negative the spherical part is undefined and is left out.",
        ranges=(_frequency(30e6), Validity(quantity="inverse_k", label="1/k", unit="", low=0.0)),
    ),
    Source(
        key="p530-19-clearance",
        title="Clearance of a path without diversity, temperate climate",
        document=_P530,
        edition="19",
        clause="section 2.2.2.1",
        status="text",
        note="Above about 13 GHz the doubt in obstacle heights is comparable with F1 and is to be added to the clearance.",
        ranges=(_frequency(2e9, "GHz"),),
    ),
    Source(
        key="p530-19-clearance-tropical",
        title="Clearance of a path without diversity, tropical climate",
        document=_P530,
        edition="19",
        clause="section 2.2.2.1",
        status="text",
        note="No rule at low k for paths up to about 30 km: only step 1, full first zone at the median k, applies there.",
        ranges=(
            _frequency(2e9, "GHz"),
            Validity(quantity="distance_m", label="path length", unit="km", low=30_000.0, scale=1000.0),
        ),
    ),
    Source(
        key="sixty-percent",
        title="60 % of the first Fresnel zone at k = 4/3",
        document="common practice, no source",
        edition="",
        clause="",
        status="practice",
        note="At 0.6 F1 a knife edge costs nothing; says nothing of hours when k is low.",
    ),
)

__all__ = ["SOURCES", "Source", "Validity", "out_of_range", "source"]

SOURCES: Final[Mapping[str, Source]] = MappingProxyType(
    {entry.key: entry for entry in (*_ALL, *ANTENNA_SOURCES, *WEATHER_SOURCES, *FADING_SOURCES, *REFLECTION_SOURCES)}
)
"""Every source of this room by its key, in the order of the methods page."""


def source(key: str) -> Source:
    """The source with this key; KeyError names the keys there are."""
    try:
        return SOURCES[key]
    except KeyError:
        raise KeyError(f"no source {key!r}; there are {', '.join(SOURCES)}") from None


def out_of_range(key: str, **values: float) -> tuple[str, ...]:
    """What lies outside the published range of a source, one sentence each; empty where nothing does.

    Parameters
    ----------
    key
        Key of the source.
    values
        Quantities by the names of its ranges, in SI, for instance `distance_m=12e3`. Those not given are not checked. A name
        that the source has no range for is refused, so that a typing error cannot pass for a check. NaN is not judged.
    """
    entry = source(key)
    known = {validity.quantity: validity for validity in entry.ranges}
    for name in values:
        if name not in known:
            raise ValueError(f"{key!r} states no range of {name!r}; it has {', '.join(known) or 'none'}")
    return tuple(
        f"{limit.label} {values[name] / limit.scale:.4g} {limit.unit}".rstrip()
        + f" is outside the range of {entry.reference}: {limit.text()}"
        for name, limit in known.items()
        if name in values and (values[name] < limit.low or values[name] > limit.high)
    )
