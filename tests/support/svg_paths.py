"""Reads the paths of an SVG file back, by the path parser of fontTools, for the tests of what we write."""

from __future__ import annotations

import xml.etree.ElementTree as ElementTree
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from fontTools.pens.recordingPen import RecordingPen
from fontTools.svgLib.path import parse_path
from platewright.backend.contract import F64

SVG = "{http://www.w3.org/2000/svg}"


@dataclass(frozen=True, eq=False)
class ReadPath:
    """One path element: its attributes with those it inherits, its ids from the root on, and points along its runs."""

    attributes: dict[str, str]
    ids: tuple[str, ...]
    runs: tuple[F64, ...]


def read_paths(data: bytes, n_steps: int = 16) -> list[ReadPath]:
    """All paths but those of clips, in order; curves as `n_steps` points."""
    return list(_read(ElementTree.fromstring(data), {}, (), n_steps))


def _read(element: ElementTree.Element, inherited: dict[str, str], ids: tuple[str, ...], n_steps: int):
    if element.tag == f"{SVG}clipPath":
        return
    attributes = {**inherited, **element.attrib}
    ids = (*ids, element.attrib["id"]) if "id" in element.attrib else ids
    if element.tag == f"{SVG}path":
        yield ReadPath(attributes, ids, flattened(element.attrib["d"], n_steps))
    for child in element:
        yield from _read(child, attributes, ids, n_steps)


def flattened(data: str, n_steps: int = 16) -> tuple[F64, ...]:
    """Points along each run of path data."""
    pen = RecordingPen()
    parse_path(data, pen)
    runs: list[list[np.ndarray]] = []
    for command, arguments in pen.value:
        points = [np.array(point, float) for point in arguments]
        if command == "moveTo":
            runs.append([points[0]])
        elif command == "lineTo":
            runs[-1].append(points[0])
        elif command in ("curveTo", "qCurveTo"):
            runs[-1] += _curve([runs[-1][-1], *points], n_steps)
        elif command == "closePath":
            runs[-1].append(runs[-1][0])
    return tuple(np.array(run) for run in runs)


def _curve(points: list[np.ndarray], n_steps: int) -> list[np.ndarray]:
    """De Casteljau's points of a Bezier curve, its start left out."""
    found = []
    for step in range(1, n_steps + 1):
        t, level = step / n_steps, points
        while len(level) > 1:
            level = [(1 - t) * a + t * b for a, b in pairwise(level)]
        found.append(level[0])
    return found
