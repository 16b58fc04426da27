"""The measured fan-beam scan of an acrylic disc, where it is there (it is no part of the project): the disc is found and
its diameter is 69.8 +- 0.2 mm at half of the local step (the estimate that comes with the data; no other measurement is
published).

Data: A. Meaney, F. Silva de Moura, S. Siltanen (2022), Helsinki Tomography Challenge 2022 open tomographic dataset,
Zenodo, doi:10.5281/zenodo.6984868, CC BY 4.0; one phantom of it."""
import json
import os
import pathlib
import subprocess
import sys
import tempfile

ROOT = pathlib.Path(__file__).resolve().parent.parent.parent
PROGRAM = os.path.abspath(os.environ.get("TOMOGAUGE", ROOT / "build/release/tomogauge"))
SCAN = pathlib.Path(os.environ.get("TOMOGAUGE_DATA", ROOT.parent / "shared/data")) / "acrylic-disc.fits"
NOTE = ("Scan by Meaney, Silva de Moura, Siltanen (2022), Helsinki Tomography Challenge 2022 open tomographic dataset, "
        "doi:10.5281/zenodo.6984868, CC BY 4.0; one phantom of it, as FITS")
JOB = f"""
job: measured acrylic disc
phantom: {ROOT}/phantoms/acrylic-disc.yaml
scan: {SCAN}
specification: diameter.yaml
note: "{NOTE}"
reconstructions:
  - {{name: hann, kernel: hann, pixels: 512, field: 76, axis-channel: 280.36}}
"""
SPECIFICATION = """
specification: diameter of the disc
checks:
  - {measure: diameter, in: body, nominal: 69.8, tolerance: 0.2, source: estimate that comes with the data}
"""

if not SCAN.exists():
    print(f"measured_scan: skipped, {SCAN} is not there")
    sys.exit(78)
with tempfile.TemporaryDirectory() as folder:
    job, out = pathlib.Path(folder) / "job.yaml", pathlib.Path(folder) / "out"
    job.write_text(JOB)
    (pathlib.Path(folder) / "diameter.yaml").write_text(SPECIFICATION)
    run = subprocess.run([PROGRAM, "evaluate", job, "-o", out, "--quiet"], capture_output=True, text=True)
    if run.returncode not in (0, 5):
        print(f"measured_scan: FAILED: exit status {run.returncode}\n{run.stdout}{run.stderr}")
        sys.exit(1)
    results = json.loads((out / "results.json").read_text())
    item = results["reconstructions"][0]
    diameter = next((r for r in item["results"] if r["measure"] == "diameter" and r["where"] == "body"), None)
    page = (out / "report.html").read_text()
if "lost" in item or diameter is None or diameter["value"] is None:
    print("measured_scan: FAILED: the disc was not measured:", item.get("lost"), diameter)
    sys.exit(1)
print(f"measured_scan: diameter {diameter['value']:.3f} +- {diameter['uncertainty']:.3f} mm (want 69.8 +- 0.2), "
      f"found {item['pose']['shift_mm'][0]:+.2f}, {item['pose']['shift_mm'][1]:+.2f} mm from the axis")
if abs(diameter["value"] - 69.8) > 0.2 or "Meaney" not in page:
    print("measured_scan: FAILED")
    sys.exit(1)
