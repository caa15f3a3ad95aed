"""What a grid needs of those who do the work: to take models and to report them."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

from oscsolve.grid.plan import Planned
from oscsolve.grid.work import Outcome

#: Models that each worker holds: the one it works on and one that waits behind it, so that it never
#: waits for the writer.
HELD = 2
#: A model that has ended so many workers is not tried again.
MOST_DEATHS = 2


@dataclass(frozen=True, eq=False)
class Report:
    """One model that came back: its outcome, or why it has none."""

    planned: Planned
    outcome: Outcome | None
    reason: str = ""


class Crew(Protocol):
    """Takes models and reports them, in any order."""

    @property
    def workers(self) -> int:
        """How many work side by side."""

    def wants(self) -> int | None:
        """A place that could take one more model now, or None."""

    def give(self, place: int, planned: Planned) -> None:
        """Hand a model to a place that wanted one."""

    def take(self, timeout: float) -> Report | None:
        """The next model that came back, or None where nothing did in `timeout` seconds."""

    def stop(self) -> None:
        """End the workers; what they hold is given up."""


def worded(error: BaseException) -> str:
    """Kind and message of an error, in one line."""
    text = " ".join(str(error).split())
    return f"{type(error).__name__}: {text}" if text else type(error).__name__
