"""What a person must know beside a verdict: ranges left, doubtful data, and work that can hurt someone."""

from collections.abc import Sequence
from typing import Final

from fellspan.links.criteria import range_cautions
from fellspan.links.ends import EndLevel, roof_edge_cautions
from fellspan.links.safety import RAISING
from fellspan.links.signal_result import TreeLoss
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
    trees: TreeLoss | None,
    no_errors: bool,
    magnetic: tuple[str | None, str | None],
    antennas: Sequence[str] = (),
    beside: Sequence[str] = (),
) -> tuple[str, ...]:
    """All cautions of one link, each once, the ends first; `trees` where trees stand in the required zone."""
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
    if trees is not None:
        found += _tree_cautions(trees)
    if no_errors:
        found.append(
            "The data state no height error, so the confidence is a plain yes or no: check the heights on site."
        )
    found += profile.notes
    found += [text for text in magnetic if text]
    if raises:
        found.append(RAISING)
    return tuple(dict.fromkeys(found))


def _tree_cautions(trees: TreeLoss) -> list[str]:
    """How trees in the required zone were counted, where that costs anything."""
    where = "Trees stand in the required zone"
    if trees.way == "through" and trees.depth_m > 0.0:
        span = f"{trees.least_through_db:.1f} to {trees.most_through_db:.1f} dB"
        text = (
            f"{where}. The ray passes {trees.depth_m:.0f} m of wood: {trees.through_db:.1f} dB with diffraction ({span}), less "
            f"than over it ({trees.over_db:.1f} dB). Leaves, rain, wind and growth change it."
        )
    elif trees.way == "through":
        text = (
            f"{where}, below the ray: they are not counted ({trees.through_db:.1f} dB without them), taken as opaque they "
            f"would cost {trees.over_db:.1f} dB. Leaves, rain and growth change it."
        )
    elif trees.over_db > 0.0:
        text = (
            f"{where} and were taken as opaque in the diffraction loss ({trees.over_db:.1f} dB): leaves, rain and growth "
            "change it."
        )
    else:
        return []
    return [text]
