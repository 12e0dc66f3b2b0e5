"""Geometry of a site file in numpy: lines of sight, linearised sigmas, and the second root of four antennas.

    python site_geometry.py ../../demo-sites/marl-bank/site.toml

prints, for the middle of each asset: the antennas that an obstacle hides, the sigma of each axis and the 95 % ellipse
for a random sigma of 0.05 ns and the systematic sigmas of the site, and the mirror root if there is one.
"""

import sys
import tomllib

import numpy as np

LIGHT_M_S = 299792458.0
RANDOM_SIGMA_NS = 0.05
# sqrt of the 0.95 quantile of chi-square with two degrees: -2 ln 0.05.
ELLIPSE_95 = np.sqrt(-2.0 * np.log(0.05))


class Site:
    """What the scripts here need of a site file, with the defaults of the program's documentation."""

    def __init__(self, path):
        with open(path, "rb") as file:
            text = tomllib.load(file)
        self.name = text["site"]["name"]
        self.mains_hz = text["site"].get("mains_frequency_hz", 50.0)
        refractivity = text.get("air", {}).get("refractivity_n_units", 315.0)
        self.speed_m_s = LIGHT_M_S / (1.0 + refractivity * 1e-6)
        antennas = sorted(text["antenna"], key=lambda antenna: antenna["channel"])
        self.names = [antenna["name"] for antenna in antennas]
        self.antenna_m = np.array([antenna["position_m"] for antenna in antennas], float)
        self.survey_m = np.array([np.broadcast_to(a.get("position_sigma_m", 0.03), 3) for a in antennas], float)
        self.delay_ns = np.array([antenna.get("delay_ns", 0.0) for antenna in antennas])
        self.delay_sigma_ns = np.array([antenna.get("delay_sigma_ns", 0.1) for antenna in antennas])
        self.response_sigma_ns = np.array([antenna.get("response_sigma_ns", 0.05) for antenna in antennas])
        self.band_hz = np.array(antennas[0]["band_mhz"], float) * 1e6
        self.rate_hz = text["recorder"]["sample_rate_gsps"] * 1e9
        self.bandwidth_hz = text["recorder"]["bandwidth_mhz"] * 1e6
        self.bits = text["recorder"]["bits"]
        self.snr_at_10m_db = text["planning"]["snr_at_10m_db"]
        self.search_m = np.array([text["search"]["min_m"], text["search"]["max_m"]])
        self.assets = {}
        for asset in text["asset"]:
            start = np.array(asset.get("at_m", asset.get("from_m")), float)
            end = np.array(asset.get("at_m", asset.get("to_m")), float)
            self.assets[asset["name"]] = (start, end)
        self.boxes = []
        for obstacle in text.get("obstacle", []):
            corners = np.array(obstacle["footprint_m"], float)
            low, high = corners.min(axis=0), corners.max(axis=0)
            if not all(any(corner == side) for c in corners for corner, side in zip(c, zip(low, high))):
                raise ValueError(f"{obstacle['name']}: only rectangles along the axes are known here")
            self.boxes.append((np.append(low, obstacle["base_m"]), np.append(high, obstacle["top_m"])))

    def hidden(self, place_m):
        """Names of the antennas with an obstacle between them and the place."""
        return [
            name
            for name, antenna_m in zip(self.names, self.antenna_m)
            if any(crosses(antenna_m, place_m, low, high) for low, high in self.boxes)
        ]

    def systematic_variance_m2(self, place_m):
        """Per antenna: delay, response and survey (along the way), as a length squared."""
        along = directions(self.antenna_m, place_m)
        times_m = np.hypot(self.delay_sigma_ns, self.response_sigma_ns) * 1e-9 * self.speed_m_s
        return times_m**2 + ((along * self.survey_m) ** 2).sum(axis=1)

    def nearest_assets(self, place_m):
        """(distance, name) of every asset, nearest first."""
        return sorted((distance_m(place_m, *piece), name) for name, piece in self.assets.items())


def crosses(start_m, end_m, low_m, high_m):
    """Whether the straight way passes through the inside of the box: clip it by one pair of sides after the other."""
    near, far = 0.0, 1.0
    for start, end, low, high in zip(start_m, end_m, low_m, high_m):
        step = end - start
        if step == 0.0:
            if not low < start < high:
                return False
            continue
        first, second = sorted(((low - start) / step, (high - start) / step))
        near, far = max(near, first), min(far, second)
    return near < far


def directions(antenna_m, place_m):
    """Unit vectors from each antenna to the place."""
    ways = place_m - antenna_m
    return ways / np.linalg.norm(ways, axis=1, keepdims=True)


def distance_m(place_m, start_m, end_m):
    """Distance from the place to a straight piece."""
    along = end_m - start_m
    length2 = along @ along
    share = np.clip((place_m - start_m) @ along / length2, 0.0, 1.0) if length2 > 0.0 else 0.0
    return float(np.linalg.norm(place_m - start_m - share * along))


def covariance_m2(antenna_m, place_m, variance_m2):
    """Position block of (J' S^-1 J)^-1 with the emission time as a fourth unknown."""
    jacobian = np.column_stack([directions(antenna_m, place_m), np.ones(len(antenna_m))])
    normal = jacobian.T @ (jacobian / np.broadcast_to(variance_m2, len(antenna_m))[:, None])
    return np.linalg.inv(normal)[:3, :3]


def ellipse_95_m(covariance):
    """Semi-axes of the horizontal 95 % ellipse, larger first."""
    return ELLIPSE_95 * np.sqrt(np.linalg.eigvalsh(covariance[:2, :2]))[::-1]


def both_roots(antenna_m, range_m):
    """Places that explain four ranges with a common offset exactly: none, one or two.

    Subtracting the first squared equation from the others makes them linear in the place for a given offset b; put
    into the first, that leaves a quadratic in b. Roots of the squared equations that fail the unsquared are dropped.
    """
    first = antenna_m[0]
    matrix = 2.0 * (antenna_m[1:] - first)
    constant = (antenna_m[1:] ** 2).sum(axis=1) - first @ first - range_m[1:] ** 2 + range_m[0] ** 2
    base = np.linalg.solve(matrix, constant)
    slope = np.linalg.solve(matrix, 2.0 * (range_m[1:] - range_m[0]))
    offset = base - first
    quadratic = [slope @ slope - 1.0, 2.0 * (offset @ slope + range_m[0]), offset @ offset - range_m[0] ** 2]
    found = []
    for root in np.roots(quadratic):
        if abs(root.imag) > 1e-9 * max(1.0, abs(root)):
            continue
        place = base + slope * root.real
        if np.abs(np.linalg.norm(place - antenna_m, axis=1) - range_m + root.real).max() < 1e-6:
            found.append(place)
    return found


def main(path):
    site = Site(path)
    apart = np.linalg.norm(site.antenna_m[:, None] - site.antenna_m[None], axis=2)
    print(f"{site.name}: antennas {apart[apart > 0].min():.1f} to {apart.max():.1f} m apart")
    random_m2 = (RANDOM_SIGMA_NS * 1e-9 * site.speed_m_s) ** 2
    print(f"{'asset':34} {'sx':>5} {'sy':>5} {'sz':>5}   95 % ellipse  hidden from; mirror")
    for name, (start, end) in site.assets.items():
        place = 0.5 * (start + end)
        told = covariance_m2(site.antenna_m, place, site.systematic_variance_m2(place) + random_m2)
        sx, sy, sz = np.sqrt(np.diag(told))
        major, minor = ellipse_95_m(told)
        roots = both_roots(site.antenna_m, np.linalg.norm(place - site.antenna_m, axis=1))
        told_roots = []
        for root in roots:
            if np.linalg.norm(root - place) > 1e-4:
                inside = np.all((root >= site.search_m[0]) & (root <= site.search_m[1]))
                told_roots.append(f"{np.round(root, 1).tolist()} {'IN' if inside else 'outside'} the search box")
        line = f"{name:34} {sx:5.2f} {sy:5.2f} {sz:5.2f}   {major:5.2f} x {minor:4.2f}  "
        print(line, ",".join(site.hidden(place)) or "-", ";", ", ".join(told_roots) or "-")
    count, near = 0, []
    low, high = site.search_m
    grids = [np.arange(a + 0.25, b, 0.5) for a, b in zip(low, high)]
    points = np.stack(np.meshgrid(*grids, indexing="ij"), axis=-1).reshape(-1, 3)
    for place in points:
        for root in both_roots(site.antenna_m, np.linalg.norm(place - site.antenna_m, axis=1)):
            if np.linalg.norm(root - place) > 0.5 and np.all((root >= low) & (root <= high)):
                count += 1
                near.append(min(site.nearest_assets(root)[0][0], site.nearest_assets(place)[0][0]))
    told = f", nearest to an asset {min(near):.2f} m" if near else ""
    print(f"of {len(points)} places of the search box {count} have their mirror inside it too{told}")


if __name__ == "__main__":
    main(sys.argv[1])
