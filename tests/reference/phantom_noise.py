"""Photon noise of simulated scans against scipy's Poisson law: chi-square over all counts, from few photons to many.

The seeds are fixed: a chance below 1e-4 would be met once in two thousand choices of seed (six tests)."""
import os
import subprocess
import sys
import tempfile

try:
    import numpy as np
    from astropy.io import fits
    from scipy import stats
except ImportError as missing:
    print("skipped:", missing)
    sys.exit(77)

LEAST_CHANCE = 1e-4
MEANS = [0.5, 4, 9.5, 11, 70, 1500]
PHANTOM = """phantom: slab
materials: [{name: a, mu: 0.02}]
solids: [{name: slab, shape: box, material: a, size: [1000, 100, 1000]}]
"""
SCANNER = """scanner: one direction
geometry: parallel
channels: 1000
pitch: 0.1
views: 1
slices: 100
"""


def chance(counts, mean):
    """Of a worse agreement; bins of less than ten expected join their neighbours."""
    edges = [int(k) for k in np.unique(stats.poisson.ppf(np.linspace(0, 1, 60)[1:-1], mean))]
    below = np.concatenate(([0], stats.poisson.cdf(edges, mean), [1])) * len(counts)
    seen = np.concatenate(([0], np.searchsorted(np.sort(counts), np.array(edges) + 0.5), [len(counts)]))
    expected, found = np.diff(below), np.diff(seen)
    while len(expected) > 2 and expected.min() < 10:
        i = int(expected.argmin())
        j = i - 1 if i else 1
        expected[j] += expected[i]
        found[j] += found[i]
        expected, found = np.delete(expected, i), np.delete(found, i)
    return stats.chisquare(found, expected).pvalue


def main():
    failed = False
    with tempfile.TemporaryDirectory() as folder:
        phantom, scanner, sino = (os.path.join(folder, n) for n in ("p.yaml", "s.yaml", "s.fits"))
        with open(phantom, "w", encoding="utf-8") as f:
            f.write(PHANTOM)
        with open(scanner, "w", encoding="utf-8") as f:
            f.write(SCANNER)
        for seed, mean in enumerate(MEANS):
            photons = mean * np.exp(2.0)  # 100 mm of 0.02 per mm
            subprocess.run([os.environ["TOMOGAUGE"], "simulate", phantom, scanner, "-o", sino, "--quiet", "--photons",
                            f"{photons:.12g}", "--seed", str(seed)], check=True, stdout=subprocess.DEVNULL)
            counts = photons * np.exp(-fits.getdata(sino).astype(float).ravel())
            whole = np.where(np.abs(counts - 0.5) < 1e-3, 0, np.round(counts))  # no photon is written as half a photon
            p = chance(whole, mean)
            print(f"mean {mean}: mean of {len(whole)} counts {whole.mean():.4f}, chance by scipy.stats.poisson {p:.3g}")
            failed |= p < LEAST_CHANCE or np.abs(counts - np.maximum(whole, 0.5)).max() > 1e-5 * mean + 1e-5
    return 1 if failed else 0


sys.exit(main())
