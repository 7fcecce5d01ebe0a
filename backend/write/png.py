"""PNG pictures (W3C PNG, third edition) with their printed size and colour space.

Pillow encodes. It was checked that it writes an sRGB chunk and iTXt chunks handed to it in that order, then pHYs, all
before IDAT, adds no time or software chunk, and picks a filter for each row in C, which our own lines around zlib would
have to do in Python. Either way the compressed bytes depend on the zlib at hand, so pictures are promised to
be equal in pixels everywhere and in bytes only within one locked environment.
"""

from __future__ import annotations

import io

from PIL import Image
from PIL.PngImagePlugin import PngInfo

from ..contract import U8

_PERCEPTUAL = b"\0"


def png_bytes(image: U8, dpi: float, text: tuple[tuple[str, str], ...] = ()) -> bytes:
    """A PNG of an (h,w,3) RGB or (h,w) grey uint8 image, sRGB encoded, the first row on top.

    `dpi` becomes whole pixels per metre, rounded half up (600 dpi is 23622). `text` are pairs of keyword
    (1 to 79 Latin-1 characters) and value, kept in order as uncompressed iTXt chunks before the image.
    Raises ValueError on an image of another shape or type. Cost: about 30 ns a pixel.
    """
    require_image(image)
    chunks = PngInfo()
    chunks.add(b"sRGB", _PERCEPTUAL)
    for keyword, value in text:
        chunks.add_itxt(keyword, value)
    out = io.BytesIO()
    Image.fromarray(image).save(out, "PNG", dpi=(dpi, dpi), pnginfo=chunks, compress_level=6)
    return out.getvalue()


def require_image(image: U8) -> None:
    """Raise ValueError unless `image` is uint8 with shape (h,w) or (h,w,3) and at least one pixel."""
    is_grey_or_rgb = image.ndim == 2 or (image.ndim == 3 and image.shape[2] == 3)
    if image.dtype != "uint8" or not is_grey_or_rgb or 0 in image.shape:
        raise ValueError(f"not a picture: {image.dtype} {image.shape}")
