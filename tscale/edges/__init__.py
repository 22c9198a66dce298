"""The edges that a chain may be made of: one function per kind of step.

Each returns a `Step` bound to its places, tables and observer; none does any work yet.
"""

from __future__ import annotations

from .barycentric import tcb_tdb_step, tcg_tcb_step, tt_barycentric_step, tt_wavefront_step, wavefront_step
from .lunar import tcl_tcb_step
from .proper import proper_step
from .terrestrial import clock_step, fixed_step, tt_bipm_step, tt_tcg_step, ut1_step

__all__ = [
    "clock_step",
    "fixed_step",
    "proper_step",
    "tcb_tdb_step",
    "tcg_tcb_step",
    "tcl_tcb_step",
    "tt_barycentric_step",
    "tt_bipm_step",
    "tt_tcg_step",
    "tt_wavefront_step",
    "ut1_step",
    "wavefront_step",
]
