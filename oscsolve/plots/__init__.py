"""Figures of stars and their modes.

Each function draws on an Axes of matplotlib and returns it; `make_figure` makes the figure around
it and `save_figure` the file.
"""

from oscsolve.plots.coordinate import COORDINATES
from oscsolve.plots.echelle import frequency_echelle, period_echelle
from oscsolve.plots.eigenfunction import displacement_plot, energy_plot
from oscsolve.plots.figure import make_figure, save_figure
from oscsolve.plots.gallery import gallery
from oscsolve.plots.inertia import inertia_plot
from oscsolve.plots.kernel import (
    rotation_kernel_plot,
    running_kernel_plot,
    structure_kernel_plot,
)
from oscsolve.plots.match import match_plot
from oscsolve.plots.propagation import propagation_diagram
from oscsolve.plots.spacing import spacing_plot
from oscsolve.plots.style import colour, look, marker

__all__ = [
    "COORDINATES",
    "colour",
    "displacement_plot",
    "energy_plot",
    "frequency_echelle",
    "gallery",
    "inertia_plot",
    "look",
    "make_figure",
    "marker",
    "match_plot",
    "period_echelle",
    "propagation_diagram",
    "rotation_kernel_plot",
    "running_kernel_plot",
    "save_figure",
    "spacing_plot",
    "structure_kernel_plot",
]
