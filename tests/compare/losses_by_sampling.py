#!/usr/bin/env python3
"""Losses of separation of a day folder by sampling: every flight's place every few seconds, and a
scipy cKDTree of each sample for the pairs within 5 NM and less than 1 000 ft at or above FL 245.

    pip install numpy scipy && python tests/compare/losses_by_sampling.py DAY [SECONDS ...]

Prints the CPU time of trees and queries alone (places are made beforehand) and how many pairs lose
separation, to be set beside `cargo bench --bench losses` with RIMESHIFT_DAY=DAY, which prints both
for the continuous-time search. Places lie on great circles between filed points, by normals of the
ellipsoid, so a few tens of metres from the geodesics: a pair that only grazes the minimum may be
told otherwise. All flights count as approved for RVSM.
"""

import csv
import sys
import time
from datetime import datetime

import numpy as np
from scipy.spatial import cKDTree

MINIMUM_M = 2 * 6_371_008.8 * np.sin(9260 / (2 * 6_371_008.8))
FLOOR_FT = 24_500


def flights(folder):
    rows = {}
    with open(f"{folder}/points.csv", encoding="utf-8", newline="") as f:
        for row in csv.DictReader(f):
            t = datetime.fromisoformat(row["time"].replace("Z", "+00:00")).timestamp()
            point = (t, float(row["lon"]), float(row["lat"]), float(row["level_fl"]) * 100)
            rows.setdefault(row["flight"], []).append(point)
    return [np.array(points) for points in rows.values()]


def normals(points):
    lon, lat = np.radians(points[:, 1]), np.radians(points[:, 2])
    return np.stack((np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)), axis=1)


def sampled(points, step_s):
    """Sample numbers, earth-centred places and levels of one flight."""
    numbers = np.arange(np.ceil(points[0, 0] / step_s), np.floor(points[-1, 0] / step_s) + 1)
    t = numbers * step_s
    leg = np.clip(np.searchsorted(points[:, 0], t, side="right") - 1, 0, len(points) - 2)
    share = (t - points[leg, 0]) / (points[leg + 1, 0] - points[leg, 0])
    n = normals(points)
    a, b = n[leg], n[leg + 1]
    angle = np.arccos(np.clip(np.sum(a * b, axis=1), -1, 1))
    sine = np.sin(angle)
    straight = sine < 1e-9
    sine = np.where(straight, 1, sine)
    wa = np.where(straight, 1 - share, np.sin((1 - share) * angle) / sine)
    wb = np.where(straight, share, np.sin(share * angle) / sine)
    up = wa[:, None] * a + wb[:, None] * b
    e2 = 0.00669437999014
    radius = 6_378_137.0 / np.sqrt(1 - e2 * up[:, 2] ** 2)
    place = radius[:, None] * up * np.array([1, 1, 1 - e2])
    level = points[leg, 3] + share * (points[leg + 1, 3] - points[leg, 3])
    high = level >= FLOOR_FT
    return numbers[high].astype(np.int64), place[high], level[high]


def losing_pairs(all_flights, step_s):
    parts = [sampled(points, step_s) for points in all_flights]
    owner = np.repeat(np.arange(len(parts)), [len(p[0]) for p in parts])
    number, place, level = (np.concatenate([p[k] for p in parts]) for k in range(3))
    order = np.argsort(number, kind="stable")
    owner, number, place, level = owner[order], number[order], place[order], level[order]
    bounds = np.flatnonzero(np.diff(number)) + 1
    pairs = set()
    start = time.process_time()
    for i, j in zip(np.r_[0, bounds], np.r_[bounds, len(number)]):
        near = cKDTree(place[i:j]).query_pairs(MINIMUM_M, output_type="ndarray") + i
        near = near[np.abs(level[near[:, 0]] - level[near[:, 1]]) < 1000]
        if len(near):
            ids = np.sort(owner[near], axis=1)
            pairs.update(map(tuple, ids))
    return pairs, time.process_time() - start, len(number)


def main():
    folder, steps = sys.argv[1], [float(s) for s in sys.argv[2:]] or [10.0]
    day = flights(folder)
    print(f"{len(day)} flights")
    for step_s in steps:
        pairs, spent_s, samples = losing_pairs(day, step_s)
        print(f"every {step_s:g} s: {samples} samples, {len(pairs)} losing pairs, {spent_s:.2f} s CPU")


if __name__ == "__main__":
    main()
