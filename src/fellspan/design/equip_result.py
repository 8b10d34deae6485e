"""What comparing equipment gives: a row for each antenna with each radio, the policy, and the decision; computes nothing."""

from dataclasses import dataclass
from typing import Final, Literal

from fellspan.links.result import AtEnds
from fellspan.links.signal_result import Periods
from fellspan.vocabulary import PathVerdict, SignalVerdict

ShortOf = Literal["margin", "availability"]
EquipEnd = Literal["both", "a", "b"]

POLICY: Final = (
    "Smallest that meets the target: by frontal area, then mass, then gain; an antenna of unknown size comes after those of "
    "known size. Those that fall short follow, by how much they lack."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class EquipSettings:
    """What equipment is compared for.

    Parameters
    ----------
    wind_speed_m_s
        Design gust at the height of the antenna, m/s; None works out no force.
    arm_m
        Height of the antenna above the last support of its mast, m; for the moment.
    off_aim_deg
        Error of aim whose cost is told, degrees; it is in no level.
    end
        Which end gets the antenna: 'both', or one of them while the other keeps its own.
    reach
        Whether to search how far each pair reaches.
    """

    wind_speed_m_s: float | None = None
    arm_m: float = 1.0
    off_aim_deg: float = 1.0
    end: EquipEnd = "both"
    reach: bool = False


@dataclass(frozen=True, slots=True, kw_only=True)
class WindLoad:
    """Wind on one antenna from the front; `confirmed` says whether the drag coefficient was seen in its source."""

    speed_m_s: float
    force_n: float
    arm_m: float
    moment_nm: float
    drag_coefficient: float
    drag_source: str
    confirmed: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class Reach:
    """How far a pair serves at the target over a free path.

    `distance_m` is None where it does not even serve the shortest distance tried; `limited_by` says what ends it: 'margin',
    'rain', 'multipath', 'timing' of the radio, or 'beyond' where it goes past the longest distance tried. `spare_db` is what
    is left over the target at each of `EquipResult.reach_distance_m`; None where that is not known.
    """

    distance_m: float | None
    limited_by: str
    spare_db: tuple[float | None, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class EquipRow:
    """One antenna with one radio on the link; levels and margins are those of `plan` with this antenna and this power.

    `power_dbm` is the most power the radio is set to: as stated, or lower by `lowered_db` where the power rule allows no more
    with this antenna. `spare_db` is what is left over margin and availability asked, in the worse direction; below 0 it is what
    is missing, `short_of` which of the two is missing most, and `cause` what takes it ('rain', 'multipath', 'diffraction',
    'level' where it is short in clear air); None where that cannot be said. `off_aim_db` is the worst of four directions.
    """

    antenna: str
    kind: str
    radio: str
    rank: int
    meets: bool
    signal_verdict: SignalVerdict | None
    power_dbm: float | None
    lowered_db: float
    highest_setting_dbm: float | None
    rule: str | None
    received_dbm: AtEnds
    margin_db: AtEnds
    spare_db: float | None
    short_of: ShortOf | None
    cause: str | None
    availability_percent: Periods
    minutes_per_year: float | None
    modulation: str | None
    throughput_mean_bps: float | None
    peak_gain_dbi: float | None
    azimuth_width_deg: float | None
    elevation_width_deg: float | None
    off_aim_deg: float
    off_aim_db: float | None
    sway_mean_db: float | None
    """Mean loss by the sway that the link states, in the level already; None where none is stated or it is unknown."""
    sway_p999_db: float | None
    """Loss by sway that is not exceeded for 99.9 % of the time."""
    far_field_m: float | None
    width_m: float | None
    height_m: float | None
    mass_kg: float | None
    frontal_area_m2: float | None
    wind: WindLoad | None
    reach: Reach | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class EquipResult:
    """The comparison for one link.

    `rows` are ranked by `policy`; `best` is the index of the first that meets the target, None where none does. `decision`
    says which and why in one sentence, `changes` what would change it. `path_verdict` is that of the terrain, None on a free
    path. `passed_over` names what could not be compared, and why.
    """

    link: str
    distance_m: float
    frequency_hz: float
    target_availability_percent: float | None
    wanted_margin_db: float
    end: EquipEnd
    path_verdict: PathVerdict | None
    decision: str
    changes: str
    policy: str
    rows: tuple[EquipRow, ...]
    best: int | None
    passed_over: tuple[str, ...]
    cautions: tuple[str, ...]
    assumptions: tuple[str, ...]
    reach_distance_m: tuple[float, ...] = ()
