"""The sight line of the sweep against GDAL's viewshed, an independent program over the same raster.

GDAL asks each cell of the cells beside it on the way (Wang, Robinson and White 2000, as its documentation says), the sweep
asks bilinear heights along rays: the two may differ where a shadow ends, and nowhere else.
"""

import os
from pathlib import Path

import numpy as np
import pytest
from gdal_viewshed import VIEWSHED, compared, swept, viewshed
from made_relief import SOUTH_M, WEST_M, relief_m, write_relief
from scipy.ndimage import binary_dilation


@pytest.mark.skipif(
    VIEWSHED is None and os.environ.get("CI") != "true", reason="gdal_viewshed (gdal-bin) is not installed"
)
@pytest.mark.slow
@pytest.mark.parametrize(("seed", "k"), [(5, 4 / 3), (6, 0.7), (7, float("inf"))])
def test_it_sees_what_gdal_sees(tmp_path: Path, seed: int, k: float) -> None:
    cell_m, side = 47.5, 800
    file = write_relief(tmp_path / "relief.tif", relief_m(side, seed=seed), cell_m=cell_m)
    x, y = WEST_M + 400.5 * cell_m, SOUTH_M + 400.5 * cell_m
    radius_m = 19_000.0
    seen = viewshed(file, out=tmp_path / "seen.tif", x=x, y=y, radius_m=radius_m, k=k)
    ours, gdals, both = compared(swept(file, x=x, y=y, radius_m=radius_m, k=k), seen, file, radius_m)
    assert 0.2 < gdals[both].mean() < 0.9  # a relief that hides nothing would prove nothing
    # 99 %: what is promised
    assert (ours == gdals)[both].mean() >= 0.99
    # where they differ a shadow ends within three cells, by the one or the other
    edge = np.zeros_like(both)
    for answer in (gdals, ours):
        edge |= binary_dilation(answer, iterations=3) & binary_dilation(~answer, iterations=3)
    assert edge[both & (ours != gdals)].mean() > 0.97
    assert edge[both].mean() < 0.15  # not everywhere
