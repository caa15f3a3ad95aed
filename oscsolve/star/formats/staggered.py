"""Models on a staggered mesh: r and m at the outer faces of cells, P, rho, T at their centres.

Detected by the laws that the numbers obey, then moved to one mesh: the cell centres.
"""

from __future__ import annotations

import numpy as np

from oscsolve.star.formats.points import Draft

#: The staggered form must hold this much better than the node form to be believed.
_CLEARLY = 0.1
#: Cells lighter than this fraction of the star say little: their mass is a difference of
#: numbers that agree in most digits.
_LIGHT = 1e-6


def cell_masses(radius: np.ndarray, mass: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(n,) mass and volume (cgs) between each point and the one below it, the first from r = 0."""
    below = np.concatenate(([0.0], radius[:-1]))
    # Factored: r_o^3 - r_i^3 would cancel in the thin cells of an envelope.
    volume = (radius - below) * (radius**2 + radius * below + below**2) * (4.0 * np.pi / 3.0)
    return np.diff(mass, prepend=0.0), volume


def mean_density_ratio(
    radius: np.ndarray, mass: np.ndarray, density: np.ndarray
) -> dict[str, float]:
    """rho dV / dm, the median over the heavier cells, on either kind of mesh; 1 if consistent.

    Returns
    -------
    {"staggered": with rho of the outer point, "node": with the mean of the two points}
    """
    return {kind: float(np.median(v)) for kind, v in _density_ratios(radius, mass, density).items()}


def _density_ratios(
    radius: np.ndarray, mass: np.ndarray, density: np.ndarray
) -> dict[str, np.ndarray]:
    dm, volume = cell_masses(radius, mass)
    mean = density.copy()
    mean[1:] = 0.5 * (density[1:] + density[:-1])
    use = (dm > _LIGHT * mass[-1]) & (volume > 0.0)
    use[0] = False
    if not use.any():
        return {"staggered": np.array([np.nan]), "node": np.array([np.nan])}
    return {
        "staggered": (density * volume)[use] / dm[use],
        "node": (mean * volume)[use] / dm[use],
    }


def face_gravity(
    radius: np.ndarray, mass: np.ndarray, pressure: np.ndarray, density: np.ndarray
) -> tuple[float, float]:
    """G of a staggered model and its scatter (relative): dP/dm = -G m / (4 pi r^4) at the faces.

    The mass of a cell is taken as rho dV, not as the difference of m: they are the same unless
    r and m of a file were scaled with constants that do not match, and then this G is the one
    with which dP/dr = -G m rho / r^2 holds.
    """
    _, volume = cell_masses(radius, mass)
    dm = density * volume
    load = mass[:-1] / (4.0 * np.pi * radius[:-1] ** 4) * 0.5 * (dm[1:] + dm[:-1])
    use = (dm[1:] > _LIGHT * mass[-1]) & (load > 0.0)
    if np.count_nonzero(use) < 5:
        use = load > 0.0
    values = -np.diff(pressure)[use] / load[use]
    middle = float(np.median(values))
    return middle, float(np.median(np.abs(values / middle - 1.0)))


def is_staggered(draft: Draft) -> bool:
    """True if mass and hydrostatic balance both hold clearly better on the staggered mesh."""
    r, m, p, d = (draft.columns[name] for name in ("radius", "mass", "pressure", "density"))
    # A uniform factor is a matter of units or constants; the spread is what tells the meshes.
    spread = {}
    for kind, ratio in _density_ratios(r, m, d).items():
        middle = np.median(ratio)
        spread[kind] = float(np.median(np.abs(ratio / middle - 1.0)))
    by_mass = spread["staggered"] < _CLEARLY * spread["node"]
    _, at_faces = face_gravity(r, m, p, d)
    at_nodes = _node_balance(r, m, p, d)
    by_balance = at_faces < _CLEARLY * at_nodes
    if by_mass != by_balance:
        draft.note(
            "doubt",
            "mesh-unclear",
            "the masses and the pressures of the file disagree on whether P and rho belong to "
            f"cell centres (dm: {spread['staggered']:.2g} staggered, {spread['node']:.2g} node; "
            f"dP: {at_faces:.2g} staggered, {at_nodes:.2g} node); taken as belonging to the points",
            "check the model with more digits",
        )
        return False
    if by_mass:
        draft.note(
            "note",
            "mesh-staggered",
            "r and m belong to outer cell faces, P, rho and T to cell centres (mass of cells "
            f"holds to {spread['staggered']:.1g} in that form, {spread['node']:.1g} otherwise; "
            f"dP/dm to {at_faces:.1g} against {at_nodes:.1g}); all were moved to cell centres",
            size=spread["staggered"],
        )
    return bool(by_mass)


def _node_balance(r: np.ndarray, m: np.ndarray, p: np.ndarray, d: np.ndarray) -> float:
    load = m * d / r**2
    step = 0.5 * (load[1:] + load[:-1]) * np.diff(r)
    use = (np.diff(m) > _LIGHT * m[-1]) & (step > 0.0)
    if np.count_nonzero(use) < 5:
        use = step > 0.0
    values = -np.diff(p)[use] / step[use]
    return float(np.median(np.abs(values / np.median(values) - 1.0)))


def to_centres(draft: Draft, n2_at_faces: bool) -> None:
    """Move r and m (and N^2, if it sits there) from the outer faces to the cell centres.

    The centre of a cell halves its volume, r^3 = (r_i^3 + r_o^3)/2, and so its mass. N^2 is
    the mean of A* on the two faces of a cell times g/r at its centre.
    """
    radius, mass = draft.columns["radius"], draft.columns["mass"]
    below_r = np.concatenate(([0.0], radius[:-1]))
    below_m = np.concatenate(([0.0], mass[:-1]))
    centre_r = np.cbrt(0.5 * (below_r**3 + radius**3))
    centre_m = 0.5 * (below_m + mass)
    if n2_at_faces:
        a_face = draft.columns["brunt_n2"] * radius**3 / mass
        a_below = np.concatenate(([a_face[0]], a_face[:-1]))
        draft.columns["brunt_n2"] = 0.5 * (a_below + a_face) * centre_m / centre_r**3
    draft.columns["radius"], draft.columns["mass"] = centre_r, centre_m


def buoyancy_at_faces(draft: Draft, gravity: float) -> bool:
    """True if the N^2 of a staggered file belongs to the outer faces of its cells.

    Both readings are compared with the N^2 that P, rho and Gamma1 give on the faces.
    """
    c = draft.columns
    r, m = c["radius"][:-1], c["mass"][:-1]
    lnp, lnd = np.log(c["pressure"]), np.log(c["density"])
    inverse = 0.5 * (1.0 / c["gamma1"][1:] + 1.0 / c["gamma1"][:-1])
    # On a face: dlnP/dlnr = -G m rho / (r P) with rho / P the mean of the two cells.
    ratio = c["density"] / c["pressure"]
    strength = gravity * m / r * 0.5 * (ratio[1:] + ratio[:-1])
    with np.errstate(divide="ignore", invalid="ignore"):
        a_face = strength * (np.diff(lnd) / np.diff(lnp) - inverse)
    n2 = a_face * gravity * m / r**3
    face, centre = c["brunt_n2"][1:-1], 0.5 * (n2[1:] + n2[:-1])
    good = np.isfinite(centre) & (np.abs(centre) > 0.0)
    scale = np.abs(centre[good])
    at_face = float(np.median(np.abs(face[good] - n2[1:][good]) / scale))
    at_centre = float(np.median(np.abs(face[good] - centre[good]) / scale))
    is_face = at_face < at_centre
    draft.note(
        "note" if min(at_face, at_centre) < 0.1 else "doubt",
        "buoyancy-place",
        f"N^2 of the file belongs to cell {'faces' if is_face else 'centres'}: it differs from "
        f"the one of P, rho and Gamma1 by {at_face:.2g} (median) at faces, {at_centre:.2g} at "
        "centres",
        "" if min(at_face, at_centre) < 0.1 else "check N^2 of the file against its P and rho",
        size=min(at_face, at_centre),
    )
    return is_face
