"""What is done about trouble outside the mission, apart from halting: it is written down, told, and given its time.

The journal may be the very thing that fails, so the first place for a note is a text file beside it, and the second
one in the system's temporary folder.
"""

from __future__ import annotations

import contextlib
import tempfile
import time
import traceback
from dataclasses import dataclass, field
from datetime import datetime
from pathlib import Path

from runner.host.hooks import Occasion, Teller
from runner.host.plan import Care

FILE = "trouble.txt"
ABORTED = "aborted"
"""An empty file of this name: a person aborted the run, and the record could not take it."""


class RunError(Exception):
    """The robot or the record failed during the run, in a sentence. The robot was told to halt."""


@dataclass(slots=True)
class Distress:
    """The trouble a run is in, if any. `kind` is empty while there is none."""

    folder: Path
    mission: str
    care: Care
    teller: Teller
    kind: str = ""
    detail: str = ""
    _since: float = field(default=0.0, init=False)

    def begin(self, kind: str, detail: str, stamp: float, error: BaseException | None = None) -> None:
        """Note trouble and tell about it, once for each kind until it is over."""
        if kind == self.kind:
            return
        if not self.kind:
            self._since = time.monotonic()
        self.kind, self.detail = kind, detail
        self.write_down(f"{kind}: {detail}", error if kind == "program" else None)
        self.tell("trouble", kind, detail, stamp)

    def over(self) -> None:
        """A person has dealt with it."""
        self.kind = self.detail = ""

    @property
    def impatient(self) -> bool:
        """Whether nobody came in time."""
        patience = self.care.patience
        return bool(self.kind) and patience is not None and time.monotonic() - self._since >= patience

    def tell(self, what: str, kind: str, text: str, stamp: float) -> None:
        """Tell the hook for it."""
        hook = self.care.on_end if what == "end" else self.care.on_trouble
        now = datetime.now().astimezone()
        self.teller.tell(hook, Occasion(what, kind, text, self.folder.name, self.mission, stamp, now))

    def mark_aborted(self, who: str) -> None:
        """Note that a person aborted the run, for when the record cannot be told. An empty file takes no room."""
        with contextlib.suppress(OSError):
            (self.folder / ABORTED).touch()
        self.write_down(f"aborted by {who}; this is not in the record")

    def write_down(self, line: str, error: BaseException | None = None) -> None:
        """Keep a note outside the journal, in the first place that takes it."""
        text = f"{datetime.now().astimezone().isoformat(timespec='seconds')}  {line}\n"
        if error is not None:
            text += "".join(traceback.format_exception(error))
        for path in (self.folder / FILE, Path(tempfile.gettempdir()) / f"trundle-{self.folder.name}-{FILE}"):
            with contextlib.suppress(OSError):
                with path.open("a", encoding="utf-8") as file:
                    file.write(text)
                return
