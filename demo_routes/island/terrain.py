"""The ground of the island: its coast, its hills, its river and the height of any place."""

from __future__ import annotations

from functools import cache
from typing import NamedTuple

import numpy as np

from island.frame import Floats, random_stream, xy_from_lonlat
from island.lines import along_m, cut, nearest, point_at, resample, through

__all__ = [
    "HILLS",
    "Hill",
    "beck_xy",
    "coast_xy",
    "height_m",
    "height_of_lonlat_m",
    "inland_ratio",
    "river_distance_m",
    "river_xy",
    "terrain_grid",
    "waves",
]

_HALF_EAST_M, _HALF_NORTH_M = 11_900.0, 8_300.0
_LOWLAND_M = 34.0
_SOURCE_M = 165.0  # of the valley floor at the spring
_VALLEY_BLUR_M = 420.0


class Hill(NamedTuple):
    """A bell-shaped rise (a hollow where the height is negative), turned about its top."""

    name: str
    x_m: float
    y_m: float
    height_m: float
    along_m: float
    across_m: float
    turn_deg: float


HILLS = (
    Hill("Quenmoor", 6_900, 3_300, 352, 1_750, 1_350, 35),
    Hill("Sarrel Fell", -4_300, 1_900, 250, 2_900, 1_300, 96),
    Hill("Sarrel Fell, south", -3_650, -4_700, 185, 2_100, 1_150, 98),
    Hill("Urlaw Head", -300, 5_600, 245, 2_300, 1_500, 10),
    Hill("Thrumble", 6_600, -3_600, 118, 1_700, 1_200, 150),
    Hill("Sarrel Gate", -3_950, -1_750, 26, 1_500, 1_250, 96),
    Hill("Grey Lathe", -7_900, 2_700, 95, 1_500, 1_900, 20),
    Hill("Skelvane Rig", 2_900, 3_400, 130, 2_000, 1_000, 60),
)


@cache
def _shore_waves() -> tuple[Floats, Floats, Floats]:
    random = random_stream("coast")
    order = np.arange(2.0, 46.0)
    size: Floats = 0.23 * random.uniform(0.35, 1.0, len(order)) / order**1.04
    return order, size, random.uniform(0, 2 * np.pi, len(order))


def _shore_ratio(angle: Floats) -> Floats:
    """Return how far the coast lies out, as a share of the plain oval."""
    order, size, phase = _shore_waves()
    wave = size * np.cos(np.asarray(angle)[..., None] * order + phase)
    out: Floats = 1.0 + np.sum(wave, axis=-1)
    return out


def inland_ratio(xy: Floats) -> Floats:
    """Return how far inside the coast a place lies: 0 on it, negative at sea, 1 in the middle."""
    east, north = xy[..., 0] / _HALF_EAST_M, xy[..., 1] / _HALF_NORTH_M
    return _shore_ratio(np.arctan2(north, east)) - np.hypot(east, north)


def coast_xy(count: int = 1_100) -> Floats:
    """Return the coast, anticlockwise and closed, in the local frame. [m]"""
    angle = np.linspace(-np.pi, np.pi, count, endpoint=False)
    out = _shore_ratio(angle)
    ring = np.stack(
        [_HALF_EAST_M * out * np.cos(angle), _HALF_NORTH_M * out * np.sin(angle)], axis=1
    )
    return np.vstack([ring, ring[:1]])


def waves(xy: Floats, name: str, *, shortest_m: float, longest_m: float, count: int) -> Floats:
    """Return a rolling pattern between -1 and 1, the same for the same name."""
    random = random_stream(name)
    length_m = np.geomspace(longest_m, shortest_m, count)
    heading = random.uniform(0, 2 * np.pi, count)
    phase = random.uniform(0, 2 * np.pi, count)
    total = np.zeros(xy.shape[:-1])
    for size_m, turn, start in zip(length_m, heading, phase, strict=True):
        ahead = xy[..., 0] * np.cos(turn) + xy[..., 1] * np.sin(turn)
        total += size_m * np.sin(2 * np.pi * ahead / size_m + start)
    return total / np.sum(length_m)


@cache
def river_xy() -> Floats:
    """Return the river Lunnoth from its spring to the sea, in the local frame. [m]"""
    bends = [
        (-1_150, 4_300), (-700, 3_500), (-950, 2_700), (-150, 1_900), (300, 1_000), (150, 200),
        (900, -600), (1_500, -1_500), (1_350, -2_500), (2_050, -3_400), (1_900, -4_500),
        (2_600, -5_500), (2_500, -6_600), (2_950, -7_600), (3_000, -9_500),
    ]  # fmt: skip
    line = through(bends, 30.0)
    random = random_stream("river")
    chain = along_m(line)
    sway = sum(
        size * np.sin(2 * np.pi * chain / length + random.uniform(0, 2 * np.pi))
        for size, length in ((38, 900), (24, 520), (12, 290))
    )
    sway = sway * np.clip(chain / 1_500, 0.2, 1.0)
    step = np.gradient(line, axis=0)
    unit = step / np.hypot(*step.T)[:, None]
    line = line + sway[:, None] * np.stack([-unit[:, 1], unit[:, 0]], axis=1)
    mouth = int(np.argmax(inland_ratio(line) < 0))
    return resample(cut(line, 0.0, float(along_m(line)[mouth])), 60.0)


@cache
def beck_xy() -> Floats:
    """Return Sarrel Beck, a stream from the fell to the river, in the local frame. [m]"""
    bends = [(-2_500, 2_300), (-1_900, 1_500), (-1_750, 800), (-1_000, 350), (-700, -500),
             (100, -900), (600, -1_250)]  # fmt: skip
    line = through([*bends, tuple(point_at(river_xy(), 7_200.0))], 30.0)
    chain = along_m(line)
    sway = np.interp(chain, [0, 200, chain[-1] - 200, chain[-1]], [0, 1, 1, 0])
    sway = sway * (16 * np.sin(chain / 61.0) + 9 * np.sin(chain / 23.0 + 1.0))
    return resample(line + np.stack([sway, 0.6 * sway], axis=1), 45.0)


def river_distance_m(xy: Floats) -> Floats:
    """Return how far each place is from the middle of the river. [m]"""
    return nearest(xy.reshape(-1, 2), river_xy())[0].reshape(xy.shape[:-1])


def height_m(xy: Floats) -> Floats:
    """
    Return the height of the ground above the sea, negative where there is sea.

    Hills on a rolling lowland, drawn down to nothing at the coast; the river's valley is cut into
    them, its floor falling steadily from the spring to the sea.

    Parameters
    ----------
    xy
        East and north of the origin, last axis of size 2. [m]

    Returns
    -------
    height_m
        One value per place. [m]
    """
    xy = np.asarray(xy, dtype=float)
    inland = inland_ratio(xy)
    rise = 1.0 - (1.0 - np.clip(inland / 0.20, 0.0, 1.0)) ** 2
    rolling = waves(xy, "rolling", shortest_m=700, longest_m=4_800, count=26)
    rough = waves(xy, "rough", shortest_m=160, longest_m=520, count=14)
    relief = _LOWLAND_M + 62.0 * rolling + 5.0 * rough
    for hill in HILLS:
        relief = relief + _bell(xy, hill)
    land = rise * np.maximum(relief, 4.0)
    return np.where(
        inland > 0, _with_valley(xy, land, inland), -70.0 * (1.0 - np.exp(7.0 * inland))
    )


def _bell(xy: Floats, hill: Hill) -> Floats:
    turn = np.radians(hill.turn_deg)
    east, north = xy[..., 0] - hill.x_m, xy[..., 1] - hill.y_m
    ahead = east * np.cos(turn) + north * np.sin(turn)
    aside = north * np.cos(turn) - east * np.sin(turn)
    spread = (ahead / hill.along_m) ** 2 + (aside / hill.across_m) ** 2
    rise: Floats = hill.height_m * np.exp(-spread)
    return rise


def _with_valley(xy: Floats, land: Floats, inland: Floats) -> Floats:
    """Return land heights with the valley cut in, its floor smooth where two bends are as near."""
    places, river = xy.reshape(-1, 2), river_xy()
    away = nearest(places, river)[0]
    weight, share = np.zeros(len(places)), np.zeros(len(places))
    for part, bend in zip(np.linspace(0.0, 1.0, len(river)), river, strict=True):
        square = np.sum((places - bend) ** 2, axis=1)
        near_bend = np.exp((away**2 - square) / _VALLEY_BLUR_M**2)
        weight += near_bend
        share += part * near_bend
    share = share / np.maximum(weight, 1e-9)
    shore = np.clip(inland.reshape(-1) / 0.03, 0.0, 1.0)
    floor = _SOURCE_M * (1.0 - share) ** 2.7 * shore
    near = np.exp(-((away / (300.0 + 600.0 * share)) ** 2))
    flat = land.reshape(-1)
    return (flat + near * (floor - flat)).reshape(land.shape)


def height_of_lonlat_m(lonlat: Floats) -> Floats:
    """Return ground heights [m] at longitudes and latitudes [deg]."""
    return height_m(xy_from_lonlat(lonlat))


def terrain_grid(west: float, north: float, step_deg: float, shape: tuple[int, int]) -> Floats:
    """Return heights at cell middles, rows from the north, for a raster in degrees. [m]"""
    rows, columns = shape
    lat = north - (np.arange(rows) + 0.5) * step_deg
    lon = west + (np.arange(columns) + 0.5) * step_deg
    lonlat = np.stack(np.meshgrid(lon, lat), axis=-1)
    return np.round(height_of_lonlat_m(lonlat), 1)
