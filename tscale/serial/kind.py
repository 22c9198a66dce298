"""What a kind of object is in a document: its fields, and how it is made of them again."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from .values import damaged

__all__ = ["Context", "Kind", "of_class"]

Fields = dict[str, Any]


@dataclass(frozen=True)
class Context:
    """What a reader brings along: tables, the folder with moved files, whether other tables will do."""

    reference: Any = None
    folder: Any = None
    any_tables: bool = False


@dataclass(frozen=True)
class Kind:
    """One kind of object.

    Attributes
    ----------
    name : str
        What stands under `kind`.
    cls : type
        Its class.
    take : callable
        From an object to its fields by name, in their order.
    make : callable
        From fields (complete, none unknown) and the context to the object.
    needed, more : tuple of str
        Fields that must be there, and those that may: what later versions of a class add has a default.
    """

    name: str
    cls: type
    take: Callable[[Any], Fields]
    make: Callable[[Fields, Context], Any]
    needed: tuple[str, ...]
    more: tuple[str, ...] = ()

    def build(self, fields: Mapping[str, Any], context: Context) -> Any:
        """The object, or `DataFileError` for fields that are missing or unknown."""
        lacking = [name for name in self.needed if name not in fields]
        if lacking:
            raise damaged(f"a {self.name} lacks {', '.join(lacking)}")
        unknown = [name for name in fields if name not in (*self.needed, *self.more)]
        if unknown:
            raise damaged(f"a {self.name} holds {', '.join(unknown)}, which nobody reads here")
        return self.make(dict(fields), context)


def of_class(cls: type, name: str = "", *, without: tuple[str, ...] = ()) -> Kind:
    """A dataclass or named tuple that is made of its own fields and checks them itself."""
    if dataclasses.is_dataclass(cls):
        items = [item for item in dataclasses.fields(cls) if item.init and item.name not in without]
        names = tuple(item.name for item in items)
        missing = dataclasses.MISSING
        more = tuple(i.name for i in items if i.default is not missing or i.default_factory is not missing)
    else:
        names = cls._fields  # type: ignore[attr-defined]
        more = tuple(cls._field_defaults)  # type: ignore[attr-defined]
    # In a document `kind` tells the class.
    word = {field: "type" if field == "kind" else field for field in names}
    held = {shown: field for field, shown in word.items()}
    return Kind(
        name or cls.__name__,
        cls,
        lambda value: {shown: getattr(value, field) for shown, field in held.items()},
        lambda fields, context: cls(**{held[shown]: value for shown, value in fields.items()}),
        tuple(word[field] for field in names if field not in more),
        tuple(word[field] for field in more),
    )
