"""Turn a month of plant-logger CSV exports into a statement that a person can sign."""

from __future__ import annotations

from typing import TYPE_CHECKING

__version__ = "0.1.0"
__all__ = ["__version__", "audit"]

if TYPE_CHECKING:
    from auditor.audit_run import audit


def __getattr__(name: str) -> object:
    # `audit` pulls pandas and numpy; a bare `import auditor` (and `auditor --help`) must stay quick.
    if name == "audit":
        from auditor.audit_run import audit

        return audit
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
