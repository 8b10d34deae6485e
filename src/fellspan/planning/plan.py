"""LinkPlan and StudyPlan: what the views show."""

from dataclasses import dataclass

from fellspan.design.acceptance_result import AcceptanceResult
from fellspan.design.confidence import ConfidenceResult
from fellspan.design.equip_result import EquipResult
from fellspan.design.heights_result import HeightsResult
from fellspan.design.reflection_result import ReflectionResult
from fellspan.design.survey_list import SurveyPoint
from fellspan.errors import FellspanError
from fellspan.links.interference_result import StudyInterference
from fellspan.links.levels import PathLevels
from fellspan.links.result import LinkResult
from fellspan.links.site import Link
from fellspan.links.skyline import Skyline
from fellspan.planning.inputs import Study
from fellspan.planning.what_if import WhatIf
from fellspan.showing import Shown
from fellspan.terrain.profile import PathProfile


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Horizons:
    """The skyline from each end toward the other."""

    a: Skyline
    b: Skyline


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class LinkPlan(Shown):
    """One planned link: the result, and the profile and levels it was worked out from.

    `profile` has the same samples as `levels`.
    """

    link: Link
    result: LinkResult
    profile: PathProfile
    levels: PathLevels
    reflections: ReflectionResult | None = None
    heights: HeightsResult | None = None
    confidence: ConfidenceResult | None = None
    survey: tuple[SurveyPoint, ...] = ()
    horizons: Horizons | None = None
    """None where nobody asked for skylines."""
    equipment: EquipResult | None = None
    """None where nobody asked which antennas would serve, or where the radio states too little to say."""
    as_built: AcceptanceResult | None = None
    """What a crew measured, held against the plan; None where no measured file was given."""
    what_if: WhatIf | None = None
    """None where nobody asked what would hold at other heights, or where the terrain refused to be looked at so closely."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LinkFailure:
    """A link that could not be assessed, and why."""

    link: Link
    error: FellspanError


@dataclass(frozen=True, slots=True, kw_only=True)
class InputFile:
    """A file that the plan rests on: for the stamp of the issue."""

    role: str
    name: str
    modified: str
    size: int
    sha256: str
    """Hex digest; starts with 'partial:' for files over 256 MB, hashed at their start, middle and end only, and with 'server:'
    or 'sampled:' for what is read over a network (`terrain.remote.RemoteMark`)."""


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class StudyPlan(Shown):
    """All links of a study, planned; `links` and `failures` keep the order of the study."""

    study: Study
    links: tuple[LinkPlan, ...]
    failures: tuple[LinkFailure, ...]
    files: tuple[InputFile, ...]
    version: str
    cautions: tuple[str, ...]
    interference: StudyInterference | None = None
    """What the links do to each other; None where fewer than two have their power and gains stated."""
