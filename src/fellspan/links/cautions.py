"""What a person must know beside a verdict: ranges left, doubtful data, and work that can hurt someone."""

from collections.abc import Sequence
from typing import Final

from fellspan.links.criteria import range_cautions
from fellspan.links.ends import EndLevel, roof_edge_cautions
from fellspan.links.safety import RAISING
from fellspan.links.site import Link
from fellspan.propagation import inverse_k, out_of_range
from fellspan.propagation.constants import K_FORMULA_HIGH_M
from fellspan.terrain.profile import PathProfile
from fellspan.vocabulary import CriteriaPreset

LONGEST_M: Final = 300_000.0
"""Longer paths than this are taken for a slip in the coordinates, m (common practice, no source)."""


def cautions(
    link: Link,
    profile: PathProfile,
    levels: tuple[EndLevel, EndLevel],
    *,
    preset: CriteriaPreset | None,
    median_k: float,
    raises: bool,
    diffraction_db: float,
    trees: bool,
    no_errors: bool,
    magnetic: tuple[str | None, str | None],
    antennas: Sequence[str] = (),
    beside: Sequence[str] = (),
) -> tuple[str, ...]:
    """All cautions of one link, each once, the ends first."""
    found: list[str] = []
    for level in levels:
        found += level.cautions
        found += roof_edge_cautions(level, profile)
    found += beside
    found += antennas
    if profile.length_m > LONGEST_M:
        found.append(
            f"The path is {profile.length_m / 1000.0:.0f} km long, more than radio links over land and sea span: check the "
            "coordinates of both sites."
        )
    if preset is not None:
        found += range_cautions(preset, frequency_hz=link.radio.frequency_hz)
    # Below the curve a rule of our own holds its first value, and the criterion's note says so; beyond it nothing is held.
    if preset in ("p530-temperate", "p530-tropical") and profile.length_m > K_FORMULA_HIGH_M:
        found += [f"Worst-month k: {breach}." for breach in out_of_range("p530-19-k999", distance_m=profile.length_m)]
    breaches = out_of_range(
        "p526-16-delta-bullington", frequency_hz=link.radio.frequency_hz, inverse_k=float(inverse_k(median_k))
    )
    found += [f"Diffraction loss: {breach}." for breach in breaches]
    if trees and diffraction_db > 0.0:
        found.append(
            f"Trees stand in the required zone and were taken as opaque in the diffraction loss ({diffraction_db:.1f} dB): "
            "leaves, rain and growth change it."
        )
    if no_errors:
        found.append(
            "The data state no height error, so the confidence is a plain yes or no: check the heights on site."
        )
    found += profile.notes
    found += [text for text in magnetic if text]
    if raises:
        found.append(RAISING)
    return tuple(dict.fromkeys(found))
