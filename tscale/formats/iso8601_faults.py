"""What is wrong with a text that is not a date, in words that say what to write instead."""

from __future__ import annotations

import re

__all__ = ["fault"]

_ALLOWED = "write YYYY-MM-DD or YYYY-DDD, then T or a blank, hh:mm or hh:mm:ss, and up to 18 decimals"


def fault(text: str, *, allow_z: bool, allow_second_60: bool, last_minute: int) -> str:
    """Say why a text was refused."""
    last = f"{last_minute // 60:02d}:{last_minute % 60:02d}"
    if not text.strip():
        return f"it is empty; {_ALLOWED}"
    if text != text.strip():
        return "there are blanks around it; strip them"
    if re.search(r"[T ]\d\d:\d\d(:\d\d([.,]\d+)?)?([+-]\d\d(:?\d\d)?)\Z", text):
        return "zone offsets are not read; convert to UTC first, and leave the offset out"
    if re.search(r"[.,]\d{19,}Z?\Z", text):
        return "more than 18 decimals would have to be cut off; round the text first"
    if text.endswith("Z") and not allow_z:
        return "Z says UTC, but the scale is another one; leave the Z out or name a UTC scale"
    if re.match(r"[+-]?\d+-\d\d-\d\d[T ]24:", text):
        return "24:00 is not read; write 00:00 of the next day"
    if re.match(r"(\d{1,3}|\d{5,}|[+-]\d{1,4}|[+-]\d{13,})-", text):
        return "a year has four digits, or a sign and 5 to 12 digits"
    if re.match(r"-0+-", text):
        return "there is no year -0; write 0000"
    parts = re.match(r"([+-]?\d+)-(?:\d\d-\d\d|\d{3})(?:[T ](\d\d):(\d\d)(?::(\d+))?.*)?\Z", text)
    if parts is None:
        return _ALLOWED
    hour, minute, second = (int(part) if part else 0 for part in parts.groups()[1:])
    if hour > 23 or minute > 59:
        return "hours run from 00 to 23 and minutes from 00 to 59"
    if second > 59:
        if not allow_second_60:
            return "seconds run from 00 to 59: the scale has no leap seconds"
        if hour * 60 + minute != last_minute:
            return f"second 60 exists only at {last}, on a day with a leap second"
    if re.match(
        r"[+-]?\d+-(\d\d-\d\d|\d{3})([T ]\d\d:\d\d(:(\d\d|[1-9]\d{2,4})([.,]\d{1,18})?)?Z?)?\Z", text, re.ASCII
    ):
        return "there is no such day in the calendar"
    return _ALLOWED
