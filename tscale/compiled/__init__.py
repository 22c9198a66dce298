"""Compiled chains: a whole chain as certified piecewise polynomials, for a billion readings or one in microseconds.

direct -> breaks -> fits -> pieces -> checks -> certificate        (build)
piece_table -> compiled_chain -> container                          (use; numpy alone)
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from .certificate import Certificate, Check, TableUsed
from .compiled_chain import CompiledChain, load_compiled

if TYPE_CHECKING:
    from ..chains import Chain
    from ..instants import Instants

__all__ = ["Certificate", "Check", "CompiledChain", "TableUsed", "compile_chain", "load_compiled"]


def compile_chain(
    chain: Chain, start: str | Instants, stop: str | Instants, *, tolerance_s: float = 1e-13
) -> CompiledChain:
    """Turn a chain into certified polynomials between two dates; see `build.compile_chain`."""
    from .build import compile_chain as build

    return build(chain, start, stop, tolerance_s=tolerance_s)
