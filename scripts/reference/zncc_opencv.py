#!/usr/bin/env python3
"""Scores of zero-mean normalised cross-correlation by OpenCV, for the test of src/track/correlate.rs.

Needs numpy and opencv-python-headless. Writes fixtures/reference/zncc/*.csv anew; never part of a test run.
Three cases: order-free luma, a smooth picture with an edge, and a weak texture on a bright ramp.
OpenCV computes in 32-bit floats, where a large mean costs digits (4e-4 of a score for the ramp); a score does not change
under an offset, so the mean is taken off first. The script prints how far the scores lie from the definition in 64 bits.
"""
import pathlib

import cv2
import numpy as np

HERE = pathlib.Path(__file__).resolve().parents[2] / "fixtures" / "reference" / "zncc"


def smooth(height, width):
    y, x = np.mgrid[0:height, 0:width]
    edge = 1500 + 1200 * np.tanh((x - 0.55 * width) / 3.0)
    return edge + 300 * np.sin(0.4 * x) * np.cos(0.3 * y)


def ramp(height, width, rng):
    y, x = np.mgrid[0:height, 0:width]
    return 2500 + 30 * x + 10 * y + rng.normal(0, 20, (height, width))


def by_definition(field, template):
    height, width = template.shape
    windows = np.lib.stride_tricks.sliding_window_view(field.astype(float), (height, width))
    f = windows - windows.mean(axis=(2, 3), keepdims=True)
    t = template - template.mean()
    return (f * t).sum(axis=(2, 3)) / np.sqrt((f * f).sum(axis=(2, 3)) * (t * t).sum())


def main():
    rng = np.random.default_rng(20_260_101)
    cases = {
        "random": (rng.integers(0, 4081, (26, 31)).astype(float), (3, 4, 9, 7)),
        "smooth": (smooth(30, 40), (12, 9, 15, 11)),
        "ramp": (ramp(24, 28, rng), (8, 6, 10, 10)),
    }
    HERE.mkdir(parents=True, exist_ok=True)
    for name, (field, (left, top, width, height)) in cases.items():
        field = np.clip(np.rint(field), 0, 4095).astype(np.int64)
        template = field[top : top + height, left : left + width].copy()
        # A gain, an offset and a little noise, so that the best score is below 1.
        template = np.clip(np.rint(0.6 * template + 300 + rng.normal(0, 25, template.shape)), 0, 4095).astype(np.int64)
        centred = [(table - table.mean()).astype(np.float32) for table in (field, template)]
        scores = cv2.matchTemplate(*centred, cv2.TM_CCOEFF_NORMED)
        print(name, "OpenCV against 64 bits:", np.abs(scores - by_definition(field, template)).max())
        for kind, table, form in (("field", field, "%d"), ("template", template, "%d"), ("scores", scores, "%.9f")):
            np.savetxt(HERE / f"{name}_{kind}.csv", table, fmt=form, delimiter=",")
    print("OpenCV", cv2.__version__, "numpy", np.__version__)


if __name__ == "__main__":
    main()
