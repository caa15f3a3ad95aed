"""Stars made here: exact ones to test on, and stars with a prescribed stratification."""

from oscsolve.star.build.layered import layered_sphere
from oscsolve.star.build.polytrope import polytrope, uniform_sphere
from oscsolve.star.build.stratified import stratified_star

__all__ = ["layered_sphere", "polytrope", "stratified_star", "uniform_sphere"]
