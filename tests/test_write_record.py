"""The record of a figure against its schema and against the job it came from."""

from __future__ import annotations

import json
from importlib import resources

import jsonschema
import numpy as np
import pytest
from platewright.backend.contract import (
    Job,
    Lighting,
    Measure,
    Page,
    Panel,
    Projection,
    Sheet,
    Style,
    verify,
)
from platewright.backend.write.record import record_bytes
from support import geometries

PARALLEL = Projection(
    "parallel",
    np.array([[1.0, 0.0, 0.0, 42.0], [0.0, 0.0, -1.0, -0.0], [0.0, 1.0, 0.0, 0.1], [0.0, 0.0, 0.0, 1.0]]),
    None,
    (0.0, 1.0, 0.0),
    (1.0, 0.0, 0.0),
    (0.0, 0.0, 1.0),
    1.0,
)
CENTRAL = Projection(
    "central",
    np.array([[50.0, 42.0, 0.0, 0.0], [0.0, 30.0, -50.0, 0.0], [0.0, 0.0, 0.0, -1.0], [0.0, 1.0, 0.0, 900.0]]),
    (0.0, -900.0, 0.0),
    (0.0, 1.0, 0.0),
    (1.0, 0.0, 0.0),
    (0.0, 0.0, 1.0),
    1 / 18,
)


def job() -> Job:
    panels = tuple(
        Panel(name, 0, projection, (42.0 * k, 0.0, 42.0, 60.0), Style(), Lighting(()))
        for k, (name, projection) in enumerate([("front", PARALLEL), ("überblick", CENTRAL)])
    )
    made = Job((geometries.two_of_a_kind(),), geometries.MATERIALS, Sheet("overview", Page(84.0, 60.0), panels))
    verify(made)
    return made


MEASURES = (
    Measure(1, 4, 12.345678, 24.691356, (43.00004, 1.0, 50.0, 9.5)),
    Measure(0, 2, 0.0, 30.0, None),
    Measure(1, 2, 0.0, 0.0, None),
)


def schema_file() -> dict[str, object]:
    text = (resources.files("platewright.backend.write") / "record.schema.json").read_text(encoding="utf-8")
    loaded: dict[str, object] = json.loads(text)
    return loaded


def test_the_record_fits_its_schema() -> None:
    jsonschema.Draft202012Validator.check_schema(schema_file())
    jsonschema.validate(json.loads(record_bytes(job(), MEASURES)), schema_file(), jsonschema.Draft202012Validator)


@pytest.mark.parametrize(
    ("path", "value"),
    [
        (("schema",), 2),
        (("page", "width_mm"), 0),
        (("panels", 0, "view", "eye"), [0, 0, 0]),
        (("panels", 1, "view", "eye"), None),
        (("panels", 1, "parts", 0, "box_mm"), [1, 2, 3]),
        (("panels", 0, "view", "world_to_page"), [[1, 0, 0, 0]]),
        (("extra",), 1),
    ],
)
def test_the_schema_refuses_another_shape(path: tuple[str | int, ...], value: object) -> None:
    record = json.loads(record_bytes(job(), MEASURES))
    owner = record
    for step in path[:-1]:
        owner = owner[step]
    owner[path[-1]] = value
    with pytest.raises(jsonschema.ValidationError):
        jsonschema.validate(record, schema_file(), jsonschema.Draft202012Validator)


def test_the_record_says_what_the_job_said() -> None:
    record = json.loads(record_bytes(job(), MEASURES))
    assert (record["schema"], record["figure"]) == (1, "overview")
    assert record["page"] == {"width_mm": 84, "height_mm": 60, "resolution_dpi": 600, "columns": 1984, "rows": 1417}
    for panel, projection in zip(record["panels"], (PARALLEL, CENTRAL), strict=True):
        view = panel["view"]
        assert np.array_equal(view["world_to_page"], projection.world_to_page)
        assert view["scale"] == projection.scale and view["projection"] == projection.kind
        assert view["eye"] == (None if projection.eye is None else list(projection.eye))
    assert [panel["name"] for panel in record["panels"]] == ["front", "überblick"]
    assert [panel["place_mm"][0] for panel in record["panels"]] == [0, 42]


def test_measures_come_under_their_panel_rounded() -> None:
    front, overview = json.loads(record_bytes(job(), MEASURES))["panels"]
    assert front["parts"] == [
        {"path": "stand.arm.foot[1]", "visible_mm2": 0, "unoccluded_mm2": 30, "visible_percent": 0, "box_mm": None}
    ]
    assert overview["parts"] == [
        {
            "path": "stand.base",
            "visible_mm2": 12.3457,
            "unoccluded_mm2": 24.6914,
            "visible_percent": 50,
            "box_mm": [43, 1, 50, 9.5],
        },
        {"path": "stand.arm.foot[1]", "visible_mm2": 0, "unoccluded_mm2": 0, "visible_percent": None, "box_mm": None},
    ]


def test_the_record_is_one_line_without_minus_zero() -> None:
    data = record_bytes(job(), MEASURES)
    assert data.endswith(b"}\n") and data.count(b"\n") == 1
    assert b"-0," not in data and b"-0]" not in data and b"nan" not in data.lower()


def test_another_schema_number_is_refused() -> None:
    with pytest.raises(ValueError, match="schema 2"):
        record_bytes(job(), MEASURES, schema=2)
