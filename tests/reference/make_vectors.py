"""Reference values from scipy and numpy, written to vectors.toml beside this script.

    python make_vectors.py

Inputs are given by formula or written out in full; numbers are written so that they read back exactly. Each value is
computed twice by different means where there are two, and the script stops if they disagree.
"""

import math
from pathlib import Path

import numpy as np
import scipy
from scipy import optimize, signal, stats

LIGHT_M_S = 299792458.0
SPEED_M_NS = LIGHT_M_S / (1.0 + 315e-6) * 1e-9


def text(value):
    """A TOML value; floats in the shortest form that reads back exactly."""
    if isinstance(value, str):
        return '"' + value + '"'
    if isinstance(value, (bool, np.bool_)):
        return "true" if value else "false"
    if isinstance(value, (int, np.integer)):
        return str(int(value))
    if isinstance(value, (float, np.floating)):
        return repr(float(value))
    return "[" + ", ".join(text(item) for item in value) + "]"


def table(name, entries, remark=None):
    lines = [f"# {line}" for line in (remark or "").splitlines() if line]
    lines.append(name)
    lines += [f"{key} = {text(value)}" for key, value in entries.items()]
    return "\n".join(lines) + "\n"


def agree(first, second, relative, what):
    first, second = np.asarray(first, float), np.asarray(second, float)
    scale = max(np.abs(first).max(), np.abs(second).max())
    if np.abs(first - second).max() > relative * scale:
        raise SystemExit(f"{what}: two ways of computing it disagree by {np.abs(first - second).max() / scale:.1e}")


def filter_input(count):
    n = np.arange(count)
    return np.exp(-0.08 * n) * np.sin(0.9 * n + 0.3) + 0.25 * np.cos(2.1 * n)


def other_cascade(zeros, poles, gain, values):
    """Direct form I, one section for each pole of the upper half-plane and its conjugate, zeros 1 and -1 in each."""
    upper = sorted((pole for pole in poles if pole.imag > 0.0), key=np.angle, reverse=True)
    if 2 * len(upper) != len(poles) or sorted(np.round(zeros.real)) != [-1.0] * len(upper) + [1.0] * len(upper):
        raise SystemExit("other cascade: poles or zeros are not those of a narrow band-pass")
    out = np.asarray(values, np.longdouble)
    for pole in upper:
        twice, square = np.longdouble(2.0 * pole.real), np.longdouble(abs(pole)) ** 2
        x, out = out, np.zeros_like(out)
        for n in range(len(x)):
            two_back = (x[n - 2], out[n - 2]) if n > 1 else (0.0, 0.0)
            out[n] = x[n] - two_back[0] + twice * (out[n - 1] if n else 0.0) - square * two_back[1]
    return (np.longdouble(gain) * out).astype(float)


def butterworth():
    cases = [
        ("uhf order 2", 2, 300e6, 1500e6, 5e9),
        ("uhf order 4", 4, 300e6, 1500e6, 5e9),
        ("vhf order 2", 2, 30e6, 300e6, 1e9),
        ("vhf order 4", 4, 30e6, 300e6, 1e9),
    ]
    parts = []
    for name, order, low, high, rate in cases:
        sos = signal.butter(order, [low, high], "bandpass", fs=rate, output="sos")
        zeros, poles, gain = signal.butter(order, [low, high], "bandpass", fs=rate, output="zpk")
        shares = np.array([0.1, 0.5, 0.9, 1.0, 1.3])
        above = np.array([0.7, 0.9, 1.0, 1.2, 1.5])
        frequencies = np.concatenate([low * shares, [np.sqrt(low * high)], high * above])
        response = signal.sosfreqz(sos, worN=frequencies, fs=rate)[1]
        # The bilinear transform of the analogue prototype, in closed form.
        warped, warped_low, warped_high = (np.tan(np.pi * np.asarray(f) / rate) for f in (frequencies, low, high))
        prototype = (warped**2 - warped_low * warped_high) / ((warped_high - warped_low) * warped)
        agree(np.abs(response) ** 2, 1.0 / (1.0 + prototype ** (2 * order)), 1e-10, name)
        signal_in = filter_input(64)
        filtered = signal.sosfilt(sos, signal_in)
        # The same filter with zeros at +1 and -1 together in every section, poles paired by angle, in long doubles.
        agree(filtered, other_cascade(zeros, poles, gain, signal_in), 1e-12, name)
        parts.append(
            table(
                "[[butterworth]]",
                {
                    "name": name,
                    "order": order,
                    "low_hz": low,
                    "high_hz": high,
                    "sample_rate_hz": rate,
                    "frequency_hz": frequencies,
                    "magnitude": np.abs(response),
                    "phase_rad": np.angle(response),
                    "filtered": filtered,
                },
            )
        )
    remark = (
        "scipy.signal.butter(order, [low, high], 'bandpass', fs=rate, output='sos'): `order` is the prototype's, so\n"
        "the band-pass has `order` sections of second order. magnitude and phase: scipy.signal.sosfreqz. filtered:\n"
        "scipy.signal.sosfilt, from rest, of x[n] = exp(-0.08 n) sin(0.9 n + 0.3) + 0.25 cos(2.1 n), n = 0..63."
    )
    return "\n".join(f"# {line}" for line in remark.splitlines()) + "\n" + "\n".join(parts)


def correlation():
    n = np.arange(24)
    m = np.arange(20)
    a = np.exp(-0.5 * ((n - 7.0) / 2.0) ** 2) * np.cos(1.1 * (n - 7.0)) + 0.03 * np.sin(2.7 * n)
    b = 0.6 * np.exp(-0.5 * ((m - 11.0) / 2.0) ** 2) * np.cos(1.1 * (m - 11.0)) + 0.03 * np.cos(1.9 * m)
    product = signal.correlate(b, a, mode="full", method="direct")
    lags = signal.correlation_lags(len(b), len(a), mode="full")
    plain = [sum(b[i + lag] * a[i] for i in range(len(a)) if 0 <= i + lag < len(b)) for lag in lags]
    agree(product, plain, 1e-13, "correlation")
    return table(
        "[correlation]",
        {
            "a": a,
            "b": b,
            "lags": lags,
            "values": product,
            "peak_lag": lags[np.argmax(product)],
        },
        "scipy.signal.correlate(b, a), correlation_lags(len(b), len(a)): value[lag] = sum over i of b[i + lag] a[i].\n"
        "A positive lag says that b is later: arrival at b minus arrival at a. The pulse is at sample 7 in a, 11 in b.",
    )


def fractional_delay():
    count, shift = 256, 0.37
    # Frequencies in cycles a sample; the taper is a sum of sinusoids too, so the whole is band-limited and its shifted
    # twin is exact.
    frequency = [0.0625, 0.1015625, 0.1484375, 0.1953125]
    amplitude = [0.5, 1.0, 0.8, 0.4]
    phase = [0.2, -0.4, 1.1, 2.3]

    def at(t):
        taper = (0.5 - 0.5 * np.cos(2.0 * np.pi * t / count)) ** 4
        return taper * sum(
            A * np.cos(2.0 * np.pi * f * (t - 128.0) + p) for A, f, p in zip(amplitude, frequency, phase)
        )

    n = np.arange(count)
    early, late = at(n.astype(float)), at(n - shift)
    turned = np.fft.irfft(np.fft.rfft(early) * np.exp(-2j * np.pi * np.fft.rfftfreq(count) * shift), count)
    agree(late, turned, 1e-12, "fractional delay")
    return table(
        "[fractional_delay]",
        {
            "expected_delay_samples": shift,
            "frequency_cycles_per_sample": frequency,
            "amplitude": amplitude,
            "phase_rad": phase,
            "early": early,
            "late": late,
        },
        "s(t) = (1/2 - 1/2 cos(2 pi t/256))^4 sum_k A_k cos(2 pi f_k (t - 128) + p_k), t in samples; early[n] = s(n),\n"
        "late[n] = s(n - 0.37), n = 0..255. s has the period 256 and no content above 0.22 cycles a sample.",
    )


def solve(antenna_m, time_ns, covariance_ns2, start_m):
    """Place (2 or 3 coordinates), emission time, chi-square and covariance, by whitened least squares."""
    lower = np.linalg.cholesky(covariance_ns2)

    def whiten(values):
        return scipy.linalg.solve_triangular(lower, values, lower=True)

    unknowns = antenna_m.shape[1]

    # Work in metres about the array's centre for x and the emission path c t0, so that all unknowns are alike.
    def residuals(u):
        way_m = np.linalg.norm(u[:unknowns] - antenna_m, axis=1)
        return whiten(time_ns - u[-1] / SPEED_M_NS - way_m / SPEED_M_NS)

    def jacobian(u):
        ways = u[:unknowns] - antenna_m
        unit = ways / np.linalg.norm(ways, axis=1, keepdims=True)
        return whiten(-np.column_stack([unit, np.ones(len(unit))]) / SPEED_M_NS)

    start = np.append(start_m, np.mean(time_ns * SPEED_M_NS - np.linalg.norm(start_m - antenna_m, axis=1)))
    options = {"jac": jacobian, "xtol": 1e-15, "ftol": 1e-15, "gtol": 1e-15, "max_nfev": 2000}
    found = optimize.least_squares(residuals, start, method="trf", **options)
    u = found.x
    for _ in range(5):  # least_squares stops at its own rounding; a few Newton-like steps take out the rest
        u = u - np.linalg.lstsq(jacobian(u), residuals(u), rcond=None)[0]
    other = optimize.least_squares(residuals, start, method="lm", **options)
    agree(found.x, u, 1e-8, "least squares, polished")
    agree(other.x, u, 1e-7, "least squares, other method")
    J = jacobian(u)
    covariance = np.linalg.inv(J.T @ J)
    # The same with the emission time marginalised: P = S^-1 - S^-1 1 1' S^-1 / (1' S^-1 1).
    inverse = np.linalg.inv(covariance_ns2)
    one = np.ones(len(time_ns))
    projector = inverse - np.outer(inverse @ one, one @ inverse) / (one @ inverse @ one)
    ways = u[:unknowns] - antenna_m
    lengths = np.linalg.norm(ways, axis=1)
    r = time_ns - lengths / SPEED_M_NS
    slope = ways / lengths[:, None] / SPEED_M_NS
    chi_square = float(residuals(u) @ residuals(u))
    agree(chi_square, r @ projector @ r, 1e-8, "chi-square")
    agree(covariance[:unknowns, :unknowns], np.linalg.inv(slope.T @ projector @ slope), 1e-8, "covariance")
    return u[:unknowns], u[-1] / SPEED_M_NS, chi_square, covariance[:unknowns, :unknowns]


def least_squares():
    rng = np.random.default_rng(3150)
    space6 = [
        [0.0, 0.0, 2.1],
        [13.7, 1.2, 4.6],
        [15.3, 12.9, 1.4],
        [2.4, 14.1, 5.2],
        [7.9, -3.3, 3.0],
        [-4.1, 7.7, 1.2],
    ]
    space8 = space6 + [[18.2, 6.4, 2.7], [8.8, 17.5, 1.9]]
    plane5 = [[0.0, 0.0], [12.3, -1.1], [14.9, 9.7], [3.2, 13.6], [-3.8, 6.1]]
    factor = rng.normal(size=(8, 8))
    full8 = 1e-3 * (factor @ factor.T) + np.diag(rng.uniform(0.003, 0.02, 8))
    cases = [
        ("six antennas in space, unequal sigmas", space6, [9.3, 6.2, 5.8], np.diag(rng.uniform(0.05, 0.2, 6) ** 2)),
        ("eight antennas in space, full covariance", space8, [4.4, 8.9, 6.7], full8),
        ("five antennas in a plane, source outside", plane5, [19.6, 15.8], np.diag(rng.uniform(0.05, 0.15, 5) ** 2)),
    ]
    parts = []
    for name, antennas, source, covariance in cases:
        antennas, source = np.array(antennas), np.array(source)
        noise = np.linalg.cholesky(covariance) @ rng.normal(size=len(antennas))
        # Times as an instrument gives them: non-round, to a femtosecond.
        times = np.round(np.linalg.norm(source - antennas, axis=1) / SPEED_M_NS + 213.456789 + noise, 6)
        place, emission, chi_square, told = solve(antennas, times, covariance, source + 0.4)
        agree(solve(antennas, times, covariance, antennas.mean(axis=0) + 0.5)[0], place, 1e-9, name + ", other start")
        degrees = len(antennas) - 1 - len(source)
        parts.append(
            table(
                "[[least_squares]]",
                {
                    "name": name,
                    "antenna_m": antennas,
                    "time_ns": times,
                    "covariance_ns2": covariance,
                    "true_position_m": source,
                    "position_m": place,
                    "emission_ns": emission,
                    "chi_square": chi_square,
                    "degrees_of_freedom": degrees,
                    "p_value": stats.chi2.sf(chi_square, degrees),
                    "position_covariance_m2": told,
                },
            )
        )
    remark = (
        "t_i = t0 + |x - a_i|/v + e_i, v = 299792458/(1 + 315e-6) m/s, e ~ N(0, covariance): scipy's least_squares\n"
        "on residuals whitened by the Cholesky factor, unknowns x and t0. position_covariance_m2: position block\n"
        "of (J' S^-1 J)^-1 at the solution. Good to 1e-9 relative (1e-8 for chi_square, which is a small difference)."
    )
    return "\n".join(f"# {line}" for line in remark.splitlines()) + "\n" + "\n".join(parts)


def poisson_sum(x, half):
    return math.exp(-x / 2.0) * sum((x / 2.0) ** j / math.factorial(j) for j in range(half))


def distributions():
    levels = [0.05, 0.393469340287366, 0.5, 0.68268949213709, 0.9, 0.95, 0.99, 0.999]
    degrees = [1, 2, 3, 4, 5, 6, 10, 40]
    quantiles = [[stats.chi2.ppf(level, k) for level in levels] for k in degrees]
    agree(quantiles[1], [-2.0 * np.log1p(-level) for level in levels], 1e-14, "chi-square of two degrees")
    tails = [0.5, 4.0, 11.3, 27.9]
    # Closed forms: a sum for even degrees (k = 2 m), the error function for one degree and for the normal distribution.
    for row, k in enumerate(degrees):
        if k % 2 == 0:
            told = [poisson_sum(x, k // 2) for x in tails + quantiles[row]]
        elif k == 1:
            told = [math.erfc(math.sqrt(x / 2.0)) for x in tails + quantiles[row]]
        else:
            continue
        agree(told[: len(tails)], stats.chi2.sf(tails, k), 1e-13, f"chi-square tail, {k} degrees")
        agree(told[len(tails) :], 1.0 - np.array(levels), 1e-13, f"chi-square quantiles, {k} degrees")
    z = [-4.9, -3.0, -1.959963984540054, -1.0, -0.25, 0.0, 0.5, 1.644853626951473, 2.326347874040841, 4.9]
    agree([0.5 * math.erfc(-x / math.sqrt(2.0)) for x in z], stats.norm.cdf(z), 1e-13, "normal distribution")
    return (
        table(
            "[chi_square]",
            {
                "levels": levels,
                "degrees_of_freedom": degrees,
                "quantiles": quantiles,
                "survival_at": tails,
                "survival": [[stats.chi2.sf(x, k) for x in tails] for k in degrees],
            },
            "scipy.stats.chi2: ppf and sf; one row for each number of degrees of freedom.",
        )
        + "\n"
        + table(
            "[normal]",
            {
                "z": z,
                "density": stats.norm.pdf(z),
                "cumulative": stats.norm.cdf(z),
                "levels": levels,
                "quantiles": stats.norm.ppf(levels),
            },
            "scipy.stats.norm: pdf, cdf and ppf.",
        )
    )


def main():
    head = table(
        "[provenance]",
        {"script": "tests/reference/make_vectors.py", "numpy": np.__version__, "scipy": scipy.__version__},
        "Reference values from scipy. Made by make_vectors.py in this folder; do not edit.",
    )
    parts = [head, butterworth(), correlation(), fractional_delay(), least_squares(), distributions()]
    Path(__file__).with_name("vectors.toml").write_text("\n".join(parts))


if __name__ == "__main__":
    main()
