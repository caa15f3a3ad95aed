"""Makes the demo stars of this folder. Run from the repository: python models_demo/build_stars.py

The Lantern Field is an invented survey; its stars are made to order (`oscsolve.build_star`), not
observed and not computed with an evolution code. Masses, radii and temperatures are typical of the
kinds of pulsators that each star stands for.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np

import oscsolve
from oscsolve import Run, StarModel, build_star
from oscsolve.star.build import stratified_star
from oscsolve.units import SOLAR_MASS, SOLAR_RADIUS

FOLDER = Path(__file__).resolve().parent
#: Noise of the invented observations, uHz, their surface term at 3000 uHz, and the seed.
NOISE, SURFACE_TERM, SEED = 0.15, -4.0, 20260801


def made(
    number: int, *, mass: float, radius: float, points: int = 600, **asked: object
) -> StarModel:
    """A star by `build_star`, masses and radii in units of the Sun."""
    return build_star(
        mass=mass * SOLAR_MASS,
        radius=radius * SOLAR_RADIUS,
        points=points,
        name=f"lantern-{number} (invented)",
        **asked,  # type: ignore[arg-type]
    )


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


def lantern_2() -> StarModel:
    """A subgiant: condensed helium core, mixed modes."""
    return made(
        2, mass=1.2, radius=2.4, effective_temperature=5400.0,
        hydrogen=Run((0.0, 0.7), [(0.09, 0.14)]), convective_envelope=0.78, superadiabatic=0.8,
        opacity=0.15, gradient=Run((0.02, 0.25), [(0.08, 0.13)]), points=800,
    )  # fmt: skip


def lantern_4() -> StarModel:
    """An A-type dwarf in low-order p modes."""
    return made(
        4, mass=1.8, radius=1.9, effective_temperature=7900.0,
        hydrogen=Run((0.45, 0.7), [(0.14, 0.2)]), convective_core=0.14, opacity=0.5,
    )  # fmt: skip


def lantern_5() -> StarModel:
    """An F dwarf in high-order g modes."""
    return made(
        5, mass=1.5, radius=1.65, effective_temperature=7000.0,
        hydrogen=Run((0.4, 0.7), [(0.085, 0.13)]), convective_core=0.085,
        convective_envelope=0.95, opacity=0.4,
    )  # fmt: skip


def lantern_6() -> StarModel:
    """A slowly pulsating B star with a zone of graded composition."""
    return made(
        6, mass=4.0, radius=2.9, effective_temperature=14500.0,
        hydrogen=Run((0.45, 0.7), [(0.17, 0.25)]), convective_core=0.17, opacity=0.5,
    )  # fmt: skip


def lantern_7() -> StarModel:
    """A hotter B star in low-order p and g modes."""
    return made(
        7, mass=10.0, radius=5.5, effective_temperature=22500.0,
        hydrogen=Run((0.35, 0.7), [(0.22, 0.36)]), convective_core=0.22, opacity=0.4,
    )  # fmt: skip


def lantern_8() -> StarModel:
    """A supergiant radial pulsator."""
    return made(
        8, mass=6.0, radius=45.0, effective_temperature=5800.0,
        hydrogen=Run((0.0, 0.7), [(0.17, 0.2)]), convective_core=0.05, opacity=0.03,
    )  # fmt: skip


def lantern_9() -> StarModel:
    """A horizontal-branch radial pulsator."""
    return made(
        9, mass=0.65, radius=5.2, effective_temperature=6700.0,
        hydrogen=Run((0.0, 0.75), [(0.74, 0.76)]), metals=Run((0.3, 0.001), [(0.19, 0.21)]),
        convective_core=0.19, opacity=0.05,
    )  # fmt: skip


def lantern_10() -> StarModel:
    """A hot subdwarf."""
    return made(
        10, mass=0.47, radius=0.18, effective_temperature=29000.0,
        hydrogen=Run((0.0, 0.7), [(-3.0, -3.6)], "pressure"),
        metals=Run((0.5, 0.02), [(0.3, 0.32)]), convective_core=0.3, opacity=0.6,
    )  # fmt: skip


def lantern_12() -> StarModel:
    """A rapid oscillator among A stars."""
    return made(
        12, mass=1.75, radius=1.75, effective_temperature=7900.0,
        hydrogen=Run((0.5, 0.7), [(0.14, 0.2)]), convective_core=0.14, opacity=0.5,
    )  # fmt: skip


STARS: dict[str, Callable[[], StarModel]] = {
    "lantern-1.fgong": lantern_1,
    "lantern-2.h5": lantern_2,
    "lantern-4.h5": lantern_4,
    "lantern-5.h5": lantern_5,
    "lantern-6.h5": lantern_6,
    "lantern-7.h5": lantern_7,
    "lantern-8.h5": lantern_8,
    "lantern-9.h5": lantern_9,
    "lantern-10.h5": lantern_10,
    "lantern-12.h5": lantern_12,
}


def observed_list(star: StarModel) -> list[str]:
    """What a telescope that does not exist saw of a star: p modes with noise and a surface term."""
    modes = oscsolve.solve_modes(star, (0, 1, 2), (2000.0, 3900.0), surface="isothermal")
    term = SURFACE_TERM * (modes.nu / 3000.0) ** 4.9
    noise = np.random.default_rng(SEED).normal(0.0, NOISE, len(modes))
    lines = [
        "# invented: the p modes of lantern-1 with a surface term of "
        f"{SURFACE_TERM:g} uHz (nu / 3000 uHz)^4.9",
        f"# and Gaussian noise of {NOISE:g} uHz, seed {SEED}; made by build_stars.py",
        "degree,order,nu,nu_error",
    ]
    columns = zip(modes.degree, modes.order, modes.nu + term + noise, strict=True)
    return lines + [f"{degree},{order},{nu:.3f},{NOISE:g}" for degree, order, nu in columns]


def main() -> None:
    for name, make in STARS.items():
        oscsolve.write_model(make(), FOLDER / name, overwrite=True)
    lines = observed_list(oscsolve.read_model(FOLDER / "lantern-1.fgong"))
    (FOLDER / "lantern-1-observed.csv").write_text("\n".join(lines) + "\n")


if __name__ == "__main__":
    main()
