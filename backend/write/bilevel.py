"""Pictures of two values: TIFF 6.0 with Group 4 compression (ITU-T T.6), as offices and presses take it, and PNG.

Pillow packs, through libtiff and zlib. Ink is black: 1 in a TIFF, which says so (white is zero), 0 in a PNG.
"""

from __future__ import annotations

import io
from typing import TYPE_CHECKING

from PIL import Image, ImageOps
from PIL.PngImagePlugin import PngInfo

if TYPE_CHECKING:
    from ..converter import Bits

_PHOTOMETRIC, _WHITE_IS_ZERO = 262, 0
_SAMPLES_A_PIXEL = 277


def group4_bytes(bits: Bits, dpi: float) -> bytes:
    """A TIFF with one bit a pixel. No date, software or host tag. Cost: about 1 ns a pixel."""
    out = io.BytesIO()
    tags = {_PHOTOMETRIC: _WHITE_IS_ZERO, _SAMPLES_A_PIXEL: 1}
    _picture(bits).save(out, "TIFF", compression="group4", dpi=(dpi, dpi), tiffinfo=tags)
    return out.getvalue()


def png_bits_bytes(bits: Bits, dpi: float, text: tuple[tuple[str, str], ...] = ()) -> bytes:
    """A PNG with one bit a pixel, with resolution and texts as `png.png_bytes` has them."""
    chunks = PngInfo()
    for keyword, value in text:
        chunks.add_itxt(keyword, value)
    out = io.BytesIO()
    _picture(bits).save(out, "PNG", dpi=(dpi, dpi), pnginfo=chunks, bits=1)
    return out.getvalue()


def _picture(bits: Bits) -> Image.Image:
    size = (bits.columns, len(bits.rows))
    return ImageOps.invert(Image.frombytes("1", size, bits.rows.tobytes()))
