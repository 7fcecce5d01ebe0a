"""TIFF pictures (TIFF 6.0): LZW with horizontal differencing, no alpha, resolution in dots per inch, sRGB profile.

Pillow encodes through libtiff and adds no date, software or host tag of its own. The profile is fixed data,
`srgb.icc`: it was made once with `PIL.ImageCms.createProfile("sRGB")`, which stamps the creation
time into bytes 24 to 35 (ICC.1:2022 7.2.8), and those bytes were set to midnight of 1 January 2000. A profile
made on the spot would differ with the clock and with the version of its library.
"""

from __future__ import annotations

import io
from importlib import resources

from PIL import Image

from ..contract import U8
from .png import require_image

_PREDICTOR_TAG, _HORIZONTAL_DIFFERENCING = 317, 2


def tiff_bytes(image: U8, dpi: float) -> bytes:
    """A TIFF of an (h,w,3) RGB or (h,w) grey uint8 image, sRGB encoded, the first row on top.

    A grey picture carries no profile, because an RGB profile does not fit it. Raises ValueError on an image
    of another shape or type. Cost: about 15 ns a pixel.
    """
    require_image(image)
    profile = srgb_profile() if image.ndim == 3 else None
    out = io.BytesIO()
    Image.fromarray(image).save(
        out,
        "TIFF",
        compression="tiff_lzw",
        dpi=(dpi, dpi),
        icc_profile=profile,
        tiffinfo={_PREDICTOR_TAG: _HORIZONTAL_DIFFERENCING},
    )
    return out.getvalue()


def srgb_profile() -> bytes:
    """The sRGB profile of every colour picture, the same bytes always."""
    return (resources.files(__package__) / "srgb.icc").read_bytes()
