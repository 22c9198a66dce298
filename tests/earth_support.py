"""A held Earth orientation for tests that need one at any date, and pyerfa's own chain of matrices."""

from __future__ import annotations

from types import SimpleNamespace

import erfa
import numpy as np

from tscale.tables import EOPMotion

ARCSEC = np.pi / 648000.0


class HeldOrientation:
    """UT1 - TAI, the pole and dX, dY held at one value at every date."""

    def __init__(self, ut1_minus_tai_s=-32.5, x_rad=0.0, y_rad=0.0, dx_rad=0.0, dy_rad=0.0):
        self.values = {
            "ut1_minus_tai_s": ut1_minus_tai_s,
            "x_rad": x_rad,
            "y_rad": y_rad,
            "dx_rad": dx_rad,
            "dy_rad": dy_rad,
        }

    def motion(self, tai):
        shape = np.shape(tai[0] + tai[1])
        values = [np.full(shape, value) for value in self.values.values()]
        return EOPMotion(*values, *np.zeros((5, *shape)))


def held(**values):
    return SimpleNamespace(earth_orientation=HeldOrientation(**values))


def erfa_celestial_to_terrestrial(tt, values):
    """pyerfa: xys06a + dX, dY -> c2ixys; era00; sp00 and pom00; c2tcio. `tt` are counts, shape (n,)."""
    day, second = np.divmod(tt[0], 86400)
    x, y, s = erfa.xys06a(2451545.0 + day, (second + tt[1]) / 86400.0)
    ut1_fraction = (second + (tt[1] - 32.184 + values["ut1_minus_tai_s"])) / 86400.0
    return erfa.c2tcio(
        erfa.c2ixys(x + values["dx_rad"], y + values["dy_rad"], s),
        erfa.era00(2451545.0 + day, ut1_fraction),
        erfa.pom00(values["x_rad"], values["y_rad"], erfa.sp00(2451545.0 + day, (second + tt[1]) / 86400.0)),
    )
