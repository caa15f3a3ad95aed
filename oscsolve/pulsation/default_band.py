"""The band that is searched when the user names none."""

from __future__ import annotations

from oscsolve.star.findings import Finding
from oscsolve.star.likely_band import likely_band
from oscsolve.star.model import StarModel
from oscsolve.star.profile import Profile


def choose_band(star: StarModel, profile: Profile) -> tuple[tuple[float, float], Finding]:
    """Limits in uHz, see `likely_band`, and the finding that tells them."""
    (low, high), why = likely_band(star, profile)
    finding = Finding(
        "note", "band-chosen", f"no band was given; {low:g} to {high:g} uHz was chosen ({why})"
    )
    return (low, high), finding
