"""Where the island lies: a flat local frame in metres and its longitudes and latitudes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "BOUNDS",
    "ORIGIN_LAT",
    "ORIGIN_LON",
    "SEED",
    "Floats",
    "lonlat_from_xy",
    "random_stream",
    "xy_from_lonlat",
]

Floats = NDArray[np.float64]

SEED = 20_417
ORIGIN_LON = -21.6
ORIGIN_LAT = -38.6
BOUNDS = (-21.76, -38.70, -21.44, -38.50)  # west, south, east, north: all that is drawn

_MAJOR_AXIS_M = 6_378_137.0
_FLATTENING = 1 / 298.257223563
_SQUARED_ECCENTRICITY = _FLATTENING * (2 - _FLATTENING)
_CURVE = 1 - _SQUARED_ECCENTRICITY * np.sin(np.radians(ORIGIN_LAT)) ** 2
_NORTH_RADIUS_M = float(_MAJOR_AXIS_M * (1 - _SQUARED_ECCENTRICITY) / _CURVE**1.5)
_EAST_RADIUS_M = float(_MAJOR_AXIS_M / _CURVE**0.5)


def random_stream(name: str) -> np.random.Generator:
    """Return the random numbers of one part, so that changing one part leaves the others alone."""
    return np.random.Generator(np.random.PCG64([SEED, *name.encode()]))


def lonlat_from_xy(xy: Floats) -> Floats:
    """
    Return longitudes and latitudes of points of the local frame.

    The frame is for drawing the island only. Plans measure the coordinates that come out of it.

    Parameters
    ----------
    xy
        East and north of the origin, shape (n, 2). [m]

    Returns
    -------
    lonlat
        WGS 84, shape (n, 2). [deg]
    """
    xy = np.asarray(xy, dtype=float)
    lat = ORIGIN_LAT + np.degrees(xy[..., 1] / _NORTH_RADIUS_M)
    lon = ORIGIN_LON + np.degrees(xy[..., 0] / (_EAST_RADIUS_M * np.cos(np.radians(lat))))
    return np.stack([lon, lat], axis=-1)


def xy_from_lonlat(lonlat: Floats) -> Floats:
    """Return points of the local frame [m] from longitudes and latitudes [deg], shape (n, 2)."""
    lonlat = np.asarray(lonlat, dtype=float)
    east_m = _EAST_RADIUS_M * np.cos(np.radians(lonlat[..., 1]))
    x = np.radians(lonlat[..., 0] - ORIGIN_LON) * east_m
    y = np.radians(lonlat[..., 1] - ORIGIN_LAT) * _NORTH_RADIUS_M
    return np.stack([x, y], axis=-1)
