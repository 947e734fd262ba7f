"""Panels for notebooks: thin views over the findings that every other output is made of."""

from importlib import import_module
from typing import Any

_HOME = {"YearlyReview": "audiokit.widgets.yearly_review"}

__all__ = ["YearlyReview"]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module 'audiokit.widgets' has no attribute {name!r}; it has {', '.join(sorted(_HOME))}")
    return getattr(import_module(_HOME[name]), name)
