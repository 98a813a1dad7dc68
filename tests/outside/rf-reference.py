"""Answers of reference libraries to the questions of rf-reference.test.ts: JSON in, JSON out.

Match comes from scikit-rf, interpolation and angles from numpy, crossings and extrema from scipy. Shares
nothing with the project but the questions.
"""

import contextlib
import json
import platform
import sys

with contextlib.redirect_stdout(sys.stderr):  # one of them greets on stdout
    import numpy as np
    import scipy
    import skrf
    from scipy.interpolate import PPoly, make_interp_spline
    from scipy.optimize import brentq, minimize_scalar


def match(question):
    """A one-port for each reflection coefficient, in 50 ohms."""
    gamma = np.array(question["re"]) + 1j * np.array(question["im"])
    port = skrf.Network(s=gamma.reshape(-1, 1, 1), f=np.arange(1, gamma.size + 1), f_unit="Hz", z0=50)
    z = skrf.tlineFunctions.reflection_coefficient_2_input_impedance(50, gamma)
    # Power into the load over power available: from the impedance, not from the reflection.
    accepted = 4 * 50 * z.real / np.abs(z + 50) ** 2
    return {
        "vswr": port.s_vswr[:, 0, 0].tolist(),
        "returnLossDb": (-port.s_db[:, 0, 0]).tolist(),
        "mismatchLossDb": (-10 * np.log10(accepted)).tolist(),
        "resistanceOhm": z.real.tolist(),
        "reactanceOhm": z.imag.tolist(),
    }


class Pattern:
    """A beam and harmonics round it, as a formula of the angle: any angle, no samples."""

    def __init__(self, q):
        self.peak_deg, self.sharpness = q["peakDeg"], q["sharpness"]
        self.harmonics = [(h["order"], h["re"] + 1j * h["im"]) for h in q["harmonics"]]

    def level_db(self, deg):
        t = np.deg2rad(np.asarray(deg, dtype=float))
        field = np.exp(self.sharpness * (np.cos(t - np.deg2rad(self.peak_deg)) - 1)).astype(complex)
        for order, size in self.harmonics:
            field = field + size * np.exp(1j * order * t)
        return 20 * np.log10(np.abs(field))

    def top(self):
        grid = np.arange(-180, 180, 0.05)
        start = grid[np.argmax(self.level_db(grid))]
        found = minimize_scalar(
            lambda deg: -self.level_db(deg), bounds=(start - 0.1, start + 0.1), method="bounded", options={"xatol": 1e-9}
        )
        return float(found.x), float(-found.fun)

    def skewness(self, top_deg):
        """Third over second derivative at the top, per degree: a parabola knows nothing of the third."""
        x = np.linspace(-1, 1, 201)
        _, third, second, _, _ = np.polyfit(x, self.level_db(top_deg + x), 4)
        return float(abs(6 * third / (2 * second)))

    def crossing(self, top_deg, threshold_db, side):
        """First crossing outwards: a fine walk, then a root."""
        walk = top_deg + side * np.arange(0, 180, 0.02)
        below = np.nonzero(self.level_db(walk) < threshold_db)[0]
        if below.size == 0:
            return None
        k = below[0]
        return brentq(lambda deg: self.level_db(deg) - threshold_db, walk[k - 1], walk[k], xtol=1e-11)

    def slopes_and_bend(self, deg, reach):
        """Least and largest slope (dB/deg) and largest curvature (dB/deg^2) within `reach` degrees."""
        grid = deg + np.linspace(-reach, reach, 401)
        step = grid[1] - grid[0]
        levels = self.level_db(grid)
        slope = np.abs(np.diff(levels) / step)
        bend = np.abs(np.diff(levels, 2) / step**2)
        return float(slope.min()), float(slope.max()), float(bend.max())


def width(pattern, top_deg, top_db, drop_db, step_deg):
    edges = [pattern.crossing(top_deg, top_db - drop_db, side) for side in (-1, 1)]
    if None in edges:
        return None
    near = [pattern.slopes_and_bend(edge, step_deg) for edge in edges]
    return {
        "widthDeg": edges[1] - edges[0],
        # A chord lies off a curve by at most h^2/8 of its curvature.
        "chordErrorDeg": sum(step_deg**2 / 8 * bend / slope for slope, _, bend in near),
        "degPerDb": sum(1 / slope for slope, _, _ in near),
    }


def straight_crossings(angles, levels, top, threshold_db):
    """Crossings of the straight lines between samples, right and left of the largest sample."""
    order = [(top + k) % len(angles) for k in range(len(angles) + 1)]
    offsets = np.array([(angles[k] - angles[top]) % 360 for k in order])
    offsets[-1] = 360
    line = PPoly.from_spline(make_interp_spline(offsets, np.array(levels)[order], k=1))
    roots = line.solve(threshold_db, extrapolate=False)
    return float(roots[0]), float(360 - roots[-1])


def pattern(question):
    step_deg = question["stepDeg"]
    angles = np.arange(-180 + step_deg, 180 + step_deg / 2, step_deg)
    shape = Pattern(question)
    levels = shape.level_db(angles)
    top_deg, top_db = shape.top()
    top = int(np.argmax(levels))
    # The parabola through the largest sample and its neighbours.
    three = np.polyfit([-step_deg, 0, step_deg], [levels[top - 1], levels[top], levels[(top + 1) % len(levels)]], 2)
    vertex = -three[1] / (2 * three[0])
    _, back_slope, back_bend = shape.slopes_and_bend(top_deg + 180, step_deg)
    right, left = straight_crossings(angles, levels, top, levels[top] - 5)
    return {
        "anglesDeg": angles.tolist(),
        "levelDb": levels.tolist(),
        "peakDeg": top_deg,
        "peakDb": top_db,
        "skewness": shape.skewness(top_deg),
        "oppositeDb": float(shape.level_db(top_deg + 180)),
        "oppositeSlope": back_slope,
        "oppositeBend": back_bend,
        "halfPower": width(shape, top_deg, top_db, 10 * np.log10(2), step_deg),
        "tenDb": width(shape, top_deg, top_db, 10, step_deg),
        "vertexDeg": float(angles[top] + vertex),
        "vertexDb": float(np.polyval(three, vertex)),
        "straightLeftDeg": left,
        "straightRightDeg": right,
        "straightDb": np.interp(question["askedDeg"], angles, levels, period=360).tolist(),
    }


def drift(question):
    """Level in dB and unwrapped phase, linear in time and held beyond the ends; relative to the first tie."""
    times = np.array(question["timesMs"])
    ties = np.array(question["re"]) + 1j * np.array(question["im"])
    level = 20 * np.log10(np.abs(ties))
    phase = np.unwrap(np.angle(ties))
    asked = np.array(question["askedMs"])
    factor = 10 ** (-(np.interp(asked, times, level) - level[0]) / 20) * np.exp(
        -1j * (np.interp(asked, times, phase) - phase[0])
    )
    return {
        "re": factor.real.tolist(),
        "im": factor.imag.tolist(),
        "driftDb": float(np.ptp(level)),
        "turnDeg": float(np.rad2deg(np.ptp(phase))),
    }


def gain_table(question):
    return np.interp(question["askedHz"], question["frequenciesHz"], question["gainDbi"]).tolist()


def main():
    questions = json.load(sys.stdin)
    answers = {
        "versions": {
            "python": platform.python_version(),
            "numpy": np.__version__,
            "scipy": scipy.__version__,
            "scikit-rf": skrf.__version__,
        },
        "match": match(questions["match"]),
        "patterns": [pattern(question) for question in questions["patterns"]],
        "drifts": [drift(question) for question in questions["drifts"]],
        "gainTable": gain_table(questions["gainTable"]),
    }
    json.dump(answers, sys.stdout)


main()
