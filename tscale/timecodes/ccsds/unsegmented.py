"""CUC, the unsegmented code (CCSDS 301.0-B-4, 3.2): seconds and a binary fraction since an epoch."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ...errors import InvalidInput, OutOfSpan
from ...exact import Pair, add, normalise, subtract
from ...instants import Instants
from ..binary import from_numerator, octets_of, to_octets
from .octets import Octets, number, split, with_preamble

__all__ = ["from_cuc", "to_cuc"]

_CCSDS_EPOCH: Final = (-1325419200, 0.0)  # 1958-01-01T00:00:00 TAI as a count from 2000-01-01T12:00:00 TAI
_LEVEL_1, _LEVEL_2 = 0b001, 0b010


def from_cuc(code: Any, *, p_field: bytes | int | None = None, epoch: Instants | None = None) -> Instants:
    """Read unsegmented codes.

    Parameters
    ----------
    code : bytes, list of bytes, or uint8 array (..., octets)
    p_field : bytes or int, optional
        The preamble as agreed on; None where each code begins with it.
    epoch : Instants, optional
        The agency's epoch, one instant of a uniform scale; needed for codes with identification 010, and refused for
        those with 001, whose epoch is 1958-01-01T00:00:00 TAI.

    Returns
    -------
    Instants
        TAI, or the scale of `epoch`; the fraction rounded to the nearest float64.

    Raises
    ------
    InvalidInput
        Octets that are no such code, or an epoch that is missing or too much.
    """
    preamble, octets = split(code, p_field, "CUC", (_LEVEL_1, _LEVEL_2), lambda p: sum(_sizes(p)))
    if (preamble[0] >> 4 & 0b111 == _LEVEL_2) != (epoch is not None):
        raise InvalidInput(
            "epoch= goes with code identification 010 (an agency's epoch) alone; that of 001 is 1958-01-01 TAI"
        )
    basic, _ = _sizes(preamble)
    scale, start = _epoch(epoch)
    return Instants._of(add((number(octets[..., :basic]), from_numerator(octets[..., basic:])), start), scale)


def to_cuc(
    t: Instants, *, basic: int = 4, fraction: int = 3, epoch: Instants | None = None, p_field: bool = True
) -> Octets:
    """Write unsegmented codes.

    Parameters
    ----------
    t : Instants
        TAI, or the scale of `epoch`.
    basic : int
        Octets of whole seconds, 1 to 7.
    fraction : int
        Octets of the fraction, 0 to 10; it is rounded to nearest.
    epoch : Instants, optional
        An agency's epoch; without it that of CCSDS, 1958-01-01T00:00:00 TAI.
    p_field : bool
        Put the preamble before each code.

    Returns
    -------
    uint8 array, shape of `t` + (octets,)
        `.tobytes()` gives the bytes of a single code.

    Raises
    ------
    InvalidInput
        Another scale than that of the epoch, or sizes that are not allowed.
    OutOfSpan
        Instants before the epoch or beyond `basic` octets of seconds, with the mask.
    """
    for name, size, least, most in (("basic", basic, 1, 7), ("fraction", fraction, 0, 10)):
        if isinstance(size, bool) or not isinstance(size, int) or not least <= size <= most:
            raise InvalidInput(f"{name} must be {least} to {most} octets, got {size!r}")
    scale, start = _epoch(epoch)
    if t.scale != scale:
        raise InvalidInput(f"this code counts {scale}, got {t.scale}; convert with tscale.chain first")
    whole, low = to_octets(*subtract(t.pair, start), fraction)
    bad = np.asarray((whole < 0) | (whole >= 2 ** (8 * basic)))
    if np.any(bad):
        raise OutOfSpan(
            f"{int(np.count_nonzero(bad))} of {bad.size} instants are before the epoch or beyond {basic} octets of "
            "seconds (see .mask)",
            mask=bad,
        )
    more_basic, more_fraction = max(0, basic - 4), max(0, fraction - 3)
    first = (_LEVEL_1 if epoch is None else _LEVEL_2) << 4 | (min(basic, 4) - 1) << 2 | min(fraction, 3)
    preamble = bytes([first])
    if more_basic or more_fraction:
        preamble = bytes([first | 0x80, more_basic << 5 | more_fraction << 2])
    return with_preamble(preamble, np.concatenate([octets_of(whole, basic), low], axis=-1), sent=p_field)


def _sizes(preamble: bytes) -> tuple[int, int]:
    """Octets of seconds and of the fraction."""
    basic, fraction = (preamble[0] >> 2 & 0b11) + 1, preamble[0] & 0b11
    if len(preamble) > 1:
        second = preamble[1]
        if len(preamble) > 2 or second & 0x83:
            raise InvalidInput(f"P-field {preamble.hex()} has a third octet or reserved bits set, which CUC has not")
        basic, fraction = basic + (second >> 5 & 0b11), fraction + (second >> 2 & 0b111)
    return basic, fraction


def _epoch(epoch: Instants | None) -> tuple[str, Pair]:
    if epoch is None:
        return "TAI", normalise(*_CCSDS_EPOCH)
    if not isinstance(epoch, Instants) or epoch.size != 1:
        raise InvalidInput(f"epoch= takes one instant, as Instants, got {epoch!r}")
    whole, fraction = epoch.pair
    return epoch.scale, (whole.reshape(()), fraction.reshape(()))
