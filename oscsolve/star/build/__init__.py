"""Stars made here: exact ones to test on, and stars with a prescribed stratification."""

from oscsolve.star.build.layered import layered_sphere
from oscsolve.star.build.polytrope import polytrope, uniform_sphere
from oscsolve.star.build.runs import Run
from oscsolve.star.build.star import build_star
from oscsolve.star.build.stratified import stratified_star

__all__ = [
    "Run",
    "build_star",
    "layered_sphere",
    "polytrope",
    "stratified_star",
    "uniform_sphere",
]
