"""Validate parsed data by a pydantic model; its errors become plain sentences.

A key is named by its path from the top of the file; tables of an array count from 1:
``compression.valves[2].seat.seat_mm``.
"""

from collections.abc import Mapping
from types import UnionType
from typing import Any, TypeVar, Union, get_args, get_origin

from annotated_types import Ge, Gt, Le, Lt
from pydantic import BaseModel, ValidationError
from pydantic.fields import FieldInfo

from optimiser.faults import BadInput
from optimiser.parsing import nearest

Model = TypeVar("Model", bound=BaseModel)
Location = tuple[int | str, ...]

#: What a value must be, by the type of pydantic's error.
_KINDS = {
    "float_type": "a number",
    "float_parsing": "a number",
    "finite_number": "a finite number",
    "int_type": "a whole number",
    "int_parsing": "a whole number",
    "int_from_float": "a whole number",
    "string_type": "a text in quotes",
    "bool_type": "true or false",
    "bool_parsing": "true or false",
    "model_type": "a table of keys",
    "model_attributes_type": "a table of keys",
    "dict_type": "a table of keys",
    "list_type": "a list",
    "tuple_type": "a list",
    "dataclass_type": "a list of texts",
}


def validate(model: type[Model], data: Mapping[str, Any], file: str) -> Model:
    """``data`` as a ``model``. Raises BadInput, one sentence a fault, all faults at once."""
    try:
        return model.model_validate(dict(data))
    except ValidationError as error:
        faults = error.errors(include_url=False)
        raise BadInput(
            f"{file}: {sentence}" for fault in faults for sentence in _sentences(model, fault)
        ) from None


def _sentences(model: type[BaseModel], fault: Any) -> list[str]:
    kind, location = fault["type"], tuple(fault["loc"])
    key = _path(location)
    if kind == "extra_forbidden":
        keys = list(_model_at(model, location[:-1]).model_fields)
        hint = nearest(str(location[-1]), keys)
        return [f"key {key} is not known{hint}; allowed: {', '.join(keys)}"]
    about = _field_at(model, location)
    if kind == "missing":
        return [f"key {key} is missing; allowed: {_allowed(about, fault)}"]
    if kind in ("value_error", "assertion_error"):
        text = str(fault["msg"]).removeprefix("Value error, ").removeprefix("Assertion failed, ")
        start = f"key {key}: " if key else ""
        return [f"{start}{line}" for line in text.splitlines()]
    return [f"key {key}: {_shown(fault['input'])}; allowed: {_allowed(about, fault)}"]


def _shown(value: object) -> str:
    if isinstance(value, dict):
        return "is a table of keys"
    if isinstance(value, list | tuple):
        return "is a list"
    if isinstance(value, bool):
        return f"is {str(value).lower()}"
    if isinstance(value, str):
        return f'is the text "{value[:40]}"'
    return f"is {value:g}" if isinstance(value, float) else f"is {value}"


def _path(location: Location) -> str:
    """``("valves", 0, "seat")`` as ``valves[1].seat``; names pydantic adds are dropped."""
    path = ""
    for step in location:
        if isinstance(step, int):
            path += f"[{step + 1}]"
        elif not step.startswith(("function-", "constrained-", "is-instance")):
            path += f".{step}" if path else step
    return path


def _allowed(about: FieldInfo | None, fault: Any) -> str:
    """What a key may hold: its kind, its range and what it means."""
    context = fault.get("ctx", {})
    words = _KINDS.get(fault["type"], "")
    if "expected" in context:
        words = str(context["expected"])
    if about is None:
        return words or _plain(fault["msg"])
    parts = [word for word in (words, _range(about)) if word]
    if not parts and fault["type"] != "missing":
        parts = [_plain(fault["msg"])]
    text = ", ".join(parts) or _kind_of(about.annotation)
    return f"{text} ({about.description})" if about.description else text


def _plain(message: str) -> str:
    return message.removeprefix("Input ")[:1].lower() + message.removeprefix("Input ")[1:]


def _range(about: FieldInfo) -> str:
    words = []
    for limit in _limits(about):
        if isinstance(limit, Gt):
            words.append(f"more than {limit.gt:g}")
        elif isinstance(limit, Ge):
            words.append(f"{limit.ge:g} or more")
        elif isinstance(limit, Lt):
            words.append(f"less than {limit.lt:g}")
        elif isinstance(limit, Le):
            words.append(f"at most {limit.le:g}")
    return ", ".join(words)


def _limits(about: FieldInfo) -> list[Any]:
    """A field's own limits and, for ``Annotated[...] | None``, those within."""
    inner = [
        note
        for choice in get_args(about.annotation)
        for note in getattr(choice, "__metadata__", ())
        if isinstance(note, FieldInfo)
    ]
    return [*about.metadata, *(limit for note in inner for limit in note.metadata)]


def _kind_of(annotation: Any) -> str:
    inner = _inside(annotation)
    if isinstance(inner, type) and issubclass(inner, BaseModel):
        return f"a table with {', '.join(inner.model_fields)}"
    words = {float: "a number", int: "a whole number", str: "a text in quotes"}
    choices = [f'"{choice}"' for choice in get_args(inner) if isinstance(choice, str)]
    return words.get(inner) or " or ".join(choices) or "a value"


def _inside(annotation: Any) -> Any:
    """The model or type within Optional, tuple, list and Annotated."""
    origin = get_origin(annotation)
    if origin in (Union, UnionType, tuple, list):
        inner = [a for a in get_args(annotation) if a not in (type(None), Ellipsis)]
        return _inside(inner[0])
    if hasattr(annotation, "__metadata__"):
        return _inside(get_args(annotation)[0])
    return annotation


def _model_at(model: type[BaseModel], location: Location) -> type[BaseModel]:
    """The model that the path leads into."""
    for step in location:
        about = model.model_fields.get(step) if isinstance(step, str) else None
        inner = _inside(about.annotation) if about else None
        if isinstance(inner, type) and issubclass(inner, BaseModel):
            model = inner
    return model


def _field_at(model: type[BaseModel], location: Location) -> FieldInfo | None:
    names = [step for step in location if isinstance(step, str)]
    if not names:
        return None
    return _model_at(model, location[:-1]).model_fields.get(names[-1])
