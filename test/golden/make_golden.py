"""Golden values of the signal mathematics, from numpy and SciPy.

Run `python3 test/golden/make_golden.py` from the top of the repository; it writes the JSON files beside itself and
prints the versions it used. The samples are made from integers alone and scaled by powers of two, so that
test/signal/golden-samples.ts makes the same ones bit for bit and none need be stored.
"""

import json
import math
import pathlib

import numpy as np
import scipy
from scipy import signal, stats

HERE = pathlib.Path(__file__).parent
VERSIONS = {"numpy": np.__version__, "scipy": scipy.__version__}
WINDOWS = {
    "rectangular": "boxcar",
    "hann": "hann",
    "hamming": "hamming",
    "blackman": "blackman",
    "blackman-harris": "blackmanharris",
    "flat-top": "flattop",
}
FULL = 2**19


def samples(count, seed, noise_scale, tone_scale, offset, drift=0.0):
    """Noise from a linear congruential generator, two triangular tones, an offset, a drift a sample; all exact parts."""
    state = seed
    phase_a = phase_b = 0
    values = np.empty(count)
    for n in range(count):
        state = (1664525 * state + 1013904223) % 2**32
        noise = (state >> 12) - FULL
        phase_a = (phase_a + 91403) % 2**20
        phase_b = (phase_b + 7001) % 2**20
        tone = 8 * (2 * abs(phase_a - FULL) - FULL) + 2 * abs(phase_b - FULL) - FULL
        values[n] = offset + noise * noise_scale + tone * tone_scale + n * drift
    return values


def hop_of(length, overlap):
    return max(1, math.floor(length * (100 - overlap) / 100 + 0.5))


def density(x, rate, window, overlap, length):
    return signal.welch(
        x, rate, signal.get_window(WINDOWS[window], length), noverlap=length - hop_of(length, overlap)
    )[1]


def chosen_lines(length):
    half = length // 2
    if length <= 256:
        return list(range(half + 1))
    spread = np.unique(np.round(np.geomspace(1, half, 56)).astype(int)).tolist()
    return sorted({0, half - 2, half - 1, half, *spread})


def density_cases():
    # A low floor shows the side lobes of the window, a high one the statistics of the averaging.
    noisy = {"seed": 1, "noise_scale": 2.0**-20, "tone_scale": 2.0**-20, "offset": 3.0}
    quiet = {"seed": 2, "noise_scale": 2.0**-36, "tone_scale": 2.0**-20, "offset": -0.5}
    inputs = {"noisy": noisy, "quiet": quiet}
    longest = {name: samples(16384 * 16 // 3, **parts) for name, parts in inputs.items()}
    cases = []
    for window in WINDOWS:
        for length in (256, 512, 1024, 2048, 4096, 8192, 16384):
            for overlap in (0, 25, 50, 75, 90):
                name = "quiet" if overlap in (25, 75) else "noisy"
                count = length * 16 // 3
                values = density(longest[name][:count], 25600.0, window, overlap, length)
                cases.append(
                    {
                        "window": window,
                        "segment_samples": length,
                        "overlap_percent": overlap,
                        "input": name,
                        "samples": count,
                        "averages": (count - length) // hop_of(length, overlap) + 1,
                        "largest": float(values.max()),
                        "sum": float(values.sum()),
                        "density": [float(values[k]) for k in chosen_lines(length)],
                    }
                )
    lengths = sorted({case["segment_samples"] for case in cases})
    lines = {str(length): chosen_lines(length) for length in lengths}
    return {**VERSIONS, "sample_rate_hz": 25600.0, "inputs": inputs, "lines": lines, "cases": cases}


def averaging_cases():
    """Straight lines taken off each segment, and the median over the segments (divided by its bias for noise)."""
    # Over a segment of 2048 samples the drift amounts to twice the noise.
    parts = {"seed": 8, "noise_scale": 2.0**-20, "tone_scale": 2.0**-24, "offset": -2.0, "drift": 2.0**-10}
    x = samples(2048 * 16 // 3, **parts)
    cases = []
    for window in WINDOWS:
        for length in (256, 2048):
            for overlap, detrend, average in (
                (0, "linear", "mean"),
                (50, "linear", "mean"),
                (75, "linear", "mean"),
                (0, "constant", "median"),
                (50, "constant", "median"),
                (50, "linear", "median"),
            ):
                count = length * 16 // 3
                values = signal.welch(
                    x[:count],
                    25600.0,
                    signal.get_window(WINDOWS[window], length),
                    noverlap=length - hop_of(length, overlap),
                    detrend=detrend,
                    average=average,
                )[1]
                cases.append(
                    {
                        "window": window,
                        "segment_samples": length,
                        "overlap_percent": overlap,
                        "detrend": detrend,
                        "average": average,
                        "samples": count,
                        "largest": float(values.max()),
                        "density": [float(values[k]) for k in chosen_lines(length)],
                    }
                )
    lines = {str(length): chosen_lines(length) for length in (256, 2048)}
    return {**VERSIONS, "sample_rate_hz": 25600.0, "input": parts, "lines": lines, "cases": cases}


def mean_factor(a, b, integrations):
    """Mean of (2 pi f)^(-2 n) over [a, b], as the integral is written on paper."""
    if integrations == 0:
        return 1.0
    if integrations == 1:
        return 1 / (4 * math.pi**2 * a * b)
    return (a**-3 - b**-3) / (3 * (b - a) * (2 * math.pi) ** 4)


def level(values, spacing, low, high, integrations):
    parts = []
    for line in range(1, len(values)):
        a = max(low, (line - 0.5) * spacing)
        b = min(high, (line + 0.5) * spacing)
        if b > a:
            parts.append((b - a) * mean_factor(a, b, integrations) * values[line])
    return math.sqrt(math.fsum(parts))


def band_cases():
    parts = {"seed": 3, "noise_scale": 2.0**-20, "tone_scale": 2.0**-22, "offset": 1.0}
    x = samples(30000, **parts)
    cases = []
    for window in WINDOWS:
        for rate, length, overlap in ((2560.0, 1024, 50), (2560.0, 4096, 75), (25600.0, 512, 0)):
            values = density(x, rate, window, overlap, length)
            spacing = rate / length
            bands = [
                (6 * spacing, 12 * spacing),
                (9.7 * spacing, 0.39 * rate),
                (10.5 * spacing, 40.5 * spacing),
                (20.2 * spacing, 20.4 * spacing),
                (0.4 * rate, 0.5 * rate),
            ]
            for low, high in bands:
                cases.append(
                    {
                        "window": window,
                        "sample_rate_hz": rate,
                        "segment_samples": length,
                        "overlap_percent": overlap,
                        "from_hz": low,
                        "to_hz": high,
                        "levels": [level(values, spacing, low, high, n) for n in (0, 1, 2)],
                    }
                )
    return {**VERSIONS, "samples": len(x), "input": parts, "cases": cases}


def waveform_cases():
    inputs = [
        {"seed": 4, "noise_scale": 2.0**-19, "tone_scale": 0.0, "offset": 0.0},
        {"seed": 5, "noise_scale": 2.0**-21, "tone_scale": 2.0**-20, "offset": 0.25},
        # Mean 10, r.m.s. about 0.01: an accelerometer's bias or gravity beneath a quiet machine.
        {"seed": 6, "noise_scale": 2.0**-25, "tone_scale": 2.0**-30, "offset": 10.0},
        {"seed": 7, "noise_scale": 2.0**-33, "tone_scale": 2.0**-36, "offset": -1000.0},
    ]
    cases = []
    for parts in inputs:
        for count in (2, 3, 100, 4095, 4096, 4097, 50000):
            x = samples(count, **parts)
            # Exact in the offset: numpy's own mean would cost digits that the samples have.
            y = x - parts["offset"]
            rms = float(np.std(y))
            peak = float(np.max(np.abs(y - y.mean())))
            cases.append(
                {
                    **parts,
                    "samples": count,
                    "mean": parts["offset"] + float(y.mean()),
                    "rms": rms,
                    "peak": peak,
                    "crest_factor": peak / rms,
                    "kurtosis": float(stats.kurtosis(y, fisher=False)),
                    "skewness": float(stats.skew(y)),
                }
            )
    return {**VERSIONS, "cases": cases}


def quantile_cases():
    cases = []
    for degrees in (1, 1.5, 2, 3.7, 8, 20.25, 73.995, 200, 712.3, 999.9, 1000, 2000, 10000, 1e6, 1e9):
        shares = (0.0005, 0.005, 0.025, 0.05, 0.5, 0.95, 0.975, 0.995, 0.9995)
        cases.append(
            {
                "degrees": degrees,
                "shares": shares,
                "chi_square": [float(stats.chi2.ppf(share, degrees)) for share in shares],
            }
        )
    return {**VERSIONS, "cases": cases}


def smooth_step(x):
    """Integral of the four-term Blackman-Harris window, 0 to 1."""
    parts = (0.35875, -0.48829, 0.14128, -0.01168)
    x = np.clip(x, 0, 1)
    waves = [part / (2 * np.pi * k) * np.sin(2 * np.pi * k * x) for k, part in enumerate(parts) if k > 0]
    return x + sum(waves) / parts[0]


def envelope_cases():
    """Envelope of a band: lines of the whole recording weighted, back to samples, magnitude of scipy.signal.hilbert."""
    rate = 25600.0
    inputs = [
        {"seed": 11, "noise_scale": 2.0**-19, "tone_scale": 0.0, "offset": 0.0},
        {"seed": 12, "noise_scale": 2.0**-19, "tone_scale": 2.0**-18, "offset": 2.0},
    ]
    cases = []
    for parts in inputs:
        x = samples(2**16, **parts)
        # The last: samples at both ends in which the filter of the smooth edges has not rung out.
        for low, high, ends in ((2000.0, 8000.0, 276), (3200.0, 4800.0, 1024), (640.0, 9600.0, 184)):
            lines = np.fft.rfft(x)
            hertz = np.fft.rfftfreq(len(x), 1 / rate)
            edge = (high - low) / 16
            vertical = ((hertz >= low) & (hertz <= high)).astype(float)
            smooth = smooth_step((hertz - low) / edge + 0.5) * smooth_step((high - hertz) / edge + 0.5)
            of = [np.abs(signal.hilbert(np.fft.irfft(lines * weights))) for weights in (vertical, smooth)]
            hann = signal.get_window("hann", 16384)
            averaged = signal.welch(of[1][ends:-ends], rate, hann, noverlap=8192)[1]
            cases.append(
                {
                    "input": parts,
                    "from_hz": low,
                    "to_hz": high,
                    "edge_samples": ends,
                    "step": 1024,
                    "vertical_edges": [float(value) for value in of[0][::1024]],
                    "smooth_edges": [float(value) for value in of[1][::1024]],
                    # 20 to 300 Hz of the envelope at the full rate, in lines of 1.5625 Hz.
                    "level": level(averaged, rate / 16384, 20.0, 300.0, 0),
                }
            )
    return {**VERSIONS, "sample_rate_hz": rate, "samples": 2**16, "cases": cases}


def main():
    print(VERSIONS)
    files = {
        "density": density_cases(),
        "averaging": averaging_cases(),
        "band-level": band_cases(),
        "waveform": waveform_cases(),
        "chi-square": quantile_cases(),
        "envelope": envelope_cases(),
    }
    for name, content in files.items():
        path = HERE / f"{name}.json"
        path.write_text(json.dumps(content, separators=(",", ":")).replace('{"window"', '\n{"window"') + "\n")
        print(path.name, path.stat().st_size)


main()
