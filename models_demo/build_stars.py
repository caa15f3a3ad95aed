"""Makes the demo stars of this folder. Run from the repository: python models_demo/build_stars.py

The Lantern Field is an invented survey; its stars are made by formula, not observed and not
computed with an evolution code.
"""

from __future__ import annotations

from pathlib import Path

from oscsolve.star.build import stratified_star
from oscsolve.star.formats import write_model
from oscsolve.star.model import StarModel
from oscsolve.units import SOLAR_MASS, SOLAR_RADIUS


def lantern_1() -> StarModel:
    """A Sun-like dwarf: condensed core, radiative interior, convective envelope, atmosphere."""
    return stratified_star(
        [(0.0, 0.90), (2.0, 0.78), (7.0, 0.60), (24.0, 0.95)],
        photosphere=25.0,
        outermost=29.0,
        mass=SOLAR_MASS,
        radius=SOLAR_RADIUS,
        points=800,
        name="lantern-1 (invented)",
    )


def main() -> None:
    folder = Path(__file__).resolve().parent
    write_model(lantern_1(), folder / "lantern-1.fgong", overwrite=True)


if __name__ == "__main__":
    main()
