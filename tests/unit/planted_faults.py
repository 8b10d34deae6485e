"""Links of the sample built with one fault planted, and what a crew would then read: for the tests of acceptance.

The level of a fault comes from the engine with the thing itself mis-set (an antenna turned, a line lengthened, a height
changed), not from the figures that acceptance predicts causes by; where the side lobe stands is found here by walking the
pattern. Readings get a normal error of 1 dB, heights of 0.1 m, bearings of 1 to 1.5 degrees.
"""

import dataclasses as dc
import functools
import math
from pathlib import Path

import numpy as np

from fellspan.antennas.catalogue import load_catalogue
from fellspan.antennas.pattern import Pattern
from fellspan.design.acceptance_result import AcceptanceResult
from fellspan.design.as_built import AsBuilt, BuiltEnd, Reading
from fellspan.links.assess import assess_in_full
from fellspan.links.result import AtEnds
from fellspan.links.site import Aim, Antenna, Link
from fellspan.planning.accepting import accept_link
from fellspan.planning.plan import LinkPlan
from fellspan.planning.planner import open_terrain, plan_study, settings_of
from fellspan.propagation import k_exceeded_99_9
from fellspan.study.reading import load_study
from fellspan.terrain.terrain import Terrain

SAMPLE = Path(__file__).resolve().parents[2] / "sample_terrain" / "tolmera.toml"
FAULTS = (
    "side lobe",
    "polarization",
    "height",
    "low k",
    "one chain",
    "power",
    "feeder",
    "declination",
    "power control",
    "other antenna",
)
STUDY = load_study(SAMPLE)


@functools.cache
def terrain() -> Terrain:
    """Open as long as the tests run."""
    return open_terrain(STUDY)


@functools.cache
def planned(name: str, power_control_db: float = 0.0) -> LinkPlan:
    """One link of the sample, planned; its radio can lower its power by so much."""
    link = next(one for one in STUDY.links if one.name == name)
    link = dc.replace(link, radio=dc.replace(link.radio, power_control_db=power_control_db))
    return plan_study(dc.replace(STUDY, links=(link,))).links[0]


def level(link: Link, *, k: float | None = None) -> tuple[float, float]:
    """What the engine makes of a link, received at A and at B."""
    settings = settings_of(STUDY)
    found: AtEnds = assess_in_full(
        link, terrain=terrain(), settings=settings if k is None else dc.replace(settings, median_k=k)
    ).result.received_dbm
    assert found.at_a is not None
    assert found.at_b is not None
    return found.at_a, found.at_b


def antenna_at(link: Link, end: str) -> Antenna:
    return link.antenna_a if end == "a" else link.antenna_b


def with_antenna(link: Link, end: str, antenna: Antenna) -> Link:
    return dc.replace(link, antenna_a=antenna) if end == "a" else dc.replace(link, antenna_b=antenna)


def turned(plan: LinkPlan, end: str, *, across_deg: float = 0.0, polarization: str | None = None) -> Link:
    both = plan.result.antennas
    assert both is not None
    hung = both.a if end == "a" else both.b
    aim = Aim(
        bearing_deg=(hung.bearing_deg + across_deg) % 360.0,
        tilt_deg=hung.tilt_deg,
        polarization=polarization or hung.polarization,
    )
    return with_antenna(plan.link, end, dc.replace(antenna_at(plan.link, end), mounting=aim))


def lobe_deg(pattern: Pattern) -> float:
    """Where the first rise after the main lobe ends: down from the peak to the null, and up again, step by step."""
    angle = np.arange(0.0, 90.0, 0.01)
    gain = np.asarray(pattern.gain_dbi(angle, 0.0))
    at = 1
    while gain[at + 1] <= gain[at]:
        at += 1
    while gain[at + 1] >= gain[at]:
        at += 1
    return float(angle[at])


class Crew:
    """A crew with a noisy radio; `full` fills the whole sheet, else only levels are written down."""

    def __init__(self, plan: LinkPlan, seed: int, *, full: bool) -> None:
        self.plan, self.full = plan, full
        self.rng = np.random.default_rng(seed)
        self.end = "ab"[int(self.rng.integers(2))]
        self.sheet: dict[str, dict[str, object]] = {"a": {}, "b": {}}
        self.state: dict[str, object] = {}
        result = plan.result
        if not full:
            return
        assert result.antennas is not None
        assert result.signal is not None
        for end in "ab":
            hung = result.antennas.a if end == "a" else result.antennas.b
            place = result.ends.a if end == "a" else result.ends.b
            sent = result.signal.a_to_b if end == "a" else result.signal.b_to_a
            self.sheet[end] = {
                "height_m": round(place.antenna_agl_m + self.rng.normal(0.0, 0.1), 1),
                "height_reference": "ground",
                "bearing_deg": (hung.bearing_deg + self.rng.normal(0.0, 1.0)) % 360.0,
                "bearing_is": "true",
                "tilt_deg": hung.tilt_deg + self.rng.normal(0.0, 0.3),
                "power_dbm": sent.power_dbm,
                "antenna": hung.name,
                "polarization": hung.polarization,
            }
        self.state = {"power_control": "off", "modulation": result.modulation, "levels_are": "all chains"}

    def noise(self) -> float:
        return float(self.rng.normal(0.0, 1.0))

    def read(self, a_dbm: float, b_dbm: float) -> list[Reading]:
        return [Reading(end=end, level_dbm=dbm + self.noise()) for end, dbm in (("a", a_dbm), ("b", b_dbm))]

    def accept(self, readings: list[Reading]) -> AcceptanceResult:
        built = AsBuilt(
            link=self.plan.result.name,
            readings=tuple(readings),
            a=BuiltEnd(**self.sheet["a"]),
            b=BuiltEnd(**self.sheet["b"]),
            **self.state,
        )
        return accept_link(STUDY, self.plan, built, terrain=terrain())


def as_planned(name: str, seed: int, *, full: bool) -> AcceptanceResult:
    """No fault at all."""
    crew = Crew(planned(name), seed, full=full)
    return crew.accept(crew.read(*level(crew.plan.link)))


def found(name: str, fault: str, seed: int, *, full: bool) -> AcceptanceResult:
    """What acceptance finds of a link of the sample with one fault, at A or at B as the seed has it."""
    plan = planned(name, 20.0 if fault == "power control" else 0.0)
    crew = Crew(plan, seed, full=full)
    return crew.accept(_PLANT[fault](crew))


def _side_lobe(crew: Crew) -> list[Reading]:
    pattern = antenna_at(crew.plan.link, crew.end).pattern
    assert pattern is not None
    return crew.read(*level(turned(crew.plan, crew.end, across_deg=lobe_deg(pattern))))


def _polarization(crew: Crew) -> list[Reading]:
    other = "horizontal" if crew.plan.link.radio.polarization == "vertical" else "vertical"
    return crew.read(*level(turned(crew.plan, crew.end, polarization=other)))


def _height(crew: Crew) -> list[Reading]:
    """A height in feet that was typed as metres: the antenna stands at a third of it, and there it was measured."""
    link, ends = crew.plan.link, crew.plan.result.ends
    site, place = (link.a, ends.a) if crew.end == "a" else (link.b, ends.b)
    real = 0.3048 * place.antenna_agl_m
    low = dc.replace(site, height_m=real, height_reference="ground", roof_m=None, roof_edge_m=None, parapet_m=None)
    crew.sheet[crew.end].update(height_m=round(real + crew.rng.normal(0.0, 0.1), 1), height_reference="ground")
    return crew.read(*level(dc.replace(link, a=low) if crew.end == "a" else dc.replace(link, b=low)))


def _low_k(crew: Crew) -> list[Reading]:
    """A night of low k around three in the morning, read every third hour."""
    plan = crew.plan
    usual, low = level(plan.link), level(plan.link, k=float(k_exceeded_99_9(plan.result.distance_m)))
    readings = []
    for hour in range(0, 27, 3):
        share = math.exp(-(((hour - 3) / 3.0) ** 2)) + math.exp(-(((hour - 27) / 3.0) ** 2))
        for end, at, night in zip("ab", usual, low, strict=True):
            dbm = at + min(share, 1.0) * (night - at) + crew.noise()
            readings.append(Reading(end="a" if end == "a" else "b", level_dbm=dbm, hour=float(hour)))
    return readings


def _one_chain(crew: Crew) -> list[Reading]:
    """The second of two chains is received 12 to 30 dB low at one end."""
    readings = []
    for end, total in zip("ab", level(crew.plan.link), strict=True):
        for chain in ("1", "2"):
            dead = crew.rng.uniform(12.0, 30.0) if end == crew.end and chain == "2" else 0.0
            dbm = total - 10.0 * math.log10(2.0) - dead + crew.noise()
            readings.append(Reading(end="a" if end == "a" else "b", level_dbm=dbm, chain=chain))
    return readings


def _power(crew: Crew) -> list[Reading]:
    a, b = level(crew.plan.link)
    return crew.read(a - 6.0, b) if crew.end == "a" else crew.read(a, b - 6.0)


def _feeder(crew: Crew) -> list[Reading]:
    link = crew.plan.link
    antenna = antenna_at(link, crew.end)
    return crew.read(
        *level(with_antenna(link, crew.end, dc.replace(antenna, feeder_loss_db=antenna.feeder_loss_db + 4.0)))
    )


def _declination(crew: Crew) -> list[Reading]:
    """The true bearing of the sheet set on a compass; who fills the sheet writes down what the compass shows."""
    ends, both = crew.plan.result.ends, crew.plan.result.antennas
    assert both is not None
    place, hung = (ends.a, both.a) if crew.end == "a" else (ends.b, both.b)
    assert place.declination_deg is not None
    if crew.full:
        shown = (hung.bearing_deg + crew.rng.normal(0.0, 1.5)) % 360.0
        crew.sheet[crew.end].update(bearing_deg=shown, bearing_is="magnetic")
    return crew.read(*level(turned(crew.plan, crew.end, across_deg=place.declination_deg)))


def _power_control(crew: Crew) -> list[Reading]:
    """Both ends hold the other at one level, 6 to 14 dB under the weaker direction; nobody wrote down that it was on."""
    crew.state.pop("power_control", None)
    target = min(level(crew.plan.link)) - crew.rng.uniform(6.0, 14.0)
    return crew.read(target, target)


def _other_antenna(crew: Crew) -> list[Reading]:
    """The next smaller dish; who fills the sheet reads its label."""
    link = crew.plan.link
    antenna = antenna_at(link, crew.end)
    name = "dish 0.3 m" if "0.6" in antenna.name else "dish 0.6 m"
    pattern = load_catalogue().find(name).pattern(link.radio.frequency_hz)
    if crew.full:
        crew.sheet[crew.end].update(antenna=name)
    return crew.read(*level(with_antenna(link, crew.end, dc.replace(antenna, pattern=pattern, gain_dbi=None))))


_PLANT = {
    "side lobe": _side_lobe,
    "polarization": _polarization,
    "height": _height,
    "low k": _low_k,
    "one chain": _one_chain,
    "power": _power,
    "feeder": _feeder,
    "declination": _declination,
    "power control": _power_control,
    "other antenna": _other_antenna,
}
