"""The same modes by what general libraries offer: solve_bvp, dense Chebyshev collocation, eigsh.

All see the structure through `oscsolve.star.profile`, so that they differ in method only. None of
them proves that its list is complete; solve_bvp needs a guess for every mode.
"""

from __future__ import annotations

from dataclasses import dataclass
from time import process_time

import numpy as np
from scipy.integrate import solve_bvp
from scipy.linalg import eig
from scipy.sparse import coo_matrix
from scipy.sparse.linalg import eigsh

import oscsolve
from oscsolve.pulsation.boundary import surface_term
from oscsolve.pulsation.equations import coefficients
from oscsolve.pulsation.mesh import Ground, band_mesh, element
from oscsolve.pulsation.sweep import build_action
from oscsolve.star.profile import Profile

DEGREE = 2
#: Orders that are compared, and the band in sigma2 that holds them, of a polytrope n = 3.
BAND = (7.0, 110.0)


@dataclass(frozen=True)
class Outcome:
    """What one method made of the modes.

    Attributes
    ----------
    method : name and setting
    error : largest relative error of sigma2 among the modes compared
    seconds : processor time a mode
    """

    method: str
    error: float
    seconds: float


class Dziembowski:
    """y' = M(x, sigma2) y in the variables of Dziembowski (1971), scaled by x^(l-2)."""

    def __init__(self, star: oscsolve.StarModel) -> None:
        self.profile = Profile(star)
        self.outer = self.profile.outermost()[0]
        self.inner = 1e-3

    def terms(self, x: np.ndarray) -> tuple[np.ndarray, ...]:
        """V_g, A*, U and c1 at x."""
        starts = self.profile.x[self.profile.interval]
        place = np.searchsorted(starts, x, side="right") - 1
        at = self.profile.at(x, self.profile.interval[np.clip(place, 0, starts.size - 1)])
        mass = at.g * x**2
        return (
            at.g * x / at.c2,
            x * at.n2 / at.g,
            4.0 * np.pi * at.rho * x**3 / mass,
            x**3 / mass,
        )

    def matrix(self, x: np.ndarray, sigma2: float) -> np.ndarray:
        """(4, 4, k)."""
        vg, a, u, c1 = self.terms(x)
        ll, one = DEGREE * (DEGREE + 1.0), np.ones_like(x)
        rows = [
            [vg - 1 - DEGREE, ll / (c1 * sigma2) - vg, vg, 0 * x],
            [c1 * sigma2 - a, a - u + 3 - DEGREE, -a, 0 * x],
            [0 * x, 0 * x, 3 - u - DEGREE, one],
            [u * a, u * vg, ll - u * vg, 2 - u - DEGREE],
        ]
        return np.array(rows) / x


def by_oscsolve(star: oscsolve.StarModel, exact: np.ndarray, tolerance: float) -> Outcome:
    """The whole certified list with error bars, on one thread."""
    options = oscsolve.SolveOptions(threads=1, eigenfunctions=False)
    seconds, modes = np.inf, None
    for _ in range(4):
        started = process_time()
        modes = oscsolve.solve_modes(
            star, [DEGREE], BAND, unit="sigma2", tolerance=tolerance, options=options
        )
        seconds = min(seconds, process_time() - started)
    return Outcome(f"oscsolve, {tolerance:g}", _error(modes.sigma2, exact), seconds / len(modes))


def by_solve_bvp(star: oscsolve.StarModel, exact: np.ndarray, tolerance: float) -> Outcome:
    """Mode by mode, from a guess that is 1 percent off and the eigenfunction of the guess."""
    system = Dziembowski(star)
    guesses = oscsolve.solve_modes(star, [DEGREE], BAND, unit="sigma2")
    found, started = [], process_time()
    for row in range(len(guesses)):
        found.append(_one_bvp(system, guesses, row, tolerance))
    return Outcome(
        f"solve_bvp, {tolerance:g}", _error(np.array(found), exact), _per_mode(started, found)
    )


def _one_bvp(system: Dziembowski, guesses: oscsolve.ModeSet, row: int, tolerance: float) -> float:
    x = np.geomspace(0.02, 1.0, 120) * system.outer
    x = np.unique(np.concatenate(([system.inner], x, system.outer - np.geomspace(1e-4, 0.1, 60))))
    eigen = guesses.eigenfunction(row)
    keep = eigen.radius > 0.0
    star = guesses.star
    g = star.mass[keep] / star.total_mass / eigen.radius[keep] ** 2
    sigma2 = float(guesses.sigma2[row])
    scale = eigen.radius[keep] ** (2.0 - DEGREE)
    y1 = eigen.xi_r[keep] / eigen.radius[keep] * scale
    y2 = sigma2 * eigen.xi_h[keep] / g * scale
    y3 = eigen.phi_prime[keep] / (g * eigen.radius[keep]) * scale
    y4 = eigen.dphi_prime[keep] / g * scale
    y = np.array([np.interp(x, eigen.radius[keep], part) for part in (y1, y2, y3, y4)])
    y /= y[0, -1]

    def slope(x: np.ndarray, y: np.ndarray, p: np.ndarray) -> np.ndarray:
        return np.einsum("ijk,jk->ik", system.matrix(x, p[0]), y)

    def ends(a: np.ndarray, b: np.ndarray, p: np.ndarray) -> np.ndarray:
        c1 = system.terms(np.array([system.inner]))[3][0]
        return np.array(
            [
                c1 * p[0] * a[0] - DEGREE * a[1],
                DEGREE * a[2] - a[3],
                b[0] - b[1] + b[2],
                (DEGREE + 1) * b[2] + b[3],
                b[0] - 1.0,
            ]
        )

    solved = solve_bvp(slope, ends, x, y, p=[1.01 * sigma2], tol=tolerance, max_nodes=20_000)
    return float(solved.p[0])


def by_chebyshev(star: oscsolve.StarModel, exact: np.ndarray, points: int) -> Outcome:
    """All eigenvalues of one dense pencil; with z2 = y2/(c1 sigma2) it is linear in sigma2."""
    system, started = Dziembowski(star), process_time()
    t = np.cos(np.pi * np.arange(points) / (points - 1))[::-1]
    half = 0.5 * (system.outer - system.inner)
    x = system.inner + half * (t + 1.0)
    derivative = _chebyshev(t) / half
    vg, a, u, c1 = system.terms(x)
    ll, n = DEGREE * (DEGREE + 1.0), points
    left, right = np.zeros((4 * n, 4 * n)), np.zeros((4 * n, 4 * n))
    y1, z2, y3, y4 = (slice(k * n, (k + 1) * n) for k in range(4))
    xd, eye = x[:, None] * derivative, np.eye(n)
    left[y1, y1] = xd - np.diag(vg - 1 - DEGREE)
    left[y1, z2] = -ll * eye
    left[y1, y3] = -np.diag(vg)
    right[y1, z2] = -np.diag(vg * c1)
    left[z2, y1], left[z2, y3] = np.diag(a), np.diag(a)
    right[z2, y1] = np.diag(c1)
    # x (c1 z2)' = c1 (x z2' + (3 - U) z2)
    right[z2, z2] = -(c1[:, None] * xd + np.diag(c1 * (3 - u) - c1 * (a - u + 3 - DEGREE)))
    left[y3, y3], left[y3, y4] = xd - np.diag(3 - u - DEGREE), -eye
    left[y4, y1], left[y4, y3] = -np.diag(u * a), -np.diag(ll - u * vg)
    left[y4, y4] = xd - np.diag(2 - u - DEGREE)
    right[y4, z2] = np.diag(u * vg * c1)
    _chebyshev_ends(left, right, c1, n)
    values = eig(left, right, right=False)
    real = values.real[(np.abs(values.imag) < 1e-6 * np.abs(values.real))]
    inside = np.sort(real[(real > BAND[0]) & (real < BAND[1])])
    return Outcome(f"chebyshev, {points}", _error(inside, exact), _per_mode(started, exact))


def _chebyshev_ends(left: np.ndarray, right: np.ndarray, c1: np.ndarray, n: int) -> None:
    """Regular at the centre, no pressure perturbation and a vacuum field at the surface."""
    for row in (0, 2 * n, n - 1 + n, n - 1 + 3 * n):
        left[row], right[row] = 0.0, 0.0
    left[0, 0], left[0, n] = 1.0, -DEGREE  # y1 = l z2
    left[2 * n, 2 * n], left[2 * n, 3 * n] = DEGREE, -1.0
    left[2 * n - 1, n - 1], left[2 * n - 1, 3 * n - 1] = 1.0, 1.0
    right[2 * n - 1, 2 * n - 1] = c1[-1]
    left[4 * n - 1, 3 * n - 1], left[4 * n - 1, 4 * n - 1] = DEGREE + 1.0, 1.0


def _chebyshev(t: np.ndarray) -> np.ndarray:
    """Differentiation matrix on Chebyshev points (Trefethen 2000, Spectral Methods in MATLAB)."""
    n = t.size
    weight = np.where((np.arange(n) == 0) | (np.arange(n) == n - 1), 2.0, 1.0) * (
        -1.0
    ) ** np.arange(n)
    difference = t[:, None] - t + np.eye(n)
    matrix = np.outer(weight, 1.0 / weight) / difference
    return matrix - np.diag(matrix.sum(axis=1))


def by_eigsh(star: oscsolve.StarModel, exact: np.ndarray, parts: int) -> Outcome:
    """Shift-invert Lanczos on the linear pencil of Gauss collocation, two points a cell."""
    started = process_time()
    profile, elem = Profile(star), element(2)
    mesh = band_mesh(Ground(profile), DEGREE, BAND, 0.35 / parts, 10**6)
    action = build_action(profile, mesh, elem, DEGREE, "full", "free")
    # Lanczos takes the nearest to sigma, and g modes pile up at zero: stay clear of them.
    sigma = 0.62 * float(exact.max())
    stiff, mass = _pencil(profile, action, mesh, elem, sigma)
    count = min(2 * exact.size, stiff.shape[0] - 2)
    values = eigsh(stiff, count, mass, sigma=sigma, return_eigenvectors=False)
    return Outcome(
        f"eigsh, {mesh.size} cells", _error(np.sort(values), exact), _per_mode(started, exact)
    )


def _pencil(profile, action, mesh, elem, sigma2):
    """K and M with K v = sigma2 M v; the surface term is taken at one sigma2."""
    cells, s = mesh.size, elem.gauss.size
    at = mesh.at(profile, elem.gauss)
    point = coefficients(at, DEGREE, "full", mesh.lagrangian[:, None])
    nodal, h = 2 * (cells * s + 1), np.diff(mesh.node)
    size = nodal + cells * s
    rows, columns, stiff, mass = [], [], [], []

    def add(a, b, k, m):
        rows.append(a.ravel())
        columns.append(b.ravel())
        stiff.append(np.broadcast_to(k, a.shape).ravel())
        mass.append(np.broadcast_to(m, a.shape).ravel())

    base = 2 * s * np.arange(cells)[:, None] + 2 * np.arange(s + 1)
    for k in range(s):
        b0, b1, s1, s2, b22, c11, c21, d0, d1, d2 = point[:, k].T[..., None]
        w = (elem.weight[k] * h)[:, None]
        value, slope = elem.value[k], elem.slope[k] / h[:, None]
        swing = (nodal + np.arange(cells) * s + k)[:, None]
        index = np.hstack((base, base + 1, swing))
        zero = np.zeros((cells, s + 1))
        q1 = np.hstack((value + zero, zero, zero[:, :1]))
        q2 = np.hstack((zero, value + zero, zero[:, :1]))
        y = np.hstack((zero, zero, 1.0 + zero[:, :1]))
        p1 = (np.hstack((slope, zero, zero[:, :1])) - c11 * q1 - b1 * y) / b0
        f = np.hstack((zero, slope, zero[:, :1])) - c21 * q1
        z = s1 * q1 + s2 * q2

        def outer(a, b):
            return a[:, :, None] * b[:, None, :]

        form = (
            b0[..., None] * outer(p1, p1)
            - b1[..., None] * (outer(y, z) + outer(z, y))
            + outer(f, f) / b22[..., None]
            - d0[..., None] * outer(q1, q1)
            - d2[..., None] * outer(q2, q2)
        )
        kinetic = b1[..., None] * outer(y, y) - d1[..., None] * outer(q1, q1)
        a, b = np.broadcast_arrays(index[:, :, None], index[:, None, :])
        add(a, b, -w[..., None] * form, w[..., None] * kinetic)
    node = np.arange(cells) * 2 * s
    add(node, node, -action.node_term, 0.0)
    k11, k12, k22, *_ = surface_term(action.top, sigma2, 1.0 / sigma2)
    end = np.array([nodal - 2, nodal - 2, nodal - 1, nodal - 1])
    add(end, end[[0, 2, 0, 2]], -np.array([k11, k12, k12, k22]), 0.0)
    shape = (size, size)
    place = np.concatenate(rows), np.concatenate(columns)
    keep = slice(2, None)
    return tuple(
        coo_matrix((np.concatenate(part), place), shape).tocsc()[keep, keep]
        for part in (stiff, mass)
    )


def _per_mode(started: float, modes) -> float:
    return (process_time() - started) / max(len(modes), 1)


def _error(found: np.ndarray, exact: np.ndarray) -> float:
    """Largest relative distance of an exact value from the nearest one found."""
    if found.size == 0:
        return np.inf
    return float(max(np.min(np.abs(found / value - 1.0)) for value in exact))


def outcomes() -> list[Outcome]:
    """Every method at several settings, on a polytrope n = 3 and l = 2."""
    star = oscsolve.polytrope(3)
    exact = oscsolve.solve_modes(star, [DEGREE], BAND, unit="sigma2", tolerance=1e-12).sigma2
    found = [by_oscsolve(star, exact, tolerance) for tolerance in (1e-4, 1e-6, 1e-8, 1e-11)]
    found += [by_eigsh(star, exact, parts) for parts in (1, 8, 16)]
    found += [by_chebyshev(star, exact, points) for points in (40, 60, 80, 120)]
    found += [by_solve_bvp(star, exact, tolerance) for tolerance in (1e-4, 1e-6, 1e-8)]
    return found


def main() -> None:
    """The table that the contributors' guide quotes."""
    print(f"{'method':24s} {'error':>8s} {'ms a mode':>10s}")
    for found in outcomes():
        print(f"{found.method:24s} {found.error:8.1e} {1e3 * found.seconds:10.2f}")


if __name__ == "__main__":
    main()
