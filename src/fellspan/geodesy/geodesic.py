"""Distances, bearings and points along geodesics of the WGS 84 ellipsoid.

The geodesic problem itself is PROJ's; here it is put into named results and made fast for many points on one path.
Knows nothing of rasters, heights or links.
"""

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import ArrayLike, NDArray
from pyproj import Geod

from fellspan.geodesy.position import Position

WGS84_GEOD = Geod(ellps="WGS84")
_A_M = 6378137.0
_E2 = WGS84_GEOD.es
_SERIES_ERROR_M = 1e-6
"""What the degree of the series is chosen for; the tested contract is a thousand times looser (1 mm)."""
_OVERSHOOT_M = 1e-3
"""Distances may leave the path by this much, so that sums of rounded steps still end on it."""
_POLE_M = 1e-3
"""Closer to a pole than this the rounding of the series would turn the longitude, so the exact one is taken."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Geodesic:
    """The shortest line between two positions.

    `distance_m` in metres; `bearing_ab_deg` is the true bearing at A towards B, `bearing_ba_deg` the true bearing at
    B towards A, both 0 <= bearing < 360. Where A and B are the same point everything is 0.
    """

    distance_m: float
    bearing_ab_deg: float
    bearing_ba_deg: float


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Geodesics:
    """As `Geodesic`, for many pairs: float64 arrays of one shape."""

    distance_m: NDArray[np.float64]
    bearing_ab_deg: NDArray[np.float64]
    bearing_ba_deg: NDArray[np.float64]


def inverse(a: Position, b: Position) -> Geodesic:
    """Distance and true bearings between two positions.

    Notes
    -----
    Karney, "Algorithms for geodesics", Journal of Geodesy 87 (2013), as PROJ implements it; good to nanometres for
    any pair, near-antipodal ones included. Heights are not part of it: the distance runs on the ellipsoid.
    """
    many = inverse_many(a.latitude_deg, a.longitude_deg, b.latitude_deg, b.longitude_deg)
    return Geodesic(
        distance_m=float(many.distance_m),
        bearing_ab_deg=float(many.bearing_ab_deg),
        bearing_ba_deg=float(many.bearing_ba_deg),
    )


def inverse_many(
    latitude_a: ArrayLike, longitude_a: ArrayLike, latitude_b: ArrayLike, longitude_b: ArrayLike
) -> Geodesics:
    """`inverse` for arrays of degrees, which broadcast; NaN in gives NaN out for that pair."""
    lat_a, lon_a, lat_b, lon_b = np.broadcast_arrays(
        *(np.asarray(v, dtype=np.float64) for v in (latitude_a, longitude_a, latitude_b, longitude_b))
    )
    shape = lat_a.shape
    # PROJ wants flat, writable, contiguous arrays; ravel of a broadcast view may be neither
    flat = [np.array(v, dtype=np.float64).ravel() for v in (lon_a, lat_a, lon_b, lat_b)]
    ab, ba, distance = (np.asarray(v, dtype=np.float64) for v in WGS84_GEOD.inv(flat[0], flat[1], flat[2], flat[3]))
    same = distance == 0.0
    ab, ba = (np.where(same, 0.0, normalized_bearing_deg(v)) for v in (ab, ba))
    bad = ~np.isfinite(flat[0] + flat[1] + flat[2] + flat[3])
    for values in (distance, ab, ba):
        values[bad] = np.nan
    return Geodesics(
        distance_m=distance.reshape(shape), bearing_ab_deg=ab.reshape(shape), bearing_ba_deg=ba.reshape(shape)
    )


def normalized_bearing_deg(bearing_deg: ArrayLike) -> NDArray[np.float64]:
    """Bearings folded into 0 <= bearing < 360."""
    folded = np.mod(np.asarray(bearing_deg, dtype=np.float64), 360.0)
    return np.where(folded >= 360.0, 0.0, folded)  # -1e-15 % 360 rounds to 360 itself


def destination(position: Position, bearing_deg: float, distance_m: float) -> Position:
    """The position at `distance_m` metres from `position` on the geodesic that leaves it at a true bearing."""
    longitude, latitude, _ = WGS84_GEOD.fwd(position.longitude_deg, position.latitude_deg, bearing_deg, distance_m)
    return Position(latitude_deg=float(latitude), longitude_deg=float(longitude))


@dataclass(frozen=True, slots=True, kw_only=True)
class GeodesicPath:
    """A geodesic of which many points are asked.

    Made by `GeodesicPath.between(a, b)` or `GeodesicPath.towards(a, bearing_deg, length_m)`; the attributes are those
    of `Geodesic`, with the two ends. A point of 0 length is legal.
    """

    a: Position
    b: Position
    length_m: float
    bearing_ab_deg: float
    bearing_ba_deg: float
    _series: NDArray[np.float64] = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_series", self._fit())

    @classmethod
    def between(cls, a: Position, b: Position) -> "GeodesicPath":
        """The shortest path from A to B."""
        line = inverse(a, b)
        return cls(
            a=a,
            b=b,
            length_m=line.distance_m,
            bearing_ab_deg=line.bearing_ab_deg,
            bearing_ba_deg=line.bearing_ba_deg,
        )

    @classmethod
    def towards(cls, a: Position, bearing_deg: float, length_m: float) -> "GeodesicPath":
        """The path that leaves A at a true bearing, `length_m` long (not beyond 20 000 km)."""
        if not 0.0 <= length_m <= 2e7:
            raise ValueError(f"length_m is {length_m:g}, allowed are 0 to 20 000 000 m")
        lon, lat, back = WGS84_GEOD.fwd(a.longitude_deg, a.latitude_deg, bearing_deg, length_m)
        return cls(
            a=a,
            b=Position(latitude_deg=float(lat), longitude_deg=float(lon)),
            length_m=float(length_m),
            bearing_ab_deg=float(normalized_bearing_deg(bearing_deg)),
            bearing_ba_deg=float(normalized_bearing_deg(back)),
        )

    def positions(
        self, distance_m: ArrayLike, *, exact: bool = False
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Latitudes and longitudes, degrees, at distances from A.

        Parameters
        ----------
        distance_m
            Metres from A, any shape and order, 0 to `length_m`.
        exact
            Solve the geodesic for each point instead of the series; some six times slower.

        Returns
        -------
        latitude_deg, longitude_deg
            Shape of `distance_m`. Longitudes run on continuously from that of A and so may leave +-180; they step by
            180 only where the path goes over a pole itself.

        Raises
        ------
        ValueError
            A distance lies off the path by more than 1 mm, or is NaN.

        Notes
        -----
        A Chebyshev series of the Earth-centred coordinates through exact nodes. These have no seam at +-180 and no
        singularity at the poles, so one rule serves everywhere. Departs from the exact geodesic by under 1 mm for any
        length (measured: micrometres).
        """
        distance = np.asarray(distance_m, dtype=np.float64)
        off = ~((distance >= -_OVERSHOOT_M) & (distance <= self.length_m + _OVERSHOOT_M))
        if off.any():
            raise ValueError(f"distance_m is {distance[off].flat[0]:g}, the path runs from 0 to {self.length_m:g} m")
        if exact:
            latitude, turn = self._solve(distance)
        else:
            t = distance * (2.0 / self.length_m) - 1.0 if self.length_m > 0.0 else np.zeros_like(distance)
            x, y, z = chebyshev.chebval(t, self._series)
            off_axis = np.hypot(x, y)
            latitude = np.degrees(np.arctan2(z, (1.0 - _E2) * off_axis))
            turn = np.asarray(self._continued(np.degrees(np.arctan2(y, x))))
            polar = off_axis < _POLE_M
            if polar.any():
                turn[polar] = self._solve(distance[polar])[1]
        return latitude, self.a.longitude_deg + turn

    def _solve(self, distance: NDArray[np.float64]) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Exact latitudes, and longitudes counted from A, degrees."""
        flat = np.array(distance).ravel()
        lon, lat, _ = (
            np.asarray(v, dtype=np.float64)
            for v in WGS84_GEOD.fwd(
                np.full_like(flat, self.a.longitude_deg),
                np.full_like(flat, self.a.latitude_deg),
                np.full_like(flat, self.bearing_ab_deg),
                flat,
            )
        )
        turn = np.mod(lon - self.a.longitude_deg + 180.0, 360.0) - 180.0
        return lat.reshape(distance.shape), self._continued(turn).reshape(distance.shape)

    def _continued(self, turn_deg: NDArray[np.float64]) -> NDArray[np.float64]:
        """Longitudes from A without a jump at 180: a shortest path turns one way only, by half a circle at most."""
        if self.bearing_ab_deg <= 180.0:
            return np.where(turn_deg < -90.0, turn_deg + 360.0, turn_deg)
        return np.where(turn_deg > 90.0, turn_deg - 360.0, turn_deg)

    def _fit(self) -> NDArray[np.float64]:
        """Chebyshev coefficients, shape (degree + 1, 3), of x, y, z in metres, x through the meridian of A."""
        half_angle = self.length_m / 2.0 / _A_M
        degree, bound = 2, math.inf
        while bound > _SERIES_ERROR_M:
            # remainder of the series at Chebyshev nodes, of a circle and of the third harmonic that flattening adds
            degree += 1
            terms = half_angle ** (degree + 1) + _E2 * (3.0 * half_angle) ** (degree + 1)
            bound = _A_M * terms / (math.factorial(degree + 1) * 2.0**degree)
        nodes = chebyshev.chebpts1(degree + 1)
        latitude, turn = self._solve((nodes + 1.0) * (self.length_m / 2.0))
        phi, lam = np.radians(latitude), np.radians(turn)
        normal = _A_M / np.sqrt(1.0 - _E2 * np.sin(phi) ** 2)
        xyz = np.stack(
            [
                normal * np.cos(phi) * np.cos(lam),
                normal * np.cos(phi) * np.sin(lam),
                (1.0 - _E2) * normal * np.sin(phi),
            ],
            axis=1,
        )
        # discrete orthogonality at the nodes of the first kind: exact interpolation without a solve
        weights = 2.0 / (degree + 1) * chebyshev.chebvander(nodes, degree)
        weights[:, 0] /= 2.0
        return np.asarray(weights.T @ xyz)
