"""Pattern files: both forms round trip, and every bad row is refused with its number."""

from pathlib import Path

import numpy as np
import pytest

from fellspan.antennas.facts import cut
from fellspan.antennas.files import parse_pattern, read_pattern
from fellspan.antennas.patches import patch_array
from fellspan.antennas.pattern import Pattern
from fellspan.errors import AntennaError

REAL = patch_array(frequency_hz=5.8e9, rows=4, columns=2)
HEAD = "# name: Panel P\n# frequency: 5.8 GHz\n"


def cuts_text(pattern: Pattern = REAL, step: float = 1.0, absolute: bool = True, less: float = 0.5) -> str:
    lines = [HEAD + ("plane,angle_deg,gain_dbi" if absolute else "# gain: 15 dBi\nplane,angle_deg,relative_db")]
    for label, plane in (("azimuth", "horizontal"), ("elevation", "vertical")):
        data = cut(pattern, plane, step_deg=step)
        for angle, gain in zip(data.angle_deg, data.gain_dbi, strict=True):
            told = gain - less if absolute else gain - pattern.peak_gain_dbi
            lines.append(f"{label},{angle:g},{told:.4f}")
    return "\n".join(lines) + "\n"


def dense_text(pattern: Pattern = REAL, step: float = 2.0) -> str:
    lines = [HEAD + "azimuth_deg,elevation_deg,gain_dbi"]
    for azimuth in np.arange(-180.0, 180.0, step):
        for elevation in np.arange(-90.0, 90.1, step):
            lines.append(f"{azimuth:g},{elevation:g},{pattern.gain_dbi(azimuth, elevation) - 0.5:.4f}")
    return "\n".join(lines) + "\n"


CUTS, DENSE = cuts_text(), dense_text()


def test_two_cuts_come_back_on_their_planes(tmp_path: Path) -> None:
    (tmp_path / "panel.csv").write_text(CUTS, encoding="utf-8")
    read = read_pattern(tmp_path / "panel.csv")
    assert (read.name, read.frequency_hz) == ("Panel P", 5.8e9)
    assert read.peak_gain_dbi == pytest.approx(REAL.peak_gain_dbi - 0.5, abs=1e-4)
    for azimuth, elevation in ((0.0, 0.0), (17.0, 0.0), (-60.0, 0.0), (0.0, 12.0), (0.0, -33.0), (180.0, 0.0)):
        assert read.gain_dbi(azimuth, elevation) == pytest.approx(REAL.gain_dbi(azimuth, elevation) - 0.5, abs=0.001)


def test_a_dense_grid_comes_back_everywhere() -> None:
    read = parse_pattern(DENSE, file="dense.csv")
    azimuth, elevation = np.arange(-180.0, 180.0, 2.0)[:, None], np.arange(-88.0, 89.0, 2.0)[None, :]
    assert np.max(np.abs(read.gain_dbi(azimuth, elevation) - REAL.gain_dbi(azimuth, elevation) + 0.5)) < 0.001
    assert read.gain_dbi(541.0, 3.0) == pytest.approx(read.gain_dbi(181.0, 3.0))
    assert 0.5 < (read.efficiency or 0.0) <= 1.0


def test_relative_gain_stands_on_the_gain_line() -> None:
    read = parse_pattern(cuts_text(absolute=False), file="panel.csv")
    assert read.peak_gain_dbi == 15.0
    assert read.gain_dbi(0.0, 0.0) == pytest.approx(15.0, abs=1e-6)


def test_a_tilted_beam_with_its_azimuth_cut_through_the_beam() -> None:
    # Sectors with electrical tilt are measured so: the azimuth cut peaks at 0 dB, the elevation cut at the tilt.
    lines = [HEAD + "plane,angle_deg,gain_dbi"]
    for angle in range(-180, 180):
        lines.append(f"azimuth,{angle},{15.0 - 12.0 * min((angle / 65.0) ** 2, 2.5):.3f}")
        lines.append(f"elevation,{angle},{15.0 - 12.0 * min(((angle + 6.0) / 10.0) ** 2, 2.5):.3f}")
    read = parse_pattern("\n".join(lines), file="sector.csv")
    assert read.gain_dbi(0.0, -6.0) == pytest.approx(15.0, abs=0.01)
    assert read.gain_dbi(0.0, 0.0) == pytest.approx(15.0 - 12.0 * 0.36, abs=0.01)
    assert read.gain_dbi(32.5, -6.0) == pytest.approx(12.0, abs=0.1)


def test_angles_from_0_to_360_blank_lines_and_other_line_ends_do() -> None:
    lines = CUTS.splitlines()
    turned = [*lines[:3], ""]
    for line in lines[3:]:
        plane, angle, gain = line.split(",")
        turned.append(f"{plane}, {float(angle) % 360.0:g} ,{gain}")
    read = parse_pattern("\r\n".join(turned), file="panel.csv")
    assert read.gain_dbi(-20.0, 0.0) == pytest.approx(parse_pattern(CUTS, file="panel.csv").gain_dbi(-20.0, 0.0))


def test_cross_polar_cuts_are_used() -> None:
    lines = CUTS.splitlines()
    peak = REAL.peak_gain_dbi - 0.5
    crossed = [f"{line.split(',')[0]}-cross,{line.split(',')[1]},{peak - 28.0:.3f}" for line in lines[3:]]
    read = parse_pattern("\n".join(lines + crossed), file="panel.csv")
    assert read.gain_dbi(0.0, 0.0) - read.cross_gain_dbi(0.0, 0.0) == pytest.approx(28.0, abs=0.01)
    only = [line for line in crossed if line.startswith("azimuth")]
    with pytest.raises(AntennaError, match="one plane only"):
        parse_pattern("\n".join(lines + only), file="panel.csv")


def changed(line: int, text: str | None, source: str = CUTS) -> str:
    lines = source.splitlines()
    lines[line - 1 : line] = [] if text is None else [text]
    return "\n".join(lines) + "\n"


def mixed(relative: str) -> str:
    """One plane in dBi, the other one relative to its own peak."""
    lines = CUTS.splitlines()
    for number, line in enumerate(lines[3:], start=3):
        plane, angle, gain = line.split(",")
        if plane == relative:
            lines[number] = f"{plane},{angle},{float(gain) - REAL.peak_gain_dbi + 0.5:.4f}"
    return "\n".join(lines) + "\n"


@pytest.mark.parametrize(
    ("text", "told"),
    [
        (changed(10, "azimuth,-174"), r"panel.csv, line 10: 2 values for 3 columns"),
        (changed(10, "azimuth,-174,1,2"), r"line 10: 4 values"),
        (changed(10, "azimuth,-174,loud"), r"line 10: gain_dbi 'loud'"),
        (changed(10, "azimuth,-174,nan"), r"line 10: gain_dbi 'nan'"),
        (changed(10, 'azimuth,"-174,-20'), r"line 10: angle_deg '\"-174'"),
        (changed(10, "sideways,-174,-20"), r"line 10: plane 'sideways'"),
        (changed(10, "azimuth,400,-20"), r"line 10: angle 400 degrees is outside the circle"),
        (changed(10, "azimuth,-181,-20"), r"line 10: angle -181"),
        (changed(10, "azimuth,-173,14"), r"line 11: the azimuth plane has -173 degrees twice, with different gains"),
        (CUTS + CUTS.splitlines()[19] + "\n", r"line 726: the azimuth plane has -164 degrees twice\n.*in line 20"),
        (
            DENSE + DENSE.splitlines()[110] + "\n",
            r"line 16384: direction -178, -58 degrees stands twice\n.*in line 111",
        ),
        (mixed("elevation"), r"line 545: the elevation plane peaks at 0\.0 dB, but the azimuth plane has 1\d\.\d dB"),
        (mixed("azimuth"), r"line 545: the elevation plane peaks at 1\d\.\d dB, but the azimuth plane has 0\.0 dB"),
        (
            CUTS
            + "".join(
                f"{plane}-cross,{angle},40\n" for plane in ("azimuth", "elevation") for angle in range(-180, 180)
            ),
            r"line 726: cross-polar gain 40 dB stands above the peak",
        ),
        (
            "\n".join(CUTS.splitlines()[:100] + CUTS.splitlines()[110:]),
            r"line 101: the azimuth plane has a gap of 11 degrees",
        ),
        ("\n".join(CUTS.splitlines()[:364]), "no rows of the elevation plane"),
        (HEAD + "plane,angle_deg,gain_dbi\n", "holds no gains"),
        ("", "frequency"),
        (CUTS.replace("5.8 GHz", "5.8 stone"), r"line 2: frequency"),
        (CUTS.replace("# frequency", "# frequncy"), r"line 2: 'frequncy' is no key; did you mean 'frequency'"),
        ("# name: again\n" + CUTS, r"line 2: 'name' is said twice"),
        ("# electric_plane: diagonal\n" + CUTS, r"line 1: electric_plane 'diagonal'"),
        (CUTS.replace("gain_dbi", "relative_db"), "relative"),
        ("# gain: 3 dBi\n" + CUTS, r"line 185: the gain line says 3 dBi"),
        ("# gain: 15 dBi\n" + CUTS.replace("gain_dbi", "relative_db"), r"line 185: relative gains must peak at 0 dB"),
        (
            CUTS.replace("plane,angle_deg,gain_dbi", "plane,angle_deg,gain_dbi,relative_db"),
            r"line 3 mixes absolute and relative",
        ),
        (CUTS.replace("plane,angle_deg,gain_dbi", "plane;angle;gain"), "no gain_dbi or relative_db column"),
        (CUTS.replace("plane,angle_deg", "plane,degrees"), "degrees"),
        (cuts_text(less=-3.0), "more than it gets"),
        (changed(10, "-180,-95,-20", DENSE), r"line 10: direction -180, -95 degrees is outside the sphere"),
        (changed(10, "-180,-80,14", DENSE), r"line 10: direction -180, -80 degrees stands twice"),
        (changed(10, None, DENSE), "has no gain toward azimuth -180, elevation -78"),
        (changed(10, "-180,-77.3,-20", DENSE), "not an even grid"),
        (dense_text(step=10.0), "in steps up to 5"),
    ],
)
def test_bad_files_are_refused_with_the_line(text: str, told: str) -> None:
    with pytest.raises(AntennaError, match=told) as caught:
        parse_pattern(text, file="panel.csv")
    assert len(str(caught.value).splitlines()) <= 4


def test_files_that_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(AntennaError, match=r"none\.csv"):
        read_pattern(tmp_path / "none.csv")
    (tmp_path / "raw.csv").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(AntennaError, match=r"raw\.csv"):
        read_pattern(tmp_path / "raw.csv")
