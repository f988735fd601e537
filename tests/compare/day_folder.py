#!/usr/bin/env python3
"""Checks a day folder (CSV tables) against the rules of the format, and prints what it holds.

Independent of the Rust code: standard library only, distances on a sphere, so speeds are good to
half a per cent. Usage: day_folder.py FOLDER [FOLDER ...]; exits with 1 if a rule is broken.
"""

import csv
import gzip
import json
import math
import os
import sys
from collections import Counter, defaultdict
from datetime import datetime

COLUMNS = {
    "capacity": "sector from until",
    "airports": "airport lon lat",
    "airport_capacity": "airport from until",
    "flights": "flight departure destination aircraft",
    "points": "flight time lon lat level_fl",
    "aircraft": "aircraft",
    "fuel": "aircraft level_fl",
    "proposals": "proposal flight level_fl",
}
EAST = set(range(10, 420, 20)) | {450, 490}
WEST = set(range(20, 420, 20)) | {430, 470}


def table(folder, name):
    for ending, opener in ((".csv", open), (".csv.gz", gzip.open)):
        path = os.path.join(folder, name + ending)
        if os.path.exists(path):
            with opener(path, "rt", encoding="utf-8", newline="") as f:
                rows = list(csv.DictReader(f))
            missing = [c for c in COLUMNS[name].split() if rows and c not in rows[0]]
            if missing:
                raise SystemExit(f"{path}: missing columns {missing}")
            return rows
    return []


def seconds(text):
    if not text.endswith("Z"):
        raise ValueError(f"{text}: not UTC")
    return datetime.fromisoformat(text[:-1] + "+00:00").timestamp()


def leg(a, b):
    """Great-circle distance in NM and initial track in degrees."""
    lon1, lat1, lon2, lat2 = map(math.radians, (*a, *b))
    d = lon2 - lon1
    h = math.sin((lat2 - lat1) / 2) ** 2 + math.cos(lat1) * math.cos(lat2) * math.sin(d / 2) ** 2
    track = math.atan2(
        math.sin(d) * math.cos(lat2),
        math.cos(lat1) * math.sin(lat2) - math.sin(lat1) * math.cos(lat2) * math.cos(d),
    )
    return 2 * 3440.065 * math.asin(math.sqrt(h)), math.degrees(track) % 360


def check(folder):
    broken = []
    flights = {f["flight"]: f for f in table(folder, "flights")}
    if len(flights) != len(table(folder, "flights")):
        broken.append("flight names are not unique")
    points = defaultdict(list)
    for p in table(folder, "points"):
        points[p["flight"]].append(
            (seconds(p["time"]), (float(p["lon"]), float(p["lat"])), float(p["level_fl"]))
        )
    if set(points) != set(flights):
        broken.append("flights and points name different flights")
    levels, no_cruise, slow, wrong = Counter(), 0, 0, 0
    cruise, fastest = {}, 0.0
    for flight, ps in points.items():
        legs = []
        if len(ps) < 2:
            broken.append(f"{flight}: fewer than two points")
        for (t1, a, l1), (t2, b, l2) in zip(ps, ps[1:]):
            if t2 <= t1:
                broken.append(f"{flight}: times do not increase")
                continue
            distance_nm, track = leg(a, b)
            speed = distance_nm / (t2 - t1) * 3600
            fastest = max(fastest, speed)
            if speed > 1500:
                broken.append(f"{flight}: {speed:.0f} kt")
            if l1 == l2 >= 245:
                slow += speed < 50
                levels[l1] += t2 - t1
                legs.append((t1, t2, l1))
                wrong += l1 not in (EAST if track < 180 else WEST)
        no_cruise += not legs
        cruise[flight] = legs
    sectors = Counter()
    for f in json.load(open(os.path.join(folder, "sectors.geojson")))["features"]:
        sectors[f["properties"]["sector"]] += 1
        shapes = f["geometry"]["coordinates"]
        for polygon in [shapes] if f["geometry"]["type"] == "Polygon" else shapes:
            for ring in polygon:
                if ring[0] != ring[-1] or len(ring) < 4:
                    broken.append(f"{f['properties']['sector']}: ring not closed")
    periods = defaultdict(list)
    for r in table(folder, "capacity"):
        if r["sector"] not in sectors:
            broken.append(f"capacity: unknown sector {r['sector']}")
        periods[r["sector"]].append((seconds(r["from"]), seconds(r["until"])))
    for sector, rows in periods.items():
        rows.sort()
        if any(a >= b for a, b in rows) or any(x[1] > y[0] for x, y in zip(rows, rows[1:])):
            broken.append(f"{sector}: capacity periods overlap or are empty")
    asked = defaultdict(Counter)
    outside = set()
    for r in table(folder, "proposals"):
        if r["flight"] not in flights:
            broken.append(f"{r['proposal']}: unknown flight {r['flight']}")
            continue
        asked[r["proposal"]][r.get("option") or "1"] += 1
        for column in ("from_time", "until_time"):
            if r[column]:
                t = seconds(r[column])
                if not any(a <= t <= b for a, b, _ in cruise[r["flight"]]):
                    outside.add(r["proposal"])
    for proposal, options in asked.items():
        if "1" not in options:
            broken.append(f"{proposal}: no option 1")
    total_s = sum(levels.values())
    print(f"{folder}: {len(flights)} flights, {sum(map(len, points.values()))} points, "
          f"{len(sectors)} sectors, {sum(map(len, periods.values()))} capacity rows")
    print(f"  no cruise leg {no_cruise}, cruise legs against direction {wrong}, "
          f"under 50 kt {slow}, fastest {fastest:.0f} kt")
    print(f"  proposals {len(asked)}, options {Counter(len(o) for o in asked.values())}, with a time "
          f"off cruise {len(outside)}, several stretches "
          f"{sum(any(n > 1 for n in o.values()) for o in asked.values())}")
    print("  share of cruise time by level: "
          + " ".join(f"{l:.0f}:{s / total_s:.1%}" for l, s in sorted(levels.items())))
    for line in broken[:50]:
        print("  BROKEN", line)
    return not broken


if __name__ == "__main__":
    results = [check(folder) for folder in sys.argv[1:]]
    sys.exit(not all(results))
