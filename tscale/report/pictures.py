"""Pictures as parts of the page: SVG within the file itself."""

from __future__ import annotations

import base64
from typing import TYPE_CHECKING

from .markup import Markup, tag

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["picture"]


def picture(figure: Figure, alternative: str, caption: str) -> Markup:
    """A figure as an image that the page carries, with words for those who do not see it."""
    from ..plots import svg_text

    data = base64.b64encode(svg_text(figure).encode()).decode("ascii")
    image = tag("img", alt=alternative, src=f"data:image/svg+xml;base64,{data}")
    return tag("figure", image, tag("figcaption", caption))
