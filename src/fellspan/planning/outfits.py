"""The antennas that would serve a planned link in place of its own, only where they are wanted: about a second a link.

Asks `design` over the path that planning has assessed already. Reads no study file but its catalogue, and prints nothing.
"""

from fellspan.antennas.catalogue import Catalogue
from fellspan.design.equip import compare_equipment, path_over
from fellspan.design.equip_result import EquipResult, EquipSettings
from fellspan.design.offers import offers_for
from fellspan.errors import FellspanError
from fellspan.links.assess import Assessment, AssessSettings
from fellspan.links.site import Link


def equipment_of(
    link: Link, assessment: Assessment, judged: AssessSettings, *, catalogue: Catalogue
) -> EquipResult | None:
    """What `fellspan equip` says of a link without further options: its own radio, every antenna that covers its frequency.

    None where that cannot be said, as for a radio without power or threshold: that is no reason to lose the plan.
    """
    try:
        return compare_equipment(
            link,
            offers_for((link.radio.frequency_hz,), catalogue=catalogue),
            way=lambda of: path_over(of, assessment, median_k=judged.median_k, weather=judged.weather),
            weather=judged.weather,
            settings=EquipSettings(reach=True),
        )
    except FellspanError:
        return None
