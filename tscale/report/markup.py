"""HTML made of parts: every text is escaped, whatever file it came from."""

from __future__ import annotations

import html
from collections.abc import Iterable, Sequence
from typing import Final

__all__ = ["Markup", "join", "shown", "table", "tag"]

_EMPTY: Final = frozenset(("meta", "img", "br"))


class Markup(str):
    """Text that is HTML already."""

    __slots__ = ()


def shown(text: object) -> str:
    """A text as it can be shown: control characters, and those that turn the direction of writing, spelled out."""
    return "".join(c if c.isprintable() or c == "\n" else c.encode("unicode_escape").decode() for c in str(text))


def _part(child: object) -> str:
    return str(child) if isinstance(child, Markup) else html.escape(shown(child), quote=True)


def join(parts: Iterable[object]) -> Markup:
    """Parts one after the other."""
    return Markup("".join(_part(part) for part in parts))


def tag(name: str, /, *children: object, **attributes: str) -> Markup:
    """An element; `class_` and `for_` stand for attributes whose names Python keeps for itself."""
    words = "".join(
        f' {key.rstrip("_").replace("_", "-")}="{html.escape(shown(value), quote=True)}"'
        for key, value in attributes.items()
    )
    if name in _EMPTY:
        return Markup(f"<{name}{words}>")
    return Markup(f"<{name}{words}>{join(children)}</{name}>")


def table(
    head: Sequence[object],
    rows: Iterable[Sequence[object]],
    *,
    numbers: Sequence[int] = (),
    caption: str = "",
    foot: Sequence[Sequence[object]] = (),
) -> Markup:
    """A table; columns in `numbers` are set in figures of one width, to the right.

    In rows of the foot the first cell takes the place of all columns that the row has too few.
    """

    def line(cells: Sequence[object], kind: str) -> Markup:
        scope = {"scope": "col"} if kind == "th" else {}
        looks = [{"class_": "number", **scope} if i in numbers else scope for i in range(len(head))]
        lacking = len(head) - len(cells)
        looks = [{"colspan": str(lacking + 1)} if lacking else looks[0], *looks[lacking + 1 :]]
        return tag("tr", *(tag(kind, cell, **look) for cell, look in zip(cells, looks, strict=True)))

    parts = [tag("caption", caption)] if caption else []
    parts += [tag("thead", line(head, "th")), tag("tbody", *(line(row, "td") for row in rows))]
    if foot:
        parts.append(tag("tfoot", *(line(row, "td") for row in foot)))
    return tag("div", tag("table", *parts), class_="wide")
