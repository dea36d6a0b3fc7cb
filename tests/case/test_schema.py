"""The JSON Schema and the templates: what they accept is what the reader accepts, and they grow with the registries."""

from __future__ import annotations

import json
import tomllib
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from pydantic import ValidationError

import transient.drive
from transient.case.model import Case
from transient.case.read import CaseError, read_case
from transient.case.schema import case_model, schema
from transient.case.template import TEMPLATES, template
from transient.drive import KINDS
from transient.gap.shapes import SHAPES

CASES = sorted((Path(__file__).parents[2] / "cases").glob("*.toml"))
PLATES = {"gap": {"shape": "plates", "height": "1 mm"}, "fluid": {"density": "1 kg/L", "viscosity": "1 cP"}}


def accepts(tree: dict[str, Any]) -> bool:
    """Whether the schema's model takes a tree."""
    try:
        case_model().model_validate(tree)
    except ValidationError:
        return False
    return True


def tables(node: Any) -> Iterator[dict[str, Any]]:
    """Every object in a schema that has properties."""
    if isinstance(node, dict):
        if "properties" in node:
            yield node
        for child in node.values():
            yield from tables(child)
    elif isinstance(node, list):
        for child in node:
            yield from tables(child)


def test_it_is_a_schema_of_its_draft() -> None:
    """JSON Schema, draft 2020-12, core 8.1.1 and 8.2.4 (from memory): $schema, and references that resolve."""
    whole = schema()
    text = json.dumps(whole)
    assert whole["$schema"] == "https://json-schema.org/draft/2020-12/schema"
    assert whole["required"] == ["gap", "fluid"]
    for part in text.split('"$ref": "#/$defs/')[1:]:
        assert part.split('"')[0] in whole["$defs"]


def test_every_table_is_closed_and_every_key_described() -> None:
    found = list(tables(schema()))
    assert len(found) > 15
    for table in found:
        assert table["additionalProperties"] is False
        for key, value in table["properties"].items():
            assert value.get("description"), key
            assert value.get("default", 0) is not None, key


def test_shapes_and_history_kinds_come_from_their_registries() -> None:
    definitions = schema()["$defs"]
    kinds = {
        d["properties"]["kind"]["const"] for n, d in definitions.items() if n.startswith("History") and n != "History"
    }
    shapes = {d["properties"]["shape"]["const"] for n, d in definitions.items() if n.startswith("Gap")}
    assert kinds == set(KINDS)
    assert shapes == {shape.word for shape in SHAPES.values()}


def test_a_new_kind_is_read_and_in_the_schema_at_once(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(
        transient.drive.KINDS, "leap", replace(KINDS["step"], name="leap", doc="a step by another name")
    )
    tree = {**PLATES, "wall": {"upper": {"speed": {"kind": "leap", "to": "1 m/s"}}}}
    assert accepts(tree)
    assert Case(tree).problem().speeds[1].pieces(1.0).value([0.5]).tolist() == [1.0]
    assert "leap" in template("plates")


@pytest.mark.parametrize("path", CASES, ids=lambda path: path.stem)
def test_the_shipped_cases_pass(path: Path) -> None:
    assert accepts(tomllib.loads(path.read_text(encoding="utf-8")))
    case = read_case(path)
    assert accepts(tomllib.loads(case.text()))
    assert Case(tomllib.loads(case.text())) == case


@pytest.mark.parametrize(
    "change",
    [
        {"colour": "red"},
        {"gap": {"shape": "plates", "height": "1 mm", "heigth": "1 mm"}},
        {"gap": {"shape": "plates", "height": 1.0}},
        {"gap": {"shape": "plates"}},
        {"gap": {"shape": "disc", "height": "1 mm"}},
        {"gap": {"shape": "annulus", "inner_radius": "1 mm", "outer_radius": "2 mm"}},
        {"fluid": {"viscosity": "1 cP"}},
        {"wall": {"top": {"speed": "1 m/s"}}},
        {"wall": {"upper": {"speed": {"kind": "ramp", "to": "1 m/s"}}}},
        {"wall": {"upper": {"speed": {"kind": "ramp", "to": "1 m/s", "over": "1 s", "rise": "1 s"}}}},
        {"wall": {"upper": {"speed": {"kind": "sum", "parts": [{"kind": "jump"}]}}}},
        {"run": {"profiles": 1}},
        {"run": {"duration": 3}},
        {"start": {"state": "moving"}},
    ],
    ids=str,
)
def test_what_the_reader_refuses_the_schema_refuses(change: dict[str, Any]) -> None:
    assert accepts(PLATES)
    assert not accepts({**PLATES, **change})
    with pytest.raises(CaseError):
        Case({**PLATES, **change})


def test_every_shape_has_a_template_that_can_be_solved() -> None:
    assert set(TEMPLATES) == set(SHAPES)
    for name in TEMPLATES:
        tree = tomllib.loads(template(name))
        assert accepts(tree)
        problem = Case(tree).problem()
        assert problem.shape == name
        assert problem.walls[1].area is not None


def test_templates_mention_every_size_and_kind() -> None:
    for name, shape in SHAPES.items():
        text = template(name)
        for size in shape.sizes:
            assert all(part in text for part in size.name.split("_"))
        assert all(kind in text for kind in KINDS)
        assert max(map(len, text.splitlines())) <= 120


def test_template_names() -> None:
    assert template("annulus") == template("annulus_axial")
    with pytest.raises(CaseError) as caught:
        template("plate")
    assert str(caught.value) == '"plate" is no shape with a template; did you mean "plates"?'
