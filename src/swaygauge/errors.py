"""Every error swaygauge raises, drawn as a tree.

SwaygaugeError
├── ConfigError            a setting is missing, unknown, of the wrong type or impossible; nothing ran
├── InputError             a snapshot cannot be used as it is; nothing was changed
│   ├── UnreadableFile     missing, truncated, not in the stated format, not UTF-8
│   ├── MissingColumn      the file has no such column
│   ├── BadRows            rows that are not links; every one is named by file, line and reason
│   ├── NoLinks            the file holds no link at all
│   └── UnclearNight       two files for one night, or a file name that carries no real date
├── ScoreError             a number that could not be proven was asked for
│   ├── AlphaTooLarge      alpha is not below 1/lambda; names the largest safe value
│   └── NotConverged       the tolerance could not be met; says what to do
├── RuleError              a check crashed; says nothing about the data
└── StoreError             the workspace
    ├── NotInStore         no such network, night or node
    ├── Damaged            a stored part does not match the catalog
    └── Busy               another run holds this network

A message answers four questions: what, which value, what was expected, what to do now.
"""

from __future__ import annotations

from collections.abc import Sequence


class SwaygaugeError(Exception):
    """Base of every error that swaygauge raises on purpose."""


class ConfigError(SwaygaugeError):
    """Settings that cannot be used. ``problems`` holds every one found, not just the first."""

    def __init__(self, where: str, problems: Sequence[str]) -> None:
        self.where = where
        self.problems = tuple(problems)
        lines = "".join(f"\n  - {problem}" for problem in self.problems)
        noun = "setting needs" if len(self.problems) == 1 else "settings need"
        super().__init__(f"{where}: {len(self.problems)} {noun} attention; nothing was run.{lines}")


class InputError(SwaygaugeError):
    """A snapshot that cannot be used as it is."""


class UnreadableFile(InputError):
    """The bytes cannot be read as the stated format."""


class MissingColumn(InputError):
    """A configured column is not in the file."""


class BadRows(InputError):
    """Rows that are not links. ``problems`` names them by line and reason (the first hundred)."""

    def __init__(
        self,
        file: str,
        count: int,
        problems: Sequence[str],
        *,
        advice: str = "Fix the file, or set reader.bad_rows = 'drop' to leave such rows out and count them.",
    ) -> None:
        self.file = file
        self.count = count
        self.problems = tuple(problems)
        shown = "".join(f"\n  - {problem}" for problem in self.problems[:20])
        more = f"\n  ... and {count - 20} more" if count > 20 else ""
        super().__init__(
            f"{file}: {count} row(s) cannot be used; the file was left alone and nothing was stored.{shown}{more}\n"
            f"{advice}"
        )


class NoLinks(InputError):
    """A snapshot without a single link."""


class UnclearNight(InputError):
    """It is not clear which night a file belongs to, or which of two files is the night."""


class ScoreError(SwaygaugeError):
    """A score that cannot be given with a proof."""


class AlphaTooLarge(ScoreError):
    """alpha must stay strictly below 1/lambda. ``largest_safe`` is a value that is proven to work."""

    def __init__(self, alpha: float, largest_safe: float, lambda_upper: float) -> None:
        self.alpha = alpha
        self.largest_safe = largest_safe
        super().__init__(
            f"alpha = {alpha:.12g} is not proven to be below 1/lambda (lambda <= {lambda_upper:.12g}); "
            f"the scores would not exist. Use alpha < {largest_safe:.12g}."
        )


class NotConverged(ScoreError):
    """The tolerance was not met within the allowed work."""


class RuleError(SwaygaugeError):
    """A check crashed. This is a fault of the check, never a finding about the data.

    ``verdict`` is what the other rules found (a records.Verdict) for the record, or None when none could run.
    """

    def __init__(self, message: str, verdict: object = None) -> None:
        self.verdict = verdict
        super().__init__(message)


class StoreError(SwaygaugeError):
    """The workspace does not hold what was asked for, or cannot be used now."""


class NotInStore(StoreError):
    """No such network, night or node in the store."""


class Damaged(StoreError):
    """A stored part is missing or its bytes do not match the catalog."""


class Busy(StoreError):
    """Another run is working on this network."""
