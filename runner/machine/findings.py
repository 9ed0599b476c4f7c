"""What a check found: a diagnostic with a stable name, so that findings of every kind are shown and counted alike."""

from __future__ import annotations

from dataclasses import dataclass

from runner.language.diagnostics import Diagnostic, Severity


@dataclass(frozen=True, slots=True)
class Finding:
    """`name` is for scripts and never changes; the diagnostic shows the step to blame."""

    name: str
    diagnostic: Diagnostic

    @property
    def is_error(self) -> bool:
        """An error keeps a mission from running; a warning and a note do not."""
        return self.diagnostic.severity is Severity.ERROR
