"""What was noticed about a model: a finding has a severity, a place, a size and advice."""

from __future__ import annotations

from dataclasses import dataclass

#: From harmless to fatal: worth knowing, doubtful, wrong.
SEVERITIES = ("note", "doubt", "defect")


@dataclass(frozen=True)
class Finding:
    """One thing noticed about a model.

    Attributes
    ----------
    severity : "note" (worth knowing), "doubt" (may mislead) or "defect" (results will be wrong)
    code : short fixed name of the kind of finding, for example ``"gravity-estimated"``
    message : what was found, with place and size, in one sentence
    advice : what to do about it, in one sentence; empty where nothing need be done
    place : fractional radius where it is, or None
    size : how large it is, dimensionless, or None
    """

    severity: str
    code: str
    message: str
    advice: str = ""
    place: float | None = None
    size: float | None = None

    def __post_init__(self) -> None:
        if self.severity not in SEVERITIES:
            raise ValueError(f"severity {self.severity!r} is not one of {SEVERITIES}")
