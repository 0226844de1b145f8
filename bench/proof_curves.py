"""Draws the curves of proof_bench: ripples found, and onset latency, against false detections a minute.

Usage: proof_curves.py CURVES.tsv PICTURE.svg
"""
import csv
import math
import sys

import matplotlib

matplotlib.use("svg")
matplotlib.rcParams["svg.hashsalt"] = "proof"  # the same curves give the same file
import matplotlib.pyplot as plt  # noqa: E402

LOOKS = {
    "textbook": ("tab:orange", "-"),
    "two bands": ("tab:green", "-"),
    "ours, defaults": ("tab:blue", ":"),
    "ours": ("tab:blue", "-"),
    "floor": ("black", "--"),
}
LEAST, MOST = 0.1, 10.0


def read(path):
    curves = {}
    with open(path, encoding="utf-8") as file:
        for row in csv.DictReader(file, delimiter="\t"):
            point = [float(row[k]) for k in ("false_per_minute", "found", "latency_median_ms")]
            curves.setdefault(row["scene"], {}).setdefault(row["detector"], []).append(point)
    return curves


def best_at_most(points):
    """From left to right: the most that is found at no more false detections than here."""
    front = []
    for false, found, latency in sorted(points):
        if not front or found > front[-1][1]:
            front.append((false, found, latency))
    if front:  # what is found without any false detection is found at every rate
        front.append((max(MOST, front[-1][0]), *front[-1][1:]))
    return [(max(f, LEAST), found, latency) for f, found, latency in front]


def main():
    curves = read(sys.argv[1])
    figure, axes = plt.subplots(2, len(curves), figsize=(3.2 * len(curves), 6.2), sharex=True, sharey="row",
                                squeeze=False)
    for column, (scene, detectors) in enumerate(curves.items()):
        top, bottom = axes[0][column], axes[1][column]
        for name, (colour, line) in LOOKS.items():
            front = best_at_most(detectors.get(name, []))
            if not front:
                continue
            rates = [p[0] for p in front]
            top.plot(rates, [100 * p[1] for p in front], color=colour, linestyle=line, label=name,
                     drawstyle="steps-post")
            told = [(p[0], p[2]) for p in front if not math.isnan(p[2])]
            bottom.plot(*zip(*told), color=colour, linestyle=line, drawstyle="steps-post") if told else None
        top.set_title(scene)
        bottom.set_xlabel("false detections a minute, at most")
        for axis in (top, bottom):
            axis.set_xscale("log")
            axis.set_xlim(LEAST, MOST)
            axis.grid(alpha=0.3)
    axes[0][0].set_ylabel("ripples found, %")
    axes[0][0].set_ylim(0, 101)
    axes[1][0].set_ylabel("onset latency, median, ms")
    axes[1][0].set_ylim(0, 60)
    handles, names = axes[0][0].get_legend_handles_labels()
    figure.legend(handles, names, loc="lower center", ncols=len(names), frameon=False)
    figure.tight_layout(rect=(0, 0.05, 1, 1))
    figure.savefig(sys.argv[2], metadata={"Date": None})


main()
