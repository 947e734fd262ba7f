"""Review, explain and summarise pure-tone audiograms; decision support, never a diagnosis.

The public names below load on first use, so that importing the package stays light.
"""

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_HOME = {
    "AudiokitError": "audiokit.core.errors",
    "read_cohort": "audiokit.io.cohort",
    "review": "audiokit.surveillance.review",
    "write_review": "audiokit.reports.folder",
    "list_rulebooks": "audiokit.rules.catalogue",
    "load_rulebook": "audiokit.rules.catalogue",
}

__all__ = ["__version__", *_HOME]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'audiokit' has no attribute {name!r}; it has {', '.join(sorted(_HOME))}")
    return getattr(import_module(_HOME[name]), name)


def __dir__() -> list[str]:
    return sorted(__all__)
