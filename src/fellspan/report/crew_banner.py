"""What stands over a crew sheet before anything else: whether to install, and the power allowed. Computes nothing."""

from dataclasses import dataclass
from typing import Final

from fellspan.links import radio_words, words
from fellspan.links.result import LinkResult
from fellspan.links.rules import RuleCheck
from fellspan.links.verdicts import RAISING_BEGINS
from fellspan.links.words import state_of
from fellspan.report import wording

STOP: Final = "NOT CLEAR AS PLANNED: do not install before the plan is changed"
WALK: Final = "clear on bare ground only: walk the path first"
NO_LEVEL: Final = "no acceptance level: the link is not expected to work as planned"
_LONGEST: Final = 150


@dataclass(frozen=True, slots=True, kw_only=True)
class Banner:
    """A title, sentences under it, and whether it forbids to install."""

    title: str
    sentences: tuple[str, ...] = ()
    heavy: bool = True


def banner_of(result: LinkResult) -> Banner | None:
    """The banner of both ends of a link; None where path and signal leave nothing to warn of."""
    below = result.signal_verdict == "below"
    if result.verdict == "clear" and not below:
        return Banner(title=WALK, heavy=False) if state_of(result) == "clear-bare" else None
    told = [one for one in result.reasons if one.startswith(RAISING_BEGINS)][:1]
    if result.verdict != "clear" and not told:
        told = [wording.headline(result)]
    if below:
        told.append(f"Signal below what is wanted: {radio_words.verdict_why(result)}.")
    return Banner(title=STOP, sentences=tuple(wording.shorten(one, _LONGEST) for one in told))


def has_no_level(result: LinkResult) -> bool:
    """Whether no reading can be accepted: the level would come over an obstacle, or would not do."""
    return result.verdict == "obstructed" or result.signal_verdict == "below"


def most_allowed_dbm(check: RuleCheck | None) -> float | None:
    """The most power that the rule allows, dBm, where the power planned is over it; else None."""
    if check is None or not check.is_breach or check.highest_setting_dbm is None or check.breach_db is None:
        return None
    # Down, not to the nearest: what is set by this sheet must keep the rule.
    return words.down_db(check.highest_setting_dbm)


def over_rule(check: RuleCheck | None) -> str:
    """What the rule allows where the power planned is over it; else empty."""
    most = most_allowed_dbm(check)
    if most is None or check is None or check.highest_setting_dbm is None or check.breach_db is None:
        return ""
    planned = check.highest_setting_dbm + check.breach_db
    return (
        f"power rule {wording.shorten(check.rule_id, 60)} allows at most {wording.number(most)} dBm with this antenna; "
        f"planned {wording.number(planned)} dBm is over it: do not transmit at it"
    )
