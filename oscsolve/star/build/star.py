"""Stars in hydrostatic balance from a prescribed temperature gradient and composition."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from oscsolve.errors import InputError, ModelError
from oscsolve.star.build.equations import Local, Recipe, StarEquations
from oscsolve.star.build.polytrope import polytrope
from oscsolve.star.build.relaxation import Trial, gauss, relax
from oscsolve.star.build.runs import Run
from oscsolve.star.findings import Finding
from oscsolve.star.model import StarModel
from oscsolve.units import NEWTON_G, SOLAR_MASS, SOLAR_RADIUS, STEFAN_BOLTZMANN

#: Optical depth of the outermost point.
_TOP = 1e-3
#: Cells on the way to a star, whose nodes move with the solution.
_CELLS = 120
#: Change of an unknown at which a star on the way is good enough; the next step squares it.
_ROUGH = 1e-4
#: First and smallest part of the way from a plain star to the one wanted.
_FIRST_STRIDE, _SMALLEST_STRIDE = 0.25, 1e-3
#: Weights with which points are spread: r, s, ln rho, m, int N dr/r, dlnT/dlnP, X and Z.
_SPREAD = np.array([1.0, 1.0, 0.5, 0.5, 1.0, 0.6, 0.6, 0.6])
#: A gradient above nabla_ad by this where convection is not asked for is worth a finding.
_UNSTABLE = 1e-3


def build_star(
    *,
    mass: float = SOLAR_MASS,
    radius: float = SOLAR_RADIUS,
    effective_temperature: float = 5772.0,
    hydrogen: float | Run = 0.7,
    metals: float | Run = 0.02,
    gradient: float | Run = 0.25,
    convective_core: float = 0.0,
    convective_envelope: float = 1.0,
    convection: Sequence[Run] = (),
    opacity: float = 0.3,
    superadiabatic: float = 0.3,
    points: int = 1000,
    gravitational_constant: float = NEWTON_G,
    name: str = "prescribed star",
) -> StarModel:
    """A star of given mass, radius and effective temperature, made to order without evolution.

    A tool for experiments: what does a sharper step of composition do to the period spacing,
    where do modes go when a convection zone grows? The temperature gradient and the composition
    are what you say, whatever a real star of that age would have; the rest follows from the
    gas and from hydrostatic balance.

    Parameters
    ----------
    mass, radius, effective_temperature : M and R in g and cm, T in K at R
    hydrogen, metals : mass fractions X and Z, the same everywhere or a `Run`; the rest is helium
    gradient : shape of the run of dlnT/dlnP where heat is radiated. Its level is found: the one
        multiple of it that leads from the surface to a regular centre. A number asks for a
        uniform gradient, whatever the number.
    convective_core : m/M up to which the centre is convective
    convective_envelope : r/R from which on the envelope is convective; 1 for none
    convection : further convective layers, runs from 0 to 1 and back
    opacity : cm^2 g^-1 in the atmosphere; a larger one puts the photosphere at lower pressure
    superadiabatic : excess over the adiabatic gradient at the top of a convective envelope
    points : number of points, at least 200
    gravitational_constant : cm^3 g^-1 s^-2
    name : name of the star

    Returns
    -------
    StarModel
        P, rho, m, r obey the equations of structure to 1e-10, and Gamma1 and A* follow from the
        same gas in closed form. With temperature, composition and luminosity. A finding tells
        the level of the gradient.

    Raises
    ------
    InputError
        A number is out of its range, or the fractions of hydrogen and metals exceed one.
    ModelError
        No such star was found.

    Notes
    -----
    dP/dr = -G m rho/r^2, dm/dr = 4 pi r^2 rho, dlnT/dlnP = nabla. In the atmosphere T^4 =
    (3/4) T_eff^4 (tau + 2/3) (Eddington 1926), P = P_rad(0) + g tau/opacity, out to tau = 0.001; R
    is at tau = 2/3. In convection zones nabla = nabla_ad + 1e-6 except near the surface. The gas:
    ideal ions, partial ionisation of hydrogen and helium, electrons of any degeneracy,
    radiation (see `oscsolve.star.ionisation` for limits: no molecules, no Coulomb interaction).
    Steps of composition are always continuous, however sharp.

        A*/V = [chi_T (nabla_ad - nabla) - (dlnP/dX) dX/dlnP - (dlnP/dZ) dZ/dlnP]/chi_rho

    Solved by Gauss collocation (`relaxation.py`), from a plain star of the same mass, which is
    turned into the one wanted in as many strides as that takes.

    Examples
    --------
    >>> import oscsolve
    >>> star = oscsolve.build_star(convective_envelope=0.72, points=300)
    >>> zones = oscsolve.inspect_model(star).figures.convective_zones
    >>> [round(float(edge), 2) for edge in zones[0]]
    [0.72, 1.0]
    """
    numbers = {
        "mass": mass,
        "radius": radius,
        "effective_temperature": effective_temperature,
        "opacity": opacity,
        "gravitational_constant": gravitational_constant,
    }
    _check_numbers(numbers, convective_core, convective_envelope, superadiabatic, points)
    recipe = Recipe(
        mass=mass,
        radius=radius,
        temperature=effective_temperature,
        opacity=opacity,
        superadiabatic=superadiabatic,
        hydrogen=_run(hydrogen),
        metals=_run(metals),
        gradient=_run(gradient),
        convection=(*_zones(convective_core, convective_envelope), *convection),
        gravity=gravitational_constant,
    )
    _check_runs(recipe)
    return _model(recipe, _solve(recipe, points), name)


def _run(value: float | Run) -> Run:
    return value if isinstance(value, Run) else Run((value,))


def _zones(core: float, envelope: float) -> list[Run]:
    """Convective core and envelope, with borders a hundredth of their depth wide."""
    zones = []
    if core > 0.0:
        zones.append(Run((1.0, 0.0), ((0.99 * core, 1.01 * core),)))
    if envelope < 1.0:
        half = 0.005 * min(envelope, 1.0 - envelope)
        zones.append(Run((0.0, 1.0), ((envelope - half, envelope + half),), "radius"))
    return zones


def _check_numbers(
    numbers: dict[str, float], core: float, envelope: float, superadiabatic: float, points: int
) -> None:
    for name, value in numbers.items():
        if not (math.isfinite(value) and value > 0.0):
            raise InputError(f"{name} of a star must be above zero; got {value:g}")
    if not 0.0 <= core < 1.0:
        raise InputError(f"convective_core is m/M, from 0 to below 1; got {core:g}")
    if not 0.0 < envelope <= 1.0:
        raise InputError(f"convective_envelope is r/R, above 0 and up to 1; got {envelope:g}")
    if not superadiabatic >= 0.0:
        raise InputError(f"superadiabatic must not be below zero; got {superadiabatic:g}")
    if points < 200:
        raise InputError(f"a star needs at least 200 points; got {points}")


def _check_runs(recipe: Recipe) -> None:
    for name, run in (("hydrogen", recipe.hydrogen), ("metals", recipe.metals)):
        if not (min(run.values) >= 0.0 and max(run.values) <= 1.0):
            raise InputError(f"{name} is a mass fraction, from 0 to 1; got {run.values}")
    if not min(recipe.gradient.values) >= 0.0 or not max(recipe.gradient.values) > 0.0:
        raise InputError(f"gradient must be above zero; got {recipe.gradient.values}")
    for run in recipe.convection:
        if not (min(run.values) >= 0.0 and max(run.values) <= 1.0):
            raise InputError(f"a run of convection goes from 0 to 1; got {run.values}")


def _solve(recipe: Recipe, points: int) -> tuple[StarEquations, Trial]:
    """The star on its final points."""
    done, stride = 0.0, _FIRST_STRIDE
    trial = _relaxed(_between(recipe, 0.0), _first_trial(_between(recipe, 0.0)))
    while done < 1.0:
        ahead = min(1.0, done + stride)
        try:
            trial = _relaxed(_between(recipe, ahead), trial)
        except ModelError as error:
            stride *= 0.5
            if stride < _SMALLEST_STRIDE:
                raise ModelError(
                    f"no star of this mass, radius, temperature and run of gradients was found: "
                    f"from a plain star of the same mass the way leads {100 * done:.0f} percent "
                    "of the distance; change one of them"
                ) from error
            continue
        done, stride = ahead, 1.5 * stride
    for cells in (_CELLS, points - 1):
        trial = _relaxed(recipe, trial, cells)
    return StarEquations(recipe), relax(StarEquations(recipe), trial)


def _relaxed(recipe: Recipe, trial: Trial, cells: int = _CELLS) -> Trial:
    equations = StarEquations(recipe)
    return relax(equations, _spread(equations, trial, cells), _ROUGH)


def _between(recipe: Recipe, part: float) -> Recipe:
    """A recipe on the way from a plain star of the same mass to the one wanted."""
    if part == 1.0:
        return recipe

    def towards(first: float, last: float) -> float:
        return float(first ** (1.0 - part) * last**part)

    def blend(run: Run, plain: float) -> Run:
        values = tuple(plain + part * (value - plain) for value in run.values)
        return replace(run, values=values)

    suns = recipe.mass / SOLAR_MASS
    return replace(
        recipe,
        radius=towards(SOLAR_RADIUS * suns**0.7, recipe.radius),
        temperature=towards(6000.0 * suns**0.5, recipe.temperature),
        opacity=towards(0.3, recipe.opacity),
        superadiabatic=part * recipe.superadiabatic,
        hydrogen=blend(recipe.hydrogen, 0.7),
        metals=blend(recipe.metals, 0.02),
        gradient=blend(recipe.gradient, max(recipe.gradient.values)),
        convection=tuple(blend(run, 0.0) for run in recipe.convection),
    )


def _first_trial(recipe: Recipe) -> Trial:
    """A polytrope of index 3, with a temperature that is a power of pressure."""
    star = polytrope(3, mass=recipe.mass, radius=recipe.radius)
    ln_centre = float(np.log(star.pressure[0]))
    depth = ln_centre - float(np.log(recipe.photospheric_pressure))
    inside = (star.pressure > 0.0) & (star.radius > 0.0)
    s = ln_centre - np.log(star.pressure[inside])
    z = np.linspace(0.0, 1.0, _CELLS + 1) ** 1.2
    nodes = np.append(z * depth, depth + _above(recipe, z.size // 10))
    central = np.log(
        2.0
        * star.pressure[0]
        / (recipe.gravity * star.density[0])
        / (4.0 * np.pi / 3.0 * star.density[0])
    )
    a = np.interp(nodes, s, 2.0 * np.log(star.radius[inside]) - np.log(s))
    a[0] = central
    b = np.interp(nodes, s, np.log(star.mass[inside] / star.radius[inside] ** 3))
    b[0] = np.log(4.0 * np.pi / 3.0 * star.density[0])
    hot = np.log(0.6 * star.pressure[0] / (8.3145e7 * star.density[0]))
    cool = np.log(recipe.temperature)
    c = cool + (hot - cool) * np.maximum(1.0 - nodes / depth, 0.0)
    # Above the photosphere T^4 = (3/4) T_eff^4 (tau + 2/3), or radiation would outweigh the gas.
    c[z.size :] = cool + 0.25 * np.log(0.75 * (_depths(nodes.size - z.size) + 2.0 / 3.0))
    shape = max(recipe.gradient.values)
    y = np.stack((a, b, c), axis=1)
    above = nodes[z.size :] - depth
    return Trial(z, above, y, _stages(nodes, y), depth, float((hot - cool) / depth / shape))


def _above(recipe: Recipe, cells: int) -> np.ndarray:
    """ln of the fall of pressure from the photosphere, at nodes up to the outermost."""
    base, tau = recipe.radiation_above, _depths(cells)
    pressure = base + (recipe.photospheric_pressure - base) * 1.5 * tau
    return np.log(recipe.photospheric_pressure / pressure)


def _depths(cells: int) -> np.ndarray:
    """Optical depths of the nodes above the photosphere."""
    return np.geomspace(2.0 / 3.0, _TOP, cells + 1)[1:]


def _stages(s: np.ndarray, y: np.ndarray) -> np.ndarray:
    """Values at the Gauss points, linear between the nodes."""
    nodes = gauss()[0]
    return y[:-1, None] + nodes[None, :, None] * np.diff(y, axis=0)[:, None]


def _spread(equations: StarEquations, trial: Trial, cells: int) -> Trial:
    """The trial on new nodes, which crowd where something changes."""
    recipe = equations.recipe
    # The trial may be of another recipe; its pressures and places are near enough.
    s, y = _fine(trial)
    ln_p = equations.ln_photosphere + trial.depth - s
    floor = np.log(recipe.radiation_above * (1.0 + 1e-9) + 1e-300)
    at = equations.local(np.maximum(ln_p, floor), s, y, trial.level)
    place = _places(at, s, recipe)
    photosphere = int(np.argmin(np.abs(s - trial.depth)))
    inner = max(20, round(cells * place[photosphere] / place[-1]))
    inner = min(inner, cells - 10)
    new = np.interp(np.linspace(0.0, place[photosphere], inner + 1), place, s)
    z = new / trial.depth
    z[0], z[-1] = 0.0, 1.0
    above = _above(recipe, cells - inner)
    nodes = np.append(z * trial.depth, trial.depth + above)
    fine = _interpolate(s, y, nodes)
    gauss_places = nodes[:-1, None] + np.diff(nodes)[:, None] * gauss()[0]
    stages = _interpolate(s, y, gauss_places.ravel()).reshape(cells, -1, 3)
    return Trial(z, above, fine, stages, trial.depth, trial.level)


def _fine(trial: Trial) -> tuple[np.ndarray, np.ndarray]:
    """s and y at nodes and Gauss points together."""
    s = trial.s
    nodes = gauss()[0]
    inner = s[:-1, None] + np.diff(s)[:, None] * nodes
    places = np.append(np.concatenate((s[:-1, None], inner), axis=1).ravel(), s[-1])
    y = np.concatenate((trial.y[:-1, None], trial.stages), axis=1).reshape(-1, 3)
    return places, np.concatenate((y, trial.y[-1:]))


def _interpolate(s: np.ndarray, y: np.ndarray, places: np.ndarray) -> np.ndarray:
    # Imported here: the import takes longer than many a command.
    from scipy.interpolate import PchipInterpolator

    return PchipInterpolator(s, y, axis=0, extrapolate=True)(places)


def _places(at: Local, s: np.ndarray, recipe: Recipe) -> np.ndarray:
    """Rising measure of which every cell gets the same."""
    r = at.r / recipe.radius
    with np.errstate(divide="ignore", invalid="ignore"):
        v = recipe.gravity * at.m * np.exp(at.gas.ln_rho - at.ln_p) / at.r
        buoyancy = np.sqrt(np.maximum(at.excess * v, 0.0) * at.m / at.r**3)
    buoyancy[0] = 0.0
    ln_r = np.log(np.maximum(r, r[1]))
    waves = np.append(0.0, np.cumsum(0.5 * (buoyancy[1:] + buoyancy[:-1]) * np.diff(ln_r)))
    columns = [r, s, at.gas.ln_rho, at.m / recipe.mass, waves, at.nabla, at.hydrogen, at.metals]
    steps = np.abs(np.diff(np.stack(columns), axis=1))
    total = np.sum(steps, axis=1)
    # What hardly changes deserves no points.
    share = np.divide(steps, np.maximum(total, 0.02)[:, None])
    share[4] = steps[4] / total[4] if total[4] > 0.0 else 0.0
    share[0] = steps[0] / total[0]
    return np.append(0.0, np.cumsum(_SPREAD @ share))


def _model(recipe: Recipe, solved: tuple[StarEquations, Trial], name: str) -> StarModel:
    equations, trial = solved
    s = trial.s
    at = equations.local(equations.ln_photosphere + trial.depth - s, s, trial.y, trial.level)
    r = at.r.copy()
    r[trial.z.size - 1] = recipe.radius
    density, pressure = np.exp(at.gas.ln_rho), np.exp(at.ln_p)
    v = np.divide(
        recipe.gravity * at.m * density, r * pressure, out=np.zeros_like(r), where=r > 0.0
    )
    surface = 4.0 * np.pi * recipe.radius**2 * STEFAN_BOLTZMANN * recipe.temperature**4
    return StarModel(
        radius=r,
        mass=at.m,
        pressure=pressure,
        density=density,
        gamma1=at.gas.gamma1,
        a_star=v * at.excess,
        total_mass=recipe.mass,
        photospheric_radius=recipe.radius,
        gravitational_constant=recipe.gravity,
        name=name,
        temperature=np.exp(trial.y[:, 2]),
        hydrogen=at.hydrogen,
        helium=1.0 - at.hydrogen - at.metals,
        effective_temperature=recipe.temperature,
        luminosity=surface,
        findings=tuple(_findings(recipe, at, trial.level)),
    )


def _findings(recipe: Recipe, at: Local, level: float) -> list[Finding]:
    shape = recipe.gradient.values
    low, high = level * min(shape), level * max(shape)
    values = f"{low:.4g}" if low == high else f"{low:.4g} to {high:.4g}"
    return [
        Finding(
            "note",
            "gradient-level",
            f"dlnT/dlnP is {values} where heat is radiated: the level that closes the star",
            size=level,
        )
    ]
