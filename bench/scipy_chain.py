"""The peer of engine_bench: the same chain in NumPy and SciPy, on one core. Prints seconds of processor time.

Usage: scipy_chain.py CHANNELS RATE_HZ SECONDS ORDER
"""
import sys
import time

import numpy as np
from scipy import signal

channels, rate, seconds, order = int(sys.argv[1]), float(sys.argv[2]), float(sys.argv[3]), int(sys.argv[4])
rng = np.random.default_rng(1)
# One row a channel: the layout in which sosfilt is quickest.
x = rng.normal(0.0, 20.0, (channels, int(rate * seconds)))
sos = signal.butter(order, [150.0, 250.0], "bandpass", fs=rate, output="sos")
smooth = 1.0 / (1.0 + 0.002 * rate)
weight = 1.0 / (1.0 + 20.0 * rate)


def one_pole(values, c):
    return signal.lfilter([c], [1.0, c - 1.0], values, axis=-1)


begun = time.process_time()
envelope = np.abs(signal.sosfilt(sos, x, axis=-1))
envelope = one_pole(one_pole(envelope, smooth), smooth)
mean = one_pole(envelope, weight)
deviation = one_pole(np.abs(envelope - mean), weight)
crossings = np.count_nonzero(envelope > mean + 5.0 * deviation)
print(time.process_time() - begun, crossings)
