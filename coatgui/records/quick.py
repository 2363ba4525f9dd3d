"""Frozen records that are made by the hundred thousand."""

from __future__ import annotations

from dataclasses import MISSING, fields
from typing import Any, TypeVar

Record = TypeVar("Record")


def quickly_made(record: type[Record]) -> type[Record]:
    """Give a frozen dataclass with slots an `__init__` that fills the slots directly. The one that
    `dataclass` writes goes through `object.__setattr__` for every field and takes twice the time:
    a fifth of the time in which a large campaign is assessed."""
    known: dict[str, Any] = {}
    arguments, body = ["self"], []
    for field in fields(record):  # type: ignore[arg-type]
        known[f"set_{field.name}"] = record.__dict__[field.name].__set__
        arguments.append(field.name)
        if field.default is not MISSING:
            known[f"default_{field.name}"] = field.default
            arguments[-1] += f"=default_{field.name}"
        body.append(f"    set_{field.name}(self, {field.name})")
    exec("\n".join([f"def __init__({', '.join(arguments)}):", *body]), known)
    made = known["__init__"]
    made.__qualname__ = f"{record.__qualname__}.__init__"
    setattr(record, "__init__", made)  # noqa: B010 - a type checker forbids the plain way
    return record
