"""PNG and TIFF: pixels, chunks and tags."""

from __future__ import annotations

import io
import struct
import zlib

import numpy as np
import pytest
from PIL import Image, ImageCms
from platewright.backend.contract import U8, Page
from platewright.backend.write.png import png_bytes
from platewright.backend.write.tiff import srgb_profile, tiff_bytes


def picture(height: int = 9, width: int = 7, channels: int | None = 3) -> U8:
    shape = (height, width) if channels is None else (height, width, channels)
    return np.random.default_rng(1).integers(0, 256, shape, dtype=np.uint8)


def png_chunks(data: bytes) -> list[tuple[bytes, bytes]]:
    """Names and bodies of all chunks, their checks verified."""
    assert data[:8] == b"\x89PNG\r\n\x1a\n"
    chunks, at = [], 8
    while at < len(data):
        (length,) = struct.unpack_from(">I", data, at)
        name, body = data[at + 4 : at + 8], data[at + 8 : at + 8 + length]
        assert struct.unpack_from(">I", data, at + 8 + length)[0] == zlib.crc32(name + body)
        chunks.append((name, body))
        at += 12 + length
    return chunks


def tiff_tags(data: bytes) -> dict[int, tuple[int, int, bytes]]:
    """Tag to (type, count, bytes) of the only directory of a little-endian TIFF 6.0."""
    order, magic, at = struct.unpack_from("<2sHI", data)
    assert (order, magic) == (b"II", 42)
    (n_tags,) = struct.unpack_from("<H", data, at)
    tags = {}
    for k in range(n_tags):
        tag, kind, count, value = struct.unpack_from("<HHI4s", data, at + 2 + 12 * k)
        size = count * {1: 1, 2: 1, 3: 2, 4: 4, 5: 8, 7: 1}[kind]
        tags[tag] = kind, count, value[:size] if size <= 4 else data[(o := struct.unpack("<I", value)[0]) : o + size]
    assert struct.unpack_from("<I", data, at + 2 + 12 * n_tags)[0] == 0
    return tags


@pytest.mark.parametrize("channels", [3, None])
def test_pixels_come_back(channels: int | None) -> None:
    image = picture(channels=channels)
    for data in (png_bytes(image, 600), tiff_bytes(image, 600)):
        with Image.open(io.BytesIO(data)) as read:
            assert read.mode == ("RGB" if channels else "L")
            assert np.array_equal(np.asarray(read), image)


@pytest.mark.parametrize(("dpi", "per_metre"), [(300, 11811), (500, 19685), (600, 23622), (1000, 39370), (1200, 47244)])
def test_png_says_its_size_and_space_before_the_image(dpi: float, per_metre: int) -> None:
    """Order: W3C PNG 3rd ed. 5.6; px/m: dpi / 0.0254 rounded, as in its 11.3.4.3 (pHYs)."""
    chunks = png_chunks(png_bytes(picture(), dpi, (("Title", "Trichter"), ("Description", "Größe 9 мм"))))
    assert [name for name, _ in chunks] == [b"IHDR", b"sRGB", b"iTXt", b"iTXt", b"pHYs", b"IDAT", b"IEND"]
    assert chunks[0][1] == struct.pack(">IIBBBBB", 7, 9, 8, 2, 0, 0, 0)
    assert chunks[1][1] == b"\0"  # perceptual
    assert chunks[2][1] == b"Title\0\0\0\0\0Trichter"
    assert chunks[3][1] == b"Description\0\0\0\0\0" + "Größe 9 мм".encode()
    assert chunks[4][1] == struct.pack(">IIB", per_metre, per_metre, 1)


def test_resolution_rounds_half_up() -> None:
    half = 0.0254 * 10000.5
    assert dict(png_chunks(png_bytes(picture(), half)))[b"pHYs"] == struct.pack(">IIB", 10001, 10001, 1)


def test_a_column_84_mm_wide_prints_84_mm_wide() -> None:
    """84 mm at 600 dpi is 1984 px; read back from the file, 1984 px are 83.99 mm, within half a pixel."""
    columns, rows = Page(84.0, 1.0, 600.0).pixels
    assert columns == 1984
    (wide, _, unit) = struct.unpack(">IIB", dict(png_chunks(png_bytes(picture(rows, columns), 600)))[b"pHYs"])
    assert unit == 1
    assert abs(columns / wide * 1000 - 84.0) < 25.4 / 600 / 2 + 84.0 * 0.5 / wide


def test_tiff_tags() -> None:
    """Tag numbers and types: TIFF 6.0 (1992); 34675: ICC.1:2022 annex B."""
    tags = tiff_tags(tiff_bytes(picture(), 600))
    numbers = {
        tag: struct.unpack(f"<{count}{'H' if kind == 3 else 'I'}", data)
        for tag, (kind, count, data) in tags.items()
        if kind in (3, 4)
    }
    assert numbers[256] == (7,) and numbers[257] == (9,)
    assert numbers[258] == (8, 8, 8) and numbers[277] == (3,)  # three samples: no alpha
    assert 338 not in tags  # no extra samples
    assert numbers[259] == (5,)  # LZW
    assert numbers[262] == (2,)  # RGB
    assert numbers[296] == (2,)  # resolution in inches
    assert numbers[317] == (2,)  # horizontal differencing
    for tag in (282, 283):
        numerator, denominator = struct.unpack("<II", tags[tag][2])
        assert numerator == 600 * denominator
    assert tags[34675][2] == srgb_profile()
    assert not {305, 306, 315, 316} & set(tags)  # software, date, artist, host


def test_a_grey_tiff_carries_no_colour_profile() -> None:
    tags = tiff_tags(tiff_bytes(picture(channels=None), 1200))
    assert 34675 not in tags
    assert struct.unpack("<H", tags[262][2]) == (1,)  # black is zero


def test_a_fractional_resolution_is_kept_to_a_ten_millionth() -> None:
    numerator, denominator = struct.unpack("<II", tiff_tags(tiff_bytes(picture(), 609.6))[282][2])
    assert abs(numerator / denominator / 609.6 - 1) < 1e-7


def test_the_profile_is_srgb_without_a_clock() -> None:
    """Header offsets: ICC.1:2022 7.2; primaries and curve: an independent table of IEC 61966-2-1 values."""
    profile = srgb_profile()
    assert struct.unpack_from(">I", profile)[0] == len(profile)
    assert profile[12:24] == b"mntrRGB XYZ " and profile[36:40] == b"acsp"
    assert struct.unpack_from(">6H", profile, 24) == (2000, 1, 1, 0, 0, 0)
    own = ImageCms.getOpenProfile(io.BytesIO(profile))
    to_lab = ImageCms.buildTransform(
        own, ImageCms.createProfile("LAB"), "RGB", "LAB", ImageCms.Intent.RELATIVE_COLORIMETRIC
    )
    patch = Image.fromarray(
        np.array([[[255, 255, 255], [255, 0, 0], [0, 255, 0], [0, 0, 255], [119, 119, 119]]], dtype=np.uint8)
    )
    lab = ImageCms.applyTransform(patch, to_lab)
    assert lab is not None
    found = [(light, a - 256 * (a > 127), b - 256 * (b > 127)) for light, a, b in np.asarray(lab)[0].astype(int)]
    # L*a*b* relative to D50 of the sRGB primaries and of grey 119 (L* 50.03), from memory, L scaled by 2.55
    expected = [(255, 0, 0), (138, 81, 70), (224, -79, 81), (75, 68, -112), (128, 0, 0)]
    assert np.abs(np.array(found) - np.array(expected)).max() <= 1


@pytest.mark.parametrize(
    "image",
    [
        np.zeros((4, 4, 4), dtype=np.uint8),
        np.zeros((4, 4, 3), dtype=np.float64),
        np.zeros((0, 4, 3), dtype=np.uint8),
        np.zeros(4, dtype=np.uint8),
    ],
)
def test_another_shape_or_type_is_refused(image: U8) -> None:
    for write in (png_bytes, tiff_bytes):
        with pytest.raises(ValueError, match="not a picture"):
            write(image, 600)


@pytest.mark.slow
def test_a_page_beyond_the_readers_warning_is_written() -> None:
    """A4 at 1200 dpi is 139 million pixels; Pillow warns about such files when it opens them, not when it writes."""
    columns, rows = Page(210.0, 297.0, 1200.0).pixels
    assert columns * rows > (Image.MAX_IMAGE_PIXELS or 0)
    page = np.full((rows, columns), 255, dtype=np.uint8)
    assert png_chunks(png_bytes(page, 1200))[0][1][:8] == struct.pack(">II", 9921, 14031)
    assert tiff_bytes(page, 1200)[:4] == b"II*\0"
