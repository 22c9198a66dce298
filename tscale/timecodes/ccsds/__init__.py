"""The time codes of CCSDS 301.0-B-4 (Time Code Formats, November 2010).

CUC (unsegmented, TAI or an agency's epoch), CDS (days and milliseconds, UTC), CCS (calendar, BCD, UTC) and the two
ASCII codes (UTC). A code is a preamble field (P-field), which may be sent or agreed on, and a time field (T-field).
Codes are bytes, or arrays of uint8 whose last axis holds the octets of one code.
"""

from __future__ import annotations

from .calendar_code import from_ascii, from_ccs, to_ascii, to_ccs
from .day_code import from_cds, to_cds
from .unsegmented import from_cuc, to_cuc

__all__ = ["from_ascii", "from_ccs", "from_cds", "from_cuc", "to_ascii", "to_ccs", "to_cds", "to_cuc"]
