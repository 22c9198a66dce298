"""Contributions of tables in rows: TT(BIPM) and Earth orientation."""

from __future__ import annotations

from typing import Final

import numpy as np

from ..exact import FloatArray, IntArray, Pair
from ..tables.common import since
from ..tables.earth_orientation import EarthOrientation
from ..tables.eop_rows import EOPNodes
from ..tables.tt_bipm import TTBIPM
from .assumptions import Assumptions
from .contribution import Contribution, Omission
from .correlation import Exponential, Rows

__all__ = ["EOP_COLUMNS", "OrientationRows", "orientation_rows", "phases", "tt_bipm_contributions", "tt_bipm_omissions"]

EOP_COLUMNS: Final = ("UT1 - TAI", "polar motion x", "polar motion y", "celestial pole dX", "celestial pole dY")
"""Input quantities of an Earth orientation table, in the order of its columns."""

_HELD_DECAY_S: Final = 10 * 31557600.0


def tt_bipm_contributions(table: TTBIPM, tai: Pair) -> list[Contribution]:
    """Contributions of a realisation of TT to it at TAI counts.

    The rounding of its rows is another in each; an uncertainty that was stated is that of the realisation as a whole.
    """
    shape = np.shape(tai[0])
    at = (np.ravel(tai[0]), np.ravel(tai[1]))
    rounding = not table.stated
    interval, elapsed_s = table._find(at)
    nodes_s = since(_first(table._tai), table._tai)
    u = np.clip(elapsed_s / np.diff(nodes_s)[interval], 0.0, 1.0)
    rows = Rows(
        np.stack([interval, interval + 1], axis=-1),
        np.stack([1.0 - u, u], axis=-1),
        table._sigma_s,
        None if rounding else np.zeros(len(nodes_s)),
        "own to each row" if rounding else "common to all",
    )
    return [
        Contribution(
            source=table.scale,
            quantity=f"{table.scale} - TAI",
            unit="s",
            sensitivity=np.ones(shape),
            sigma=rows.at().reshape(shape),
            value=table.offset_s(tai) + 32.184,
            distribution="rectangular" if rounding else "normal",
            correlation=rows,
            handle=("tt_bipm", table.scale),
        )
    ]


def tt_bipm_omissions(table: TTBIPM) -> list[Omission]:
    """What a realisation of TT does not say of itself."""
    if table.stated:
        return []
    return [
        Omission(
            f"{table.scale} itself", "not stated by its table, which is rounded; give uncertainty_s where it is loaded"
        )
    ]


class OrientationRows:
    """The errors of an Earth orientation table at some instants: those of its rows, and of holding the last."""

    def __init__(self, table: EarthOrientation, tai: Pair, assumptions: Assumptions) -> None:
        self.shape = np.shape(tai[0])
        at = (np.ravel(tai[0]), np.ravel(tai[1]))
        nodes = table._nodes
        self._interval, elapsed_s = nodes.within(at)
        self._u = elapsed_s / nodes.length_s[self._interval]
        self._values = table.at(at)
        predicted = self._values.status == 1
        how_many = "all" if predicted.all() else "some"
        self._words = "shared by rows near in time" + (f", {how_many} predicted" if predicted.any() else "")
        self._sigmas = np.concatenate([nodes.sigmas[:, 0], nodes.sigmas[-1:].sum(axis=1)])
        self._index, self._weight = _lagrange_weights(nodes, self._interval, self._u)
        self._at_s = since(_first(nodes.tai), at)
        decay_s = np.where(nodes.status[1:] > 0, assumptions.prediction_decay_s, assumptions.orientation_decay_s)
        self._phase = phases(since(_first(nodes.tai), nodes.tai), decay_s)

    def contributions(self, column: int, source: str, unit: str, sensitivity: FloatArray) -> list[Contribution]:
        """Those of one column (0 to 4); `sensitivity` in s per unit, the unit being s for UT1, else rad."""
        rows = Rows(self._index, self._weight, self._sigmas[:, column], self._phase, self._words)
        name = EOP_COLUMNS[column]
        value = np.asarray(self._values[column], dtype=np.float64).reshape(self.shape)
        sigma = rows.at()
        handle = ("earth_orientation", column)
        found = [
            Contribution(
                source, name, unit, sensitivity, sigma.reshape(self.shape), value, correlation=rows, handle=handle
            )
        ]
        held = self._values.status == 2
        if held.any():
            last = self._sigmas[-1, column]
            grown = np.where(held, np.sqrt(np.maximum(self._values[5 + column] ** 2 - last**2, 0.0)), 0.0)
            drifting = Exponential(self._at_s, _HELD_DECAY_S)
            found.append(
                Contribution(
                    source, f"{name}, held", unit, sensitivity, grown.reshape(self.shape), value, correlation=drifting
                )
            )
        return found


def orientation_rows(table: EarthOrientation, tai: Pair, assumptions: Assumptions) -> OrientationRows:
    """The errors of an Earth orientation table at TAI counts."""
    return OrientationRows(table, tai, assumptions)


def _lagrange_weights(nodes: EOPNodes, interval: IntArray, u: FloatArray) -> tuple[IntArray, FloatArray]:
    """Rows (n, 4) around each instant and their weights in the four-point Lagrange polynomial."""
    count = len(nodes.status)
    order = min(4, count)
    first = np.clip(interval - 1, 0, count - order)
    index = first[:, None] + np.arange(order)
    start = (nodes.tai[0][interval][:, None], nodes.tai[1][interval][:, None])
    at = since(start, (nodes.tai[0][index], nodes.tai[1][index])) / nodes.length_s[interval][:, None]
    weight = np.ones(index.shape)
    for a in range(order):
        for b in range(order):
            if a != b:
                weight[:, a] *= (u - at[:, b]) / (at[:, a] - at[:, b])
    return index, weight


def phases(at_s: FloatArray, decay_s: FloatArray | float) -> FloatArray | None:
    """Positions of rows on a scale on which their errors fade by 1/e per unit; None for independent rows."""
    decay = np.broadcast_to(np.asarray(decay_s, dtype=np.float64), (len(at_s) - 1,))
    if not decay.all():
        return None
    return np.concatenate([[0.0], np.cumsum(np.diff(at_s) / decay)])


def _first(nodes: Pair) -> Pair:
    return nodes[0][0], nodes[1][0]
