"""FITS files against astropy.io.fits (an independent reader and writer of the standard) and fitsverify (HEASARC's check
of conformity).

- what the program writes opens without a warning, sums verified, and its WCS places the pixels where the README says;
- the same scan written by astropy in other pixel types, orders, signs, units and places in the file reconstructs to the
  same image."""
import os
import pathlib
import shutil
import subprocess
import sys
import tempfile
import warnings

try:
    import numpy as np
    from astropy.io import fits
    from astropy.wcs import WCS
except ImportError as missing:
    print(f"fits_astropy: skipped, {missing}")
    sys.exit(77)
if not shutil.which("fitsverify"):
    print("fits_astropy: skipped, no fitsverify")
    sys.exit(77)

ROOT = pathlib.Path(__file__).resolve().parent.parent.parent
PROGRAM = os.path.abspath(os.environ.get("TOMOGAUGE", ROOT / "build/release/tomogauge"))
GEOMETRY = {
    "parallel": "pitch: 2.1\narc: 180\n",
    "fan-equiangular": "pitch: 0.2\nsource-axis: 500\nsource-detector: 900\n",
    "fan-equispaced": "pitch: 4.1\nsource-axis: 500\nsource-detector: 900\n",
}
PHANTOM = """
phantom: two discs
materials:
  - {name: body, mu: 0.02}
  - {name: rod, mu: 0.05}
solids:
  - {name: body, shape: cylinder, material: body, centre: [0, 0, 0], radius: 60, length: 60}
  - {name: rod, shape: cylinder, material: rod, centre: [30, 12, 0], radius: 9, length: 60}
"""
failures = []


def check(good, what):
    if not good:
        failures.append(what)
        print(f"fits_astropy: FAILED: {what}")


def run(*arguments):
    done = subprocess.run([PROGRAM, *map(str, arguments), "--quiet"], capture_output=True, text=True)
    if done.returncode:
        sys.exit(f"fits_astropy: {' '.join(map(str, arguments))}: {done.returncode}: {done.stderr}")


def verified(path):
    out = subprocess.run(["fitsverify", "-q", str(path)], capture_output=True, text=True).stdout
    check(out.startswith("verification OK"), f"fitsverify {path.name}: {out}")


def opened(path):
    """The first image of a file; a sum that does not match, or any other remark of astropy, is an exception."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        with fits.open(path, checksum=True) as hdus:
            check("CHECKSUM" in hdus[0].header and "DATASUM" in hdus[0].header, f"{path.name}: sums")
            return np.array(hdus[0].data, dtype=np.float32), hdus[0].header.copy()


def image_of(path):
    run("reconstruct", path, "-o", path.with_suffix(".image.fits"), "--pixels", 64, "--field", 130, "--mu-water", 0.02)
    return opened(path.with_suffix(".image.fits"))


def contract(path):
    """Axes of an image: WCS by astropy against pixels of 130 / 64 mm about the axis."""
    data, header = image_of(path)
    verified(path.with_suffix(".image.fits"))
    step = 130 / 64
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # HU is no unit of astropy's
        wcs = WCS(header)
    for x, y in [(0, 0), (63, 0), (0, 63), (31.5, 31.5)]:
        got = np.array([float(v) for v in wcs.wcs_pix2world(x, y, 0)])
        if wcs.wcs.cunit[0] == "m":  # astropy brings lengths to m
            got = got * 1000
        check(np.allclose(got, [(x - 31.5) * step, (y - 31.5) * step], rtol=0, atol=1e-9), f"WCS {got} at {x}, {y}")
    check(header["BUNIT"] == "HU" and header["METHOD"] == "fbp" and header["KERNEL"].startswith("hann"), "keywords")
    check(header["CREATOR"].startswith("tomogauge ") and "DATASUM" in header["INPUT1"], "provenance")
    at = data[int(round(12 / step + 31.5)), int(round(30 / step + 31.5))]
    other = data[int(round(-12 / step + 31.5)), int(round(30 / step + 31.5))]
    check(at > 1000 and other < 500, f"the rod at x = 30, y = 12: {at} HU there, {other} HU at y = -12")
    return data


def variants(data, header):
    """name, HDUs, how close the images must be relative to the largest value; 0: the same bits"""
    def hdu(values=data, kind=fits.PrimaryHDU, **changes):
        made = kind(values)
        for card in header.cards:
            if card.keyword in ("BITPIX", "SIMPLE", "EXTEND", "CHECKSUM", "DATASUM", "COMMENT", "LONGSTRN",
                                "CONTINUE", "") or card.keyword.startswith("NAXIS"):
                continue
            made.header[card.keyword] = card.value
        for key, value in changes.items():
            if value is None:
                del made.header[key]
            else:
                made.header[key] = value
        return made

    views, channels = data.shape
    crpix, cdelt, first, step = (header[k] for k in ("CRPIX1", "CDELT1", "CRVAL2", "CDELT2"))
    angles = first + step * np.arange(views)
    table = fits.BinTableHDU.from_columns([fits.Column("VIEW", "1J", array=np.arange(views)),
                                           fits.Column("ANGLE", "1D", unit="deg", array=angles)], name="ANGLES")
    yield "float64", [hdu(data.astype(np.float64))], 0
    yield "reversed channels", [hdu(data[:, ::-1], CDELT1=-cdelt, CRPIX1=channels + 1 - crpix)], 0
    yield "image extension", [fits.PrimaryHDU(), hdu(kind=fits.ImageHDU)], 0
    yield "stack of one", [hdu(data[None], CTYPE3="ROW", CUNIT3="mm", CRPIX3=1.0, CRVAL3=0.0, CDELT3=2.0)], 0
    yield "shifted reference", [hdu(CRPIX1=crpix + 3, CRVAL1=3 * cdelt)], 1e-5
    # other orders of the views add in another order: n roundings of float32 of random sign, 6e-8 sqrt(n) and a margin
    tolerance = 6e-8 * 10 * np.sqrt(views)
    yield "reversed views", [hdu(data[::-1], CDELT2=-step, CRVAL2=first + (views - 1) * step)], tolerance
    yield "table of angles", [hdu(CDELT2=None, CRVAL2=None), table], tolerance
    unit = {"mm": ("cm", 0.1), "deg": ("rad", np.pi / 180)}[header["CUNIT1"]]
    yield "other unit", [hdu(CUNIT1=unit[0], CDELT1=cdelt * unit[1])], tolerance
    # integers: a rounding of at most half a step, SD step / sqrt(12), in each sample
    scale = float(data.max()) / 60000
    for kind, zero in (("int16", 30000), ("int32", 0)):
        made = hdu((np.round(data / scale) - zero).astype(kind))
        made.header["BSCALE"] = scale
        made.header["BZERO"] = scale * zero
        yield kind, [made], Rounded(scale)
    made = hdu(np.round(60000 * np.exp(-data.astype(float))).astype("uint16"), SCANDATA="count")
    air = fits.ImageHDU(np.full(channels, 60000, dtype="uint16"), name="AIR")
    yield "counts", [made, air], Rounded(np.exp(float(data.max())) / 60000)


class Rounded:
    """Samples rounded to a step."""
    def __init__(self, step):
        self.step = step

    def tolerance(self, header):
        """In HU: eight SD of the image; the ramp's variance per unit variance of a sample, which no window exceeds, is
        pi^2 / (12 pitch^2 views) over 180 degrees, and for a fan over 360 degrees within a factor of 2 of it."""
        pitch = header["CDELT1"] * {"parallel": 1, "fan-equiangular": 500 * np.pi / 180,
                                    "fan-equispaced": 500 / 900}[header["SCANGEOM"]]
        gain = np.pi / (np.sqrt(12 * header["NAXIS2"]) * pitch) / 0.02 * 1000
        return 8 * 2 * gain * self.step / np.sqrt(12)


def main(folder):
    (folder / "phantom.yaml").write_text(PHANTOM)
    for geometry, keys in GEOMETRY.items():
        (folder / "scanner.yaml").write_text(f"scanner: s\ngeometry: {geometry}\nchannels: 90\nviews: 120\n"
                                             f"axis-channel: 44.8\nstart: 17\nenergy: 70\n{keys}")
        scan = folder / f"{geometry}.fits"
        run("simulate", folder / "phantom.yaml", folder / "scanner.yaml", "-o", scan)
        verified(scan)
        data, header = opened(scan)
        check(data.shape == (120, 90) and header["SCANGEOM"] == geometry, f"{geometry}: shape {data.shape}")
        check(abs(header["CRPIX1"] - 44.8) < 1e-12 and abs(header["CRVAL2"] - 17) < 1e-12, f"{geometry}: axes")
        check(header["CTYPE1"] == "CHANNEL" and header["CUNIT1"] == ("deg" if "angular" in geometry else "mm"),
              f"{geometry}: CUNIT1 {header['CUNIT1']}")
        image = contract(scan)
        compared = 0
        for name, hdus, tolerance in variants(data, header):
            path = folder / f"{geometry}-{name.replace(' ', '-')}.fits"
            fits.HDUList(hdus).writeto(path, checksum=True)
            other, _ = image_of(path)
            largest = float(np.abs(image).max())
            worst = float(np.abs(other - image).max())
            allowed = tolerance.tolerance(header) if isinstance(tolerance, Rounded) else tolerance * largest
            check(worst <= allowed, f"{geometry}, {name}: off by {worst:.3g} HU, allowed {allowed:.3g}")
            compared += 1
        print(f"fits_astropy: {geometry}: {compared} files by astropy reconstruct as the program's own")


with tempfile.TemporaryDirectory() as name:
    main(pathlib.Path(name))
sys.exit(1 if failures else 0)
