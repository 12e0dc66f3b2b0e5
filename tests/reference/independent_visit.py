"""A visit of the demo site, simulated in numpy without any code of the project.

    python independent_visit.py ../../demo-sites/marl-bank

reads site.toml there and writes, in the same folder, `independent/` (a SigMF recording of 40 captures and truth.json)
and `independent-csv/` (three of the captures as an oscilloscope writes them). Same seed, same bytes.

What is in it: a causal band-limited pulse whose shape, size and sign change from shot to shot; 1/r; a reflection from
the ground; a short echo inside each antenna (unlike antennas); errors of delays, survey and response drawn from the
sigmas of the site file; a jittering trigger; two carriers; white noise; the quantiser of the recorder.
"""

import hashlib
import json
import sys
from datetime import datetime, timedelta, timezone
from pathlib import Path

import numpy as np
from scipy import signal

from site_geometry import Site

SEED = 20260304
ASSET = "Voltage transformer phase A"
SOURCE_M = np.array([5.50, 16.92, 3.85])
CAPTURES = 40
SAMPLES = 1500
CSV_CAPTURES = (2, 14, 27)  # counted from 1
START = datetime(2026, 3, 4, 10, 15, 0, tzinfo=timezone.utc)

# The continuous waveform is made on a grid this many times finer than the recorder's, then sampled without an ideal
# anti-alias filter, as a recorder does it.
FINER = 4
FIRST_ARRIVAL_SAMPLE = 520
TRIGGER_JITTER_S = 6e-9
SHOT_SPREAD_DB = 2.5
GAIN_SPREAD_DB = 2.0
GROUND_REFLECTION = -0.35
CARRIERS = ((634e6, -3.0), (947e6, -8.0))  # frequency, rms in dB over the noise rms in the band
TYPICAL_PEAK_SHARE = 0.35  # of full scale


def pulse_spectrum(frequency_hz, rise_s, decay_s, chain):
    """Current pulse exp(-t/decay) - exp(-t/rise) through the antenna's and the recorder's causal filters."""
    omega = 2j * np.pi * frequency_hz
    current = 1.0 / (omega + 1.0 / decay_s) - 1.0 / (omega + 1.0 / rise_s)
    response = current
    for numerator, denominator in chain:
        response = response * np.polyval(numerator, omega) / np.polyval(denominator, omega)
    return response


class Visit:
    """What is drawn once, and the captures made from it."""

    def __init__(self, site):
        self.site = site
        self.rng = np.random.default_rng(SEED)
        count = len(site.names)
        self.delay_error_ns = self.rng.normal(0.0, site.delay_sigma_ns)
        self.survey_error_m = self.rng.normal(0.0, site.survey_m)
        self.response_error_ns = self.rng.normal(0.0, site.response_sigma_ns)
        self.gain = 10.0 ** (self.rng.normal(0.0, GAIN_SPREAD_DB, count) / 20.0)
        # Weak: an echo within the pulse shifts what any estimator finds, and the site's response sigma is all there is
        # to cover that and the response error drawn above.
        self.echo = self.rng.uniform(0.04, 0.12, count) * self.rng.choice([-1.0, 1.0], count)
        self.echo_s = self.rng.uniform(0.4e-9, 0.9e-9, count)
        self.antenna_m = site.antenna_m + self.survey_error_m
        self.direct_m = np.linalg.norm(SOURCE_M - self.antenna_m, axis=1)
        self.ground_m = np.linalg.norm(SOURCE_M * [1.0, 1.0, -1.0] - self.antenna_m, axis=1)
        if site.hidden(SOURCE_M):
            raise ValueError("the source must be in sight of every antenna")
        delay_s = (site.delay_ns + self.delay_error_ns + self.response_error_ns) * 1e-9
        self.arrival_s = self.direct_m / site.speed_m_s + delay_s
        self.ground_late_s = (self.ground_m - self.direct_m) / site.speed_m_s
        low, high = site.band_hz
        self.chain = (
            signal.butter(2, [2 * np.pi * 0.8 * low, 2 * np.pi * 1.1 * high], "bandpass", analog=True),
            signal.bessel(4, 2 * np.pi * site.bandwidth_hz, "lowpass", analog=True, norm="mag"),
        )
        self.fine_rate_hz = FINER * site.rate_hz
        self.fine_count = FINER * 2048
        self.frequency_hz = np.fft.rfftfreq(self.fine_count, 1.0 / self.fine_rate_hz)
        self.timing_band = signal.butter(4, [low, high], "bandpass", fs=site.rate_hz, output="sos")
        # One volt is the peak of the average shot in the timing band at 10 m.
        middle = pulse_spectrum(self.frequency_hz, 0.35e-9, 1.6e-9, self.chain)
        self.unit = 1.0 / np.abs(signal.sosfilt(self.timing_band, self.sampled(middle, 100e-9))).max()
        white = self.rng.normal(size=200_000)
        share = np.std(signal.sosfilt(self.timing_band, white))
        self.band_noise_v = 10.0 ** (-site.snr_at_10m_db / 20.0)
        self.white_v = self.band_noise_v / share
        self.carrier_phase = self.rng.uniform(0.0, 2.0 * np.pi, (len(CARRIERS), count))
        peak_v = self.gain * 10.0 / self.direct_m * 1.2
        self.full_scale_v = peak_v / TYPICAL_PEAK_SHARE
        self.levels = 2 ** (site.bits - 1)

    def sampled(self, spectrum, delay_s):
        """The recorder's samples of the waveform with this spectrum, begun at `delay_s` after the first sample."""
        shifted = spectrum * np.exp(-2j * np.pi * self.frequency_hz * delay_s)
        fine = np.fft.irfft(shifted, self.fine_count) * self.fine_rate_hz
        return fine[::FINER][:SAMPLES]

    def capture(self):
        """Counts (samples, channels), the emission instant in the record, and the sign of the pulse."""
        site, rng = self.site, self.rng
        sign = rng.choice([-1.0, 1.0])
        size = sign * 10.0 ** (rng.normal(0.0, SHOT_SPREAD_DB) / 20.0)
        rise_s = 0.35e-9 * np.exp(rng.normal(0.0, 0.2))
        decay_s = 1.6e-9 * np.exp(rng.normal(0.0, 0.25))
        spectrum = pulse_spectrum(self.frequency_hz, rise_s, decay_s, self.chain) * self.unit * size
        jitter_s = rng.uniform(-TRIGGER_JITTER_S, TRIGGER_JITTER_S)
        emission_s = FIRST_ARRIVAL_SAMPLE / site.rate_hz - self.arrival_s.min() + jitter_s
        time_s = np.arange(SAMPLES) / site.rate_hz
        carrier_start = rng.uniform(0.0, 2.0 * np.pi, len(CARRIERS))
        wobble = rng.uniform(0.0, 2.0 * np.pi, len(CARRIERS))
        counts = np.empty((SAMPLES, len(site.names)), np.int16)
        for channel in range(len(site.names)):
            echo_phase = np.exp(-2j * np.pi * self.frequency_hz * self.echo_s[channel])
            heard = spectrum * (1.0 + self.echo[channel] * echo_phase)
            arrival_s = emission_s + self.arrival_s[channel]
            voltage = 10.0 / self.direct_m[channel] * self.sampled(heard, arrival_s)
            late_s = arrival_s + self.ground_late_s[channel]
            voltage += GROUND_REFLECTION * 10.0 / self.ground_m[channel] * self.sampled(heard, late_s)
            for number, (carrier_hz, level_db) in enumerate(CARRIERS):
                phase = carrier_start[number] + self.carrier_phase[number, channel]
                slow = 1.0 + 0.3 * np.sin(2.0 * np.pi * 2.5e6 * time_s + wobble[number])
                peak_v = np.sqrt(2.0) * self.band_noise_v * 10.0 ** (level_db / 20.0)
                voltage += peak_v * slow * np.cos(2.0 * np.pi * carrier_hz * time_s + phase)
            voltage += rng.normal(0.0, self.white_v, SAMPLES)
            scaled = self.gain[channel] * voltage / self.full_scale_v[channel] * self.levels
            counts[:, channel] = np.clip(np.rint(scaled), -self.levels, self.levels - 1)
        return counts, emission_s, int(sign)


def datetimes(rng, mains_hz):
    """An instant for each capture: some tenths of a second apart, near the crests of the mains."""
    when, found = 0.0, []
    for _ in range(CAPTURES):
        when += rng.exponential(0.8) + 0.2
        half_cycle = np.round(when * 2.0 * mains_hz) / (2.0 * mains_hz)
        found.append(half_cycle + rng.normal(0.0, 0.6e-3) + 0.0025)
    texts = []
    for seconds in found:
        whole, nanoseconds = divmod(int(round(seconds * 1e9)), 1_000_000_000)
        texts.append(f"{START + timedelta(seconds=whole):%Y-%m-%dT%H:%M:%S}.{nanoseconds:09d}Z")
    return texts


def sigmf_meta(site, times, data):
    return {
        "global": {
            "core:datatype": "ri16_le",
            "core:num_channels": len(site.names),
            "core:sample_rate": site.rate_hz,
            "core:version": "1.2.5",
            "core:sha512": hashlib.sha512(data).hexdigest(),
            "core:recorder": "independent_visit.py (simulated)",
            "core:description": f"{site.name}: invented site, simulated visit; counts of {site.bits} bits, channels "
            + ", ".join(site.names),
        },
        "captures": [
            {"core:sample_start": number * SAMPLES, "core:datetime": time} for number, time in enumerate(times)
        ],
        "annotations": [],
    }


def truth(site, visit, site_bytes, emissions):
    def rounded(values):
        return [round(float(value), 6) for value in np.atleast_1d(values)]

    return {
        "schema": "arcstead/truth/1",
        "program": {"name": "independent_visit.py", "version": "1"},
        "site": site.name,
        "inputs": {"files": [], "count": 0, "site_sha256": hashlib.sha256(site_bytes).hexdigest()},
        "options": {"snr_at_10m_db": site.snr_at_10m_db, "ground_reflection": GROUND_REFLECTION},
        "seed": SEED,
        "sources": [
            {
                "position_m": rounded(SOURCE_M),
                "asset": ASSET,
                "response_error_ns": rounded(visit.response_error_ns),
            }
        ],
        "antennas": [
            {
                "name": name,
                "stance": "main",
                "delay_ns": round(float(site.delay_ns[i] + visit.delay_error_ns[i]), 6),
                "delay_error_ns": round(float(visit.delay_error_ns[i]), 6),
                "position_m": rounded(visit.antenna_m[i]),
                "position_error_m": rounded(visit.survey_error_m[i]),
                "gain_db": round(float(20.0 * np.log10(visit.gain[i] / visit.gain.mean())), 4),
            }
            for i, name in enumerate(site.names)
        ],
        "captures": [
            {"name": f"visit.sigmf-meta#{n + 1}", "source": 0, "stance": "main", "emission_s": float(f"{e:.15e}")}
            for n, e in enumerate(emissions)
        ],
    }


def oscilloscope_csv(site, visit, counts):
    """Header rows, then seconds from the trigger and volts per channel."""
    interval_s = 1.0 / site.rate_hz
    columns = len(site.names)
    rows = [
        f"Record Length,{SAMPLES}",
        f"Sample Interval,{interval_s:.6e}",
        f"Trigger Point,{FIRST_ARRIVAL_SAMPLE}",
        "Horizontal Units,s",
        "Vertical Units" + ",V" * columns,
        f"Bits,{site.bits}",
        "",
        "TIME" + "".join(f",CH{n + 1}" for n in range(columns)),
    ]
    step_v = visit.full_scale_v / visit.levels
    for number, sample in enumerate(counts):
        seconds = (number - FIRST_ARRIVAL_SAMPLE) * interval_s
        rows.append(f"{seconds:.4e}" + "".join(f",{value:.4e}" for value in sample * step_v))
    return "\r\n".join(rows) + "\r\n"


def main(folder):
    folder = Path(folder)
    site_bytes = (folder / "site.toml").read_bytes()
    site = Site(folder / "site.toml")
    visit = Visit(site)
    shots = [visit.capture() for _ in range(CAPTURES)]
    times = datetimes(visit.rng, site.mains_hz)
    data = b"".join(counts.astype("<i2").tobytes() for counts, _, _ in shots)

    out = folder / "independent"
    out.mkdir(exist_ok=True)
    (out / "visit.sigmf-data").write_bytes(data)
    (out / "visit.sigmf-meta").write_text(json.dumps(sigmf_meta(site, times, data), indent=1) + "\n")
    told = truth(site, visit, site_bytes, [emission for _, emission, _ in shots])
    (out / "truth.json").write_text(json.dumps(told, indent=1) + "\n")
    csv = folder / "independent-csv"
    csv.mkdir(exist_ok=True)
    for number, capture in enumerate(CSV_CAPTURES):
        text = oscilloscope_csv(site, visit, shots[capture - 1][0])
        (csv / f"shot_{number + 1:03d}.csv").write_bytes(text.encode("ascii"))
    clipped = sum(int((np.abs(counts) >= visit.levels - 1).any()) for counts, _, _ in shots)
    print(f"{CAPTURES} captures, {clipped} of them clipped, {len(data)} bytes")


if __name__ == "__main__":
    main(sys.argv[1])
