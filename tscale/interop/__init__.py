"""Adapters to other libraries; each is imported only when its function is called.

astropy: `Time`, `EarthLocation`, `SkyCoord` and `Quantity`. Frames: anything that shows itself as an Arrow stream
(pandas, polars, pyarrow), and numpy's structured arrays.
"""

from __future__ import annotations

from .astropy import from_astropy, to_astropy
from .frames import add_to_frame, convert_frame, from_frame
from .quantities import metres, seconds

__all__ = ["add_to_frame", "convert_frame", "from_astropy", "from_frame", "metres", "seconds", "to_astropy"]
