"""Every public file gets the findings that its description predicts, and no false alarm."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve.star.inspection import inspect_model
from oscsolve.star.integrals import large_separation, period_spacing

#: File: doubts, and notes beyond those that any file may have; no file has a defect.
# From README.md beside the files, and, where that is silent, from the columns themselves.
PREDICTED = {
    "solar/standard.fgong": (set(), {"centre-placeholder", "gravity-estimated", "order-reversed"}),
    "formats/wide.fgong": (set(), {"gravity-read", "mass-saturated"}),
    "subgiant/structure-columns.txt": (
        set(),
        {"gravity-estimated", "centre-missing", "mass-saturated", "units-assumed"},
    ),
    "giants/red-giant-columns.txt": (
        {"gamma1-electron-gas", "mesh-coarse"},
        {"mesh-staggered", "a-star-derived", "a-star-thermal", "order-reversed"},
    ),
    "dwarfs/white-dwarf-columns.txt": (
        {"gamma1-electron-gas"},
        {"mesh-staggered", "a-star-derived", "a-star-thermal", "order-reversed"},
    ),
    "dwarfs/main-sequence-columns.txt": (
        {"gamma1-ideal-gas"},
        {"mesh-staggered", "a-star-derived", "order-reversed"},
    ),
    "formats/profile-columns.txt": (
        set(),
        {"mesh-staggered", "buoyancy-place", "density-inversion", "order-reversed"},
    ),
    "formats/duplicate-radii.txt": (
        {"gamma1-ideal-gas", "a-star-derived", "mesh-coarse", "units-assumed"},
        {"repeated-radii", "mesh-staggered", "density-inversion"},
    ),
}


@pytest.fixture(scope="module")
def inspected(shared_data):
    stars = {name: oscsolve.read_model(shared_data / name) for name in PREDICTED}
    return {name: (star, inspect_model(star)) for name, star in stars.items()}


@pytest.mark.parametrize("name", PREDICTED)
def test_file_gets_what_is_predicted(inspected, name):
    doubts, notes = PREDICTED[name]
    _, inspection = inspected[name]
    assert {f.code for f in inspection if f.severity == "defect"} == set()
    assert {f.code for f in inspection if f.severity == "doubt"} == doubts
    assert notes <= {f.code for f in inspection}
    assert all(f.advice for f in inspection if f.severity != "note")


@pytest.mark.parametrize("name", PREDICTED)
def test_implied_gravity_is_shown(inspected, name):
    star, inspection = inspected[name]
    # Staggered files hold the balance to second order once moved to cell centres.
    assert inspection.figures.gravity_implied == pytest.approx(
        star.gravitational_constant, rel=1e-4
    )


def test_base_of_the_solar_convection_zone(inspected):
    (zone,) = inspected["solar/standard.fgong"][1].figures.convective_zones
    # 0.713 +- 0.003 R: Christensen-Dalsgaard, Gough & Thompson 1991, ApJ 378, 413 (from sound
    # speed inversions).
    assert zone[0] == pytest.approx(0.713, abs=0.003)
    assert zone[1] == pytest.approx(1.0, abs=1e-3)


def test_large_separation_of_the_sun_is_the_observed_one(inspected, shared_data):
    table = np.genfromtxt(
        shared_data / "solar/observed-low-degree.csv", delimiter=",", comments="#", skip_header=2
    )
    degree, order, nu = table[:, 0], table[:, 1], table[:, 2]
    radial = (degree == 0) & (order >= 16) & (order <= 28)
    observed = np.polyfit(order[radial], nu[radial], 1)[0]
    # What is seen at order n_max is smaller than the asymptotic value by 0.57/n_max (Mosser et
    # al. 2013, A&A 550, A126, eq. 26; quoted from memory), and n_max = 22 in the Sun.
    asymptotic = observed * (1.0 + 0.57 / 22.0)
    # 1.5 percent: the atmosphere alone, which reflects at a height that depends on frequency,
    # holds 2 percent of the integral.
    assert inspected["solar/standard.fgong"][1].figures.large_separation == pytest.approx(
        asymptotic, rel=0.015
    )


def test_large_separation_of_the_subgiant_is_the_one_in_its_header(inspected, shared_data):
    # "Delta Nu" of the header, computed by the evolution code on the whole model.
    text = (shared_data / "subgiant/structure-columns.txt").read_text(encoding="latin-1")
    line = next(line for line in text.splitlines() if "Delta Nu" in line)
    header = float(line.split()[-2])
    star = inspected["subgiant/structure-columns.txt"][0]
    # The code's trapezoidal rule, to the outermost point as here.
    assert large_separation(star) == pytest.approx(header, rel=5e-4)


def test_mean_period_spacing_of_the_white_dwarf(inspected):
    star, _ = inspected["dwarfs/white-dwarf-columns.txt"]
    spacing = period_spacing(star, 1)
    modes = oscsolve.solve_modes(star, (1,), (19.5 * spacing, 50.5 * spacing), unit="s")
    # Composition steps trap modes, so single spacings scatter by half; the mean is left.
    mean = -np.polyfit(modes.order, modes.period, 1)[0]
    assert mean == pytest.approx(spacing, rel=0.03)


def test_gamma1_of_the_white_dwarf_softens_inward(inspected):
    star, _ = inspected["dwarfs/white-dwarf-columns.txt"]
    core = star.mass < 0.99 * star.total_mass
    assert np.all(np.diff(star.gamma1[core]) > 0.0)
    # Chandrasekhar 1939, ch. X and XI: a cold gas has Gamma1 = y^5/(9 p0 sqrt(1 + y^2)); y from
    # the density at two nucleons an electron, p0 by its closed form.
    y = np.cbrt(star.density[core] / 2.0 / 9.739e5)
    p0 = (y * (2 * y**2 - 3) * np.sqrt(1 + y**2) + 3 * np.arcsinh(y)) / 24
    cold = y**5 / (9 * p0 * np.sqrt(1 + y**2))
    # The core holds a little neon-22, and ions carry a few 1e-4 of the pressure.
    np.testing.assert_allclose(star.gamma1[core], cold, rtol=5e-4)


def test_white_dwarf_core_is_stable_by_its_temperature(inspected):
    star, _ = inspected["dwarfs/white-dwarf-columns.txt"]
    core = star.fractional_radius < 0.4
    v = star.gravitational_constant * star.mass * star.density / (star.radius * star.pressure)
    excess = (star.a_star / v)[core]
    # Isothermal: A*/V = chi_T nabla_ad/chi_rho, chi_T = P_ion/P nearly; 1e-5 for eta of 5000.
    assert np.all((excess > 1e-6) & (excess < 1e-4))


@pytest.mark.parametrize("name", PREDICTED)
@pytest.mark.parametrize("ending", ["fgong", "h5"])
def test_writing_a_model_and_reading_it_raises_no_new_alarm(inspected, tmp_path, name, ending):
    star, inspection = inspected[name]
    path = tmp_path / f"copy.{ending}"
    oscsolve.write_model(star, path)
    again = inspect_model(oscsolve.read_model(path))
    alarms = {f.code for f in again if f.severity != "note"}
    assert alarms <= {f.code for f in inspection if f.severity != "note"}
