"""Drawings as Encapsulated PostScript (EPSF 3.0, LanguageLevel 3 for packed pictures, else 2), pure ASCII.

The program is the page's operators of ISO 32000-1 after a prolog that gives them their meaning. The bounding box is the
page, so that a placed file has the size that was asked for.
"""

from __future__ import annotations

import base64
import math
import zlib

from ..drawing import Drawing, Image
from ..outlines import Letters, standard_letters
from .numbers import number_text
from .operators import Operators
from .strokes import is_grey

POINTS_A_MM = 72.0 / 25.4
_PROLOG = """\
/m {moveto} bind def /l {lineto} bind def /c {curveto} bind def /h {closepath} bind def
/S {stroke} bind def /f {fill} bind def /f* {eofill} bind def /n {newpath} bind def /W {clip} bind def
/B* {gsave eofill grestore stroke} bind def /q {gsave} bind def /Q {grestore} bind def
/w {setlinewidth} bind def /J {setlinecap} bind def /j {setlinejoin} bind def /M {setmiterlimit} bind def
/g {setgray} bind def /G {pop} bind def /rg {setrgbcolor} bind def /RG {pop pop pop} bind def"""


def eps_bytes(drawing: Drawing, letters: Letters | None = None) -> bytes:
    """The drawing as one EPS program. Letters are outlines. Cost: about 5 us a number."""
    operators = Operators(letters or standard_letters(), _place_image, lambda text: ("", ""))
    width, height = drawing.width * POINTS_A_MM, drawing.height * POINTS_A_MM
    body = operators.of(drawing)
    level = 3 if any(line.startswith(_IMAGE) for line in body) else 2
    scale = number_text(round(POINTS_A_MM, 8))
    lines = [
        "%!PS-Adobe-3.0 EPSF-3.0",
        f"%%BoundingBox: 0 0 {math.ceil(width - 1e-6)} {math.ceil(height - 1e-6)}",
        f"%%HiResBoundingBox: 0 0 {number_text(width, 4)} {number_text(height, 4)}",
        f"%%LanguageLevel: {level}",
        *([f"%%Title: ({_literal(drawing.title)})"] if drawing.title else []),
        "%%Pages: 1",
        "%%EndComments",
        "%%BeginProlog",
        # A dictionary of our own, so that names of the program that places the file keep their meaning.
        "40 dict begin",
        _PROLOG,
        "%%EndProlog",
        "%%Page: 1 1",
        "gsave",
        f"[{scale} 0 0 -{scale} 0 {number_text(height, 4)}] concat",
        *body,
        "grestore",
        "end",
        "%%Trailer",
        "%%EOF\n",
    ]
    return "\n".join(lines).encode("ascii")


_IMAGE = "/Device"


def _place_image(image: Image) -> str:
    """Operators of a picture: its rows from the top, packed, in ASCII."""
    rows, columns = image.pixels.shape[:2]
    grey = is_grey(image.pixels)
    data = image.pixels[:, :, 0] if grey else image.pixels
    packed = base64.a85encode(zlib.compress(data.tobytes(), 6), wrapcol=80).decode("ascii")
    # A line that begins with a percent sign could be taken for a comment of the document's structure.
    packed = "\n".join(" " + line if line.startswith("%") else line for line in packed.split("\n"))
    left, top, width, height = (number_text(round(side, 4)) for side in image.place)
    space, decode = ("/DeviceGray", "0 1") if grey else ("/DeviceRGB", "0 1 0 1 0 1")
    return (
        f"{space} setcolorspace {left} {top} translate {width} {height} scale\n"
        f"<< /ImageType 1 /Width {columns} /Height {rows} /BitsPerComponent 8 /Decode [{decode}]\n"
        f"/ImageMatrix [{columns} 0 0 {rows} 0 0]\n"
        f"/DataSource currentfile /ASCII85Decode filter /FlateDecode filter >> image\n{packed}~>"
    )


def _literal(text: str) -> str:
    """A text as ASCII for a comment line of at most 255 signs."""
    plain = "".join(each if " " <= each <= "~" and each not in "()\\" else "?" for each in text)
    return plain[:200]
