"""The benchmark's peer: a plain script for the same job, as one would write it in an afternoon.

numpy for the correction, scikit-image for the regions, one matplotlib figure an image.
"""

import base64
import io
import json
from pathlib import Path
from typing import Any

import numpy as np
import tifffile
from matplotlib.figure import Figure
from scipy import ndimage
from skimage import measure, morphology

SIGMA = 5.670374419e-8


def run(folder: Path, out: Path, sheet: dict[str, Any]) -> None:
    """Correct, find, draw and write, image by image."""
    out.mkdir(parents=True, exist_ok=True)
    findings, parts = [], []
    for image in sheet["image"]:
        reading = tifffile.imread(folder / image["file"]).astype(np.float64)
        kelvin = reading * 0.01 if sheet["camera"]["pixel"] == "linear" else reading
        eps = image["emissivity"]["value"]
        reflected = image["reflected_c"]["value"] + 273.15
        surface = ((SIGMA * kelvin**4 - (1 - eps) * SIGMA * reflected**4) / eps / SIGMA) ** 0.25
        u = np.sqrt(0.5**2 + (0.02 * (kelvin**4 - reflected**4) / (4 * eps * surface**3)) ** 2)
        rows, columns = np.mgrid[: surface.shape[0], : surface.shape[1]]
        terms = np.stack(
            [np.ones(surface.size), *(p.ravel() / 100 for p in (rows, columns)),
             (rows**2).ravel() / 1e4, (rows * columns).ravel() / 1e4, (columns**2).ravel() / 1e4],
            axis=1,
        )  # fmt: skip
        fit = np.linalg.lstsq(terms, surface.ravel(), rcond=None)[0]
        excess = ndimage.median_filter(surface - (terms @ fit).reshape(surface.shape), 3)
        mask = morphology.opening(np.abs(excess) > sheet["detect"]["min_delta_k"], np.ones((3, 3)))
        labels = measure.label(mask)
        findings += [
            [image["file"], *map(int, region.bbox), float(region.intensity_max)]
            for region in measure.regionprops(labels, surface)
        ]
        figure = Figure(figsize=(10, 4))
        for place, plane in enumerate((kelvin, surface), 1):
            axes = figure.add_subplot(1, 2, place)
            drawn = axes.imshow(plane - 273.15, cmap="inferno")
            axes.contour(labels > 0, levels=[0.5], colors="white")
            figure.colorbar(drawn)
        buffer = io.BytesIO()
        figure.savefig(buffer, format="png", dpi=100)
        coded = base64.b64encode(buffer.getvalue()).decode()
        parts.append(f'<h2>{image["file"]}</h2><img src="data:image/png;base64,{coded}">')
        for name, plane in (("corrected", surface - 273.15), ("uncertainty", u)):
            (out / name).mkdir(exist_ok=True)
            tifffile.imwrite(
                out / name / image["file"], plane.astype(np.float32), compression="zlib"
            )
    (out / "findings.json").write_text(json.dumps(findings))
    (out / "report.html").write_text("<!doctype html>" + "".join(parts))
