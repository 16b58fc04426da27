"""Line integrals of tilted, nested solids of every shape against a numerical second opinion by scipy.

Each solid is described here by a convex function that is negative inside (its own formulas, not the program's); along a
ray its minimum is found by scipy.optimize.minimize_scalar and its two zeros by brentq. Who fills a piece between two
zeros is asked of the functions at the middle of the piece: the last solid that is negative there.
1e-6 relative is asked of every line integral; the file holds float32 (6e-8)."""
import math
import os
import subprocess
import sys
import tempfile

try:
    import numpy as np
    from astropy.io import fits
    from scipy.optimize import brentq, minimize_scalar
except ImportError as missing:
    print("skipped:", missing)
    sys.exit(77)

SHAPES = ["cylinder", "elliptic-cylinder", "ellipsoid", "sphere", "box", "cone", "wedge"]
MU = [0.013, 0.021, 0.034, 0.0055]
CHANNELS, VIEWS, PITCH = 41, 8, 2.9


def make(rng, i):
    """A solid of random size, place and tilt, as keys of a description."""
    shape = SHAPES[i % len(SHAPES)]
    s = {"name": f"s{i}", "shape": shape, "material": f"m{i % len(MU)}"}
    s["centre"] = np.round(rng.normal(0, 18, 3), 3).tolist()
    s["axis"] = np.round(rng.normal(0, 1, 3), 3).tolist()
    s["turn"] = round(rng.uniform(-180, 180), 3)
    if shape in ("cylinder", "sphere", "cone"):
        s["radius"] = round(rng.uniform(4, 25), 3)
    if shape in ("cylinder", "cone"):
        s["length"] = round(rng.uniform(10, 60), 3)
    if shape == "cone":
        s["top-radius"] = round(rng.uniform(0, 30), 3)
    if shape in ("elliptic-cylinder", "ellipsoid", "box", "wedge"):
        s["size"] = np.round(rng.uniform(8, 60, 3), 3).tolist()
    return s


def axes(s):
    """Rows: the own x, y, z axes, as the README of phantoms/ says."""
    z = np.array(s["axis"]) / np.linalg.norm(s["axis"])
    x = np.array([1.0, 0, 0]) - z[0] * z
    x /= np.linalg.norm(x)
    y = np.cross(z, x)
    a = np.radians(s["turn"])
    return np.array([np.cos(a) * x + np.sin(a) * y, np.cos(a) * y - np.sin(a) * x, z])


def convex(s):
    """The function that is negative inside: convex, of the size of the distance in units of the half lengths."""
    turn, centre = axes(s), np.array(s["centre"])
    if s["shape"] in ("cylinder", "sphere", "cone"):
        half = [s["radius"]] * 2 + [s["length"] / 2 if "length" in s else s["radius"]]
    else:
        half = [v / 2 for v in s["size"]]

    def f(world):
        p = turn @ (world - centre)
        x, y, z = float(p[0]) / half[0], float(p[1]) / half[1], float(p[2]) / half[2]
        if s["shape"] in ("ellipsoid", "sphere"):
            return math.sqrt(x * x + y * y + z * z) - 1
        if s["shape"] in ("cylinder", "elliptic-cylinder"):
            return max(math.hypot(x, y) - 1, abs(z) - 1)
        if s["shape"] == "box":
            return max(abs(x), abs(y), abs(z)) - 1
        if s["shape"] == "wedge":
            return max(abs(x) - 1, abs(y) - 1, abs(z) - 1, x + z)
        return max(math.hypot(x, y) - 1 - (s["top-radius"] / s["radius"] - 1) * (z + 1) / 2, abs(z) - 1)

    return f


def interval(centre, inside, point, direction):
    def f(t):
        return inside(point + t * direction)

    near = (centre - point) @ direction
    span = 200.0
    low = minimize_scalar(f, bounds=(near - span, near + span), method="bounded", options={"xatol": 1e-7})
    if low.fun >= 0:
        return None
    return brentq(f, near - span, low.x, xtol=1e-11), brentq(f, low.x, near + span, xtol=1e-11)


def line_integral(solids, point, direction):
    found = [interval(centre, inside, point, direction) for centre, inside, _ in solids]
    ends = sorted(t for pair in found if pair for t in pair)
    total = 0.0
    for a, b in zip(ends, ends[1:]):
        middle = point + (a + b) / 2 * direction
        for (_, inside, mu), pair in zip(reversed(solids), reversed(found)):
            if pair and inside(middle) < 0:
                total += mu * (b - a)
                break
    return total


def main():
    rng = np.random.default_rng(5)
    solids = [make(rng, i) for i in range(14)]
    with tempfile.TemporaryDirectory() as folder:
        phantom, scanner, sino = (os.path.join(folder, n) for n in ("p.yaml", "s.yaml", "s.fits"))
        with open(phantom, "w", encoding="utf-8") as f:
            f.write("phantom: all shapes\nmaterials:\n")
            f.writelines(f"  - {{name: m{i}, mu: {mu}}}\n" for i, mu in enumerate(MU))
            f.write("solids:\n")
            f.writelines("  - {" + ", ".join(f"{k}: {v}" for k, v in s.items()) + "}\n" for s in solids)
        with open(scanner, "w", encoding="utf-8") as f:
            f.write(f"scanner: points\ngeometry: parallel\nchannels: {CHANNELS}\npitch: {PITCH}\nviews: {VIEWS}\n"
                    "start: 3\naperture: 0\nslices: 2\nslice-pitch: 15\n")
        subprocess.run([os.environ["TOMOGAUGE"], "simulate", phantom, scanner, "-o", sino], check=True,
                       stdout=subprocess.DEVNULL)
        got = fits.getdata(sino).astype(float)
    known = [(np.array(s["centre"]), convex(s), MU[int(s["material"][1:])]) for s in solids]
    worst, rays = 0.0, 0
    for row in range(2):
        for view in range(VIEWS):
            theta = np.radians(3 + 360 / VIEWS * view)
            for channel in range(CHANNELS):
                s = (channel - (CHANNELS - 1) / 2) * PITCH
                point = np.array([s * np.cos(theta), s * np.sin(theta), 15 * (row - 0.5)])
                want = line_integral(known, point, np.array([np.sin(theta), -np.cos(theta), 0]))
                have = got[row, view, channel]
                if want == 0 and have == 0:
                    continue
                rays += 1
                worst = max(worst, abs(have - want) / max(want, 1e-3))  # pieces of less than 0.1 mm count absolutely
    print(f"{rays} rays through 14 solids: largest relative difference from scipy {worst:.2g} (1e-6 allowed)")
    return 0 if rays > 400 and worst < 1e-6 else 1


sys.exit(main())
