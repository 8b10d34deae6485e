"""links.csv, a row for each link, and a profile CSV for each path; shows numbers and computes none.

Columns carry their unit. Text from users cannot start a formula; numbers stay numbers.
"""

from fellspan.exports.text import Cell, csv_text, number_cells, rounded, text_cells
from fellspan.links.result import CriterionResult, EndResult, LinkResult
from fellspan.links.words import STATE_WORDS, decisive_margin_db, state_of
from fellspan.planning.plan import LinkFailure, LinkPlan, StudyPlan
from fellspan.report.naming import page_name, slug
from fellspan.vocabulary import COVER_KINDS

MEASURED_WORDS = ("no", "ground", "ground and top")
NOT_ASSESSED = "not assessed"

LINK_COLUMNS = (
    "name",
    "a",
    "b",
    "verdict",
    "state",
    "signal_verdict",
    "basis",
    "confidence",
    "confidence_asked",
    "distance_m",
    "bearing_ab_deg",
    "bearing_ba_deg",
    "tilt_ab_deg",
    "tilt_ba_deg",
    "frequency_hz",
    "polarization",
    *(
        f"{end}_{column}"
        for end in ("a", "b")
        for column in (
            "latitude_deg",
            "longitude_deg",
            "ground_amsl_m",
            "roof_agl_m",
            "antenna_amsl_m",
            "antenna_agl_m",
            "magnetic_bearing_deg",
        )
    ),
    "criterion",
    "k",
    "required_fraction",
    "worst_fraction",
    "worst_at_m",
    "clearance_m",
    "required_m",
    "shortfall_m",
    "shortfall_at_m",
    "cause",
    "extra_height_a_m",
    "extra_height_b_m",
    "extra_height_both_m",
    "free_space_loss_db",
    "diffraction_loss_db",
    "polarization_loss_db",
    "a_gain_dbi",
    "b_gain_dbi",
    "received_at_a_dbm",
    "received_at_b_dbm",
    "margin_at_a_db",
    "margin_at_b_db",
    "margin_with_neighbours_at_a_db",
    "margin_with_neighbours_at_b_db",
    "wanted_margin_db",
    "modulation",
    "availability_year_percent",
    "availability_worst_month_percent",
    "outage_minutes_per_year",
    "dominant_cause",
    "target_availability_percent",
    "target_met",
    "throughput_ab_bps",
    "throughput_ba_bps",
    "rain_loss_001_db",
    "rain_edition",
    "multipath_edition",
    "power_rule",
    "highest_setting_a_dbm",
    "highest_setting_b_dbm",
    "power_breach_a_db",
    "power_breach_b_db",
    "keep_away_front_a_m",
    "keep_away_front_b_m",
    "reason",
    "page",
)


def profile_name(index: int, link_name: str) -> str:
    """File name of the profile of a link; `index` counts from 0 in the order of the plan."""
    tail = slug(link_name)
    return f"profile-{index + 1:02d}-{tail}.csv" if tail else f"profile-{index + 1:02d}.csv"


def links_csv(plan: StudyPlan) -> str:
    """One row for each planned link, then one for each link that could not be assessed.

    The columns from `criterion` to `extra_height_both_m` are those of the governing criterion.
    """
    rows = [_link_row(linked.result, page_name(i, linked.result.name)) for i, linked in enumerate(plan.links)]
    rows += [_failure_row(failure) for failure in plan.failures]
    return csv_text(LINK_COLUMNS, rows)


def profile_csv(linked: LinkPlan) -> str:
    """Every sample of a path: position, ground, cover, surface, the ray, and bulge and need of each criterion.

    `surface_m` is what the ray must clear, with the antennas' own buildings taken out; the levels are m above sea level.
    """
    profile, levels = linked.profile, linked.levels
    header = [
        "distance_m",
        "latitude_deg",
        "longitude_deg",
        "ground_m",
        "cover_m",
        "cover_kind",
        "obstacle",
        "surface_m",
        "sigma_m",
        "measured",
        "source",
        "available_m",
        "fresnel_radius_m",
    ]
    for criterion in linked.result.clearance:
        header += [f"bulge_m ({criterion.criterion})", f"need_m ({criterion.criterion})"]
    obstacles = [*(obstacle.name for obstacle in profile.obstacles), None]
    sources = [*profile.sources, None]
    columns = [
        number_cells(profile.distance_m),
        number_cells(profile.latitude_deg, 8),
        number_cells(profile.longitude_deg, 8),
        number_cells(profile.ground_m),
        number_cells(profile.cover_m),
        text_cells(COVER_KINDS, profile.cover_kind),
        text_cells(obstacles, profile.obstacle_index),
        number_cells(levels.surface_m),
        number_cells(profile.sigma_m),
        text_cells(MEASURED_WORDS, profile.measured),
        text_cells(sources, profile.source),
        number_cells(levels.available_m),
        number_cells(levels.fresnel_radius_m),
    ]
    for bulge, need in zip(levels.bulge_m, levels.need_m, strict=True):
        columns += [number_cells(bulge), number_cells(need)]
    return csv_text(header, ()) + "".join(",".join(row) + "\n" for row in zip(*columns, strict=True))


def _end_cells(end: EndResult) -> list[Cell]:
    return [
        rounded(end.latitude_deg, 8),
        rounded(end.longitude_deg, 8),
        rounded(end.ground_m),
        rounded(end.roof_m),
        rounded(end.antenna_amsl_m),
        rounded(end.antenna_agl_m),
        rounded(end.magnetic_bearing_deg),
    ]


def _criterion_cells(criterion: CriterionResult) -> list[Cell]:
    return [
        criterion.criterion,
        rounded(criterion.k, 4),
        rounded(criterion.required_fraction, 4),
        rounded(criterion.worst_fraction, 4),
        rounded(criterion.worst_at_m),
        rounded(criterion.clearance_m),
        rounded(criterion.required_m),
        rounded(criterion.shortfall_m),
        rounded(criterion.shortfall_at_m),
        criterion.cause,
        rounded(criterion.extra_height_m.a),
        rounded(criterion.extra_height_m.b),
        rounded(criterion.extra_height_m.both),
    ]


def _signal_cells(result: LinkResult) -> list[Cell]:
    """From `modulation` to `multipath_edition`; availability and outage both ways at once."""
    signal, available = result.signal, result.availability_percent
    cells: list[Cell] = [result.modulation, rounded(available.year, 6), rounded(available.worst_month, 6)]
    if signal is None:
        return cells + [None] * 9
    met = {True: "yes", False: "no", None: None}[signal.target_met]
    return [
        *cells,
        rounded(signal.minutes_per_year),
        signal.dominant_cause,
        signal.target_availability_percent,
        met,
        rounded(signal.a_to_b.throughput_mean_bps, 0),
        rounded(signal.b_to_a.throughput_mean_bps, 0),
        rounded(result.losses_db.rain_001),
        signal.editions.rain,
        signal.editions.multipath,
    ]


def _rule_cells(result: LinkResult) -> list[Cell]:
    """From `power_rule` to `keep_away_front_b_m`; distances are for the general public."""
    power, exposure = result.power, result.exposure
    checks = (None, None) if power is None else (power.a, power.b)
    ends = (None, None) if exposure is None else (exposure.a, exposure.b)
    return [
        None if power is None else power.a.rule_id,
        *(None if check is None else rounded(check.highest_setting_dbm) for check in checks),
        *(None if check is None else rounded(check.breach_db) for check in checks),
        *(None if end is None else rounded(end.public.front_m) for end in ends),
    ]


def _link_row(result: LinkResult, page: str) -> list[Cell]:
    return [
        result.name,
        result.a,
        result.b,
        result.verdict,
        STATE_WORDS[state_of(result)],
        result.signal_verdict,
        result.basis,
        rounded(result.confidence, 4),
        rounded(result.confidence_asked, 4),
        rounded(result.distance_m),
        rounded(result.bearing_ab_deg, 4),
        rounded(result.bearing_ba_deg, 4),
        rounded(result.tilt_ab_deg, 4),
        rounded(result.tilt_ba_deg, 4),
        result.frequency_hz,
        result.polarization,
        *_end_cells(result.ends.a),
        *_end_cells(result.ends.b),
        *_criterion_cells(result.clearance[result.governing]),
        rounded(result.losses_db.free_space),
        rounded(result.losses_db.diffraction),
        rounded(result.losses_db.polarization),
        None if result.antennas is None else rounded(result.antennas.a.gain_dbi),
        None if result.antennas is None else rounded(result.antennas.b.gain_dbi),
        rounded(result.received_dbm.at_a),
        rounded(result.received_dbm.at_b),
        rounded(result.margin_db.at_a),
        rounded(result.margin_db.at_b),
        rounded(decisive_margin_db(result).at_a),
        rounded(decisive_margin_db(result).at_b),
        rounded(result.wanted_margin_db),
        *_signal_cells(result),
        *_rule_cells(result),
        result.reasons[0] if result.reasons else None,
        page,
    ]


def _failure_row(failure: LinkFailure) -> list[Cell]:
    row: dict[str, Cell] = dict.fromkeys(LINK_COLUMNS)
    link = failure.link
    row |= {"name": link.name, "a": link.a.name, "b": link.b.name, "verdict": NOT_ASSESSED, "state": NOT_ASSESSED}
    row |= {"frequency_hz": link.radio.frequency_hz, "reason": str(failure.error)}
    return list(row.values())
