"""What a mode file holds: names, units, meaning, and the number that changes with them.

``/``                 attributes: what the file is, who wrote it when, the model file, every option
``/modes``            dimension ``mode``: one dataset a column
``/census``           dimension ``degree``: modes counted and listed
``/structure``        the model as used, see `oscsolve.star.formats.hdf5`
``/eigenfunctions``   dimensions ``mode`` and ``point``; absent where they were not kept
``/findings``         dimension ``finding``: what the run noticed; the model's own are with it

A grid store holds the modes of many models and no structures:

``/``                 the same attributes, and ``state`` (`FINISHED` or `UNFINISHED`), ``planned``
                      (models asked for; -1 while that is not known) and ``rows`` (models listed)
``/models``           dimension ``model``: one row a model, in the order they were asked for; the
                      census has a second dimension ``degree``; parameters given with the models
                      are columns like the others, with the attribute ``given`` = 1
``/modes``            the columns of a mode file and ``model``, the row of ``/models``; the modes of
                      one model stand together, from ``first_mode`` on
``/findings``         doubts and defects of the models, and all that the runs noticed
``/eigenfunctions``   one group a model, named by its row, as in a mode file; where they were kept

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
#: The same for a grid store.
GRID_CONTENT = "oscsolve grid"
#: Values of the root attribute ``state`` of a grid store.
FINISHED, UNFINISHED = "finished", "unfinished"
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
    "model": (0, "row of the models, from 0"),
}

#: What became of a model: all modes proved, some doubt left (see ``message``), or none computed.
STATUS = ("complete", "incomplete", "failed")
GRID_MODELS = (
    Column("name", "s", "1", "name of the model"),
    Column("source", "s", "1", "file the model was read from; empty for one made in memory"),
    Column("source_hash", "s", "1", "sha256 of that file, or of the arrays of one made in memory"),
    Column("status", "s", "1", "complete, incomplete or failed"),
    Column("message", "s", "1", "why it is not complete; empty where it is"),
    Column("total_mass", "f", "g", "mass M of the star; NaN where it could not be read"),
    Column("photospheric_radius", "f", "cm", "radius R of the star; NaN as for M"),
    Column("gravitational_constant", "f", "cm3 g-1 s-2", "G of the model; NaN as for M"),
    Column("points", "i", "1", "points of the model; 0 where it could not be read"),
    Column("band_low", "f", "uHz", "lower end of the band asked for or chosen; NaN if none was"),
    Column("band_high", "f", "uHz", "upper end of the band asked for or chosen; NaN if none was"),
    Column("first_mode", "i", "1", "row of /modes where the modes of the model begin"),
    Column("mode_count", "i", "1", "modes of the model"),
    Column("doubts", "i", "1", "findings of severity doubt, of the model and of the run"),
    Column("defects", "i", "1", "findings of severity defect, of the model and of the run"),
)
#: Columns of ``/models`` on (model, degree): those of `CENSUS`; -1 and NaN where nothing was done.
GRID_CENSUS = tuple(column for column in CENSUS if column.name != "degree")
GRID_DEGREE = CENSUS[0]
MODEL_ROW = Column("model", "i", "1", "row of /models that the entry belongs to")
GRID_FINDINGS = (
    MODEL_ROW,
    Column("about", "s", "1", "star (what was read) or run (what the solver noticed)"),
    *FINDINGS,
)
#: Units of a parameter that came with the models.
UNITS_NOT_GIVEN = "not given"
