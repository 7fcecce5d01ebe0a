"""The record of a figure as JSON: how its panels look at the model, and how much of each measured part shows."""

from __future__ import annotations

from ..contract import Job, Measure, Panel, Projection
from .numbers import JsonValue, json_text

SCHEMA = 1
_PAPER_DECIMALS = 4
_PERCENT_DECIMALS = 2


def record_bytes(job: Job, measures: tuple[Measure, ...], schema: int = SCHEMA) -> bytes:
    """One JSON object, a line, UTF-8; `record.schema.json` describes it and README.md explains it.

    `measures` are the answers to `job.sheet.measures`, kept in order within each panel. Paper lengths and areas are
    rounded to four decimals, per cents to two, the view is exact. Raises ValueError on a schema number it cannot write.
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
        "panels": [_panel(job, row, panel, measures) for row, panel in enumerate(sheet.panels)],
    }
    return (json_text(record) + "\n").encode()


def _panel(job: Job, row: int, panel: Panel, measures: tuple[Measure, ...]) -> JsonValue:
    nodes = job.geometries[panel.geometry].nodes
    return {
        "name": panel.name,
        "place_mm": panel.place,
        "view": _view(panel.projection),
        "parts": [_part(nodes[measure.node].path, measure) for measure in measures if measure.panel == row],
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
