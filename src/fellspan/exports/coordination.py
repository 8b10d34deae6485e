"""coordination.csv: what a regulator or a neighbour asks of each direction of a link; shows numbers and computes none.

EIRP is the sum of figures that the study states, at the highest power of any modulation. A direction stands in the sheet where
power and both gains are known.
"""

from dataclasses import dataclass

from fellspan.exports.text import Cell, csv_text, rounded
from fellspan.geodesy.coordinates import format_position
from fellspan.geodesy.position import Position
from fellspan.links.budget import line_loss_db
from fellspan.links.emission import emission_designator, necessary_bandwidth
from fellspan.links.radiated import highest_power_dbm
from fellspan.links.result import AntennaResult, EndResult
from fellspan.links.site import Antenna
from fellspan.planning.plan import LinkPlan, StudyPlan

HORIZONTAL_DATUM = "WGS 84"
GAIN_ONLY = "gain only, no pattern"

_END_COLUMNS = (
    "site",
    "latitude_deg",
    "longitude_deg",
    "latitude_dms",
    "longitude_dms",
    "ground_amsl_m",
    "antenna_agl_m",
    "antenna_amsl_m",
    "antenna",
    "gain_dbi",
    "pattern",
    "polarization",
    "azimuth_true_deg",
    "elevation_deg",
)

COORDINATION_COLUMNS = (
    "link",
    "direction",
    "horizontal_datum",
    "vertical_datum",
    "frequency_hz",
    "bandwidth_hz",
    "necessary_bandwidth",
    "emission_designator",
    "power_dbm",
    "feeder_loss_db",
    "eirp_dbm",
    "eirp_toward_receiver_dbm",
    "distance_m",
    "path_azimuth_true_deg",
    "path_elevation_deg",
    *(f"{role}_{column}" for role in ("transmit", "receive") for column in _END_COLUMNS),
    "revision",
    "date",
)


@dataclass(frozen=True, slots=True, kw_only=True)
class _End:
    """One end of a link, as the sheet needs it; `bearing_deg` and `tilt_deg` are those of the path there."""

    letter: str
    result: EndResult
    antenna: Antenna
    mounted: AntennaResult | None
    bearing_deg: float
    tilt_deg: float

    @property
    def peak_gain_dbi(self) -> float | None:
        return self.antenna.peak_gain_dbi if self.mounted is None else self.mounted.peak_gain_dbi

    @property
    def gain_along_path_dbi(self) -> float | None:
        return self.antenna.peak_gain_dbi if self.mounted is None else self.mounted.gain_dbi


def coordination_csv(plan: StudyPlan) -> str | None:
    """Two rows for each link, one a direction; None where no link states power and both gains."""
    rows = [row for linked in plan.links for row in _link_rows(linked, plan)]
    return csv_text(COORDINATION_COLUMNS, rows) if rows else None


def _link_rows(linked: LinkPlan, plan: StudyPlan) -> list[list[Cell]]:
    result, link = linked.result, linked.link
    mounted = result.antennas
    a = _End(
        letter="A",
        result=result.ends.a,
        antenna=link.antenna_a,
        mounted=mounted.a if mounted else None,
        bearing_deg=result.bearing_ab_deg,
        tilt_deg=result.tilt_ab_deg,
    )
    b = _End(
        letter="B",
        result=result.ends.b,
        antenna=link.antenna_b,
        mounted=mounted.b if mounted else None,
        bearing_deg=result.bearing_ba_deg,
        tilt_deg=result.tilt_ba_deg,
    )
    if highest_power_dbm(link.radio) is None or a.peak_gain_dbi is None or b.peak_gain_dbi is None:
        return []
    return [_row(linked, plan, transmit=one, receive=other) for one, other in ((a, b), (b, a))]


def _row(linked: LinkPlan, plan: StudyPlan, *, transmit: _End, receive: _End) -> list[Cell]:
    result, radio = linked.result, linked.link.radio
    width, emission = radio.bandwidth_hz, radio.emission_class
    frequency_hz = radio.transmit_hz[0 if transmit.letter == "A" else 1]
    power = highest_power_dbm(radio)
    lost = transmit.antenna.branching_loss_db + line_loss_db(transmit.antenna, frequency_hz=frequency_hz)
    at_antenna = None if power is None else power - lost
    return [
        result.name,
        f"{transmit.letter} to {receive.letter}",
        HORIZONTAL_DATUM,
        result.vertical_datum,
        frequency_hz,
        width,
        None if width is None else necessary_bandwidth(width),
        None if width is None or emission is None else emission_designator(width, emission),
        rounded(power),
        rounded(lost),
        _sum(at_antenna, transmit.peak_gain_dbi),
        _sum(at_antenna, transmit.gain_along_path_dbi),
        rounded(result.distance_m),
        _azimuth(transmit.bearing_deg),
        rounded(transmit.tilt_deg),
        *_end_cells(transmit, result.polarization),
        *_end_cells(receive, result.polarization),
        plan.study.revision or None,
        plan.study.date.isoformat(),
    ]


def _end_cells(end: _End, polarization: str) -> list[Cell]:
    place, mounted = end.result, end.mounted
    latitude, longitude = format_position(
        Position(latitude_deg=place.latitude_deg, longitude_deg=place.longitude_deg), "dms"
    ).split(", ")
    return [
        place.site,
        rounded(place.latitude_deg, 8),
        rounded(place.longitude_deg, 8),
        latitude,
        longitude,
        rounded(place.ground_m),
        rounded(place.antenna_agl_m),
        rounded(place.antenna_amsl_m),
        end.antenna.name if mounted is None else mounted.name,
        rounded(end.peak_gain_dbi),
        GAIN_ONLY if mounted is None or mounted.source is None else mounted.source,
        polarization if mounted is None else mounted.polarization,
        _azimuth(end.bearing_deg if mounted is None else mounted.bearing_deg),
        rounded(end.tilt_deg if mounted is None else mounted.tilt_deg),
    ]


def _sum(one: float | None, other: float | None) -> float | None:
    return None if one is None or other is None else rounded(one + other)


def _azimuth(bearing_deg: float) -> float | None:
    """To 0.001 degrees, 0 to below 360."""
    value = rounded(bearing_deg)
    return None if value is None else value % 360.0
