"""Which file is which night: file names carry the date.

A pattern is a path below the snapshot folder with the night in it, such as ``links-{night}.csv.gz`` or
``{night:%Y%m%d}/links-*.tsv``. ``{night}`` means ``{night:%Y-%m-%d}``; ``*`` stands for any characters but ``/``. A
pattern that names no compression also finds the file with ``.gz`` or ``.zst`` behind it.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from datetime import date, datetime
from pathlib import Path

from swaygauge.errors import InputError, UnclearNight, UnreadableFile

COMPRESSIONS = ("", ".gz", ".zst")
_PLACE = re.compile(r"\{night(?::([^{}]*))?\}")
_DIRECTIVES = "YymdjHMS"


@dataclass(frozen=True)
class Found:
    """What a look into the snapshot folder brought."""

    nights: dict[date, Path]  # in date order; only nights with exactly one file
    problems: tuple[InputError, ...] = ()  # files that stand for no night, or for one that another file claims
    ignored: tuple[str, ...] = ()  # files in the folder whose names do not have the pattern's shape


@dataclass(frozen=True)
class _Pattern:
    before: str
    form: str  # strptime form of the night
    after: str

    @property
    def endings(self) -> tuple[str, ...]:
        return ("",) if self.after.endswith((".gz", ".zst", ".parquet")) else COMPRESSIONS

    def shape(self) -> re.Pattern[str]:
        """Digits of any count where the date stands, so that a mistyped date is named rather than overlooked."""
        night = "".join(r"\d+" if part[0] == "%" else re.escape(part) for part in re.findall(r"%.|[^%]", self.form))
        ending = "(?:" + "|".join(re.escape(ending) for ending in self.endings) + ")"
        return re.compile(f"{_free(self.before)}({night}){_free(self.after)}{ending}", re.DOTALL)

    def globs(self, night: str) -> list[str]:
        literal = re.sub(r"([?\[])", r"[\1]", f"{self.before}\0{self.after}").replace("\0", night)
        return [literal + ending for ending in self.endings]

    def night(self, text: str) -> date | None:
        try:
            night = datetime.strptime(text, self.form).date()
        except ValueError:
            return None
        # strptime also takes 2025-1-5 for %Y-%m-%d: one night, one spelling
        return night if night.strftime(self.form) == text else None


def _free(text: str) -> str:
    return "[^/]*".join(re.escape(part) for part in text.split("*"))


def check_pattern(pattern: str) -> None:
    """Raises UnclearNight when the pattern cannot tell nights apart; the message says what is missing."""
    _parse(pattern)


def _parse(pattern: str) -> _Pattern:
    places = list(_PLACE.finditer(pattern))
    if len(places) != 1:
        raise UnclearNight(
            f"the file name pattern must hold the night once, such as 'links-{{night}}.csv.gz' or "
            f"'{{night:%Y%m%d}}.tsv', got {pattern!r}."
        )
    form = places[0][1] or "%Y-%m-%d"
    before, after = pattern[: places[0].start()], pattern[places[0].end() :]
    used = re.findall(r"%(.?)", form)
    if not (set(used) <= set(_DIRECTIVES) and {"Y", "y"} & set(used) and ("j" in used or {"m", "d"} <= set(used))):
        raise UnclearNight(
            f"the night in a file name must be a full date made of digits: %Y or %y with %m and %d, or with %j; "
            f"got {form!r} in {pattern!r}."
        )
    if "**" in pattern or "/" in form or "*" in form or pattern.startswith("/") or ".." in Path(pattern).parts:
        raise UnclearNight(
            f"the file name pattern must stay below the snapshot folder, without '**' and with '*' and '/' outside "
            f"the night; got {pattern!r}."
        )
    return _Pattern(before, form, after)


def find_snapshots(folder: Path, pattern: str) -> Found:
    """Every dated snapshot file below ``folder``.

    An impossible date, two files for one night and a folder in a file's place are reported in ``problems``, each naming
    its files; the other nights are found all the same. Names that begin with a dot (files still being written) are
    passed over. Raises UnclearNight for an unusable pattern, UnreadableFile when the folder cannot be listed.
    """
    parsed = _parse(pattern)
    if not folder.is_dir():
        raise UnreadableFile(f"{folder}: no such folder. Set snapshots.folder to the folder that snapshots arrive in.")
    shape = parsed.shape()
    files: dict[date, list[Path]] = {}
    problems: list[InputError] = []
    matched = set()
    for path in sorted({path for form in parsed.globs("*") for path in folder.glob(form)}):
        name = path.relative_to(folder).as_posix()
        if any(part.startswith(".") for part in name.split("/")) or not (hit := shape.fullmatch(name)):
            continue
        matched.add(path)
        night = parsed.night(hit[1])
        if night is None:
            problems.append(
                UnclearNight(f"{name}: {hit[1]!r} is no date of the form {parsed.form!r}. Correct the file's name.")
            )
        elif not path.is_file():
            problems.append(UnreadableFile(f"{name}: expected a file, got {_kind(path)}. Put the snapshot file there."))
        else:
            files.setdefault(night, []).append(path)
    problems += [_two_files(folder, night, paths) for night, paths in files.items() if len(paths) > 1]
    ignored = [path.name for path in folder.iterdir() if path.is_file() and path not in matched]
    return Found(
        nights={night: paths[0] for night, paths in sorted(files.items()) if len(paths) == 1},
        problems=tuple(problems),
        ignored=tuple(sorted(name for name in ignored if not name.startswith("."))),
    )


def file_of_night(folder: Path, pattern: str, *, night: date) -> Path | None:
    """The one file of that night, or None when there is none. Raises UnclearNight when there are two."""
    parsed = _parse(pattern)
    text = night.strftime(parsed.form)
    paths = {path for form in parsed.globs(text) for path in folder.glob(form) if path.is_file()}
    if len(paths) > 1:
        raise _two_files(folder, night, sorted(paths))
    return paths.pop() if paths else None


def _two_files(folder: Path, night: date, paths: list[Path]) -> UnclearNight:
    names = ", ".join(path.relative_to(folder).as_posix() for path in paths)
    return UnclearNight(
        f"{len(paths)} files for the night {night}: {names}. Expected one; move the others out of the folder."
    )


def _kind(path: Path) -> str:
    return "a folder" if path.is_dir() else "a link that leads nowhere" if path.is_symlink() else "no regular file"
