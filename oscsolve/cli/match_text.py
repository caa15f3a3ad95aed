"""Matches and rankings as text: tables for people, JSON for other programs."""

from __future__ import annotations

import json
from collections.abc import Iterator
from typing import TYPE_CHECKING

import numpy as np

from oscsolve.cli.documents import plain
from oscsolve.cli.numbers import aligned, fixed
from oscsolve.cli.table import star_lines
from oscsolve.pulsation.modeset import ModeSet
from oscsolve.seismology.match import RATIOS, Match
from oscsolve.seismology.observed import ObservedModes
from oscsolve.seismology.surface import SurfaceFit

if TYPE_CHECKING:
    from oscsolve.grid.rank import Ranking


def match_table(modes: ModeSet, found: Match) -> Iterator[str]:
    """The lines of a match: header, one line a pair, what is left over, chi2."""
    yield f"# oscsolve {modes.program_version}: computed against observed modes"
    yield from star_lines(modes.star)
    yield f"# observed {found.observed.name}, {len(found.observed)} modes"
    yield f"# surface  {_law_text(found.surface)}"
    yield "#"
    columns = _pair_cells(modes, found)
    yield "# " + "  ".join(name.rjust(len(cells[0])) for name, cells in columns.items())
    remarks = _remarks(modes, found)
    for cells, remark in zip(zip(*columns.values(), strict=True), remarks, strict=True):
        yield "  " + "  ".join(cells) + remark
    yield "#"
    yield from _left_lines(modes, found)
    yield (
        f"# frequencies: {found.pair.size} pairs, rms {found.rms:.4g} uHz, chi2 {found.chi2:.6g}, "
        f"{found.freedom} free, reduced chi2 {found.reduced_chi2:.4g}"
    )
    yield from _ratio_lines(found)


def match_document(modes: ModeSet, found: Match) -> str:
    """A match as one JSON document; frequencies in uHz."""
    seen, row = found.pair, found.row
    pairs = [
        {
            "degree": found.observed.degree[i],
            "order": modes.order[j],
            "observed": found.observed.nu[i],
            "observed_error": found.observed.nu_error[i],
            "computed": found.computed[k],
            "corrected": found.corrected[k],
            "corrected_error": found.corrected_error[k],
            "published_order": None if found.observed.order is None else found.observed.order[i],
            "chi2": (found.residual[k] / found.error[k]) ** 2,
            "outlier": found.outlier[k],
            "or_order": [modes.order[other] for other in found.pairing.doubtful.get(int(i), ())],
        }
        for k, (i, j) in enumerate(zip(seen, row, strict=True))
    ]
    ratios = found.ratios
    document = {
        "pairs": pairs,
        "unmatched": [
            *({"list": "observed", **_observed_mode(found, i)} for i in found.unmatched_observed),
            *(
                {
                    "list": "computed",
                    "degree": modes.degree[j],
                    "order": modes.order[j],
                    "nu": modes.nu[j],
                }
                for j in found.unmatched_computed
            ),
        ],
        "law": found.surface.law,
        "coefficients": found.surface.coefficients,
        "chi2": found.chi2,
        "reduced_chi2": found.reduced_chi2,
        "freedom": found.freedom,
        "rms": found.rms,
        "ratios": {
            "chi2": ratios.chi2,
            "freedom": ratios.freedom,
            "values": [
                {
                    "name": str(ratios.name[k]),
                    "order": ratios.order[k],
                    "observed": ratios.observed[k],
                    "observed_error": ratios.observed_error[k],
                    "computed": ratios.computed[k],
                }
                for k in range(ratios.order.size)
            ],
        },
    }
    return json.dumps(plain(document), allow_nan=False, ensure_ascii=False, indent=1)


def rank_table(
    ranking: Ranking, observed: ObservedModes, law: str, measure: str, best: int
) -> Iterator[str]:
    """The lines of a ranking: header, one line for each of the best models, estimates."""
    grid = ranking.grid
    yield f"# oscsolve {grid.program_version}: models ranked by {measure}"
    yield f"# grid     {grid.path}, {len(grid)} models, {ranking.order.size} compared"
    yield f"# observed {observed.name}, {len(observed)} modes"
    yield f"# surface  {law}, fitted to each model"
    yield "#"
    columns = _rank_cells(ranking, best)
    yield "# " + "  ".join(name.rjust(len(cells[0])) for name, cells in columns.items())
    for cells in zip(*columns.values(), strict=True):
        yield "  " + "  ".join(cells).rstrip()
    yield "#"
    yield "# parameters: mean and spread over the models, weighted by exp(-chi2/2)"
    texts = {
        "name": list(ranking.estimates),
        "mean": [f"{value.mean:.6g}" for value in ranking.estimates.values()],
        "spread": [f"{value.spread:.2g}" for value in ranking.estimates.values()],
        "best model": [f"{value.best:.6g}" for value in ranking.estimates.values()],
    }
    columns = {name: _padded(name, cells) for name, cells in texts.items()}
    yield "#   " + "  ".join(name.rjust(len(cells[0])) for name, cells in columns.items())
    for cells in zip(*columns.values(), strict=True):
        yield "#   " + "  ".join(cells)
    yield f"# The estimates rest on {ranking.effective_models:.3g} models in effect."
    if ranking.effective_models < 3.0:
        yield "# That is too few for the spread to mean much: the grid is coarse beside the errors."
    if ranking.messages:
        row, reason = next(iter(ranking.messages.items()))
        yield f"# {len(ranking.messages)} models could not be compared; row {row}: {reason}"


def rank_document(
    ranking: Ranking, observed: ObservedModes, law: str, measure: str, best: int
) -> str:
    """A ranking as one JSON document."""
    grid = ranking.grid
    document = {
        "measure": measure,
        "law": law,
        "observed": observed.name,
        "models": [
            {
                "row": row,
                "name": str(grid.name[row]),
                "chi2": ranking.chi2[row],
                "rms": ranking.rms[row],
                "pairs": ranking.pairs[row],
                "unmatched": ranking.unmatched[row],
                "parameters": {name: values[row] for name, values in grid.parameters.items()},
            }
            for row in ranking.order[:best]
        ],
        "estimates": {
            name: {"mean": value.mean, "spread": value.spread, "best": value.best}
            for name, value in ranking.estimates.items()
        },
        "effective_models": ranking.effective_models,
        "compared": ranking.order.size,
        "not_compared": [{"row": row, "message": text} for row, text in ranking.messages.items()],
    }
    return json.dumps(plain(document), allow_nan=False, ensure_ascii=False, indent=1)


def _observed_mode(found: Match, i: int) -> dict[str, object]:
    order = None if found.observed.order is None else found.observed.order[i]
    return {"degree": found.observed.degree[i], "order": order, "nu": found.observed.nu[i]}


def _computed_mode(modes: ModeSet, j: int) -> dict[str, object]:
    return {"degree": modes.degree[j], "order": modes.order[j], "nu": modes.nu[j]}


def _law_text(fit: SurfaceFit) -> str:
    parts = []
    errors = np.sqrt(np.diag(fit.covariance)) if fit.names else np.zeros(0)
    for name, value, error in zip(fit.names, fit.values, errors, strict=True):
        unit = "" if name == "b" else " uHz"
        parts.append(f"{name} = {fixed(value, error)} +- {error:.1g}{unit}")
    for name, value in fit.fixed.items():
        parts.append(f"{name} = {value:.6g}" + (" uHz" if name.startswith("nu") else ""))
    return ", ".join([fit.law, *parts])


def _pair_cells(modes: ModeSet, found: Match) -> dict[str, list[str]]:
    """Heading to cells of equal width."""
    seen, row = found.pair, found.row
    error = found.observed.nu_error[seen]
    texts = {
        "l": [str(value) for value in modes.degree[row]],
        "n": [str(value) for value in modes.order[row]],
        "observed/uHz": _digits(found.observed.nu[seen], error),
        "error": [f"{value:.2g}" for value in error],
        "computed": _digits(found.computed, error),
        "corrected": _digits(found.corrected, error),
        "residual": _digits(found.residual, error),
        "in errors": [f"{value:.1f}" for value in found.residual / found.error],
    }
    return {name: _padded(name, cells) for name, cells in texts.items()}


def _digits(values: np.ndarray, error: np.ndarray) -> list[str]:
    """Numbers with two digits that the error touches."""
    return [fixed(*pair) for pair in zip(values, 0.1 * error, strict=True)]


def _padded(name: str, cells: list[str]) -> list[str]:
    if name in ("name",):
        width = max(map(len, (*cells, name)), default=0)
        return [cell.ljust(width) for cell in cells]
    return aligned(cells, name)


def _remarks(modes: ModeSet, found: Match) -> list[str]:
    """What is to be said behind each line."""
    out = []
    published = found.observed.order
    for k, (i, j) in enumerate(zip(found.pair, found.row, strict=True)):
        parts = []
        if published is not None and published[i] != modes.order[j]:
            parts.append(f"published n = {published[i]}")
        if modes.kind[j] == "mixed":
            parts.append("mixed")
        for other in found.pairing.doubtful.get(int(i), ()):
            parts.append(f"or n = {modes.order[other]} at {modes.nu[other]:.6g}")
        if found.outlier[k]:
            parts.append("outlier")
        out.append("  # " + ", ".join(parts) if parts else "")
    return out


def _left_lines(modes: ModeSet, found: Match) -> Iterator[str]:
    left = [_observed_mode(found, int(i)) for i in found.unmatched_observed]
    if left:
        names = ", ".join(f"l = {mode['degree']} at {mode['nu']:.6g} uHz" for mode in left)
        yield f"# observed without a computed partner: {names}"
    rows = found.unmatched_computed
    if rows.size:
        names = ", ".join(f"{modes.degree[j]} {modes.order[j]}" for j in rows)
        yield f"# computed, in the observed range, without an observed one (l n): {names}"
    if not left and not rows.size:
        yield "# nothing is left over on either side"
    if found.pairing.doubtful:
        yield f"# in doubt: {len(found.pairing.doubtful)} pair(s), marked 'or' above"


def _ratio_lines(found: Match) -> Iterator[str]:
    ratios = found.ratios
    if ratios.order.size == 0:
        yield "# ratios: none can be formed"
        return
    parts = []
    for name in RATIOS:
        own = ratios.name == name
        if np.any(own):
            off = (ratios.observed - ratios.computed)[own]
            in_errors = float(np.sqrt(np.mean((off / ratios.observed_error[own]) ** 2)))
            parts.append(
                f"{name}: {np.sum(own)}, rms {in_errors:.2g} errors, mean {off.mean():+.2g}"
            )
    yield "# ratios (observed - computed, no surface law): " + "; ".join(parts)
    yield (
        f"# ratios together: chi2 {ratios.chi2:.6g} with their covariance, {ratios.freedom} free, "
        f"reduced chi2 {ratios.reduced_chi2:.4g}"
    )


def _rank_cells(ranking: Ranking, best: int) -> dict[str, list[str]]:
    grid, rows = ranking.grid, ranking.order[:best]
    texts = {
        "row": [str(row) for row in rows],
        "chi2": [f"{value:.6g}" for value in ranking.chi2[rows]],
        "rms/uHz": [f"{value:.4g}" for value in ranking.rms[rows]],
        "pairs": [str(value) for value in ranking.pairs[rows]],
        "left": [str(value) for value in ranking.unmatched[rows]],
    }
    for name, values in grid.parameters.items():
        numeric = np.issubdtype(values.dtype, np.number)
        texts[name] = [f"{values[row]:.6g}" if numeric else str(values[row]) for row in rows]
    texts["name"] = [str(grid.name[row]) for row in rows]
    return {name: _padded(name, cells) for name, cells in texts.items()}
