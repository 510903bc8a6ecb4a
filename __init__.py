"""polewright: optimization engine for pole patterns on flat permanent-magnet faces.

Importing it loads nothing heavy; the public names are fetched when first used.
"""

from __future__ import annotations

from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .runs.archive import open_run as open_run
    from .runs.execute import design as design
    from .runs.spec import load_spec as load_spec
    from .runs.verify import verify as verify

__version__ = "0.1.0"
__all__ = ["__version__", "design", "load_spec", "open_run", "verify"]

# The repository's root is the package: with this, tracebacks name real files even when it was found through a link.
__path__ = [str(Path(__file__).resolve().parent)]

_HOMES = {
    "design": ".runs.execute",
    "load_spec": ".runs.spec",
    "open_run": ".runs.archive",
    "verify": ".runs.verify",
}


def __getattr__(name: str) -> Any:
    """Fetch a public name from the module where it lives."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(_HOMES[name], __name__), name)


def __dir__() -> list[str]:
    """List the public names, fetched or not."""
    return sorted({*globals(), *_HOMES})
