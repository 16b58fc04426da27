"""results.json of a small run against the schema (python3-jsonschema), results.csv as Python's csv module reads it, the
same bytes from two runs, and the exit status of each verdict."""
import csv
import json
import os
import pathlib
import subprocess
import sys
import tempfile

try:
    import jsonschema
except ImportError:
    print("results_schema: skipped, python3-jsonschema is not there")
    sys.exit(77)

HERE = pathlib.Path(__file__).resolve().parent
PROGRAM = os.path.abspath(os.environ.get("TOMOGAUGE", HERE / "../../build/release/tomogauge"))
PHANTOM = """
phantom: disc
materials:
  - {name: water, compound: "Water, Liquid"}
  - {name: ptfe, formula: C2F4, density: 2.16}
  - {name: tungsten, formula: W, density: 19.3}
solids:
  - {name: body, shape: cylinder, material: water, radius: 40, length: 20}
  - {name: rod, shape: cylinder, material: ptfe, centre: [14, 6, 0], radius: 8, length: 20}
  - {name: wire, shape: cylinder, material: tungsten, centre: [-12, -8, 0], radius: 0.05, length: 20}
"""
SCANNER = """
scanner: bench
geometry: parallel
channels: 240
pitch: 0.4
views: 360
arc: 180
energy: 70
photons: 1e5
"""
SPECIFICATION = """
specification: {name}
conditions: {{kernel: hann}}
checks:
  - {{measure: ct-number, in: rod, nominal: computed, tolerance: {tolerance}, source: "composition, beam"}}
"""
JOB = """
job: schema, "quoted"
phantom: disc.yaml
scanner: scanner.yaml
specification: {name}.yaml
reconstructions:
  - {{name: hann, kernel: hann, pixels: 240, field: 96}}
  - {{name: ramp, kernel: ramp, pixels: 240, field: 96}}
"""
# name, tolerance in HU, exit status: a tolerance of nothing cannot be met or broken for sure, but not passed either
CASES = (("wide", 100, 0), ("narrow", 0.001, 5))


def run(folder, job, out):
    return subprocess.run([PROGRAM, "evaluate", job, "-o", out, "--quiet"], cwd=folder, capture_output=True, text=True)


def close(text, number):
    """Both were written with nine significant digits."""
    return text == "" if number is None else abs(float(text) - number) <= 1e-8 * abs(number)


def check_csv(path, results):
    with open(path, newline="", encoding="utf-8") as f:
        rows = list(csv.DictReader(f, strict=True))
    flat = [(item["name"], r) for item in results["reconstructions"] for r in item["results"]]
    assert len(rows) == len(flat), (len(rows), len(flat))
    for row, (name, r) in zip(rows, flat):
        assert row["reconstruction"] == name
        for key in ("measure", "where", "unit", "verdict"):
            assert row[key] == r[key], (key, row[key], r[key])
        for key in ("why", "note", "source"):
            assert row[key] == r.get(key, ""), (key, row[key])
        for key in ("value", "uncertainty", "uncertainty_noise", "nominal", "low", "high", "predicted"):
            assert close(row[key], r[key]), (key, row[key], r[key])
    return len(rows)


def noise_part(results, measure, where):
    return next(r["uncertainty_noise"] for r in results["reconstructions"][0]["results"]
                if r["measure"] == measure and r["where"] == where)


def check_pooled(folder, whole, schema):
    """Two images of independent noise: the random uncertainty of a mean falls by sqrt(2). It is itself an estimate from
    some tens of degrees of freedom, hence the 30 %."""
    (folder / "scanner.yaml").write_text(SCANNER + "seed: 2\n")
    assert run(folder, "job.yaml", "again").returncode in (0, 1, 5)
    r = subprocess.run([PROGRAM, "measure", "wide-1/hann.fits", "again/hann.fits", "--phantom", "disc.yaml", "--spec",
                        "wide.yaml", "-o", "pooled.json", "--quiet"], cwd=folder, capture_output=True, text=True)
    assert r.returncode == 0, (r.returncode, r.stdout, r.stderr)
    pooled = json.loads((folder / "pooled.json").read_text())
    jsonschema.validate(pooled, schema)
    ratio = noise_part(whole, "ct-number", "rod") / noise_part(pooled, "ct-number", "rod")
    assert abs(ratio / 2 ** 0.5 - 1) < 0.3, ratio
    print(f"measure: two images pooled, random uncertainty of a mean divided by {ratio:.2f} (sqrt(2) = 1.41)")


def main():
    schema = json.loads((HERE.parent / "results.schema.json").read_text())
    jsonschema.Draft7Validator.check_schema(schema)
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        (folder / "disc.yaml").write_text(PHANTOM)
        (folder / "scanner.yaml").write_text(SCANNER)
        for case, tolerance, status in CASES:
            (folder / f"{case}.yaml").write_text(SPECIFICATION.format(name=case, tolerance=tolerance))
            (folder / "job.yaml").write_text(JOB.format(name=case))
            runs = [run(folder, "job.yaml", f"{case}-{i}") for i in (1, 2)]
            for r in runs:
                # a narrow limit fails for sure where the figure lies outside by more than its uncertainty
                assert r.returncode == status or (status == 5 and r.returncode == 1), (r.returncode, r.stdout, r.stderr)
            for file in ("results.json", "results.csv", "report.html", "hann.fits", "hann.png", "ramp.fits"):
                one, two = ((folder / f"{case}-{i}" / file).read_bytes() for i in (1, 2))
                assert one == two, f"{file} differs between two runs"
            results = json.loads((folder / f"{case}-1" / "results.json").read_text())
            jsonschema.validate(results, schema)
            rows = check_csv(folder / f"{case}-1" / "results.csv", results)
            hann, ramp = results["reconstructions"]
            assert hann["verdict"] == results["verdict"] and ramp["verdict"] == "none" and "unspecified" in ramp
            print(f"{case}: verdict {results['verdict']}, {rows} results in JSON (valid) and CSV (equal), "
                  "two runs give the same bytes")
        broken = dict(results, verdict="perhaps")
        try:
            jsonschema.validate(broken, schema)
        except jsonschema.ValidationError:
            pass
        else:
            raise AssertionError("the schema lets anything through")
        measured = subprocess.run([PROGRAM, "measure", "wide-1/hann.fits", "--phantom", "disc.yaml", "--spec", "wide.yaml",
                                   "-o", "measured.json", "--quiet"], cwd=folder, capture_output=True, text=True)
        assert measured.returncode == 0, (measured.returncode, measured.stdout, measured.stderr)
        alone = json.loads((folder / "measured.json").read_text())
        jsonschema.validate(alone, schema)
        whole = json.loads((folder / "wide-1" / "results.json").read_text())
        assert alone["reconstructions"][0]["results"] == whole["reconstructions"][0]["results"], \
            "an image measured alone gives other figures than in its job"
        print("measure: the same figures as in the job, valid")
        check_pooled(folder, whole, schema)


try:
    main()
except AssertionError as error:
    print("results_schema: FAILED:", error)
    sys.exit(1)
