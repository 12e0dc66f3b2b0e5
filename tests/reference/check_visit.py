"""Locates the independent visit with a plain estimator in numpy: do its captures hold what truth.json says?

    python check_visit.py ../../demo-sites/marl-bank

Onsets by the Akaike criterion (N. Maeda, 1985) gate a window of each channel; correlation of the windows, with a
parabola through the peak, gives the delays; weighted least squares of the mean delays gives the place. Ends 1 when the
place is further than three sigmas from the truth, or when an asset other than the true one is nearest.
"""

import csv
import json
import sys
from pathlib import Path

import numpy as np
from scipy import optimize, signal

from site_geometry import Site, covariance_m2, ellipse_95_m

BEFORE, LENGTH = 4, 24  # samples of the gate before the onset, and in all
FINER = 16
QUIET = 450  # the trigger keeps the first samples of a record free of the pulse
LEAST_SNR_DB = 13.0  # of the weakest channel; some 11 dB is what the noise itself peaks at


def recording(folder):
    """Captures as (captures, samples, channels), the rate, from the SigMF files."""
    meta = json.loads((folder / "visit.sigmf-meta").read_text())
    channels = meta["global"]["core:num_channels"]
    frames = np.frombuffer((folder / "visit.sigmf-data").read_bytes(), "<i2").reshape(-1, channels)
    starts = [capture["core:sample_start"] for capture in meta["captures"]] + [len(frames)]
    captures = np.stack([frames[a:b] for a, b in zip(starts, starts[1:])]).astype(float)
    return captures, meta["global"]["core:sample_rate"]


def onset(trace):
    """Minimum of the Akaike criterion in the 300 samples up to the greatest value."""
    peak = QUIET + int(np.argmax(np.abs(trace[QUIET:-LENGTH])))
    part = trace[peak - 300 : peak + 3]
    count = np.arange(1, len(part))
    squares, sums = np.cumsum(part**2), np.cumsum(part)
    before = squares[:-1] / count - (sums[:-1] / count) ** 2
    rest = len(part) - count
    after = (squares[-1] - squares[:-1]) / rest - ((sums[-1] - sums[:-1]) / rest) ** 2
    criterion = count * np.log(np.maximum(before, 1e-12)) + (rest - 1) * np.log(np.maximum(after, 1e-12))
    return peak - 300 + 10 + int(np.argmin(criterion[10:-2])) + 1


def delay_samples(first, second, lag_limit):
    """How much later `second` is: the peak of the correlation, on a finer grid, with a parabola through it."""
    finer = [signal.resample(np.pad(part, LENGTH), 3 * LENGTH * FINER) for part in (first, second)]
    product = signal.correlate(finer[1], finer[0])
    lags = signal.correlation_lags(len(finer[1]), len(finer[0]))
    near = np.abs(lags) <= lag_limit * FINER
    product, lags = product[near], lags[near]
    best = int(np.clip(np.argmax(product), 1, len(product) - 2))
    left, middle, right = product[best - 1 : best + 2]
    return (lags[best] + 0.5 * (left - right) / (left - 2.0 * middle + right)) / FINER


def arrivals_s(captures, rate_hz, band_hz):
    """Per capture and channel, from the first channel's onset, delays not yet subtracted."""
    causal = signal.butter(2, band_hz, "bandpass", fs=rate_hz, output="sos")
    found, ratios = [], []
    for capture in captures:
        filtered = signal.sosfilt(causal, capture - capture.mean(axis=0), axis=0)
        ratios.append(20.0 * np.log10(np.abs(filtered).max(axis=0) / filtered[50:QUIET].std(axis=0)))
        onsets = [onset(trace) for trace in filtered.T]
        taper = signal.windows.tukey(LENGTH, 0.3)
        gates = [trace[o - BEFORE :][:LENGTH] * taper for trace, o in zip(filtered.T, onsets)]
        times = [onsets[0]] + [o + delay_samples(gates[0], g, 3) for o, g in zip(onsets[1:], gates[1:])]
        found.append(np.array(times) / rate_hz)
    return np.array(found), np.array(ratios)


def locate(site, times_s):
    """Least squares for place and emission time from one time per antenna, from several starts."""
    ranges_m = (times_s - site.delay_ns * 1e-9) * site.speed_m_s
    middle = site.search_m.mean(axis=0)
    sigma_m = np.sqrt(site.systematic_variance_m2(middle))

    def residuals(unknowns):
        return (np.linalg.norm(unknowns[:3] - site.antenna_m, axis=1) + unknowns[3] - ranges_m) / sigma_m

    best = None
    for start_m in (middle, *[0.5 * (a + b) for a, b in site.assets.values()]):
        offset = np.mean(ranges_m - np.linalg.norm(start_m - site.antenna_m, axis=1))
        found = optimize.least_squares(residuals, np.append(start_m, offset), method="lm", xtol=1e-14, ftol=1e-14)
        inside = np.all((found.x[:3] >= site.search_m[0]) & (found.x[:3] <= site.search_m[1]))
        if inside and (best is None or found.cost < best.cost - 1e-9):
            best = found
    return best.x[:3]


def main(folder):
    folder = Path(folder)
    site = Site(folder / "site.toml")
    told = json.loads((folder / "independent" / "truth.json").read_text())
    source_m = np.array(told["sources"][0]["position_m"])
    captures, rate_hz = recording(folder / "independent")
    times, ratios = arrivals_s(captures, rate_hz, site.band_hz)
    strong = ratios.min(axis=1) >= LEAST_SNR_DB
    print(
        f"captures {len(captures)}, strong enough on every channel {strong.sum()}; "
        f"median SNR {np.round(np.median(ratios, axis=0), 1)} dB"
    )
    times = times[strong]
    delays = times - times[:, :1]
    middle = np.median(delays, axis=0)
    scatter = 1.4826 * np.median(np.abs(delays - middle), axis=0)
    kept = np.all(np.abs(delays - middle) <= 5.0 * np.maximum(scatter, 2e-11), axis=1)
    mean_s = delays[kept].mean(axis=0)
    true_s = np.array(
        [
            np.linalg.norm(source_m - np.array(a["position_m"])) / site.speed_m_s
            + (a["delay_ns"] + told["sources"][0]["response_error_ns"][i]) * 1e-9
            for i, a in enumerate(told["antennas"])
        ]
    )
    off_ns = (mean_s - (true_s - true_s[0])) * 1e9
    print(
        f"kept {kept.sum()}; delays to the first antenna: scatter {np.round(scatter[1:] * 1e9, 3)} ns, "
        f"mean off by {np.round(off_ns[1:], 3)} ns"
    )

    place_m = locate(site, mean_s)
    random_m2 = (scatter[1:].max() / np.sqrt(2.0 * kept.sum()) * site.speed_m_s) ** 2
    covariance = covariance_m2(site.antenna_m, place_m, site.systematic_variance_m2(place_m) + random_m2)
    error_m = place_m - source_m
    distance = float(np.sqrt(error_m @ np.linalg.solve(covariance, error_m)))
    print(f"place {np.round(place_m, 3)}, truth {source_m}, off by {np.round(error_m, 3)} m")
    print(
        f"sigmas {np.round(np.sqrt(np.diag(covariance)), 3)} m, 95 % ellipse {np.round(ellipse_95_m(covariance), 2)} m"
    )
    print(f"distance from the truth in sigmas {distance:.2f}")
    nearest = site.nearest_assets(place_m)[:3]
    print("nearest assets: " + "; ".join(f"{name} {metres:.2f} m" for metres, name in nearest))
    singles = np.array([locate(site, d) for d in delays[kept]])
    right = sum(site.nearest_assets(p)[0][1] == told["sources"][0]["asset"] for p in singles)
    print(
        f"each capture by itself: nearest asset right in {right} of {len(singles)}, "
        f"sd {np.round(singles.std(axis=0), 3)} m"
    )
    for number in range(3):
        with open(folder / "independent-csv" / f"shot_{number + 1:03d}.csv", newline="") as file:
            rows = [row for row in csv.reader(file)]
        start = next(i for i, row in enumerate(rows) if row and row[0] == "TIME") + 1
        volts = np.array(rows[start:], float)[:, 1:]
        scores = [np.corrcoef(volts[:, 0], capture[:, 0])[0, 1] for capture in captures]
        print(f"shot_{number + 1:03d}.csv is capture {int(np.argmax(scores)) + 1}, correlation {max(scores):.7f}")
    return 0 if distance < 3.0 and nearest[0][1] == told["sources"][0]["asset"] else 1


if __name__ == "__main__":
    sys.exit(main(sys.argv[1]))
