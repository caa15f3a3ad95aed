"""The result of a run: modes, their labels and error bars, and the census that proves the list."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, fields, replace
from types import MappingProxyType
from typing import Any

import numpy as np

from oscsolve.errors import InputError
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel

#: What a mode can be: labels by node counting, see `oscsolve.pulsation.labels`.
KINDS = ("radial", "p", "g", "f", "mixed")


def _frozen(values: Any, dtype: Any) -> np.ndarray:
    array = np.array(values, dtype=dtype, order="C")
    array.setflags(write=False)
    return array


def signed_square(nu: np.ndarray, error: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """nu^2 with the sign of nu, and its error.

    The error of a frequency near zero is half the root of the error of its square; this undoes it.
    """
    return np.copysign(nu**2, nu), np.maximum(2.0 * np.abs(nu) * error, 4.0 * error**2)


def agree(
    nu: np.ndarray, error: np.ndarray, other: np.ndarray, other_error: np.ndarray
) -> np.ndarray:
    """(m,) bool, True where two frequencies differ by no more than their errors together.

    Squares are compared, the eigenvalues, which remain meaningful where a mode is neutral.
    """
    square, tolerance = signed_square(nu, error)
    other_square, other_tolerance = signed_square(other, other_error)
    return np.abs(square - other_square) <= tolerance + other_tolerance


@dataclass(frozen=True, eq=False)
class Census:
    """How many modes each degree has in the band, by count and in the list.

    Attributes
    ----------
    degree : (d,) int
    low, high : (d,) uHz, the band in which modes were counted
    counted : (d,) int, modes in the band by Sylvester's law of inertia at its two ends
    listed : (d,) int, modes in the list
    relabelled : (d,) int, listed modes whose node counts do not give their order
    """

    degree: np.ndarray
    low: np.ndarray
    high: np.ndarray
    counted: np.ndarray
    listed: np.ndarray
    relabelled: np.ndarray

    def __post_init__(self) -> None:
        for item in fields(self):
            dtype = np.float64 if item.name in ("low", "high") else np.int64
            object.__setattr__(self, item.name, _frozen(getattr(self, item.name), dtype))
            if getattr(self, item.name).shape != self.degree.shape:
                raise ValueError(f"census column {item.name} differs in shape from degree")

    @property
    def closes(self) -> bool:
        """True where every degree lists as many modes as it counts."""
        return bool(np.array_equal(self.counted, self.listed))


@dataclass(frozen=True, eq=False)
class Eigenfunctions:
    """Displacements and perturbations of many modes on the points of the model.

    Scaled so that the total displacement sqrt(xi_r^2 + l(l+1) xi_h^2) is 1 at the
    photosphere, with xi_r > 0 there. Dimensionless, G = M = R = 1.

    Attributes
    ----------
    radius : (n,) r/R
    xi_r, xi_h : (m, n) radial and horizontal displacement in units of the total one at r = R
    p_prime : (m, n) Eulerian pressure perturbation, G M^2 / R^4
    phi_prime, dphi_prime : (m, n) Eulerian perturbation of the potential, G M / R, and its
        radial derivative, G M / R^2; zero in the Cowling approximation
    """

    radius: np.ndarray
    xi_r: np.ndarray
    xi_h: np.ndarray
    p_prime: np.ndarray
    phi_prime: np.ndarray
    dphi_prime: np.ndarray

    def __post_init__(self) -> None:
        for item in fields(self):
            object.__setattr__(self, item.name, _frozen(getattr(self, item.name), np.float64))
        shape = self.xi_r.shape
        for item in fields(self)[1:]:
            if getattr(self, item.name).shape != shape or shape[1:] != self.radius.shape:
                raise ValueError(f"eigenfunction column {item.name} does not fit radius and xi_r")


@dataclass(frozen=True, eq=False)
class Eigenfunction:
    """One mode on the points of the model; attributes and units as in `Eigenfunctions`, (n,)."""

    radius: np.ndarray
    xi_r: np.ndarray
    xi_h: np.ndarray
    p_prime: np.ndarray
    phi_prime: np.ndarray
    dphi_prime: np.ndarray


@dataclass(frozen=True, eq=False)
class ModeSet:
    """All modes of one star in a band, sorted by degree, then frequency.

    Attributes
    ----------
    degree : (m,) int, spherical degree l
    order : (m,) int, radial order n read off the count of eigenvalues below the mode; it follows
        the order of the spectrum and cannot slip. Radial modes: the fundamental is 1.
    n_p, n_g : (m,) int, zeros of the radial displacement that turn p-wise and g-wise in the
        phase diagram (l = 1 in full gravity: of the dipole variables of Takata 2006).
        ``n_p - n_g`` equals `order` except where `relabelled`.
    kind : (m,) str, one of `KINDS`; mixed means n_p and n_g are both above zero
    nu, nu_error : (m,) uHz; numerical error estimate, not that of the model. A mode that grows
        instead of oscillating has nu < 0: minus its growth rate over 2 pi.
    sigma2 : (m,) omega^2 R^3 / (G M), negative for a growing mode
    period : (m,) s; infinite for a growing mode
    inertia : (m,) kinetic energy over M times the squared total displacement at the photosphere:
        4 pi int rho (xi_r^2 + l(l+1) xi_h^2) r^2 dr / (M [xi_r^2 + l(l+1) xi_h^2]_R)
    census : `Census`
    star : the model as used
    eigenfunctions : `Eigenfunctions` or None where they were not kept
    nu_second, nu_second_error : (m,) uHz, the same modes recomputed by shooting, and the error
        estimate of that; NaN where it found no such mode. None where no one asked
    options : everything that was asked for, name to plain value
    findings : what the run noticed (a band above the cut-off, an unstable star, ...)
    program_version : version of oscsolve that computed it
    """

    degree: np.ndarray
    order: np.ndarray
    n_p: np.ndarray
    n_g: np.ndarray
    kind: np.ndarray
    nu: np.ndarray
    nu_error: np.ndarray
    sigma2: np.ndarray
    inertia: np.ndarray
    census: Census
    star: StarModel
    eigenfunctions: Eigenfunctions | None = None
    nu_second: np.ndarray | None = None
    nu_second_error: np.ndarray | None = None
    options: Mapping[str, object] = field(default_factory=dict)
    findings: tuple[Finding, ...] = ()
    program_version: str = ""

    def __post_init__(self) -> None:
        kinds = {"degree": np.int64, "order": np.int64, "n_p": np.int64, "n_g": np.int64}
        names = ["degree", "order", "n_p", "n_g", "nu", "nu_error", "sigma2", "inertia"]
        if (self.nu_second is None) != (self.nu_second_error is None):
            raise ValueError("nu_second and nu_second_error come together or not at all")
        if self.nu_second is not None:
            names += ["nu_second", "nu_second_error"]
        for name in names:
            object.__setattr__(
                self, name, _frozen(getattr(self, name), kinds.get(name, np.float64))
            )
            if getattr(self, name).shape != np.shape(self.kind):
                raise ValueError(f"mode column {name} differs in shape from kind")
        object.__setattr__(self, "kind", _frozen(self.kind, "<U6"))
        object.__setattr__(self, "options", MappingProxyType(dict(self.options)))

    def __len__(self) -> int:
        return self.degree.size

    @property
    def period(self) -> np.ndarray:
        """(m,) period in s; infinite for a growing mode."""
        period = np.full(self.nu.shape, np.inf)
        np.divide(1e6, self.nu, out=period, where=self.nu > 0.0)
        return period

    @property
    def relabelled(self) -> np.ndarray:
        """(m,) bool, True where the node counts do not give `order`."""
        return self.n_p - self.n_g != self.order

    @property
    def confirmed(self) -> np.ndarray | None:
        """(m,) bool, True where the second opinion differs by no more than both error estimates
        together; None where no one asked for it."""
        if self.nu_second is None or self.nu_second_error is None:
            return None
        return agree(self.nu, self.nu_error, self.nu_second, self.nu_second_error)

    @property
    def complete(self) -> bool:
        """True where as many modes are listed as counted, in every degree."""
        return self.census.closes

    def only(self, degrees: Iterable[int]) -> ModeSet:
        """The part of the list and of the census that belongs to some degrees."""
        wanted = np.array(sorted({int(degree) for degree in degrees}))
        rows = np.isin(self.degree, wanted)
        kept = np.isin(self.census.degree, wanted)
        census = Census(*(getattr(self.census, item.name)[kept] for item in fields(Census)))
        columns = ("degree", "order", "n_p", "n_g", "kind", "nu", "nu_error", "sigma2", "inertia")
        second = () if self.nu_second is None else ("nu_second", "nu_second_error")
        eigen = self.eigenfunctions
        if eigen is not None:
            parts = (getattr(eigen, item.name)[rows] for item in fields(Eigenfunctions)[1:])
            eigen = Eigenfunctions(eigen.radius, *parts)
        return replace(
            self,
            **{name: getattr(self, name)[rows] for name in (*columns, *second)},
            census=census,
            eigenfunctions=eigen,
        )

    def eigenfunction(self, index: int) -> Eigenfunction:
        """The eigenfunction of mode `index`, on the points of the model.

        Raises
        ------
        InputError
            The run kept no eigenfunctions, or there is no such mode.
        """
        if self.eigenfunctions is None:
            raise InputError(
                "this mode list holds no eigenfunctions; solve with eigenfunctions=True"
            )
        if not -len(self) <= index < len(self):
            raise InputError(f"mode index {index} is outside the list of {len(self)} modes")
        rows = self.eigenfunctions
        names = ("xi_r", "xi_h", "p_prime", "phi_prime", "dphi_prime")
        return Eigenfunction(rows.radius, *(getattr(rows, name)[index] for name in names))
