"""Every public file reads with the numbers that it states or obeys."""

from __future__ import annotations

import hashlib

import numpy as np
import pytest

from oscsolve.star.derive import derive_a_star, estimate_gravity
from oscsolve.star.formats import read_model

# File, points after reading, M (g), R (cm), G (cm^3 g^-1 s^-2), relative tolerance of G.
# M and R are stated in the files (solar units of 1.9892e33 g, 6.9598e10 cm, and of IAU 2015 over
# CODATA 2018, checked by the exact balance of the staggered cells); G: see the folder's README,
# and 6.67428e-8 (CODATA 2006) and 6.6743e-8 (CODATA 2018) are exact there.
OLD_R, OLD_M, NEW_R, NEW_M = 6.9598e10, 1.9892e33, 6.957e10, 1.3271244e26 / 6.6743e-8
FACTS = [
    ("solar/standard.fgong", 2482, 1.989e33, 6.959894677e10, 6.67232e-8, 1e-5),
    ("formats/wide.fgong", 1792, 1.98840987069805e33, 7.047038773603494e10, 6.6743e-8, 0.0),
    ("subgiant/structure-columns.txt", 2271, 2.167363142e33, 9.495433238e10, 6.67259e-8, 1e-5),
    ("giants/red-giant-columns.txt", 1224, OLD_M, 3.436545918899045 * OLD_R, 6.67428e-8, 1e-10),
    ("dwarfs/white-dwarf-columns.txt", 1199, 0.6079903184542459 * OLD_M,
     0.012052869811469019 * OLD_R, 6.67428e-8, 1e-10),
    ("dwarfs/main-sequence-columns.txt", 785, OLD_M, 1.0123173502173932 * OLD_R, 6.67428e-8, 1e-10),
    ("formats/profile-columns.txt", 1150, 4 * NEW_M, 21.977464931139153 * NEW_R, 6.6743e-8, 1e-10),
    ("formats/duplicate-radii.txt", 1335, 1.5370803e33, 1.1743269e13, 6.6703e-8, 1e-5),
]  # fmt: skip
FILES = [facts[0] for facts in FACTS]


@pytest.fixture(scope="module")
def stars(shared_data):
    return {name: read_model(shared_data / name) for name in FILES}


def codes(star):
    return {finding.code for finding in star.findings}


@pytest.mark.parametrize(("name", "points", "mass", "radius", "gravity", "tolerance"), FACTS)
def test_file_gives_stated_scales(stars, name, points, mass, radius, gravity, tolerance):
    star = stars[name]
    assert star.radius.size == points
    assert star.total_mass == pytest.approx(mass, rel=1e-12)
    assert star.photospheric_radius == pytest.approx(radius, rel=1e-12)
    assert star.gravitational_constant == pytest.approx(gravity, rel=max(tolerance, 1e-15))


@pytest.mark.parametrize("name", FILES)
def test_mass_is_the_integral_of_density(stars, name):
    star = stars[name]
    use = np.flatnonzero(np.diff(star.radius, prepend=-1.0) > 0)
    r, m, rho = star.radius[use], star.mass[use], star.density[use]
    # Trapezoid in r^3, exact for constant density: second order on meshes of 1000 points. Two
    # files keep 10 digits, and one (see its finding) has r and m scaled with different constants.
    total = m[0] + np.sum(2.0 * np.pi / 3.0 * (rho[1:] + rho[:-1]) * np.diff(r**3))
    assert total == pytest.approx(m[-1], rel=3e-3 if "duplicate" in name else 5e-4)
    # A cell below the first point of a centreless model is a uniform ball.
    if r[0] > 0.0:
        assert m[0] == pytest.approx(4.0 / 3.0 * np.pi * r[0] ** 3 * rho[0], rel=3e-2)
    assert np.all(np.diff(star.mass) >= -1e-9 * star.total_mass)
    assert star.mass[-1] == pytest.approx(star.total_mass, rel=1e-6)


@pytest.mark.parametrize("name", FILES)
def test_hydrostatic_balance_holds_with_the_constant_of_the_model(stars, name):
    star = stars[name]
    implied, _ = estimate_gravity(star.radius, star.mass, star.pressure, star.density)
    # Moving staggered cells to their centres is second order: 1e-4 on these meshes.
    assert implied == pytest.approx(star.gravitational_constant, rel=3e-4)


@pytest.mark.parametrize("name", FILES)
def test_source_is_recorded(stars, shared_data, name):
    star = stars[name]
    assert star.source == str(shared_data / name)
    assert star.source_hash == hashlib.sha256((shared_data / name).read_bytes()).hexdigest()
    assert star.name == name.rsplit("/")[-1].rsplit(".")[0]
    assert all(finding.message for finding in star.findings)


def test_standard_model_placeholder_becomes_a_centre(stars):
    star = stars["solar/standard.fgong"]
    assert {"centre-placeholder", "gravity-estimated", "order-reversed"} <= codes(star)
    assert star.radius[0] == star.mass[0] == star.a_star[0] == 0.0
    assert star.pressure[0] > star.pressure[1]
    assert star.fractional_radius[-1] == pytest.approx(1.000713, abs=1e-6)
    assert star.luminosity == 3.845997429e33
    assert star.hydrogen[-1] == 0.7372519637
    assert star.helium[-1] == pytest.approx(1 - 0.7372519637 - 0.01806165, abs=1e-15)


def test_wide_fields_keep_all_digits(stars):
    star = stars["formats/wide.fgong"]
    assert "gravity-read" in codes(star)
    assert star.radius[-1] == 7.050768976192303467e10
    assert star.pressure[0] == 2.378113836582104320e17
    assert star.gamma1[0] == 1.665345933409670742
    assert star.radius[0] == star.mass[0] == 0.0


@pytest.mark.parametrize("name", ["giants/red-giant-columns.txt", "dwarfs/white-dwarf-columns.txt",
                                  "dwarfs/main-sequence-columns.txt", "formats/profile-columns.txt",
                                  "formats/duplicate-radii.txt"])  # fmt: skip
def test_staggered_mesh_is_seen_and_centred(stars, name):
    star = stars[name]
    assert "mesh-staggered" in codes(star)
    # Cell centres: the outermost point lies below R, the innermost above the centre.
    assert star.radius[0] > 0.0
    assert star.radius[-1] <= star.photospheric_radius * (1 + 1e-15)


def test_node_mesh_is_left_alone(stars):
    star = stars["subgiant/structure-columns.txt"]
    assert "mesh-staggered" not in codes(star)
    assert star.radius[0] == pytest.approx(3.2867458449e-4 * 9.495433238e10, rel=1e-15)
    assert star.gamma1[0] == 1.6694848170
    assert star.brunt_n2[0] == 4.9121010420e-8
    assert star.effective_temperature == 5901.331
    assert star.hydrogen[-1] == 7.2498239474e-1
    assert star.helium[-1] == pytest.approx(1 - 7.2498239474e-1 - 2.7017200000e-2, abs=1e-15)


def test_buoyancy_of_the_subgiant_agrees_with_its_structure(stars):
    star = stars["subgiant/structure-columns.txt"]
    derived, _ = derive_a_star(
        star.radius, star.mass, star.pressure, star.density, star.gamma1,
        star.gravitational_constant, 1e-10,
    )  # fmt: skip
    inside = (star.fractional_radius > 0.01) & (star.fractional_radius < 0.65)
    off = np.abs(derived - star.a_star)[inside]
    # A* is about 0.7 there; two independent ways to it, differences of ten-digit numbers.
    assert np.median(off) < 1e-4


def test_buoyancy_of_staggered_profile_sits_on_faces(stars):
    finding = next(
        f for f in stars["formats/profile-columns.txt"].findings if f.code == "buoyancy-place"
    )
    assert "faces" in finding.message and finding.size < 0.02


def test_repeated_radii_are_rounding_not_jumps(stars):
    star = stars["formats/duplicate-radii.txt"]
    found = next(f for f in star.findings if f.code == "repeated-radii")
    assert found.size == 15.0 and found.place > 0.9999
    assert np.all(np.diff(star.radius) > 0.0)
    assert "density-jumps" not in codes(star)


def test_missing_gamma1_is_a_doubt_with_its_size(stars):
    for name, code in (
        ("giants/red-giant-columns.txt", "gamma1-electron-gas"),
        ("dwarfs/white-dwarf-columns.txt", "gamma1-electron-gas"),
        ("dwarfs/main-sequence-columns.txt", "gamma1-ideal-gas"),
    ):
        star = stars[name]
        finding = next(f for f in star.findings if f.code == code)
        assert finding.severity == "doubt"
        assert "a-star-derived" in codes(star)
        assert np.all((star.gamma1 > 4 / 3) & (star.gamma1 < 5 / 3))


def test_convection_zone_of_the_giant_is_nearly_neutral(stars):
    star = stars["giants/red-giant-columns.txt"]
    # Degenerate helium core: stably stratified; g modes need N^2 > 0 below the envelope.
    core = (star.mass > 0.05 * star.total_mass) & (star.mass < 0.15 * star.total_mass)
    assert np.all(star.brunt_n2[core] > 0.0)
    deep = (star.fractional_radius > 0.5) & (star.fractional_radius < 0.8)
    assert np.max(np.abs(star.a_star[deep])) < 0.05
