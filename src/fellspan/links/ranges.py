"""Which published ranges a link leaves in rain and multipath, in the words of the registry; and what multipath took.

Reads the citation registry; computes no loss.
"""

from typing import Final

from fellspan.climate.figures import ClimateFigures
from fellspan.links.fading import Geometry
from fellspan.links.signal_result import WorkingInput
from fellspan.propagation import RainEdition, multipath_clearance_m, out_of_range
from fellspan.propagation.multipath import NO_MULTIPATH_UP_TO_M

NOTHING_DB: Final = 0.05
"""A loss that rounds to 0.0 dB is not doubted."""


def rain_breaches(
    geometry: Geometry, *, frequency_hz: float, edition: RainEdition, loss_db: float | None
) -> tuple[str, ...]:
    """What the rain loss leaves; nothing where it is too small to matter."""
    if loss_db is None or loss_db < NOTHING_DB:
        return ()
    found = list(out_of_range("p838-3-rain", frequency_hz=frequency_hz))
    if edition == "19":
        found += out_of_range("p530-19-rain", frequency_hz=frequency_hz, distance_m=geometry.length_m)
    return tuple(found)


def gas_breaches(*, frequency_hz: float, loss_db: float) -> tuple[str, ...]:
    """What the loss by gases leaves; nothing where it is too small to matter."""
    return () if loss_db < NOTHING_DB else out_of_range("p676-12-gases", frequency_hz=frequency_hz)


def woodland_breaches(*, frequency_hz: float) -> tuple[str, ...]:
    """What the loss through woodland leaves."""
    return (
        *out_of_range("p833-10-woodland", frequency_hz=frequency_hz),
        *out_of_range("p833-10-specific", frequency_hz=frequency_hz),
    )


def multipath_inputs(figures: ClimateFigures, *, geometry: Geometry) -> tuple[WorkingInput, ...]:
    """The climate figures that the edition in use takes."""
    edition = figures.multipath_edition
    if edition is None or geometry.length_m <= NO_MULTIPATH_UP_TO_M:
        return ()
    slope = WorkingInput(label="slope between the antennas", value=geometry.inclination_mrad, unit="mrad")
    if edition == "P.530-19":
        ground = WorkingInput(label="mean ground", value=geometry.mean_ground_m, unit="m")
        return (slope, ground, *_figures(figures, {"log_k": "log K", "dn75": "dN75"}))
    rough = {"terrain_roughness_m": "terrain roughness"} if edition == "P.530-17 detailed" else {}
    return (slope, *_figures(figures, {"dn1_n_per_km": "dN1", **rough}))


def _figures(figures: ClimateFigures, names: dict[str, str]) -> tuple[WorkingInput, ...]:
    found = ((label, getattr(figures, name)) for name, label in names.items())
    return tuple(
        WorkingInput(label=f"{label} ({figure.provenance})", value=figure.value, unit=figure.unit)
        for label, figure in found
        if figure is not None
    )


def multipath_breaches(
    figures: ClimateFigures, *, geometry: Geometry, frequency_hz: float, percent: float | None
) -> tuple[str, ...]:
    """What the occurrence of multipath leaves; nothing on paths that have none."""
    if not percent:
        return ()
    found = list(out_of_range("p530-19-fade-depths", occurrence_percent=percent))
    low_end = {"distance_frequency_m_hz": geometry.length_m * frequency_hz}
    if figures.multipath_edition == "P.530-19" and figures.dn75 is not None:
        height = multipath_clearance_m(
            geometry.length_m,
            a_amsl_m=geometry.a_amsl_m,
            b_amsl_m=geometry.b_amsl_m,
            mean_ground_amsl_m=geometry.mean_ground_m,
        )
        found += out_of_range(
            "p530-19-multipath",
            distance_m=geometry.length_m,
            frequency_hz=frequency_hz,
            inclination_mrad=geometry.inclination_mrad,
            lower_amsl_m=min(geometry.a_amsl_m, geometry.b_amsl_m),
            clearance_m=float(height),
            dn75=figures.dn75.value,
            **low_end,
        )
    else:
        # The text of -17 was not read; the law of -19 stands on the same kind of measurements. Its least length is left out:
        # there multipath counts from 5 km on.
        borrowed = out_of_range(
            "p530-19-multipath", frequency_hz=frequency_hz, inclination_mrad=geometry.inclination_mrad, **low_end
        )
        found += [f"{one} (taken for edition -17 too, whose range was not read)" for one in borrowed]
    return tuple(found)
