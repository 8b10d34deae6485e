"""Diffraction loss over average terrain, from the clearance alone; knows nothing of profiles."""

from numpy.typing import ArrayLike

from fellspan.propagation._arrays import Result, as_floats, as_result


def average_diffraction_loss_db(clearance_fraction: ArrayLike) -> Result:
    """Diffraction loss that average terrain causes for a given clearance.

    Parameters
    ----------
    clearance_fraction
        h/F1: height of the ray above the most significant blockage over the radius of the first Fresnel zone there; negative
        where the ray is blocked.

    Returns
    -------
    loss_db
        Loss relative to free space, dB, same shape: 10 - 20 h/F1. Falls below 0 beyond h/F1 = 0.5, far outside its range.

    Notes
    -----
    Rec. ITU-R P.530-19, equation (2). Strictly for losses above about 15 dB; Fig. 1 draws the line down to 6 dB (h/F1 = 0.2).
    Terrain lies between a knife edge (6 dB at grazing) and a smooth Earth (some 15 dB), hence 10 dB at grazing. Source key:
    p530-19-average-diffraction.
    """
    return as_result(10.0 - 20.0 * as_floats(clearance_fraction))  # (2)
