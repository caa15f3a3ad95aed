"""One page about one star, complete in itself: no other file, no network.

A policy in the page allows its own style and script, known by their hashes, and nothing else.
"""

from __future__ import annotations

import base64
import hashlib
import shlex
from collections.abc import Iterator, Sequence
from importlib import resources
from typing import NamedTuple

import numpy as np

from oscsolve.cli.asymptotic_rows import with_error
from oscsolve.cli.inspection import verdict
from oscsolve.cli.markup import Html, formula, join, symbol, tag, void
from oscsolve.cli.report_tables import (
    MICRO,
    asymptotics_table,
    census_table,
    findings_list,
    mode_table,
    orders_tables,
    separations_table,
    star_table,
)
from oscsolve.cli.table import verdict_sentence
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.asymptotics import Asymptotics
from oscsolve.star.inspection import Inspection
from oscsolve.units import SOLAR_MASS, SOLAR_RADIUS
from oscsolve.version import __version__

#: Knobs of a run that the command line does not have, and their usual values.
_KNOBS = {"stages": "chosen", "phase_per_cell": "chosen", "cells_factor": 1, "most_cells": 400_000}


class Picture(NamedTuple):
    """A drawing for the page.

    Attributes
    ----------
    title, caption : what it shows, and how to read it
    svg : the drawing
    """

    title: str
    caption: str
    svg: bytes


def report_page(
    modes: ModeSet,
    found: Asymptotics,
    inspection: Inspection,
    *,
    file_name: str,
    pictures: Sequence[Picture] = (),
) -> str:
    """The whole page as HTML.

    Parameters
    ----------
    modes, found, inspection : what it tells
    file_name : of the mode list, for the command that makes the page again
    pictures : drawings, in the order in which they appear
    """
    style, script = _asset("report.css"), _asset("report.js")
    policy = (
        f"default-src 'none'; img-src data:; style-src '{_hash(style)}'; "
        f"script-src '{_hash(script)}'; base-uri 'none'; form-action 'none'"
    )
    name = _name(modes)
    sections = list(_sections(modes, found, inspection, file_name, pictures))
    head = join(
        (
            void("meta", charset="utf-8"),
            void("meta", http_equiv="Content-Security-Policy", content=policy),
            void("meta", name="viewport", content="width=device-width, initial-scale=1"),
            tag("title", f"Modes of {name}"),
            void("link", rel="icon", href="data:,"),
            Html(f"<style>{style}</style>"),
        )
    )
    links = [tag("a", title, href=f"#{anchor}") for anchor, title, _ in sections]
    body = join(
        (
            tag("header", *_header(modes, found), tag("nav", *links)),
            tag("main", *(_section(*section) for section in sections)),
            tag("footer", f"Made by oscsolve {__version__}. Everything on this page is in it."),
            Html(f"<script>{script}</script>"),
        )
    )
    document = tag("html", tag("head", head), tag("body", body), lang="en")
    return f"<!DOCTYPE html>\n{document}\n"


def _asset(name: str) -> str:
    return resources.files("oscsolve.cli").joinpath(name).read_text(encoding="utf-8")


def _hash(text: str) -> str:
    digest = hashlib.sha256(text.encode("utf-8")).digest()
    return f"sha256-{base64.b64encode(digest).decode('ascii')}"


def _name(modes: ModeSet) -> str:
    return modes.star.name or "a star without a name"


def _section(anchor: str, title: str, content: Sequence[object]) -> Html:
    return tag("section", tag("h2", title), *content, id=anchor)


def _header(modes: ModeSet, found: Asymptotics) -> Iterator[Html]:
    star = modes.star
    yield tag("h1", _name(modes))
    source = f"Model: {star.source}. " if star.source else ""
    yield tag(
        "p",
        f"{source}Linear adiabatic oscillation modes, oscsolve {modes.program_version}.",
        class_="soft",
    )
    yield tag("p", verdict_sentence(modes), class_=f"verdict {'good' if modes.complete else 'bad'}")
    facts = [
        tag("div", tag("dt", label), tag("dd", value, tag("small", remark) if remark else None))
        for label, value, remark in _facts(modes, found)
    ]
    yield tag("dl", *facts, class_="facts")


def _facts(modes: ModeSet, found: Asymptotics) -> Iterator[tuple[object, object, object]]:
    star = modes.star
    yield "mass", f"{star.total_mass / SOLAR_MASS:#.4g}", "solar masses"
    yield "radius", f"{star.photospheric_radius / SOLAR_RADIUS:#.4g}", "solar radii"
    if found.effective_temperature is not None:
        yield "effective temperature", f"{found.effective_temperature:.4g} K", "of the model"
    if found.nu_max is not None:
        yield symbol("nu_max"), f"{found.nu_max:.4g} {MICRO}", "scaled from the Sun"
    if found.large_separations:
        fit = found.large_separations[0]
        numbers = (fit.separation, fit.separation_error, fit.separation_propagated)
        value, error = with_error(*numbers)
        remark = f"\u00b1 {error}, line through l\u00a0=\u00a0{fit.degree}"
        yield symbol("Delta nu"), f"{value} {MICRO}", remark
    elif np.isfinite(found.large_separation_integral):
        yield symbol("Delta nu"), f"{found.large_separation_integral:.5g} {MICRO}", "of the model"
    if found.mixed:
        first = found.mixed[0]
        value, error = with_error(first.spacing, first.spacing_error, first.spacing_propagated)
        remark = f"\u00b1 {error}, mixed modes of l\u00a0=\u00a0{first.degree}"
        yield symbol(f"Delta Pi_{first.degree}"), f"{value} s", remark
    elif found.period_spacing_integral and np.isfinite(found.period_spacing_integral[0][1]):
        degree, spacing = found.period_spacing_integral[0]
        yield symbol(f"Delta Pi_{degree}"), f"{spacing:.5g} s", "integral of the model"
    degrees = ", ".join(str(degree) for degree in modes.census.degree)
    yield "modes listed", str(len(modes)), f"l = {degrees}"
    if modes.census.low.size:
        ends = (float(modes.census.low.min()), float(modes.census.high.max()))
        yield "band", " to ".join(f"{v:.5g}" if abs(v) < 1e5 else f"{v:.0f}" for v in ends), MICRO
    if len(modes):
        with np.errstate(divide="ignore"):
            worst = float(np.max(modes.nu_error / np.abs(modes.nu)))
        yield "largest error bar", formula(f"{worst:.0e}"), "relative, numerical"


def _sections(
    modes: ModeSet,
    found: Asymptotics,
    inspection: Inspection,
    file_name: str,
    pictures: Sequence[Picture],
) -> Iterator[tuple[str, str, list[object]]]:
    if pictures:
        yield "pictures", "Pictures", [tag("div", *map(_figure, pictures), class_="pictures")]
    yield "asymptotics", "What the modes say", list(_asymptotics(found))
    yield "list", "Modes", list(_modes(modes))
    yield "star", "The star", list(_star(modes, inspection))
    yield "census", "Census", list(_census(modes))
    yield "again", "How to make it again", list(_again(modes, file_name))


def _figure(picture: Picture) -> Html:
    data = base64.b64encode(picture.svg).decode("ascii")
    return tag(
        "figure",
        void("img", alt=picture.title, src=f"data:image/svg+xml;base64,{data}"),
        tag("figcaption", tag("b", f"{picture.title}. "), picture.caption),
    )


def _asymptotics(found: Asymptotics) -> Iterator[Html]:
    yield tag(
        "p",
        "Errors of fits are those of the scatter of the modes about the law: the star does not "
        "follow it exactly. What the numerical errors of the frequencies add stands beside them.",
        class_="soft",
    )
    yield asymptotics_table(found)
    if not found.separations:
        return
    yield tag("h3", "Separations and ratios")
    yield tag(
        "p",
        "Five-point separations and ratios after Roxburgh & Vorontsov (2003). Errors are the "
        "largest that the numerical errors of the frequencies allow.",
        class_="soft",
    )
    yield separations_table(found)
    yield tag(
        "details",
        tag("summary", "All orders"),
        orders_tables(found),
        tag("p", "In colour: a mixed mode stands for a p mode.", class_="soft"),
    )


def _modes(modes: ModeSet) -> Iterator[Html]:
    yield tag(
        "p",
        "A click on a heading sorts by that column, a second one turns the order round. Error "
        "bars are numerical: how far the frequency may be from that of the model as given. "
        "Inertia is over M times the squared displacement at the photosphere.",
        class_="soft",
    )
    yield mode_table(modes) if len(modes) else tag("p", "The band holds no mode of these degrees.")


def _star(modes: ModeSet, inspection: Inspection) -> Iterator[Html]:
    yield star_table(modes.star, inspection)
    yield tag("h3", "Findings")
    yield tag("p", verdict(inspection).replace("above", "below"))
    yield findings_list([*inspection, *modes.findings])


def _census(modes: ModeSet) -> Iterator[Html]:
    yield tag(
        "p",
        "Counted is the number of modes in the band by Sylvester's law of inertia, taken at its "
        "two ends, independently of the list. Where it equals the number listed no mode is "
        "missing and none is there twice.",
        class_="soft",
    )
    yield census_table(modes)
    relabelled = int(np.count_nonzero(modes.relabelled))
    if relabelled:
        yield tag(
            "p",
            f"{relabelled} mode{'s' * (relabelled != 1)} whose node counts disagree with the "
            "order; n follows the spectrum and holds.",
        )
    if modes.confirmed is not None:
        agreed = int(np.count_nonzero(modes.confirmed))
        yield tag("p", f"Recomputed by shooting: {agreed} of {len(modes)} agree within error bars.")


def _again(modes: ModeSet, file_name: str) -> Iterator[Html]:
    star = modes.star
    page = f"{file_name.removesuffix('.hdf5').removesuffix('.h5')}.html"
    lines = [
        modes_command(modes, file_name),
        f"oscsolve report {shlex.quote(file_name)} -o {shlex.quote(page)}",
    ]
    yield tag("pre", tag("code", "\n".join(lines)))
    if not star.source:
        yield tag("p", "The model was made and not read; it is in the file of the modes.")
    knobs = {name: value for name, value in _KNOBS.items() if name in modes.options}
    odd = [name for name, usual in knobs.items() if modes.options[name] not in (usual, None)]
    if odd:
        yield tag(
            "p",
            f"Set from Python, and not on the command line: {', '.join(odd)} (SolveOptions); the "
            "mesh, and with it the last digits, follow from these.",
        )
    rows: list[tuple[str, object]] = [("oscsolve", modes.program_version)]
    if star.source_hash:
        rows.append(("model, sha256", tag("code", star.source_hash)))
    rows += [(str(name), _plain(value)) for name, value in modes.options.items()]
    cells = [tag("tr", tag("th", name, scope="row"), tag("td", value)) for name, value in rows]
    yield tag("div", tag("table", tag("tbody", *cells)), class_="box")


def _plain(value: object) -> str:
    """An option as text, without the round-off of a change of unit."""
    if isinstance(value, bool):
        return "yes" if value else "no"
    return f"{value:.14g}".replace("e-0", "e-") if isinstance(value, float) else str(value)


def _ranges(degrees: str) -> str:
    """``0,1,2,3,10`` as ``0-3,10``; what is no list of degrees as it is."""
    if not all(part.isdigit() for part in degrees.split(",")):
        return degrees
    runs: list[list[int]] = []
    for degree in map(int, degrees.split(",")):
        if runs and degree == runs[-1][1] + 1:
            runs[-1][1] = degree
        else:
            runs.append([degree, degree])
    return ",".join(str(a) if a == b else f"{a}-{b}" for a, b in runs)


def modes_command(modes: ModeSet, file_name: str) -> str:
    """The command line that computes this list again; the band is given even if it was chosen."""
    options = modes.options
    words = ["oscsolve", "modes", modes.star.source or file_name]
    if "degrees" in options:
        words += ["--degrees", _ranges(str(options["degrees"]))]
    low, high = options.get("band_low_uHz"), options.get("band_high_uHz")
    if isinstance(low, float) and isinstance(high, float):
        # As given, where a unit was turned into uHz and left its round-off.
        words += ["--band", f"{_plain(low)}:{_plain(high)}"]
    if options.get("gravity") == "cowling":
        words.append("--cowling")
    if options.get("surface") not in (None, "free"):
        words += ["--surface", str(options["surface"])]
    if isinstance(options.get("tolerance"), float):
        words += ["--tolerance", _plain(options["tolerance"])]
    if options.get("verify"):
        words.append("--verify")
    if any(finding.code == "gravity-given" for finding in modes.star.findings):
        words += ["--gravitational-constant", f"{modes.star.gravitational_constant!r}"]
    out = file_name if modes.star.source else f"again-{file_name}"
    return " ".join(shlex.quote(word) for word in [*words, "--out", out])
