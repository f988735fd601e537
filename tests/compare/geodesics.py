"""Writes tests/data/standards/geodesics.csv: geodesics of WGS 84 by the Python package
`geographiclib` (PyPI, MIT; C. F. F. Karney's own port of his algorithms, J. Geodesy 87, 2013).

    pip install geographiclib && python tests/compare/geodesics.py > tests/data/standards/geodesics.csv
"""

import random

from geographiclib.geodesic import Geodesic

random.seed(7)
places = [
    (50.0, -40.0, 44.0, -30.0),
    (0.0, 0.0, 0.5, 179.0),
    (60.0, 179.5, 62.0, -179.0),
    (89.0, 10.0, 89.5, -170.0),
]
for _ in range(16):
    places.append(
        tuple(round(random.uniform(-limit, limit), 4) for limit in (80, 180, 80, 180))
    )
print("lat1_deg,lon1_deg,lat2_deg,lon2_deg,distance_m,track_deg,middle_lat_deg,middle_lon_deg")
for lat1, lon1, lat2, lon2 in places:
    leg = Geodesic.WGS84.Inverse(lat1, lon1, lat2, lon2)
    middle = Geodesic.WGS84.Direct(lat1, lon1, leg["azi1"], leg["s12"] / 2)
    print(
        f"{lat1},{lon1},{lat2},{lon2},{leg['s12']:.6f},{leg['azi1'] % 360:.9f},"
        f"{middle['lat2']:.9f},{middle['lon2']:.9f}"
    )
