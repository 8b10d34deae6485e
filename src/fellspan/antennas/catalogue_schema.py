"""What an entry of an antenna catalogue may hold, by kind; builds no antennas and reads no files."""

from collections.abc import Callable
from typing import Annotated, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field

from fellspan.quantities import parse_frequency_hz, parse_length_m


def _text(parse: Callable[[str], float], example: str) -> BeforeValidator:
    def parsed(value: object) -> float:
        if not isinstance(value, str):
            raise ValueError(f"give it with its unit, as text: {example}")
        return parse(value)

    return BeforeValidator(parsed)


Frequency = Annotated[float, _text(parse_frequency_hz, '"5.8 GHz"')]
Length = Annotated[float, _text(parse_length_m, '"0.6 m"'), Field(gt=0.0)]


class Entry(BaseModel):
    """What every entry has."""

    model_config = ConfigDict(extra="forbid", frozen=True)

    name: str = Field(min_length=1, max_length=80)
    kind: str
    lowest: Frequency
    highest: Frequency
    width: Length
    height: Length
    mass_kg: float = Field(gt=0.0, le=5000.0)
    frontal_area_m2: float = Field(gt=0.0, le=100.0)
    note: str = ""


class DishEntry(Entry):
    """A parabolic dish, solid or grid."""

    kind: Literal["dish"]
    diameter: Length
    aperture_efficiency: float = 0.55
    edge_taper_db: float = 10.0
    cross_polar_db: float = 30.0
    grid: bool = False


class YagiEntry(Entry):
    """A Yagi-Uda antenna for a boom length, cut for `cut_for` or, without it, for the middle of its range."""

    kind: Literal["yagi"]
    boom: Length
    rod_diameter: Length | None = None
    cut_for: Frequency | None = None
    efficiency: float = 0.9


class DipoleEntry(Entry):
    """A half-wave dipole."""

    kind: Literal["dipole"]
    efficiency: float = 0.95


class OmniEntry(Entry):
    """A collinear omni; the spacing is that in the middle of its range."""

    kind: Literal["omni"]
    elements: int
    spacing_wavelengths: float = 0.7
    downtilt_deg: float = 0.0
    efficiency: float = 0.8


class PatchEntry(Entry):
    """One patch."""

    kind: Literal["patch"]
    permittivity: float = 2.2
    efficiency: float = 0.85
    front_to_back_db: float = 15.0


class PanelEntry(Entry):
    """An array of patches; the spacings are those in the middle of its range."""

    kind: Literal["panel"]
    rows: int
    columns: int
    row_spacing_wavelengths: float = 0.7
    column_spacing_wavelengths: float = 0.7
    downtilt_deg: float = 0.0
    permittivity: float = 2.2
    efficiency: float = 0.7
    front_to_back_db: float = 25.0


class SheetEntry(Entry):
    """What a data sheet says, taken over the whole range; without an azimuth width it is an omni."""

    kind: Literal["sheet"]
    gain_dbi: float
    azimuth_width_deg: float | None = None
    elevation_width_deg: float
    front_to_back_db: float | None = None
    cross_polar_db: float = 25.0
    downtilt_deg: float = 0.0


class FileEntry(Entry):
    """A pattern file, its path relative to the catalogue file."""

    kind: Literal["file"]
    path: str


KINDS: dict[str, type[Entry]] = {
    "dish": DishEntry,
    "yagi": YagiEntry,
    "dipole": DipoleEntry,
    "omni": OmniEntry,
    "patch": PatchEntry,
    "panel": PanelEntry,
    "sheet": SheetEntry,
    "file": FileEntry,
}
