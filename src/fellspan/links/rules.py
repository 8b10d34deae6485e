"""Power rules of licence-exempt bands: what a row allows with this antenna, the highest setting, and by how much it is broken.

The rows are data (`power_rules_*.toml`, and users' own files). A row that was not read, does not hold here or lacks a figure
gives no number, only the reason. Knows nothing of terrain, levels or pages. No legal advice.
"""

import difflib
import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files
from pathlib import Path
from typing import Final, Literal

from fellspan.errors import RuleError
from fellspan.links.rule_types import PowerRule
from fellspan.links.rules_file import read_rules, rules_of
from fellspan.links.tenths import down_tenth, up_tenth

SHIPPED: Final = ("power_rules_us.toml", "power_rules_europe.toml")
SAME_DB: Final = 0.005
"""A setting this little over the highest one is no breach: it is the rounding of what people type."""

Provision = Literal["conducted power", "conducted density", "EIRP", "EIRP density", "peak EIRP"]


@dataclass(frozen=True, slots=True, kw_only=True)
class RuleCheck:
    """What one row says of one end of a link; numbers are None where `reason` says why there is none.

    `allowed_conducted_dbm` is the most power at the port of the radio that the conducted limits leave with this antenna,
    `allowed_eirp_dbm` the most EIRP that all limits together leave it (None where the row sets no such limit),
    `highest_setting_dbm` the most that the radio may be set to under both, its feeder counted; `binds` is the provision that
    decides it. `eirp_dbm` is what the radio makes as it is set, `breach_db` how far the setting is over the highest one
    (0 where it keeps the rule); both are None where the setting is not known. `conditions` and `notes` go with every number.
    """

    rule_id: str
    citation: str
    reason: str
    sentence: str
    allowed_eirp_dbm: float | None = None
    allowed_conducted_dbm: float | None = None
    highest_setting_dbm: float | None = None
    binds: Provision | None = None
    eirp_dbm: float | None = None
    breach_db: float | None = None
    conditions: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()

    @property
    def is_breach(self) -> bool:
        """Whether the setting is known to be over the limit."""
        return self.breach_db is not None and self.breach_db > 0.0


def load_rules(path: Path | None = None) -> tuple[PowerRule, ...]:
    """The rows that come with Fellspan, then those of a user's file.

    Raises
    ------
    RuleError
        The user's file cannot be used (see `read_rules`), or has a row with the id of one that comes with Fellspan.
    """
    shipped = _shipped()
    if path is None:
        return shipped
    own = read_rules(path)
    taken = {row.id for row in shipped}
    for number, row in enumerate(own, start=1):
        if row.id in taken:
            raise RuleError(
                f"{path.name}, row {number} ('{row.id}'): a row that comes with Fellspan has this id",
                "give your row an id of its own, and name that one in the study",
            )
    return (*shipped, *own)


@lru_cache(maxsize=1)
def _shipped() -> tuple[PowerRule, ...]:
    room = files("fellspan.links")
    return tuple(
        row for name in SHIPPED for row in rules_of(room.joinpath(name).read_text(encoding="utf-8"), name=name)
    )


def find_rule(rule_id: str, rules: tuple[PowerRule, ...] | None = None) -> PowerRule:
    """The row of an id among `rules` (those that come with Fellspan where None).

    Raises
    ------
    RuleError
        There is no such row; the nearest ids are named.
    """
    rows = {row.id: row for row in (load_rules() if rules is None else rules)}
    if rule_id in rows:
        return rows[rule_id]
    by_folded = {name.casefold(): name for name in rows}
    near = [by_folded[word] for word in difflib.get_close_matches(rule_id.casefold(), by_folded, n=3, cutoff=0.5)]
    remedy = f"did you mean {', '.join(repr(name) for name in near)}?" if near else "docs/rules.md lists the rows"
    shown = rule_id if len(rule_id) <= 60 else rule_id[:57] + "..."
    raise RuleError(f"there is no power rule {shown!r}", remedy, "rows of your own go into a file that the study names")


def rules_at(
    frequency_hz: float, *, bandwidth_hz: float = 0.0, rules: tuple[PowerRule, ...] | None = None
) -> tuple[PowerRule, ...]:
    """The rows whose band holds the whole channel, in the order of the file, unconfirmed ones too."""
    return tuple(row for row in (load_rules() if rules is None else rules) if row.holds_for(frequency_hz, bandwidth_hz))


def check_power(
    rule: PowerRule,
    *,
    frequency_hz: float,
    bandwidth_hz: float | None,
    power_dbm: float | None,
    gain_dbi: float | None,
    feeder_loss_db: float = 0.0,
    peak_to_average_db: float | None = None,
    fixed_outdoors: bool = True,
    point_to_point: bool = True,
) -> RuleCheck:
    """Hold one end of a link against a row.

    Parameters
    ----------
    rule
        The row.
    frequency_hz, bandwidth_hz
        Centre and width of the channel, Hz; the whole channel must lie in the band. None: then a row with a limit of density
        gives no number.
    power_dbm
        Average power at the port of the radio, dBm, all chains together; None where it is not set yet.
    gain_dbi
        Greatest gain of the antenna, dBi, in whatever direction.
    feeder_loss_db
        Between the port and the antenna, dB, >= 0.
    peak_to_average_db
        Of the emission, dB; without it a limit of peak EIRP is not held against, which a note says.
    fixed_outdoors, point_to_point
        Where and for what the link is: rows for another place or use give no number.

    Returns
    -------
    check
        Never an exception for a row that cannot serve: `reason` says why, and the numbers are None.

    Notes
    -----
    On the safe side: conducted limits are held at the port of the radio, so a lossy feeder earns nothing there; EIRP counts
    the feeder. Density is that of a flat spectrum as wide as the channel.
    """
    power_dbm, peak_to_average_db = _known(power_dbm), _known(peak_to_average_db)
    bandwidth_hz = _known(bandwidth_hz)
    bandwidth_hz = None if bandwidth_hz is None or bandwidth_hz <= 0.0 else bandwidth_hz
    reason = _why_not(
        rule,
        frequency_hz=frequency_hz,
        bandwidth_hz=bandwidth_hz,
        gain_dbi=gain_dbi,
        feeder_loss_db=feeder_loss_db,
        fixed_outdoors=fixed_outdoors,
        point_to_point=point_to_point,
    )
    if reason or gain_dbi is None:
        sentence = f"No limit from row {rule.id}: {reason}; ask your regulator."
        return RuleCheck(rule_id=rule.id, citation=rule.citation, reason=reason, sentence=sentence)
    conducted, eirp = _limits(rule, gain_dbi=gain_dbi, width_hz=bandwidth_hz, peak_to_average_db=peak_to_average_db)
    # A limit at the port against one in the air: what each leaves to set the radio to.
    settings: dict[Provision, float] = conducted | {
        name: value - gain_dbi + feeder_loss_db for name, value in eirp.items()
    }
    binds = min(settings, key=settings.__getitem__)
    highest = settings[binds]
    allowed_conducted = min(conducted.values(), default=None)
    allowed_eirp = min(*eirp.values(), *(value + gain_dbi for value in conducted.values()), math.inf)
    notes = _notes(rule, bandwidth_hz=bandwidth_hz, peak_to_average_db=peak_to_average_db)
    radiated = None if power_dbm is None else power_dbm - feeder_loss_db + gain_dbi
    over = None if power_dbm is None else power_dbm - highest
    breach = None if over is None else (over if over > SAME_DB else 0.0)
    return RuleCheck(
        rule_id=rule.id,
        citation=rule.citation,
        reason="",
        sentence=_sentence(
            rule, highest, allowed_eirp, gain_dbi=gain_dbi, binds=binds, power_dbm=power_dbm, breach=breach
        ),
        allowed_eirp_dbm=allowed_eirp,
        allowed_conducted_dbm=allowed_conducted,
        highest_setting_dbm=highest,
        binds=binds,
        eirp_dbm=radiated,
        breach_db=breach,
        conditions=rule.conditions,
        notes=notes,
    )


def _why_not(
    rule: PowerRule,
    *,
    frequency_hz: float,
    bandwidth_hz: float | None,
    gain_dbi: float | None,
    feeder_loss_db: float,
    fixed_outdoors: bool,
    point_to_point: bool,
) -> str:
    """Why a row gives no number here; empty where it does."""
    tests: tuple[tuple[bool, Callable[[], str]], ...] = (
        (rule.status != "rule text seen", lambda: "the row is unconfirmed, its text was not read"),
        (
            not rule.holds_for(frequency_hz, bandwidth_hz or 0.0),
            lambda: (
                f"its band is {rule.band_words}, and {_channel_words(frequency_hz, bandwidth_hz)} does not lie in it"
            ),
        ),
        (rule.place == "indoors" and fixed_outdoors, lambda: "it is for indoor use, and this link is outdoors"),
        (rule.place == "not fixed outdoors" and fixed_outdoors, lambda: "it is not for fixed outdoor installations"),
        (rule.place == "fixed outdoors" and not fixed_outdoors, lambda: "it is for fixed outdoor installations only"),
        (
            rule.use == "fixed point-to-point" and not point_to_point,
            lambda: "it is for fixed point-to-point links only",
        ),
        (
            not any(limit is not None for limit in (rule.eirp_max_dbm, rule.conducted_max_dbm, *rule.densities)),
            lambda: "the row holds no limit",
        ),
        (gain_dbi is None or not math.isfinite(gain_dbi), lambda: "the gain of the antenna is not known"),
        (not (math.isfinite(feeder_loss_db) and feeder_loss_db >= 0.0), lambda: "the feeder loss is not 0 dB or more"),
        (
            bool(rule.densities) and bandwidth_hz is None,
            lambda: "it limits density, and the width of the channel is not known",
        ),
        (
            rule.gain_min_dbi is not None and gain_dbi is not None and gain_dbi < rule.gain_min_dbi,
            lambda: f"it asks for an antenna of at least {rule.gain_min_dbi:g} dBi, and this one has {gain_dbi:g} dBi",
        ),
    )
    return next((words() for found, words in tests if found), "")


def _known(value: float | None) -> float | None:
    return None if value is None or not math.isfinite(value) else value


def _limits(
    rule: PowerRule, *, gain_dbi: float, width_hz: float | None, peak_to_average_db: float | None
) -> tuple[dict[Provision, float], dict[Provision, float]]:
    """Most average power, dBm, by provision: at the port of the radio, and as EIRP."""
    conducted: dict[Provision, float] = {}
    eirp: dict[Provision, float] = {}
    lower = 0.0 if rule.back_off is None else rule.back_off.reduction_db(gain_dbi)
    if rule.conducted_max_dbm is not None:
        conducted["conducted power"] = rule.conducted_max_dbm - lower
    for density in rule.densities:
        spread = 0.0 if width_hz is None else max(10.0 * math.log10(width_hz / density.per_hz), 0.0)
        most = density.power_dbm + spread
        if density.of == "eirp":
            eirp["EIRP density"] = min(most, eirp.get("EIRP density", math.inf))
        else:
            most -= lower if rule.back_off is not None and rule.back_off.density else 0.0
            conducted["conducted density"] = min(most, conducted.get("conducted density", math.inf))
    fall = rule.eirp_fall
    if rule.eirp_max_dbm is not None:
        eirp["EIRP"] = rule.eirp_max_dbm if fall is None else fall.limit_dbm(rule.eirp_max_dbm, gain_dbi)
    if rule.peak_eirp_max_dbm is not None and peak_to_average_db is not None:
        peak = rule.peak_eirp_max_dbm if fall is None else fall.peak_limit_dbm(rule.peak_eirp_max_dbm, gain_dbi)
        eirp["peak EIRP"] = peak - max(peak_to_average_db, 0.0)
    return conducted, eirp


def _notes(rule: PowerRule, *, bandwidth_hz: float | None, peak_to_average_db: float | None) -> tuple[str, ...]:
    notes = [f"Text seen {rule.seen}; rules change, and this is no legal advice."]
    if rule.densities and bandwidth_hz is not None:
        notes.append("Density is reckoned for a flat spectrum over the channel; a real one has peaks above its mean.")
    if rule.peak_eirp_max_dbm is not None and peak_to_average_db is None:
        notes.append("The row limits peak EIRP too, which was not checked: the peak to average ratio is not known.")
    if rule.conducted_max_dbm is not None:
        notes.append(
            "Power is that of all chains together, at the port of the radio; a lossy feeder earns nothing there."
        )
    return tuple(notes)


def _sentence(
    rule: PowerRule,
    highest_dbm: float,
    eirp_dbm: float,
    *,
    gain_dbi: float,
    binds: Provision,
    power_dbm: float | None,
    breach: float | None,
) -> str:
    words = (
        f"Limit by row {rule.id} ({rule.citation}): {_down(highest_dbm)} dBm at most at the radio with this antenna of "
        f"{gain_dbi:.1f} dBi, EIRP {_down(eirp_dbm)} dBm at most; {binds} decides"
    )
    if breach:
        # Up, not to the nearest: a breach is never shown as 0.0 dB.
        words += f"; the {power_dbm:g} dBm set are {up_tenth(breach):.1f} dB over it"
    return f"{words}; confirm with your regulator."


def _down(value: float) -> str:
    """To a tenth of a dB, never above the limit."""
    return f"{down_tenth(value):.1f}"


def _channel_words(frequency_hz: float, bandwidth_hz: float | None) -> str:
    centre = f"{frequency_hz / 1e6:.10g} MHz"
    return f"a channel of {bandwidth_hz / 1e6:.10g} MHz at {centre}" if bandwidth_hz else centre
