"""``like = "base"``: the mover takes every key of the base that it does not give itself."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from ...models.errors import Issue
from .messages import show
from .parts import SHAPE_KEYS


def expand(data: Mapping[str, Any]) -> tuple[dict[str, Any], list[Issue]]:
    """Return the spec's data with the mover written out, and what is wrong with ``like`` itself.

    A mover of another shape does not take over the sizes of the base's shape, and one with a pattern of its own not
    what bounds a free pattern (symmetry, fixed cells).
    """
    expanded = dict(data)
    base, mover = data.get("base"), data.get("mover")
    if not isinstance(mover, dict) or "like" not in mover:
        return expanded, []
    own = {key: value for key, value in mover.items() if key != "like"}
    expanded["mover"] = own
    issues = []
    if mover["like"] != "base":
        issues.append(Issue(f'must be "base", received {show(mover["like"])}', "mover.like"))
    if isinstance(base, dict):
        left: set[str] = set()
        if own.get("shape", base.get("shape")) != base.get("shape"):
            left |= {key for keys in SHAPE_KEYS.values() for key in keys}
        if own.get("pattern", "free") != "free":
            left |= {"symmetry", "fixed"}
        expanded["mover"] = {key: value for key, value in base.items() if key not in left} | own
    return expanded, issues


def drop_repeated(issues: list[Issue], data: Mapping[str, Any]) -> list[Issue]:
    """Leave out what is said of the mover only because it copies the base's key, where the base says it too."""
    mover = data.get("mover")
    own = set(mover) if isinstance(mover, dict) else set()
    if "like" not in own:
        return issues
    said = {(issue.path.removeprefix("base"), issue.message) for issue in issues if _part(issue) == "base"}
    return [
        issue
        for issue in issues
        if not (
            _part(issue) == "mover"
            and (issue.path.removeprefix("mover"), _as_base(issue.message)) in said
            and own.isdisjoint(issue.path.split(".")[1:2])
        )
    ]


def _as_base(message: str) -> str:
    # What a message about the mover says otherwise than the same one about the base.
    return message.replace("[mover]", "[base]").removesuffix(", like")


def _part(issue: Issue) -> str:
    return issue.path.split(".")[0]
