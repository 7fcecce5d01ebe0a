"""The record of a figure as JSON: how its panels look at the model, and how much of each measured part shows."""

from __future__ import annotations

from dataclasses import dataclass

from ..contract import Job, LineClass, Measure, Panel, Projection
from .numbers import JsonValue, json_text

SCHEMA = 1
_PAPER_DECIMALS = 4
_PERCENT_DECIMALS = 2


@dataclass(frozen=True, slots=True)
class DrawnLine:
    """One line of a drawing: its panel, the path of its part (empty for none), class, whether it is seen, mm long."""

    panel: int
    part: str
    line_class: LineClass
    is_visible: bool
    length: float


def record_bytes(
    job: Job, measures: tuple[Measure, ...], lines: tuple[DrawnLine, ...] = (), schema: int = SCHEMA
) -> bytes:
    """One JSON object, a line, UTF-8; `record.schema.json` describes it and README.md explains it.

    `measures` are the answers to `job.sheet.measures`, kept in order within each panel. Paper lengths and areas are
    rounded to four decimals, per cents to two, the view is exact. `lines` are those of panels drawn in lines, in
    painting order. Raises ValueError on a schema number it cannot write.
    """
    if schema != SCHEMA:
        raise ValueError(f"record schema {schema}, this writer knows {SCHEMA}")
    sheet, page = job.sheet, job.sheet.page
    columns, rows = page.pixels
    record: dict[str, JsonValue] = {
        "schema": SCHEMA,
        "figure": sheet.name,
        "title": sheet.title,
        "alt": sheet.alt,
        "description": sheet.description,
        "page": {
            "width_mm": page.width,
            "height_mm": page.height,
            "resolution_dpi": page.resolution,
            "columns": columns,
            "rows": rows,
        },
        "panels": [_panel(job, row, panel, measures, lines) for row, panel in enumerate(sheet.panels)],
    }
    return (json_text(record) + "\n").encode()


def _panel(job: Job, row: int, panel: Panel, measures: tuple[Measure, ...], lines: tuple[DrawnLine, ...]) -> JsonValue:
    nodes = job.geometries[panel.geometry].nodes
    return {
        "name": panel.name,
        "place_mm": panel.place,
        "view": _view(panel.projection),
        "parts": [_part(nodes[measure.node].path, measure) for measure in measures if measure.panel == row],
        "lines": [_line(line) for line in lines if line.panel == row],
    }


def _line(line: DrawnLine) -> JsonValue:
    return {
        "part": line.part,
        "class": line.line_class.value,
        "visible": line.is_visible,
        "length_mm": round(line.length, _PAPER_DECIMALS),
    }


def _view(projection: Projection) -> JsonValue:
    return {
        "projection": projection.kind,
        "world_to_page": projection.world_to_page.tolist(),
        "eye": projection.eye,
        "sight": projection.sight,
        "right": projection.right,
        "up": projection.up,
        "scale": projection.scale,
    }


def _part(path: str, measure: Measure) -> JsonValue:
    covered = measure.unoccluded
    return {
        "path": path,
        "visible_mm2": round(measure.visible, _PAPER_DECIMALS),
        "unoccluded_mm2": round(covered, _PAPER_DECIMALS),
        "visible_percent": round(100 * measure.visible / covered, _PERCENT_DECIMALS) if covered > 0 else None,
        "box_mm": None if measure.box is None else [round(side, _PAPER_DECIMALS) for side in measure.box],
    }
