"""Sites, sources, logs, orbits, chains and results as JSON text, to the last bit.

    to_json -> kinds (what an object is made of) -> values (numbers, arrays, texts)
    from_json <- the same way back, each step checked

A document says its `kind` and the `version` of this layout, and carries a SHA-256 of what it holds. All objects
here can be pickled too; JSON is for what is kept, sent to others or read by another language.
"""

from __future__ import annotations

from .document import VERSION, OtherTables, from_json, to_json

__all__ = ["VERSION", "OtherTables", "from_json", "to_json"]
