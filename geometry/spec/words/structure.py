"""What may stand at a place of the spec, found by walking the model along a path.

Used to put the model's own error messages into the words of the spec, and to write the reference.
"""

from __future__ import annotations

import types
from collections.abc import Iterator, Mapping, Sequence
from typing import Annotated, Any, Literal, Union, get_args, get_origin, get_type_hints

from pydantic import BaseModel

from geometry.spec.text.tokens import with_article
from geometry.spec.words.fields import OfKind

Path = tuple[str | int, ...]
"""Keys and list indices (from 0) from the top of the spec."""


def written(path: Path) -> str:
    """A path as it is shown: ``members.arm.holes[1].at``, the first one being [1]."""
    text = ""
    for step in path:
        text += f"[{step + 1}]" if isinstance(step, int) else f".{step}" if text else step
    return text or "the spec"


def model_of(annotation: Any, value: Any = None) -> type[BaseModel] | None:
    """The table (model) that an annotation allows; of several sections the one of the given shape."""
    models = [a for a in alternatives(annotation) if isinstance(a, type) and issubclass(a, BaseModel)]
    if len(models) < 2:
        return models[0] if models else None
    shape = value.get("shape") if isinstance(value, Mapping) else None
    return next((m for m in models if shape in get_args(m.model_fields["shape"].annotation)), None)


def alternatives(annotation: Any) -> Iterator[Any]:
    """Every type that an annotation allows, without marks."""
    origin = get_origin(annotation)
    if origin is Annotated:
        yield from alternatives(get_args(annotation)[0])
    elif origin in (Union, types.UnionType):
        for argument in get_args(annotation):
            yield from alternatives(argument)
    else:
        yield annotation


def mark_in(annotation: Any) -> OfKind | None:
    """The quantity that an annotation itself holds (not one within a list)."""
    origin = get_origin(annotation)
    if origin is Annotated:
        found = next((m for m in get_args(annotation)[1:] if isinstance(m, OfKind)), None)
        return found or mark_in(get_args(annotation)[0])
    if origin in (Union, types.UnionType):
        return next(filter(None, map(mark_in, get_args(annotation))), None)
    return None


def field_annotation(model: type[BaseModel], name: str) -> Any:
    """Annotation of a field with its marks put back, found by its TOML word or its Python name."""
    for key, info in model.model_fields.items():
        if name in (info.alias, key):
            return Annotated[(info.annotation, *info.metadata)] if info.metadata else info.annotation
    return None


def words_of(model: type[BaseModel]) -> tuple[str, ...]:
    """The TOML words of a table."""
    return tuple(info.alias or name for name, info in model.model_fields.items())


def step_into(annotation: Any, value: Any, step: str | int) -> Any:
    """What may stand one step further down, or None when nothing is known about it."""
    model = model_of(annotation, value)
    if model is not None and isinstance(step, str) and isinstance(value, Mapping):
        found = field_annotation(model, step)
        if found is not None:
            return found
        return extra_annotation(model)
    wanted: type = list if isinstance(step, int) else dict
    for option in alternatives(annotation):
        if get_origin(option) is wanted:
            return get_args(option)[-1]
    return None


def extra_annotation(model: type[BaseModel]) -> Any:
    """What the free words of a table hold, or None."""
    if model.model_config.get("extra") != "allow":
        return None
    return get_args(get_type_hints(model, include_extras=True)["__pydantic_extra__"])[-1]


def at_path(root: Any, data: Any, path: Path) -> Any:
    """Annotation of what may stand at `path` of `data`."""
    annotation, value = root, data
    for step in path:
        annotation = step_into(annotation, value, step)
        value = below(value, step)
    return annotation


def below(value: Any, step: str | int) -> Any:
    """The value one step further down, or None."""
    if isinstance(value, Mapping) and isinstance(step, str):
        return value.get(step)
    if isinstance(value, Sequence) and not isinstance(value, str) and isinstance(step, int) and step < len(value):
        return value[step]
    return None


def described(annotation: Any) -> str:
    """What may stand there, in words."""
    mark = mark_in(annotation)
    if mark is not None:
        limits = f" {mark.range}" if mark.range else ""
        if mark.kind.unit:
            return f'{with_article(mark.word)}{limits} with its unit, as text: "{mark.kind.example}"'
        return f"a {'whole ' if int in alternatives(annotation) else ''}number{limits}"
    return " or ".join(dict.fromkeys(filter(None, map(_described_type, alternatives(annotation)))))


def _described_type(option: Any) -> str:
    origin = get_origin(option)
    if origin is Literal:
        return "one of " + ", ".join(f'"{word}"' for word in get_args(option) if word)
    if origin is list:
        item = get_args(option)[0]
        mark = mark_in(item)
        if mark:
            return f'a list of {mark.word} values, such as ["{mark.kind.example}", ...]'
        return f"a list of {', '.join(get_args(item))}" if get_origin(item) is Literal else "a list"
    if origin is dict:
        key = get_args(option)[0]
        return f"a table of {', '.join(get_args(key))} = value" if get_origin(key) is Literal else "a table"
    if isinstance(option, type) and issubclass(option, BaseModel):
        return "a table of " + ", ".join(words_of(option))
    return {str: "text", float: "a number", int: "a whole number", bool: "true or false"}.get(option, "")
