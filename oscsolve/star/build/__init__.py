"""Stars made here: exact ones to test on, and demo stars."""

from oscsolve.star.build.polytrope import polytrope, uniform_sphere

__all__ = ["polytrope", "uniform_sphere"]
