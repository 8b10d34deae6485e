"""From a catalogue entry to a pattern at a frequency: which kind takes which parameters, and what scales with frequency."""

from dataclasses import replace
from pathlib import Path

from fellspan.antennas import catalogue_schema as schema
from fellspan.antennas.data_sheet import from_data_sheet
from fellspan.antennas.dishes import dish
from fellspan.antennas.files import read_pattern
from fellspan.antennas.patches import patch, patch_array
from fellspan.antennas.pattern import Pattern
from fellspan.antennas.wires import collinear, dipole
from fellspan.antennas.yagi import propose_yagi, yagi
from fellspan.errors import AntennaError


def build(entry: schema.Entry, frequency_hz: float, folder: Path | None) -> Pattern:
    """The pattern of an entry at a frequency; `folder` is where the paths of pattern files start."""
    # Spacings are metal: in wavelengths they grow with frequency.
    stretch = 2.0 * frequency_hz / (entry.lowest + entry.highest)
    match entry:
        case schema.DishEntry():
            return dish(
                name=entry.name,
                frequency_hz=frequency_hz,
                diameter_m=entry.diameter,
                aperture_efficiency=entry.aperture_efficiency,
                edge_taper_db=entry.edge_taper_db,
                cross_polar_db=entry.cross_polar_db,
                grid=entry.grid,
            )
        case schema.YagiEntry():
            design = propose_yagi(
                frequency_hz=entry.cut_for or 0.5 * (entry.lowest + entry.highest),
                boom_m=entry.boom,
                rod_diameter_m=entry.rod_diameter,
            )
            return yagi(design, name=entry.name, frequency_hz=frequency_hz, efficiency=entry.efficiency)
        case schema.DipoleEntry():
            return dipole(name=entry.name, frequency_hz=frequency_hz, efficiency=entry.efficiency)
        case schema.OmniEntry():
            return collinear(
                name=entry.name,
                frequency_hz=frequency_hz,
                elements=entry.elements,
                spacing_wavelengths=entry.spacing_wavelengths * stretch,
                downtilt_deg=entry.downtilt_deg,
                efficiency=entry.efficiency,
            )
        case schema.PatchEntry():
            return patch(
                name=entry.name,
                frequency_hz=frequency_hz,
                permittivity=entry.permittivity,
                efficiency=entry.efficiency,
                front_to_back_db=entry.front_to_back_db,
            )
        case schema.PanelEntry():
            return patch_array(
                name=entry.name,
                frequency_hz=frequency_hz,
                rows=entry.rows,
                columns=entry.columns,
                row_spacing_wavelengths=entry.row_spacing_wavelengths * stretch,
                column_spacing_wavelengths=entry.column_spacing_wavelengths * stretch,
                downtilt_deg=entry.downtilt_deg,
                permittivity=entry.permittivity,
                efficiency=entry.efficiency,
                front_to_back_db=entry.front_to_back_db,
            )
        case schema.SheetEntry():
            return from_data_sheet(
                name=entry.name,
                frequency_hz=frequency_hz,
                gain_dbi=entry.gain_dbi,
                azimuth_width_deg=entry.azimuth_width_deg,
                elevation_width_deg=entry.elevation_width_deg,
                front_to_back_db=entry.front_to_back_db,
                cross_polar_db=entry.cross_polar_db,
                downtilt_deg=entry.downtilt_deg,
                size_m=max(entry.width, entry.height),
            )
        case schema.FileEntry():
            # One measurement stands for the range that the entry states.
            return replace(read_pattern((folder or Path()) / entry.path), name=entry.name, frequency_hz=frequency_hz)
    raise AntennaError(f"antenna kind '{entry.kind}' has no builder")
