"""Renderers of others, for the tests of vector files: each gives (rows, columns, 3) uint8 over white."""

from __future__ import annotations

import io
import re
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest
from PIL import Image
from platewright.backend.contract import U8
from platewright.backend.drawing import Drawing
from platewright.backend.write.eps import eps_bytes
from platewright.backend.write.pdf import pdf_bytes
from platewright.backend.write.svg import svg_bytes

Renderer = Callable[[Drawing, float, Path], U8]


def resvg(drawing: Drawing, resolution: float, folder: Path) -> U8:
    """SVG by resvg."""
    import resvg_py

    return _pixels(bytes(resvg_py.svg_to_bytes(svg_string=_in_pixels(drawing, resolution))))


def cairo(drawing: Drawing, resolution: float, folder: Path) -> U8:
    """SVG by CairoSVG."""
    import cairosvg

    return _pixels(cairosvg.svg2png(bytestring=_in_pixels(drawing, resolution).encode(), background_color="white"))


def pdfium(drawing: Drawing, resolution: float, folder: Path) -> U8:
    """PDF by pdfium."""
    import pypdfium2

    document = pypdfium2.PdfDocument(pdf_bytes(drawing))
    try:
        # pdfium rounds the size up from single-precision points: a hair less keeps a whole number of pixels.
        return np.asarray(document[0].render(scale=resolution / 72.0 - 1e-6).to_pil().convert("RGB"))
    finally:
        document.close()


def poppler(drawing: Drawing, resolution: float, folder: Path) -> U8:
    """PDF by poppler's pdftoppm, which moves strokes to the pixel grid."""
    _needs("pdftoppm")
    (folder / "a.pdf").write_bytes(pdf_bytes(drawing))
    subprocess.run(["pdftoppm", "-r", str(resolution), "-png", "-singlefile", "a.pdf", "a"], cwd=folder, check=True)
    return _pixels((folder / "a.png").read_bytes())


def ghostscript(drawing: Drawing, resolution: float, folder: Path) -> U8:
    """EPS by Ghostscript, which fills with 4 x 4 samples and moves strokes to the pixel grid."""
    _needs("gs")
    (folder / "a.eps").write_bytes(eps_bytes(drawing))
    options = ["-q", "-dNOPAUSE", "-dBATCH", "-dSAFER", "-sDEVICE=png16m", "-dEPSCrop", "-dGraphicsAlphaBits=4"]
    command = ["gs", *options, f"-r{resolution:g}", "-sOutputFile=b.png", "a.eps"]
    run = subprocess.run(command, cwd=folder, check=True, capture_output=True, text=True)
    assert run.stdout == ""
    return _pixels((folder / "b.png").read_bytes())


def _needs(tool: str) -> None:
    if shutil.which(tool) is None:
        pytest.skip(f"{tool} is not installed")


def _in_pixels(drawing: Drawing, resolution: float) -> str:
    """Our SVG with its size in pixels of a resolution, all else as it is."""
    sizes = [round(side * resolution / 25.4) for side in (drawing.width, drawing.height)]
    text, n = re.subn(
        r'width="[\d.]+mm" height="[\d.]+mm"',
        f'width="{sizes[0]}px" height="{sizes[1]}px"',
        svg_bytes(drawing).decode(),
        count=1,
    )
    assert n == 1
    return text


def _pixels(data: bytes) -> U8:
    with Image.open(io.BytesIO(data)) as read:
        over_white = Image.new("RGBA", read.size, "white")
        over_white.alpha_composite(read.convert("RGBA"))
        return np.asarray(over_white.convert("RGB"))
