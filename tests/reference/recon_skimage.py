"""A sinogram by scikit-image's radon reconstructs as by its iradon (ramp, linear): 1e-4 of the range inside the circle.

radon turns the image clockwise about pixel N // 2 and sums its columns: its theta and row axis run against ours (y up),
so with row 0 of our image at the smallest y and rows flipped, column i of the image is x = i - N // 2, and a ray of the
view theta at column i is x cos(theta) + y sin(theta) = i - N // 2 with y = N // 2 - row.
"""
import os
import subprocess
import sys
import tempfile

try:
    import numpy as np
    from astropy.io import fits
    from skimage.transform import iradon, radon
except ImportError as missing:
    print(f"skipped: {missing}")
    sys.exit(77)

SIZE = 160


def phantom():
    """Ellipses of different values, one hard edge each, nothing symmetric."""
    y, x = np.mgrid[:SIZE, :SIZE] - SIZE // 2
    image = np.zeros((SIZE, SIZE))
    for cx, cy, a, b, value in [(0, 0, 70, 60, 1.0), (20, -25, 14, 9, 0.5), (-30, 10, 8, 18, -0.4), (25, 30, 5, 5, 2.0)]:
        image[((x - cx) / a) ** 2 + ((y - cy) / b) ** 2 <= 1] += value
    return image


def write(path, sinogram, theta):
    """Axes channel, view; channel N // 2 (0-based) meets the axis."""
    hdu = fits.PrimaryHDU(sinogram.T.astype(np.float32))
    h = hdu.header
    h["SCANGEOM"], h["SCANDATA"] = "parallel", "line-integral"
    h["CTYPE1"], h["CUNIT1"], h["CRPIX1"], h["CRVAL1"], h["CDELT1"] = "CHANNEL", "mm", SIZE // 2 + 1.0, 0.0, 1.0
    h["CTYPE2"], h["CUNIT2"], h["CRPIX2"], h["CRVAL2"], h["CDELT2"] = "VIEW", "deg", 1.0, theta[0], theta[1] - theta[0]
    hdu.writeto(path)


def compare(folder, views):
    theta = np.arange(views) * 180.0 / views
    sinogram = radon(phantom(), theta, circle=True)
    want = iradon(sinogram, theta, filter_name="ramp", interpolation="linear", circle=True)
    source, target = (os.path.join(folder, f"{name}-{views}.fits") for name in ("sino", "image"))
    write(source, sinogram, theta)
    # the grid of iradon: N pixels of 1 mm, pixel N // 2 on the axis; -0.5 is the middle of an even number of pixels
    subprocess.run([os.environ.get("TOMOGAUGE", "tomogauge"), "reconstruct", source, "-o", target, "--kernel", "ramp",
                    "--pixels", str(SIZE), "--field", str(SIZE), "--centre=-0.5,0.5", "--quiet"], check=True,
                   stdout=subprocess.DEVNULL)
    got = fits.getdata(target)[::-1]
    y, x = np.mgrid[:SIZE, :SIZE] - SIZE // 2
    inside = x**2 + y**2 <= (SIZE // 2 - 1) ** 2
    worst = np.abs(got - want)[inside].max() / np.ptp(want[inside])
    print(f"iradon, ramp, linear, {views} views: largest difference {worst:.2e} of the range, allowed 1e-4")
    return worst <= 1e-4


with tempfile.TemporaryDirectory() as scratch:
    sys.exit(0 if all([compare(scratch, views) for views in (180, 233)]) else 1)
