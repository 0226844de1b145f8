"""The textbook chain once more, by other hands: filters of SciPy, the rules written anew. Prints the decision frames.

Usage: scipy_textbook.py FRAMES.f32 SETTINGS.json
FRAMES.f32: 32-bit floats in microvolts, the channels of a frame side by side, no frame missing.
SETTINGS.json: rate_hz, roles (ripple or reference, one a channel), low_hz, high_hz, order, method (rectify or analytic),
smoothing_ms, time_constant_s, clip_deviations, settle_s, freeze_ms, deviations, rearm_deviations, rule (mean or count),
sites_needed, veto_deviations, veto_window_ms. Words and rules are those of the project's detector settings; a deviation
is 1.2533 times the running mean distance from the mean (a Gaussian law's SD).
"""
import json
import math
import sys

import numpy as np
from scipy import signal

PER_SPREAD = math.sqrt(math.pi / 2)


def frames_in_ms(ms, rate):
    return 0 if ms <= 0 else max(1, int(ms * rate / 1000 + 0.5))


def settle_frames(low, high, order, smoothing_ms, rate):
    """Until less than a ten-thousandth of the band-pass's energy is left, and five times the smoother's delay."""
    impulse = np.zeros(1 << 15)
    impulse[0] = 1.0
    energy = signal.sosfilt(signal.butter(order, [low, high], "bandpass", fs=rate, output="sos"), impulse) ** 2
    left = np.cumsum(energy[::-1])[::-1]
    return int(np.count_nonzero(left >= 1e-4 * energy.sum())) + frames_in_ms(5 * smoothing_ms, rate)


def envelopes(x, s):
    rate = s["rate_hz"]
    band = signal.sosfilt(
        signal.butter(s["order"], [s["low_hz"], s["high_hz"]], "bandpass", fs=rate, output="sos"), x - x[0], axis=0)
    if s["method"] == "rectify":
        size = np.abs(band)
    else:  # a first-order all-pass turns the middle of the band by 90 degrees
        tangent = math.tan(math.pi * math.sqrt(s["low_hz"] * s["high_hz"]) / rate)
        q = (tangent - 1) / (tangent + 1)
        size = np.hypot(band, signal.lfilter([q, 1.0], [1.0, q], band, axis=0))
    c = 1 / (1 + s["smoothing_ms"] * rate / 2000)
    for _ in range(2):
        size = signal.lfilter([c], [1.0, c - 1.0], size, axis=0)
    return size


def start_of_floor(first):
    """Median and scaled median distance of about 256 frames spread over the first ones."""
    kept = np.sort(first[::max(len(first) // 256, 1)], axis=0)
    median = kept[len(kept) // 2]
    distance = np.sort(np.abs(kept - median), axis=0)[len(kept) // 2]
    return median, distance * 1.4826 / 1.2533


def detections(columns, needed, references, s):
    """`columns`: envelopes that vote, then those of references. Frames at which `needed` of them cross."""
    rate = s["rate_hz"]
    begin = settle_frames(s["low_hz"], s["high_hz"], s["order"], s["smoothing_ms"], rate)
    settle = frames_in_ms(s["settle_s"] * 1000, rate)
    full = max(frames_in_ms(s["time_constant_s"] * 1000, rate), 1)
    freeze, window = frames_in_ms(s["freeze_ms"], rate), frames_in_ms(s["veto_window_ms"], rate)
    count = max(min(frames_in_ms(1000, rate), max(settle // 2, 1)), 1)
    means, spreads = (list(map(float, v)) for v in start_of_floor(columns[begin:begin + count]))
    n, voting = columns.shape[1], columns.shape[1] - references
    clip = s["clip_deviations"] * PER_SPREAD
    above = [s["deviations"] * PER_SPREAD] * voting + [s["veto_deviations"] * PER_SPREAD] * references
    rearm = s["rearm_deviations"] * PER_SPREAD
    taken, frozen_until, spent, newest_reference, found = count, 0, False, None, []
    for at, row in enumerate(columns[begin + count:].tolist(), begin + count):
        still = at < frozen_until
        weight = 1 / (min(taken, full) + 1)
        votes = rearm_votes = 0
        for i in range(n):
            value = row[i]
            if not still:
                off = min(value, means[i] + clip * spreads[i]) - means[i]
                means[i] += weight * off
                spreads[i] += weight * (abs(off) - spreads[i])
            if i < voting:
                votes += value > means[i] + above[i] * spreads[i]
                rearm_votes += value > means[i] + rearm * spreads[i]
            elif value > means[i] + above[i] * spreads[i]:
                newest_reference = at
        taken += not still
        if spent:
            spent = rearm_votes >= needed
        elif votes >= needed:
            spent = True
            frozen_until = at + 1 + freeze
            vetoed = newest_reference is not None and at - newest_reference <= window
            if taken >= settle and not vetoed:
                found.append(at)
    return found


def main():
    with open(sys.argv[2], encoding="utf-8") as file:
        s = json.load(file)
    x = np.fromfile(sys.argv[1], "<f4").astype(float).reshape(-1, len(s["roles"]))
    envelope = envelopes(x, s)
    sites = [i for i, role in enumerate(s["roles"]) if role == "ripple"]
    references = [i for i, role in enumerate(s["roles"]) if role == "reference"]
    voting = envelope[:, sites]
    if s["rule"] == "mean":
        voting = voting.mean(axis=1, keepdims=True)
    needed = 1 if s["rule"] == "mean" else s["sites_needed"]
    columns = np.concatenate([voting, envelope[:, references]], axis=1)
    print(*detections(columns, needed, len(references), s), sep="\n")


main()
