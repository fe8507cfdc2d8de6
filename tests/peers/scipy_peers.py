#!/usr/bin/env python3
"""The fixed-white problems of tests/data/solve, solved by general-purpose methods of scipy and by `whitesmith solve`.

    pip install numpy scipy
    cargo build --release
    python3 tests/peers/scipy_peers.py [PATH OF THE PROGRAM]

For each problem with limits on Ra and R9 and the most lm/W as the aim: SLSQP from 20 random starts, differential
evolution with penalties, and the program; objective, worst shortfall of a limit, and seconds of one run each in this process
order on this machine. The colour numbers here are an independent, plain numpy implementation (CIE 1931 sums, CIE 13.3) of the
tables in assets/tables, so the answers of the program are checked as well. Nothing is timed as a test: it is a measurement.
"""
import csv
import json
import pathlib
import subprocess
import sys
import time

import numpy as np
from scipy.optimize import LinearConstraint, differential_evolution, minimize

ROOT = pathlib.Path(__file__).resolve().parents[2]
GRID = np.arange(380.0, 781.0)
C2 = 1.4388e-2  # m·K, CIE 15


def table(name):
    """Columns of an embedded table, linear on 380-780 nm at 1 nm."""
    rows = [line for line in open(ROOT / "assets/tables" / name) if not line.startswith("#")]
    data = np.array([[float(x or 0) for x in row] for row in list(csv.reader(rows))[1:]])
    return np.stack([np.interp(GRID, data[:, 0], column) for column in data[:, 1:].T], 1)


def raw(name):
    rows = [line for line in open(ROOT / "assets/tables" / name) if not line.startswith("#")]
    return np.array([[float(x or 0) for x in row] for row in list(csv.reader(rows))[1:]])


CMF = table("cie1931_2deg_cmf_1nm.csv")
CMF_WIDE = raw("cie1931_2deg_cmf_1nm.csv")
TCS = table("cie13_3_tcs01_14_5nm.csv")[:, :9]
DAYLIGHT = table("cie_daylight_s0_s1_s2_5nm.csv")


def planckian(kelvin, nm):
    metres = nm * 1e-9
    return metres**-5 / np.expm1(C2 / (metres * kelvin))


def daylight(t):
    """CIE 15 daylight, 4000-25000 K."""
    if t <= 7000:
        x = -4.6070e9 / t**3 + 2.9678e6 / t**2 + 99.11 / t + 0.244063
    else:
        x = -2.0064e9 / t**3 + 1.9018e6 / t**2 + 247.48 / t + 0.237040
    y = -3 * x * x + 2.87 * x - 0.275
    q = 0.0241 + 0.2562 * x - 0.7341 * y
    return DAYLIGHT @ np.array([1, (-1.3515 - 1.7703 * x + 5.9114 * y) / q, (0.03 - 31.4424 * x + 30.0717 * y) / q])


def uv(xyz):
    d = xyz[..., 0] + 15 * xyz[..., 1] + 3 * xyz[..., 2]
    return np.stack([4 * xyz[..., 0] / d, 6 * xyz[..., 1] / d], -1)


def target_uv(kelvin, duv):
    """The point Duv above the Planckian locus at a CCT (locus over 360-830 nm)."""
    def at(t):
        return uv(planckian(t, CMF_WIDE[:, 0]) @ CMF_WIDE[:, 1:])
    step = kelvin * 1e-4
    along = at(kelvin + step) - at(kelvin - step)
    normal = np.array([along[1], -along[0]]) / np.hypot(*along)
    return at(kelvin) + duv * (normal if normal[1] > 0 else -normal)


class Rendering:
    """CIE 13.3 Ra and R9 of a blend at a fixed reference."""

    def __init__(self, spectra, kelvin):
        self.white = spectra @ CMF
        self.samples = np.einsum("nl,ls,lk->nsk", spectra, TCS, CMF)
        light = planckian(kelvin, GRID) if kelvin < 5000 else daylight(kelvin)
        self.reference_white = light @ CMF
        self.reference = self.uvw(self.reference_white, np.einsum("l,ls,lk->sk", light, TCS, CMF), adapt=False)

    def uvw(self, white, samples, adapt=True):
        def cd(p):
            return (4 - p[..., 0] - 10 * p[..., 1]) / p[..., 1], (1.708 * p[..., 1] + 0.404 - 1.481 * p[..., 0]) / p[..., 1]
        k, r, s = uv(white), uv(self.reference_white), uv(samples)
        if adapt:
            (ck, dk), (cr, dr), (cs, ds) = cd(k), cd(r), cd(s)
            c, d = cr / ck * cs, dr / dk * ds
            den = 16.518 + 1.481 * c - d
            s = np.stack([(10.872 + 0.404 * c - 4 * d) / den, 5.520 / den], -1)
        w = 25 * np.cbrt(100 * samples[:, 1] / white[1]) - 17
        return np.stack([13 * w * (s[:, 0] - r[0]), 13 * w * (s[:, 1] - r[1]), w], -1)

    def ra_r9(self, shares):
        moved = self.uvw(shares @ self.white, np.einsum("n,nsk->sk", shares, self.samples)) - self.reference
        r = 100 - 4.6 * np.linalg.norm(moved, axis=1)
        return r[:8].mean(), r[8]


def solve_all(problem, program):
    spectra = np.loadtxt(ROOT / "tests/data/solve/spectra" / f"{problem['id']}.csv", delimiter=",", skiprows=1)[:, 1:].T
    spectra = spectra / spectra.sum(1, keepdims=True)
    goal, limits = problem["target"], problem["constraints"]
    render, n = Rendering(spectra, goal["CCT"]), len(spectra)
    lm_per_w = 683.0 * spectra @ CMF[:, 1]
    u, v = target_uv(goal["CCT"], goal["Duv"])
    x, y, z = render.white.T
    # u (X + 15Y + 3Z) = 4X and v (X + 15Y + 3Z) = 6Y are linear in the shares
    rows = np.stack([np.ones(n), u * (x + 15 * y + 3 * z) - 4 * x, v * (x + 15 * y + 3 * z) - 6 * y])
    margin = [(0 if k.startswith("Ra") else 1, 1 if k.endswith("min") else -1, bound) for k, bound in limits.items()]

    def margins(p):
        values = render.ra_r9(p)
        return np.array([sign * (values[k] - bound) for k, sign, bound in margin])

    rng, answers = np.random.default_rng(20), {}
    begun, best, hits = time.perf_counter(), -np.inf, []
    for _ in range(20):
        end = minimize(lambda p: -(p @ lm_per_w), rng.dirichlet(np.ones(n)), jac=lambda p: -lm_per_w, method="SLSQP", bounds=[(0, 1)] * n,
                       constraints=[{"type": "eq", "fun": lambda p: rows @ p - [1, 0, 0], "jac": lambda p: rows},
                                    {"type": "ineq", "fun": margins}], options={"maxiter": 300, "ftol": 1e-10})
        if np.abs(rows @ end.x - [1, 0, 0]).max() < 1e-7 and margins(end.x).min() > -1e-4:
            hits.append(-end.fun)
            best = max(best, -end.fun)
    answers["SLSQP, 20 starts"] = (best, time.perf_counter() - begun, f"{sum(h > best - 0.01 for h in hits)} of 20 reach it")

    # Differential evolution over the free directions: a point of the plane of the white, penalties for the rest.
    plane = np.linalg.svd(rows)[2][3:]
    origin = np.linalg.lstsq(rows, [1, 0, 0], rcond=None)[0]
    evaluations = [0]

    def penalised(t):
        evaluations[0] += 1
        p = origin + t @ plane
        negative = np.minimum(p, 0).sum()
        short = np.minimum(margins(p), 0).sum() if negative > -0.5 else -100
        return -(p @ lm_per_w) - 1e4 * negative - 100 * short
    begun = time.perf_counter()
    end = differential_evolution(penalised, [(-1.5, 1.5)] * (n - 3), seed=20, tol=1e-8, maxiter=400)
    answers["differential evolution"] = (-end.fun, time.perf_counter() - begun, f"{evaluations[0]} evaluations")

    command = [program, "solve", "--json", "--emitters", str(ROOT / "tests/data/solve/spectra" / f"{problem['id']}.csv"), "--cct", str(goal["CCT"]), f"--duv={goal['Duv']}"]
    for name in ("Ra", "R9"):
        low, high = limits.get(f"{name}_min"), limits.get(f"{name}_max")
        if low is not None or high is not None:
            command.append(f"--{name.lower()}={'' if low is None else low}..{'' if high is None else high}")
    answer = json.loads(subprocess.run(command, capture_output=True, text=True, check=True).stdout)
    p = np.array(answer["shares"])
    short = max(0.0, -margins(p).min())
    white = np.abs(rows @ p - [1, 0, 0]).max()
    answers["whitesmith, with proof"] = (p @ lm_per_w, answer["seconds"], f"gap {answer['gap']:.1e}, {answer['boxes']} boxes, limits short by {short:.1e}, white off by {white:.1e}")
    return answers


def main():
    program = sys.argv[1] if len(sys.argv) > 1 else str(ROOT / "target/release/whitesmith")
    problems = json.load(open(ROOT / "tests/data/solve/problems.json"))["problems"]
    known = {b["id"]: b for b in json.load(open(ROOT / "tests/data/solve/best_known.json"))["solutions"]}
    for problem in problems:
        plain = problem["job"] == "fixed" and problem["objective"] == "max LER"
        if not plain or known[problem["id"]]["status"] != "optimal" or not all(k[:2] in ("Ra", "R9") for k in problem["constraints"]):
            continue
        answers = solve_all(problem, program)
        ours = answers["whitesmith, with proof"][1]
        print(f"{problem['id']}  {len(problem['emitters'])} emitters, {problem['constraints']}")
        for name, (value, seconds, note) in answers.items():
            print(f"  {name:24} {value:10.4f} lm/W  {seconds * 1e3:10.2f} ms  x{seconds / ours:8.1f}  {note}")


if __name__ == "__main__":
    main()
