"""What a mode file holds: names, units, meaning, and the number that changes with them.

``/``                 attributes: what the file is, who wrote it when, the model file, every option
``/modes``            dimension ``mode``: one dataset a column
``/census``           dimension ``degree``: modes counted and listed
``/structure``        the model as used, see `oscsolve.star.formats.hdf5`
``/eigenfunctions``   dimensions ``mode`` and ``point``; absent where they were not kept
``/findings``         dimension ``finding``: what the run noticed; the model's own are with it

Every dimension is an HDF5 dimension scale, every dataset has ``units`` and ``long_name``, texts are
UTF-8 of variable length, an option called x is the root attribute ``option_x`` (empty: None).
"""

from __future__ import annotations

from typing import NamedTuple

#: Raised by one whenever a program that reads the old layout would misread the new one.
SCHEMA = 1
#: First version of oscsolve that reads and writes `SCHEMA`; stored for the error of older ones.
SCHEMA_SINCE = "0.1.0"
#: Value of the root attribute ``content``.
CONTENT = "oscsolve modes"
#: Prefix of the root attributes that hold the options of the run.
OPTION = "option_"


class Column(NamedTuple):
    """One dataset: `kind` is "i" (whole number), "f" (64-bit float) or "s" (text)."""

    name: str
    kind: str
    units: str
    long_name: str


MODES = (
    Column("degree", "i", "1", "spherical degree l"),
    Column("order", "i", "1", "radial order n, by count of the eigenvalues below"),
    Column("n_p", "i", "1", "nodes of the radial displacement that turn p-wise"),
    Column("n_g", "i", "1", "nodes of the radial displacement that turn g-wise"),
    Column("kind", "s", "1", "radial, p, g, f or mixed, by node counts"),
    Column("nu", "f", "uHz", "cyclic frequency; minus growth rate / 2 pi of a growing mode"),
    Column("nu_error", "f", "uHz", "numerical error estimate of the frequency"),
    Column("sigma2", "f", "1", "omega^2 R^3 / (G M)"),
    Column("period", "f", "s", "period; infinite for a growing mode"),
    Column("inertia", "f", "1", "kinetic energy / (M x squared displacement at R)"),
)
#: Columns of ``/modes`` that are there only where a second opinion was asked for.
SECOND_OPINION = (
    Column("nu_second", "f", "uHz", "frequency recomputed by shooting; NaN where none was found"),
    Column("nu_second_error", "f", "uHz", "numerical error estimate of nu_second"),
)
CENSUS = (
    Column("degree", "i", "1", "spherical degree l"),
    Column("low", "f", "uHz", "lower end of the band"),
    Column("high", "f", "uHz", "upper end of the band"),
    Column("counted", "i", "1", "modes in the band by the law of inertia"),
    Column("listed", "i", "1", "modes in the list"),
    Column("relabelled", "i", "1", "listed modes whose node counts do not give their order"),
)
FINDINGS = (
    Column("severity", "s", "1", "note, doubt or defect"),
    Column("code", "s", "1", "short name of the kind of finding"),
    Column("message", "s", "1", "what was found"),
    Column("advice", "s", "1", "what to do about it"),
    Column("place", "f", "1", "fractional radius where it is; NaN where it has none"),
    Column("size", "f", "1", "how large it is; NaN where it has none"),
)
EIGENFUNCTION_RADIUS = Column("radius", "f", "R", "fractional radius r/R")
EIGENFUNCTIONS = (
    Column("xi_r", "f", "1", "radial displacement; total displacement 1 at R"),
    Column("xi_h", "f", "1", "horizontal displacement; total displacement 1 at R"),
    Column("p_prime", "f", "G M2 R-4", "Eulerian pressure perturbation"),
    Column("phi_prime", "f", "G M R-1", "Eulerian perturbation of the gravitational potential"),
    Column("dphi_prime", "f", "G M R-2", "radial derivative of phi_prime"),
)
#: Dimension: first number of its scale, and what a number means.
DIMENSIONS = {
    "mode": (0, "row of the mode list, from 0"),
    "point": (1, "number of the point, from the centre"),
    "finding": (0, "row of the findings, from 0"),
}
