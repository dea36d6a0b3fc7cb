"""The JSON Schema of the case file (draft 2020-12), grown from the tables of keys and the registries.

Shapes, history kinds and keys appear here by themselves; nothing is listed twice.  Models are pydantic's.
"""

from __future__ import annotations

from typing import Annotated, Any, Literal, Union

from pydantic import BaseModel, ConfigDict, Field, RootModel, StringConstraints, create_model

from transient.case.gap import size_key
from transient.case.history import field_dimension
from transient.case.keys import (
    BODY,
    COUNT,
    FLUID,
    PRESSURE,
    RUN,
    START,
    TABLE_FILE,
    TABLE_UNITS,
    TITLE,
    WALL,
    Key,
)
from transient.case.later import later
from transient.drive import KINDS
from transient.drive.kind import Field as HistoryField
from transient.drive.kind import Kind
from transient.gap.shapes import SHAPES, Shape
from transient.units import DIMENSIONS

_STRICT = ConfigDict(extra="forbid")
_NUMBER = r"(\d+\.?\d*|\.\d+)([eE][-+]?\d+)?"


class Quantity(RootModel[Annotated[str, StringConstraints(pattern=rf"^\s*[-+]?{_NUMBER}\s*[A-Za-z%°µμ1(].*$")]]):
    """A number with its unit, such as "0.80 mm"."""


class Fraction(RootModel[Annotated[str, StringConstraints(pattern=rf"^\s*\+?{_NUMBER}\s*%?\s*$")] | float]):
    """A share, such as "1 %"."""


def schema() -> dict[str, Any]:
    """The JSON Schema of the case file as a plain dict."""
    out = {"$schema": "https://json-schema.org/draft/2020-12/schema", **case_model().model_json_schema()}
    out["title"] = "Case file of transient"
    return out


def case_model() -> type[BaseModel]:
    """The pydantic model of the whole file."""
    history = _history_type()
    tables: dict[str, Any] = {
        "title": _optional(TITLE.doc, str),
        "gap": (_gap_type(), Field(description="The gap: shape and sizes")),
        "fluid": (_model("Fluid", FLUID, history), Field(description="The liquid: density and viscosity")),
        "wall": _optional("The walls by name; one that is left out stands still", _walls_model(history)),
        "pressure": _optional(
            "What drives the flow along the gap; left out: no pressure drop", _model("Pressure", PRESSURE, history)
        ),
        "start": _optional("The state before t = 0", _model("Start", START, history)),
        "run": _optional("Length, accuracy and what to keep", _model("Run", RUN, history)),
    }
    return create_model("CaseFile", __config__=_STRICT, **tables)


def _optional(doc: str, kind: Any, default: Any = None) -> tuple[Any, Any]:
    """A key that may be left out but not be null."""
    # The default never has to fit the type: TOML has no null, and the schema must not offer one.
    return kind, Field(default=default, description=doc, json_schema_extra=_drop_null)


def _drop_null(schema: dict[str, Any]) -> None:
    if schema.get("default", 0) is None:
        schema.pop("default")


def _model(name: str, keys: tuple[Key, ...], history: Any) -> type[BaseModel]:
    """The model of one table of keys; what this version cannot do yet is left out."""
    prefix = {"Wall": "wall.any", "Body": "wall.any.body"}.get(name, name.lower())
    fields = {key.name: _field(key, history) for key in keys if not later(f"{prefix}.{key.name}")}
    return create_model(name, __config__=_STRICT, **fields)


def _field(key: Key, history: Any) -> tuple[Any, Any]:
    doc = key.doc + (f", such as {key.example}" if key.example else "")
    kind = _type_of(key, history)
    return (kind, Field(description=doc)) if key.required else _optional(doc, kind, key.default)


def _type_of(key: Key, history: Any) -> Any:
    if key.kind == "quantity":
        base = Fraction if key.dimension == "fraction" else Quantity
        return Literal[key.words] | base if key.words else base
    if key.kind == "whole":
        return Annotated[int, Field(ge=key.low, le=key.high)]
    if key.kind == "choice":
        return Literal[key.choices]
    if key.kind == "times":
        return Annotated[list[Quantity], Field(min_length=1)]
    if key.kind == "curve":
        return _curve_model()
    if key.kind == "table":
        return _model("Body", BODY, history)
    if key.name in ("time_column", "column"):
        return str | Annotated[int, Field(ge=1)]
    return {"history": history, "text": str, "flag": bool}[key.kind]


def _curve_model() -> type[BaseModel]:
    pair = Annotated[list[Quantity], Field(min_length=2)]
    return create_model(
        "Curve",
        __config__=_STRICT,
        speeds=(pair, Field(description="Speeds of the body, rising")),
        values=(pair, Field(description="Force or torque at each speed")),
        beyond=(Literal["hold", "refuse"], Field(default="hold", description="Outside the speeds given")),
    )


def _gap_type() -> Any:
    models = [_gap_model(shape) for shape in SHAPES.values()]
    return Union[tuple(models)]  # noqa: UP007 (built from the registry)


def _gap_model(shape: Shape) -> type[BaseModel]:
    head: dict[str, Any] = {"shape": (Literal[shape.word], Field(description=shape.doc))}
    if shape.motion is not None:
        head["motion"] = (Literal[shape.motion], Field(description="Motion of the walls and the flow"))
    sizes = {size.name: _field(size_key(size), None) for size in shape.sizes}
    name = "Gap" + "".join(part.capitalize() for part in shape.name.split("_"))
    return create_model(name, __config__=_STRICT, **head, **sizes, count=_field(COUNT, None))


def _walls_model(history: Any) -> type[BaseModel]:
    wall = _model("Wall", WALL, history)
    names = dict.fromkeys(name for shape in SHAPES.values() for name in shape.real_walls)
    owners = {name: " or ".join(s.name for s in SHAPES.values() if name in s.real_walls) for name in names}
    fields = {name: _optional(f"The {name} wall ({owners[name]})", wall) for name in names}
    return create_model("Walls", __config__=_STRICT, **fields)


def _history_type() -> Any:
    """A quantity, or one of the registered kinds; kinds may hold histories themselves."""
    models = {
        kind.name: _history_model("History" + "".join(part.capitalize() for part in kind.name.split("_")), kind)
        for kind in KINDS.values()
    }
    choices = Union[(Quantity, *models.values())]
    history = create_model("History", __base__=RootModel[choices], __doc__="A quantity held from t = 0 on, or a kind")
    for model in models.values():
        model.model_rebuild(_types_namespace={"History": history})
    history.model_rebuild()
    return history


def _history_model(name: str, kind: Kind) -> type[BaseModel]:
    tabular = any(field.quantity == "times" for field in kind.fields)
    fields: dict[str, Any] = {"kind": (Literal[kind.name], Field(description=kind.doc))}
    for field in kind.fields:
        # Python's own word: "from" is the name in the file.
        attribute = f"{field.name}_" if field.name in ("from", "global") else field.name
        fields[attribute] = _history_field(field, tabular)
    for key in (*TABLE_FILE, *TABLE_UNITS) if tabular else ():
        fields[key.name] = _field(key, None)
    return create_model(name, __config__=_STRICT, **fields)


def _history_field(field: HistoryField, tabular: bool) -> tuple[Any, Any]:
    kind = _history_field_type(field)
    options: dict[str, Any] = {"description": field.doc}
    if field.name == "from":
        options["alias"] = "from"
    if field.required and not (tabular and field.quantity in ("times", "values")):
        return kind, Field(**options)
    return kind, Field(default=None, json_schema_extra=_drop_null, **options)


def _history_field_type(field: HistoryField) -> Any:
    if field_dimension(field, "speed") in DIMENSIONS:
        return Quantity
    if field.quantity in ("times", "values"):
        return Annotated[list[float], Field(min_length=1)]
    if field.quantity == "history":
        return "History"
    if field.quantity == "histories":
        return "list[History]"
    if field.quantity == "count":
        return Annotated[int, Field(ge=1)]
    return Literal[field.choices]
