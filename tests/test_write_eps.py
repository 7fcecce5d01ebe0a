"""EPS: what its structure promises, and the same operators as in PDF."""

from __future__ import annotations

import base64
import re
import zlib

import numpy as np
import pytest
from platewright.backend.drawing import Drawing, Image
from platewright.backend.write.eps import eps_bytes
from platewright.backend.write.pdf import pdf_bytes
from support.drawings import SAMPLES, picture, wording


@pytest.mark.parametrize("name", sorted(SAMPLES))
def test_files_are_plain_repeat_and_keep_the_structure(name: str) -> None:
    """EPSF 3.0 (Adobe 5002) and its structuring conventions (5001): ASCII, lines of at most 255, comments in order."""
    data = eps_bytes(SAMPLES[name]())
    assert data == eps_bytes(SAMPLES[name]())
    text = data.decode("ascii")
    assert "\r" not in text and max(map(len, text.split("\n"))) <= 255
    comments = [each for each in text.split("\n") if each.startswith("%")]
    assert comments[0] == "%!PS-Adobe-3.0 EPSF-3.0" and comments[-1] == "%%EOF"
    keys = [each.split(":")[0] for each in comments]
    assert keys[1:4] == ["%%BoundingBox", "%%HiResBoundingBox", "%%LanguageLevel"]
    assert len(keys) == len(set(keys))
    lines = re.sub(r"(?s)>> image\n.*?~>", "", text).split("\n")
    assert not any(re.search(r"showpage|(?<![\d.])-0(?![.\d])", each) for each in lines)
    assert lines.count("q") == lines.count("Q")


def test_the_boxes_hold_the_page() -> None:
    text = eps_bytes(Drawing(210.0, 297.0, (), title="Größe (1)")).decode("ascii")
    assert "%%BoundingBox: 0 0 596 842\n" in text
    assert "%%HiResBoundingBox: 0 0 595.2756 841.8898\n" in text
    assert "%%Title: (Gr??e ?1?)\n" in text
    whole = eps_bytes(Drawing(25.4, 50.8, ())).decode("ascii")
    assert "%%BoundingBox: 0 0 72 144\n" in whole


def test_every_operator_is_given_a_meaning() -> None:
    for name in SAMPLES:
        text = eps_bytes(SAMPLES[name]()).decode("ascii")
        prolog, body = text.split("%%EndProlog")
        defined = set(re.findall(r"/(\S+) \{", prolog))
        operators = set(re.findall(r"(?<=\s)([A-Za-z][A-Za-z]?\*?)(?=\s)", re.sub(r"(?s)<<.*?~>", "", body)))
        assert operators <= defined, operators - defined


def test_letters_are_outlines_alike_in_both() -> None:
    import io

    import pikepdf

    text = eps_bytes(wording()).decode("ascii")
    with pikepdf.open(io.BytesIO(pdf_bytes(wording()))) as pdf:
        page = pdf.pages[0].Contents.read_bytes().decode("ascii")
    curves = [re.findall(r"^.* c$", each, re.MULTILINE) for each in (text, page)]
    assert curves[0] == curves[1] and len(curves[0]) > 100


def test_a_picture_comes_back_pixel_by_pixel() -> None:
    text = eps_bytes(picture()).decode("ascii")
    assert "%%LanguageLevel: 3" in text
    found = re.search(r">> image\n(.*?~>)", text, re.DOTALL)
    mark = picture().groups[0].items[0]
    assert found is not None and isinstance(mark, Image)
    packed = base64.a85decode("<~" + found[1], adobe=True)
    read = np.frombuffer(zlib.decompress(packed), np.uint8).reshape(mark.pixels.shape)
    assert np.array_equal(read, mark.pixels)
    assert "%%LanguageLevel: 2" in eps_bytes(wording()).decode("ascii")
