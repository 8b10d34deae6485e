"""Links over made profiles on which antennas and radios are compared, for the tests of equipment and reach."""

from dataclasses import replace

from made_profiles import profile_of
from signal_links import CLIMATE, over

from fellspan.antennas.catalogue import Catalogue, load_catalogue
from fellspan.antennas.pattern import Pattern
from fellspan.climate.given import GivenClimate
from fellspan.design.equip import EquipPath, compare_equipment, path_over
from fellspan.design.equip_result import EquipResult, EquipSettings
from fellspan.design.offers import Offer, offers_named
from fellspan.links.assess import AssessSettings, assess_profile
from fellspan.links.radio import Radio
from fellspan.links.result import LinkResult
from fellspan.links.site import Link
from fellspan.terrain.profile import PathProfile

CATALOGUE: Catalogue = load_catalogue()
DISHES = ("dish 0.3 m", "dish 0.6 m", "dish 0.9 m", "dish 1.2 m", "dish 1.8 m")
FIVE = Radio(name="five", frequency_hz=5.8e9, power_dbm=20.0, threshold_dbm=-72.0, bandwidth_hz=20e6)
ELEVEN = Radio(name="eleven", frequency_hz=11e9, power_dbm=18.0, threshold_dbm=-70.0, bandwidth_hz=28e6)


class Bench:
    """A link over flat ground and the means to compare on it or to plan it as it would stand."""

    def __init__(
        self, length_m: float = 20e3, *, radio: Radio = ELEVEN, climate: GivenClimate = CLIMATE, **changes: object
    ):
        self.profile: PathProfile = profile_of(length_m)
        self.link: Link = over(self.profile, equipment=radio, **changes)  # type: ignore[arg-type]
        self.judged = AssessSettings(climate=climate)

    def way(self, link: Link) -> EquipPath:
        """The path of a link, as planning would find it."""
        assessment = assess_profile(link, self.profile, self.judged)
        return path_over(link, assessment, median_k=self.judged.median_k, weather=self.judged.weather)

    def compare(
        self, names: tuple[str, ...] = DISHES, *radios: Radio, offers: tuple[Offer, ...] = (), **settings: object
    ) -> EquipResult:
        """The comparison; `settings` are those of EquipSettings."""
        return compare_equipment(
            self.link,
            offers or offers_named(names, catalogue=CATALOGUE),
            radios,
            way=self.way,
            weather=self.judged.weather,
            settings=EquipSettings(**settings),  # type: ignore[arg-type]
        )

    def planned(self, name: str, radio: Radio, *, ends: str = "ab") -> LinkResult:
        """What planning gives with an antenna of the catalogue hung by hand."""
        link = replace(self.link, radio=radio)
        hung: Pattern = CATALOGUE.find(name).pattern(radio.frequency_hz)
        if "a" in ends:
            link = replace(link, antenna_a=replace(link.antenna_a, gain_dbi=None, pattern=hung))
        if "b" in ends:
            link = replace(link, antenna_b=replace(link.antenna_b, gain_dbi=None, pattern=hung))
        return assess_profile(link, self.profile, self.judged).result
