"""A conversion as one HTML page: path, results, every term, uncertainty budget, pictures, provenance.

The page stands alone: nothing is fetched, nothing runs. Same inputs, same bytes.
"""

from __future__ import annotations

from .page import report_html, save_report

__all__ = ["report_html", "save_report"]
