"""An inspection as text for people and as a JSON document."""

from __future__ import annotations

import json
import math
import textwrap
from collections.abc import Iterator
from dataclasses import asdict

from oscsolve.cli.documents import plain
from oscsolve.cli.table import star_lines
from oscsolve.star.findings import SEVERITIES, Finding
from oscsolve.star.inspection import Figures, Inspection
from oscsolve.star.model import StarModel
from oscsolve.version import __version__

_WIDTH = 100
#: Unit of each figure of the star.
UNITS = {
    "total_mass": "g",
    "photospheric_radius": "cm",
    "gravitational_constant": "cm3 g-1 s-2",
    "gravity_implied": "cm3 g-1 s-2",
    "points": "1",
    "innermost": "R",
    "outermost": "R",
    "central_density_ratio": "1",
    "nu_dynamical": "uHz",
    "large_separation": "uHz",
    "period_spacing": "s",
    "acoustic_cutoff": "uHz",
    "buoyancy_range": "uHz",
    "lamb_range": "uHz",
    "convective_zones": "R",
}


def inspection_lines(star: StarModel, found: Inspection) -> Iterator[str]:
    """Figures of the star, then the findings, worst first, then a verdict."""
    yield f"oscsolve {__version__}: inspection of a model"
    for line in star_lines(star):
        yield line.removeprefix("# ")
    yield from _figure_lines(found)
    yield ""
    for finding in found:
        yield from _finding_lines(finding)
    yield ""
    yield verdict(found)


def inspection_document(star: StarModel, found: Inspection) -> str:
    """One JSON document; what is not finite is null."""
    document = {
        "program": f"oscsolve {__version__}",
        "usable": found.usable,
        "star": {"name": star.name, "source": star.source, "source_hash": star.source_hash},
        "figures": asdict(found.figures),
        "units": {"figures": UNITS, "band": "uHz"},
        "band": found.band,
        "points_per_wavelength": found.points_per_wavelength,
        "findings": [asdict(finding) for finding in found],
    }
    return json.dumps(plain(document), allow_nan=False, ensure_ascii=False, indent=1)


def verdict(found: Inspection) -> str:
    """How many findings of each kind, and what that means."""
    count = {kind: sum(f.severity == kind for f in found) for kind in SEVERITIES}
    counts = ", ".join(f"{count[k]} {k}{'s' * (count[k] != 1)}" for k in reversed(SEVERITIES))
    if count["defect"]:
        return f"Not fit for pulsation work as it is: {counts}."
    if count["doubt"]:
        return f"Usable with the doubts above in mind: {counts}."
    return f"Fit for pulsation work: {counts}."


def _figure_lines(found: Inspection) -> Iterator[str]:
    f = found.figures
    off = f.gravity_implied / f.gravitational_constant - 1.0
    implied = f"implies G = {f.gravity_implied:.7g}, {off:+.1g} from the G in use"
    if math.isfinite(off):
        yield _entry("balance", implied)
    yield _entry("points", f"{f.points}, from x = {f.innermost:.4g} to {f.outermost:.8g}")
    yield _entry("density", f"{f.central_density_ratio:.5g} = rho_c / mean density")
    yield _entry("spacing", f"{f.large_separation:.6g} uHz = [2 int dr/c]^-1, between p modes")
    yield from _spacing_lines(f)
    if math.isinf(f.acoustic_cutoff):
        yield _entry("cut-off", "none: pressure vanishes at the outermost point")
    else:
        yield _entry("cut-off", f"{f.acoustic_cutoff:.5g} uHz = c/(4 pi H), outermost layer")
    if math.isnan(f.buoyancy_range[0]):
        yield _entry("N", "nowhere above zero")
    else:
        low, high = f.buoyancy_range
        yield _entry("N", f"{low:.4g} to {high:.5g} uHz where stable, below the photosphere")
    for degree, low, high in f.lamb_range:
        yield _entry(f"S_{degree}", f"{low:.4g} uHz at the outermost point, {high:.4g} innermost")
    zones = ", ".join(f"{a:.5g} to {b:.8g}" for a, b in f.convective_zones)
    yield _entry("N^2 < 0", f"in x = {zones}" if zones else "nowhere")
    why = found.band_reason or "as asked"
    yield _entry("band", f"{found.band[0]:.5g} to {found.band[1]:.5g} uHz ({why})")
    if math.isfinite(found.points_per_wavelength):
        yield _entry("mesh", f"{found.points_per_wavelength:.3g} points per wavelength or more")


def _spacing_lines(figures: Figures) -> Iterator[str]:
    finite = [(degree, value) for degree, value in figures.period_spacing if math.isfinite(value)]
    text = ", ".join(f"{value:.6g} s (l = {degree})" for degree, value in finite)
    yield _entry(
        "", f"{text}, between g modes (Tassoul 1980)" if finite else "no g modes: nothing is stable"
    )


def _entry(name: str, text: str) -> str:
    return f"{name:<9}{text}"


def _finding_lines(finding: Finding) -> list[str]:
    parts = [part.rstrip(".") for part in (finding.message, finding.advice) if part]
    text = " ".join("; ".join(parts).split())
    head = f"{finding.severity:<7}"
    return textwrap.wrap(
        f"{text} [{finding.code}]",
        _WIDTH,
        initial_indent=head,
        subsequent_indent=" " * len(head),
        break_long_words=False,
        break_on_hyphens=False,
    )
