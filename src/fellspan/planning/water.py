"""What a study says of open water, made ready for the search for reflections: levels, and outlines read from their files."""

from fellspan.design.reflections import Water
from fellspan.planning.inputs import Study
from fellspan.terrain.water_outlines import read_outlines


def water_of(study: Study) -> Water:
    """The water of a study; WaterFileError where a file of outlines cannot be used."""
    return Water(
        level_m=study.water_level_m,
        low_m=study.water_low_m,
        high_m=study.water_high_m,
        outlines=read_outlines(study.water_outlines),
    )
