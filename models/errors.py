"""Errors that a user can act on: every one says where, what is required, what was received and what to do."""

from __future__ import annotations

from dataclasses import dataclass


class PolewrightError(Exception):
    """Base of every error that polewright raises on purpose; shown to people as a message, never a traceback."""


@dataclass(frozen=True)
class Issue:
    """One thing that is wrong with an input.

    Attributes:
        message: What is required, what was received, what to do.
        path: Dotted key path inside the input ("require.0.gap_mm"), or "" for the input as a whole.
        line: Line of the input file, counted from 1, where known.
    """

    message: str
    path: str = ""
    line: int | None = None


class InputError(PolewrightError, ValueError):
    """Bad input or usage (exit code 2); carries every issue found, not the first alone.

    Attributes:
        issues: All that is wrong, in the order of the input.
        source: The file's name or what else the input is called.
    """

    def __init__(self, issues: str | Issue | list[Issue], source: str = "") -> None:
        if isinstance(issues, str):
            issues = [Issue(issues)]
        elif isinstance(issues, Issue):
            issues = [issues]
        self.issues: tuple[Issue, ...] = tuple(issues)
        self.source = source
        super().__init__("\n".join(self.lines()))

    def lines(self) -> list[str]:
        """One line an issue: ``file:line: key path: message``."""
        out = []
        for issue in self.issues:
            where = self.source + (f":{issue.line}" if issue.line is not None else "") if self.source else ""
            out.append(": ".join(part for part in (where, issue.path, issue.message) if part))
        return out
