"""The project file: a TOML file that names site, clocks, source and tables once, for every command."""

from __future__ import annotations

import argparse
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

if TYPE_CHECKING:
    from ..tables.clock_log import ClockLog

__all__ = ["check_clocks", "from_project", "with_noise", "with_project"]

_FILE: Final = "a file name"
_FILES: Final = "a file name or a list of them"
_YES: Final = "true or false"
_NUMBER: Final = "a number"

# Key of the file, what it holds, and the attribute of the options.
_KEYS: Final = {
    "site": (_FILE, "site"),
    "solid_tide": (_YES, "solid_tide"),
    "orbit": (_FILE, "orbit"),
    "clocks": (_FILES, "clock"),
    "interpolation": ("linear, cubic or step", "interpolation"),
    "max_gap_s": (_NUMBER, "max_gap_s"),
    "source": (_FILE, "source"),
    "second_order": (_YES, "second_order"),
    "ephemeris": (_FILE, "ephemeris"),
    "time_ephemeris": (_FILE, "time_ephemeris"),
    "leap_seconds": (_FILE, "leap_seconds"),
    "earth_orientation": (_FILE, "earth_orientation"),
    "tt_bipm": (_FILES, "tt_bipm"),
    "sub_daily": (_YES, "sub_daily"),
}
_BY_CLOCK: Final = {
    "noise": ("white_frequency", "flicker_frequency", "random_walk_frequency", "white_phase_s"),
    "predict": ("fit_s", "until", "start", "drift"),
}
# An option given takes the place of all that says the same in another way.
_INSTEAD: Final = {
    "site": ("site", "orbit"),
    "orbit": ("site", "orbit", "solid_tide"),
    "source": ("source",),
    "ra": ("source",),
    "dec": ("source",),
}


def with_project(args: argparse.Namespace) -> argparse.Namespace:
    """The options with what the file of `--project` says put where none was given.

    Raises
    ------
    DataFileError
        For a file that cannot be read, a key that does not exist, or a value of another kind.
    """
    project = getattr(args, "project", None)
    if project is None:
        return args
    path = Path(project)
    given = vars(args)
    found = _read(path)
    taken = {name for name, value in given.items() if value not in (None, [])}
    kept = taken.union(*(_INSTEAD.get(name, ()) for name in taken))
    # A command has no use for what it has no option for: one project serves them all.
    fresh = {name: value for name, value in found.items() if name in given and name not in kept}
    by_clock = {name: found.get(name) or {} for name in _BY_CLOCK}
    return argparse.Namespace(**{**given, **fresh, **by_clock, "from_project": frozenset(fresh)})


def from_project(args: argparse.Namespace) -> frozenset[str]:
    """Options that the project gave."""
    found: frozenset[str] = getattr(args, "from_project", frozenset())
    return found


def _read(path: Path) -> dict[str, Any]:
    """Values by attribute of the options; names of files relative to the project file."""
    from ..errors import DataFileError
    from ..storage import read_toml

    document = read_toml(path)
    allowed = [*_KEYS, *(f"[{name}.CLOCK]" for name in _BY_CLOCK)]
    unknown = [key for key in document if key not in {*_KEYS, *_BY_CLOCK}]
    if unknown:
        raise DataFileError(
            f"unknown key {', '.join(unknown)} in the project; allowed are {', '.join(allowed)}", path=path
        )
    found: dict[str, Any] = {}
    for key, value in document.items():
        if key in _BY_CLOCK:
            found[key] = _by_clock(path, key, value)
        else:
            kind, name = _KEYS[key]
            found[name] = _value(path, key, kind, value)
    return found


def _value(path: Path, key: str, kind: str, value: Any) -> Any:
    from ..errors import DataFileError

    if kind == _YES:
        good = isinstance(value, bool)
    elif kind == _NUMBER:
        good = isinstance(value, int | float) and not isinstance(value, bool)
    elif kind == _FILES:
        value = [value] if isinstance(value, str) else value
        good = isinstance(value, list) and all(isinstance(item, str) and item for item in value)
    elif kind == _FILE:
        good = isinstance(value, str) and value != ""
    else:
        good = value in kind.replace(" or", ",").split(", ")
    if not good:
        raise DataFileError(f"{key} must be {kind}, got {value!r:.60}", path=path)
    if kind == _FILE:
        return _beside(path, value)
    if kind == _FILES:
        return [_beside(path, item) for item in value]
    return float(value) if kind == _NUMBER else value


def _beside(path: Path, name: str) -> str:
    """A name as it is meant from the working folder."""
    from ..tables.imported import PREFIX

    return name if name.startswith(PREFIX) else str(path.parent / name)


def _by_clock(path: Path, key: str, value: Any) -> dict[str, dict[str, Any]]:
    """The tables [key.CLOCK], by the clock's scale."""
    from ..errors import DataFileError, InvalidInput
    from ..tables.clock_rows import clock_scale

    if not isinstance(value, dict) or not all(isinstance(table, dict) for table in value.values()):
        raise DataFileError(f"{key} is given by clock, in a table such as [{key}.maser]", path=path)
    found = {}
    for clock, table in value.items():
        unknown = [name for name in table if name not in _BY_CLOCK[key]]
        if unknown:
            raise DataFileError(
                f"unknown key {', '.join(unknown)} in [{key}.{clock}]; allowed are {', '.join(_BY_CLOCK[key])}",
                path=path,
            )
        try:
            found[clock_scale(clock).name] = table
        except InvalidInput as error:
            raise DataFileError(f"[{key}.{clock}]: {error}", path=path) from error
    return found


def with_noise(log: ClockLog, args: argparse.Namespace) -> ClockLog:
    """The log with the noise of its clock, and predicted, where the project says so.

    Raises
    ------
    DataFileError
        For levels or a stretch that cannot be.
    """
    from ..errors import DataFileError, InvalidInput
    from ..tables.clock_noise import ClockNoise

    levels, ahead = ((getattr(args, name, None) or {}).get(log.scale) for name in _BY_CLOCK)
    if levels is None and ahead is None:
        return log
    path = Path(args.project)
    if levels is None:
        raise DataFileError(
            f"[predict] of {log.scale} needs [noise] of it, such as white_frequency = 2e-13: without noise the "
            "uncertainty of a prediction is not known",
            path=path,
        )
    try:
        noise = ClockNoise(**levels)
        if ahead is None:
            return log.with_noise(noise)
        if isinstance(ahead.get("fit_s"), bool) or not isinstance(ahead.get("fit_s"), int | float):
            raise InvalidInput("it needs fit_s, the stretch at the end that the rate is taken from, in seconds")
        if not isinstance(ahead.get("drift", False), bool):
            raise InvalidInput("drift must be true or false")
        # TOML has dates of its own beside texts.
        ends = {
            name: ahead[name].isoformat() if hasattr(ahead[name], "isoformat") else str(ahead[name])
            for name in ("until", "start")
            if name in ahead
        }
        return log.predicted(noise, fit_s=float(ahead["fit_s"]), drift=ahead.get("drift", False), **ends)
    except InvalidInput as error:
        raise DataFileError(
            f"[{'noise' if ahead is None else 'predict'}] of {log.scale}: {error}", path=path
        ) from error


def check_clocks(args: argparse.Namespace, scales: set[str]) -> None:
    """Refuse noise for a clock that the project's own logs are not of: a slip of the pen.

    Raises
    ------
    DataFileError
        Names the clocks that there are.
    """
    if "clock" not in from_project(args):
        return
    for name in _BY_CLOCK:
        idle = sorted(set(getattr(args, name)) - scales)
        if idle:
            from ..errors import DataFileError

            raise DataFileError(
                f"[{name}] of {', '.join(idle)} belongs to no log of the project; those are of "
                f"{', '.join(sorted(scales))}",
                path=Path(args.project),
            )
