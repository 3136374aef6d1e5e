"""Lengths and projections on plain arrays of longitude and latitude."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
import pyproj
from numpy.typing import NDArray

__all__ = [
    "WGS84_INVERSE_FLATTENING",
    "WGS84_SEMI_MAJOR_M",
    "densified",
    "grid_length_m",
    "ground_steps_m",
    "is_turned",
    "local_xy_m",
    "mean_radius_m",
    "steps_m",
    "unwrapped",
    "utm_crs",
    "wrapped",
]

Floats = NDArray[np.float64]

WGS84_SEMI_MAJOR_M = 6378137.0
WGS84_INVERSE_FLATTENING = 298.257223563

# The local-radii form errs by less than 4 micrometres on 1 km up to latitude 60 and 9 at 70;
# beyond either the full geodesic is solved.
_LOCAL_STEP_M = 1000.0
_LOCAL_LATITUDE_DEG = 70.0
_CHUNK = 8192  # keeps every temporary array in the processor's cache


def steps_m(
    lonlat: Floats,
    *,
    semi_major_m: float = WGS84_SEMI_MAJOR_M,
    inverse_flattening: float = WGS84_INVERSE_FLATTENING,
) -> Floats:
    """
    Return the geodesic length of every step of a polyline on an ellipsoid.

    Steps up to 1 km below latitude 70 use the radii of curvature at the step's middle latitude
    (within 0.01 ppm of the geodesic); all others solve the geodesic itself [1]_.

    Parameters
    ----------
    lonlat
        Vertices, shape (n, 2), longitude and latitude; the antimeridian may be crossed. [deg]
    semi_major_m
        Semi-major axis of the ellipsoid. [m]
    inverse_flattening
        Inverse flattening, 0 for a sphere. [-]

    Returns
    -------
    steps_m
        Shape (n - 1,). [m]

    References
    ----------
    .. [1] C. F. F. Karney, Algorithms for geodesics, J. Geodesy 87 (2013) 43-55.

    Examples
    --------
    >>> round(float(steps_m(np.array([[0.0, 51.0], [0.1, 51.0]]))[0]), 3)
    7019.767
    """
    longitude, latitude = np.ascontiguousarray(lonlat.T)
    lengths = np.empty(max(len(longitude) - 1, 0))
    flattening = 1.0 / inverse_flattening if inverse_flattening else 0.0
    for begin in range(0, len(lengths), _CHUNK):
        end = min(begin + _CHUNK, len(lengths))
        lengths[begin:end] = _local_steps_m(
            longitude[begin : end + 1],
            latitude[begin : end + 1],
            semi_major_m,
            flattening * (2.0 - flattening),
        )
    far = ~(lengths <= _LOCAL_STEP_M)
    far |= np.maximum(np.abs(latitude[1:]), np.abs(latitude[:-1])) > _LOCAL_LATITUDE_DEG
    if far.any():
        geod = _geod(semi_major_m, flattening)
        index = np.flatnonzero(far)
        # Solved from the same end whichever way the line runs, so that a reversed line is equal.
        swap = longitude[index] > longitude[index + 1]
        swap |= (longitude[index] == longitude[index + 1]) & (latitude[index] > latitude[index + 1])
        first, second = index + swap, index + ~swap
        _, _, exact = geod.inv(
            longitude[first], latitude[first], longitude[second], latitude[second]
        )
        lengths[index] = exact
    return lengths


def _local_steps_m(
    longitude: Floats, latitude: Floats, semi_major_m: float, eccentricity_squared: float
) -> Floats:
    latitude_rad = np.radians(latitude)
    middle = 0.5 * (latitude_rad[1:] + latitude_rad[:-1])
    dlat = latitude_rad[1:] - latitude_rad[:-1]
    turn = longitude[1:] - longitude[:-1]
    dlon = np.radians(turn - 360.0 * np.round(turn / 360.0))
    sine = np.sin(middle)
    shrink = 1.0 - eccentricity_squared * sine * sine
    normal = semi_major_m / np.sqrt(shrink)
    north = normal * (1.0 - eccentricity_squared) / shrink * dlat
    east = normal * np.cos(middle) * dlon
    return np.asarray(np.sqrt(north * north + east * east))


def mean_radius_m(semi_major_m: float, inverse_flattening: float) -> float:
    """
    Return the mean radius (2a + b) / 3 of an ellipsoid.

    Parameters
    ----------
    semi_major_m
        Semi-major axis. [m]
    inverse_flattening
        Inverse flattening, 0 for a sphere. [-]

    Examples
    --------
    >>> round(mean_radius_m(WGS84_SEMI_MAJOR_M, WGS84_INVERSE_FLATTENING), 4)
    6371008.7714
    """
    flattening = 1.0 / inverse_flattening if inverse_flattening else 0.0
    return semi_major_m * (3.0 - flattening) / 3.0


def ground_steps_m(
    ellipsoid_steps_m: Floats, heights_m: Floats | None, *, radius_m: float
) -> Floats:
    """
    Return steps on the ground: raised from the ellipsoid to their height, then along the slope.

    Each step is scaled by (R + h) / R with h the mean of its two heights and combined with the
    difference of height [1]_. A step with an unknown height at either end is left as it is.

    Parameters
    ----------
    ellipsoid_steps_m
        Steps on the ellipsoid, shape (n - 1,). [m]
    heights_m
        Heights of the vertices, shape (n,), NaN where unknown, or None. [m]
    radius_m
        Mean radius of the ellipsoid. [m]

    Returns
    -------
    ground_steps_m
        Shape (n - 1,). [m]

    References
    ----------
    .. [1] Reduction of distances with the elevation factor R / (R + h), textbook surveying.

    Examples
    --------
    >>> float(ground_steps_m(np.array([300.0]), np.array([0.0, 40.0]), radius_m=6371008.8)[0])
    302.6558...
    """
    if heights_m is None:
        return ellipsoid_steps_m
    rise = heights_m[1:] - heights_m[:-1]
    level = ellipsoid_steps_m * (1.0 + 0.5 * (heights_m[1:] + heights_m[:-1]) / radius_m)
    slope = np.sqrt(level * level + rise * rise)
    return np.where(np.isnan(slope), ellipsoid_steps_m, slope)


def unwrapped(longitude: Floats) -> Floats:
    """
    Return longitudes without the jump at the antimeridian; they may leave -180..180.

    Parameters
    ----------
    longitude
        Shape (n,). [deg]

    Examples
    --------
    >>> unwrapped(np.array([179.9, -179.9])).tolist()
    [179.9, 180.1]
    """
    turns = np.round(np.diff(longitude) / 360.0)
    if not turns.any():
        return longitude
    return np.asarray(longitude - 360.0 * np.concatenate([[0.0], np.cumsum(turns)]))


def wrapped(longitude: Floats) -> Floats:
    """
    Return longitudes within -180..180.

    Parameters
    ----------
    longitude
        Shape (n,). [deg]
    """
    outside = np.abs(longitude) > 180.0
    if not outside.any():
        return longitude
    return np.where(outside, (longitude + 180.0) % 360.0 - 180.0, longitude)


def is_turned(lonlat: Floats) -> bool:
    """
    Tell whether a polyline runs against its canonical direction.

    Of the two directions the canonical one is that whose vertices come first in order of
    longitude, then latitude. What is rounded along it comes out mirrored for a reversed line.

    Parameters
    ----------
    lonlat
        Vertices, shape (n, 2). [deg]

    Examples
    --------
    >>> is_turned(np.array([[0.0, 1.0], [2.0, 0.0]])), is_turned(np.array([[2.0, 0.0], [0.0, 1.0]]))
    (False, True)
    """
    if lonlat[0, 0] != lonlat[-1, 0]:
        return bool(lonlat[0, 0] > lonlat[-1, 0])
    differs = np.flatnonzero((lonlat != lonlat[::-1]).any(axis=1))
    if not len(differs):
        return False
    return bool(lonlat[differs[0]].tolist() > lonlat[::-1][differs[0]].tolist())


def densified(
    lonlat: Floats,
    *,
    step_m: float,
    lengths_m: Floats,
    semi_major_m: float = WGS84_SEMI_MAJOR_M,
    inverse_flattening: float = WGS84_INVERSE_FLATTENING,
) -> tuple[Floats, Floats]:
    """
    Return a polyline with points put on the geodesic of every step longer than `step_m`.

    Parameters
    ----------
    lonlat
        Vertices, shape (n, 2). [deg]
    step_m
        Longest step left. [m]
    lengths_m
        Length of every step, shape (n - 1,). [m]
    semi_major_m
        Semi-major axis of the ellipsoid. [m]
    inverse_flattening
        Inverse flattening, 0 for a sphere. [-]

    Returns
    -------
    lonlat
        Shape (m, 2), m >= n; the longitude runs on over the antimeridian. [deg]
    index
        Fractional index of every point in the input, shape (m,). [-]
    """
    long_steps = np.flatnonzero(lengths_m > step_m)
    whole = np.arange(len(lonlat), dtype=np.float64)
    if not len(long_steps):
        return lonlat, whole
    flattening = 1.0 / inverse_flattening if inverse_flattening else 0.0
    geod = _geod(semi_major_m, flattening)
    begin, end = lonlat[long_steps], lonlat[long_steps + 1]
    azimuth, _, length = geod.inv(begin[:, 0], begin[:, 1], end[:, 0], end[:, 1])
    parts = np.ceil(lengths_m[long_steps] / step_m).astype(np.int64)
    number = np.concatenate([np.arange(1, count) for count in parts])
    owner = np.repeat(np.arange(len(parts)), parts - 1)
    share = number / parts[owner]
    lon, lat, _ = geod.fwd(begin[owner, 0], begin[owner, 1], azimuth[owner], length[owner] * share)
    index = np.concatenate([whole, long_steps[owner] + share])
    order = np.argsort(index, kind="stable")
    dense = np.concatenate([lonlat, np.column_stack([lon, lat])])[order]
    return np.column_stack([unwrapped(dense[:, 0]), dense[:, 1]]), index[order]


def local_xy_m(
    lonlat: Floats, *, lon: Floats | float, lat: Floats | float
) -> tuple[Floats, Floats]:
    """
    Return east and north of points from near-by origins, by the WGS 84 radii at the origin.

    Good to a millimetre within 50 m of the origin below latitude 80, to two centimetres within
    200 m; meant for "how far is this point from that line".

    Parameters
    ----------
    lonlat
        Points, shape (n, 2). [deg]
    lon
        Longitude of the origin, scalar or shape (n,). [deg]
    lat
        Latitude of the origin, scalar or shape (n,). [deg]

    Returns
    -------
    east_m, north_m
        Shape (n,) each. [m]
    """
    flattening = 1.0 / WGS84_INVERSE_FLATTENING
    eccentricity_squared = flattening * (2.0 - flattening)
    sine = np.sin(np.radians(lat))
    shrink = 1.0 - eccentricity_squared * sine * sine
    normal = WGS84_SEMI_MAJOR_M / np.sqrt(shrink)
    turn = lonlat[:, 0] - lon
    dlon = np.radians(turn - 360.0 * np.round(turn / 360.0))
    east = normal * np.cos(np.radians(lat)) * dlon
    north = normal * (1.0 - eccentricity_squared) / shrink * np.radians(lonlat[:, 1] - lat)
    return np.asarray(east), np.asarray(north)


def utm_crs(lon: float, lat: float) -> str:
    """
    Return the WGS 84 UTM zone of a point as an EPSG code.

    Parameters
    ----------
    lon
        Longitude. [deg]
    lat
        Latitude. [deg]

    Examples
    --------
    >>> utm_crs(-73.5, 40.5), utm_crs(179.99, -16.0)
    ('EPSG:32618', 'EPSG:32760')
    """
    zone = int((lon + 180.0) % 360.0 // 6.0) + 1
    return f"EPSG:{(32600 if lat >= 0 else 32700) + zone}"


def grid_length_m(lonlat: Floats, crs: str) -> float:
    """
    Return the planar length of a polyline in a projected CRS, in metres whatever its unit.

    Parameters
    ----------
    lonlat
        WGS 84 vertices, shape (n, 2). [deg]
    crs
        The projected CRS, as pyproj reads it.

    Returns
    -------
    grid_m
        Infinite or NaN where the projection does not reach. [m]
    """
    transformer, unit_m = _to_grid(crs)
    x, y = transformer.transform(lonlat[:, 0], lonlat[:, 1])
    with np.errstate(invalid="ignore"):  # the difference of two infinities
        return float(np.sum(np.hypot(np.diff(x), np.diff(y)))) * unit_m


@lru_cache(maxsize=64)
def _to_grid(crs: str) -> tuple[pyproj.Transformer, float]:
    target = pyproj.CRS.from_user_input(crs)
    unit_m = float(target.axis_info[0].unit_conversion_factor) if target.axis_info else 1.0
    return pyproj.Transformer.from_crs("EPSG:4326", target, always_xy=True), unit_m


@lru_cache(maxsize=16)
def _geod(semi_major_m: float, flattening: float) -> pyproj.Geod:
    return pyproj.Geod(a=semi_major_m, f=flattening)
