"""Drawings as PDF 1.7 (ISO 32000-1): one page of vectors, its boxes the page, tagged as one figure with its words.

pikepdf (qpdf) builds the file: it gives the objects as they are, so that tags and alternative texts are ours to write,
stamps no time and makes the id from the content. Letters are outlines that carry their text as ActualText.
"""

from __future__ import annotations

import io
import zlib
from typing import TYPE_CHECKING

import numpy as np

from ..drawing import Drawing, Image
from ..outlines import Letters, standard_letters
from .eps import POINTS_A_MM
from .numbers import number_text
from .operators import Operators
from .strokes import is_grey
from .tiff import srgb_profile

if TYPE_CHECKING:
    import pikepdf

_UP = 2  # the PNG filter that tells a row by its difference to the one above


def pdf_bytes(drawing: Drawing, letters: Letters | None = None) -> bytes:
    """The drawing as one PDF page of its own size, language, title and alternative text included.

    Greys are DeviceGray; colours are sRGB by a profile that the file carries. Cost: about 5 us a number.
    """
    import pikepdf

    pdf = pikepdf.new()
    images: list[Image] = []

    def place(image: Image) -> str:
        images.append(image)
        left, top, width, height = image.place
        matrix = (width, 0.0, 0.0, -height, left, top + height)
        return f"{' '.join(number_text(round(side, 4)) for side in matrix)} cm /Im{len(images) - 1} Do"

    height = drawing.height * POINTS_A_MM
    scale = number_text(round(POINTS_A_MM, 8))
    lines = [
        "/Figure <</MCID 0>> BDC",
        "q",
        f"{scale} 0 0 -{scale} 0 {number_text(round(height, 4))} cm",
        *Operators(letters or standard_letters(), place, _span).of(drawing),
        "Q",
        "EMC",
    ]
    content = pdf.make_stream("\n".join(lines).encode("ascii"))
    page = _page(pdf, drawing, content, images)
    pdf.pages.append(pikepdf.Page(page))
    _tag(pdf, drawing)
    out = io.BytesIO()
    pdf.save(
        out,
        deterministic_id=True,
        min_version="1.7",
        compress_streams=True,
        object_stream_mode=pikepdf.ObjectStreamMode.generate,
    )
    return out.getvalue()


def _page(pdf: pikepdf.Pdf, drawing: Drawing, content: pikepdf.Object, images: list[Image]) -> pikepdf.Dictionary:
    from pikepdf import Array, Dictionary, Name

    profile = pdf.make_stream(srgb_profile(), N=3, Alternate=Name.DeviceRGB)
    resources = Dictionary(ColorSpace=Dictionary(DefaultRGB=Array([Name.ICCBased, profile])))
    if images:
        resources.XObject = Dictionary({f"/Im{k}": _picture(pdf, image) for k, image in enumerate(images)})
    box = Array([0, 0, *(_points(side) for side in (drawing.width, drawing.height))])
    return Dictionary(
        Type=Name.Page,
        MediaBox=box,
        CropBox=box,
        TrimBox=box,
        Resources=resources,
        Contents=content,
        StructParents=0,
        Tabs=Name.S,
    )


def _picture(pdf: pikepdf.Pdf, image: Image) -> pikepdf.Object:
    from pikepdf import Dictionary, Name

    rows, columns = image.pixels.shape[:2]
    grey = is_grey(image.pixels)
    levels = image.pixels[:, :, 0] if grey else image.pixels.reshape(rows, -1)
    filtered = np.empty((rows, levels.shape[1] + 1), np.uint8)
    filtered[:, 0], filtered[0, 1:] = _UP, levels[0]
    filtered[1:, 1:] = levels[1:] - levels[:-1]
    stream = pdf.make_stream(
        zlib.compress(filtered.tobytes(), 6),
        Type=Name.XObject,
        Subtype=Name.Image,
        Width=columns,
        Height=rows,
        BitsPerComponent=8,
        ColorSpace=Name.DeviceGray if grey else Name.DeviceRGB,
        Filter=Name.FlateDecode,
        DecodeParms=Dictionary(Predictor=15, Colors=1 if grey else 3, BitsPerComponent=8, Columns=columns),
    )
    return stream


def _tag(pdf: pikepdf.Pdf, drawing: Drawing) -> None:
    """Say what the page is: a document of one figure, its language, title and alternative text."""
    from pikepdf import Array, Dictionary, Name, String

    root = pdf.make_indirect(Dictionary(Type=Name.StructTreeRoot))
    page = pdf.pages[0].obj
    document = pdf.make_indirect(Dictionary(Type=Name.StructElem, S=Name.Document, P=root))
    box = Array([0, 0, *(_points(side) for side in (drawing.width, drawing.height))])
    figure = Dictionary(
        Type=Name.StructElem,
        S=Name.Figure,
        P=document,
        Pg=page,
        K=0,
        A=Dictionary(O=Name.Layout, BBox=box, Placement=Name.Block),
    )
    alternative = drawing.alt or drawing.description or drawing.title
    if alternative:
        figure.Alt = String(alternative)
    if drawing.title:
        figure.T = String(drawing.title)
    figure = pdf.make_indirect(figure)
    document.K = Array([figure])
    root.K = Array([document])
    root.ParentTree = pdf.make_indirect(Dictionary(Nums=Array([0, Array([figure])])))
    root.ParentTreeNextKey = 1
    pdf.Root.StructTreeRoot = root
    pdf.Root.MarkInfo = Dictionary(Marked=True)
    if drawing.language:
        pdf.Root.Lang = String(drawing.language)
    if drawing.title:
        pdf.Root.ViewerPreferences = Dictionary(DisplayDocTitle=True)
        pdf.docinfo["/Title"] = String(drawing.title)
    if drawing.description:
        pdf.docinfo["/Subject"] = String(drawing.description)


def _span(text: str) -> tuple[str, str]:
    coded = b"\xfe\xff" + text.encode("utf-16-be", "replace")
    return f"/Span <</ActualText <{coded.hex()}>>> BDC\n", " EMC"


def _points(length: float) -> float:
    return round(length * POINTS_A_MM, 4)
