"""GLB against the Khronos glTF validator (npm gltf-validator), the reference implementation of the glTF 2.0 rules."""

from __future__ import annotations

import json
import struct
from pathlib import Path

import pytest
from platewright.backend.contract import Geometry
from platewright.backend.write.exports import export
from support import geometries
from support.geometries import MATERIALS
from support.khronos import Validator, find_validator

GEOMETRIES = {
    "cube": geometries.one_cube(),
    "instances": geometries.two_of_a_kind(),
    "mirrored": geometries.mirrored(),
    "stretched": geometries.stretched(),
    "names": geometries.awkward_names(),
    "wide indices": geometries.flattened(
        [geometries.leaf("sheet", -1, 0, 1, geometries.shifted(0, 0, 0))], [geometries.sheet(260)]
    ),
}


@pytest.fixture(scope="module")
def validator() -> Validator:
    found = find_validator()
    if isinstance(found, str):
        pytest.skip(found)
    return found


def glb(geometry: Geometry) -> bytes:
    return export(geometry, MATERIALS, "glb")["glb"]


def test_every_glb_is_accepted(validator: Validator, tmp_path: Path) -> None:
    files = []
    for name, geometry in GEOMETRIES.items():
        files.append(tmp_path / f"{name}.glb")
        files[-1].write_bytes(glb(geometry))
    for geometry, report in zip(GEOMETRIES.values(), validator.reports(files), strict=True):
        assert report["issues"]["messages"] == []
        info = report["info"]
        pairs = {(node.mesh, node.material) for node in geometry.nodes if node.mesh >= 0}
        assert info["totalTriangleCount"] == sum(len(geometry.meshes[mesh].faces) for mesh, _ in pairs)
        assert info["materialCount"] == len({material for _, material in pairs})


def test_the_validator_finds_a_wrong_bound_and_a_number_that_is_none(validator: Validator, tmp_path: Path) -> None:
    """Codes from the validator's ISSUES.md: the check above could fail."""
    good = glb(geometries.one_cube())
    (length,) = struct.unpack_from("<I", good, 12)
    document = json.loads(good[20 : 20 + length])
    document["accessors"][0]["max"] = [0.002] * 3
    text = json.dumps(document, separators=(",", ":")).encode().ljust(length)
    assert len(text) == length
    wrong, none = tmp_path / "wrong.glb", tmp_path / "none.glb"
    wrong.write_bytes(good[:20] + text + good[20 + length :])
    none.write_bytes(good[: 28 + length] + struct.pack("<f", float("nan")) + good[32 + length :])
    codes = [{message["code"] for message in r["issues"]["messages"]} for r in validator.reports([wrong, none])]
    assert "ACCESSOR_MAX_MISMATCH" in codes[0]
    assert "ACCESSOR_INVALID_FLOAT" in codes[1]
