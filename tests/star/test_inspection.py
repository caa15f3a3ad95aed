"""One test a finding: a good star is spoiled in memory, and the inspection says what was done."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve.star.balance import measure_balance
from oscsolve.star.findings import Finding
from oscsolve.star.inspection import convective_zones, inspect_model
from oscsolve.units import SOLAR_MASS


@pytest.fixture(scope="module")
def star():
    return oscsolve.polytrope(3)


def found(star, code, **options):
    """The one finding of that code."""
    matches = [f for f in inspect_model(star, **options) if f.code == code]
    assert len(matches) == 1, [f.code for f in inspect_model(star, **options)]
    return matches[0]


def codes(star, severities=("doubt", "defect"), **options):
    return {f.code for f in inspect_model(star, **options) if f.severity in severities}


def changed(star, **columns):
    """The star with columns replaced by functions of themselves, A* kept."""
    return star.with_changes(**{name: f(getattr(star, name)) for name, f in columns.items()})


@pytest.mark.parametrize("index", [1.5, 2, 3, 4, 4.5])
def test_a_good_polytrope_gives_notes_only(index):
    inspection = inspect_model(oscsolve.polytrope(index))
    assert {f.severity for f in inspection} == {"note"}
    assert inspection.usable


def test_inspection_is_a_sequence_of_findings_worst_first(star):
    spoiled = changed(star, mass=lambda m: 1.2 * m).with_findings(Finding("doubt", "mine", "odd"))
    inspection = inspect_model(spoiled)
    severities = [finding.severity for finding in inspection]
    assert len(inspection) == len(severities) == len(inspection.findings)
    assert severities == sorted(severities, key=["defect", "doubt", "note"].index)
    assert "mine" in {finding.code for finding in inspection}
    assert not inspection.usable


def test_public_name_is_the_same_function():
    assert oscsolve.inspect_model is inspect_model


# Mass against density: each mistake is recognised as what it is.
@pytest.mark.parametrize(
    ("mistake", "words"),
    [
        (lambda m, total: m / total, "fractions of the total mass"),
        (lambda m, total: m / SOLAR_MASS, "solar masses"),
        (lambda m, total: m / 1e3, "kg"),
        (lambda m, total: np.append(m[0], np.diff(m)), "mass of each shell"),
        (lambda m, total: np.maximum(total - m, 1e-6 * total), "mass above each point"),
        (lambda m, total: np.log10(np.maximum(m, 10.0)), "decimal logarithm"),
    ],
)
def test_a_wrong_mass_column_is_recognised(mistake, words):
    # Two solar masses: fractions and solar masses are told apart.
    star = oscsolve.polytrope(3, mass=2.0 * SOLAR_MASS)
    # The points near the edge, where shells weigh nothing, are left out.
    keep = slice(1, int(np.searchsorted(star.mass, 0.999999 * star.mass[-1])))
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    columns = {name: getattr(star, name)[keep] for name in names}
    columns["mass"] = mistake(columns["mass"], star.total_mass)
    finding = found(star.with_changes(**columns), "mass-mismatch")
    assert finding.severity == "defect"
    assert words in finding.message
    assert "the mass is wrong" in finding.message


def test_a_slightly_scaled_mass_is_a_doubt_with_its_factor(star):
    finding = found(changed(star, mass=lambda m: 1.01 * m), "mass-mismatch")
    assert finding.severity == "doubt"
    # The sum over shells is good to 3e-5.
    factor = float(finding.message.split(" times ")[0].split()[-1])
    assert factor == pytest.approx(1.01, abs=1e-4)
    assert finding.size == pytest.approx(0.01, rel=0.01)


def test_a_wrong_density_is_not_blamed_on_the_mass(star):
    finding = found(changed(star, density=lambda rho: 1.3 * rho), "mass-mismatch")
    assert "the mass is wrong" not in finding.message


def test_a_saturated_mass_is_a_note(star):
    top = star.mass.copy()
    x = star.fractional_radius
    top[x > 0.9] = star.mass[-1]
    finding = found(star.with_changes(mass=top), "mass-saturated")
    assert finding.severity == "note"
    assert 0.89 < finding.place < 0.91
    assert finding.size == pytest.approx(float(np.interp(0.1, 1 - x[::-1], 1 - star.mass[::-1]
                                                          / star.mass[-1])), rel=0.02)  # fmt: skip


def test_broken_hydrostatic_balance_is_located(star):
    x = star.fractional_radius
    bump = 1.0 + 0.3 / (1.0 + np.exp(-(x - 0.4) / 0.01))
    finding = found(changed(star, pressure=lambda p: p * bump), "hydrostatic-balance")
    assert finding.severity in ("doubt", "defect")
    assert finding.place == pytest.approx(0.4, abs=0.03)
    # ln 1.3 within the group of cells in which ln P would fall by a few tenths.
    assert finding.size > 0.1


def test_good_balance_is_a_note_with_its_size(star):
    finding = found(star, "hydrostatic-balance")
    assert finding.severity == "note"
    assert finding.size < 1e-4


@pytest.mark.parametrize(("factor", "severity"), [(1.0 + 5e-4, "doubt"), (1.1, "defect")])
def test_the_implied_gravity_is_held_against_the_one_in_use(star, factor, severity):
    gravity = factor * star.gravitational_constant
    finding = found(star.with_changes(gravitational_constant=gravity), "gravity-mismatch")
    assert finding.severity == severity
    assert finding.size == pytest.approx(1.0 - 1.0 / factor, rel=0.1)
    assert "6.6743" in finding.message
    assert found_figures(star).gravity_implied == pytest.approx(6.6743e-8, rel=1e-6)


def found_figures(star):
    return inspect_model(star).figures


def test_a_mismatch_that_the_reader_told_is_not_told_twice(star):
    told = Finding("doubt", "gravity-mismatch", "told by the reader")
    spoiled = star.with_changes(gravitational_constant=6.7e-8).with_findings(told)
    assert found(spoiled, "gravity-mismatch") is told or found(spoiled, "gravity-mismatch") == told


@pytest.mark.parametrize(
    ("mistake", "severity"),
    [
        (lambda a: -a, "defect"),  # sign
        (lambda a: 1.3 * a, "doubt"),  # unit
        (lambda a: np.zeros_like(a), "doubt"),  # left out
    ],
)
def test_buoyancy_that_contradicts_the_structure_is_found(star, mistake, severity):
    finding = found(changed(star, a_star=mistake), "buoyancy-mismatch")
    assert finding.severity == severity


def test_local_error_of_the_buoyancy_is_located(star):
    x = star.fractional_radius
    v = star.a_star / 0.15  # n = 3, Gamma1 = 5/3: A*/V = 3/4 - 3/5.
    spoiled = star.with_changes(a_star=star.a_star + np.where(np.abs(x - 0.5) < 0.06, v, 0.0))
    finding = found(spoiled, "buoyancy-mismatch")
    assert finding.place == pytest.approx(0.5, abs=0.06)


def test_rounding_of_a_fine_mesh_is_no_contradiction(star):
    # Ten digits, and points so close that single differences of ln rho are noise.
    x = star.fractional_radius
    fine = np.unique(np.concatenate((x, np.linspace(1e-3, 0.05, 1500))))
    columns = {
        name: np.interp(fine, x, getattr(star, name))
        for name in ("mass", "pressure", "density", "gamma1", "a_star")
    }
    exact = star.with_changes(radius=fine * star.photospheric_radius, **columns)
    rounded = exact.with_changes(
        **{
            name: np.array([float(f"{v:.9e}") for v in getattr(exact, name)])
            for name in ("pressure", "density")
        }
    )
    assert "buoyancy-mismatch" not in codes(rounded)
    assert "hydrostatic-balance" not in codes(rounded)


def test_columns_that_no_sound_speed_joins_are_a_defect(star):
    rng = np.random.default_rng(1)
    noisy = changed(star, mass=lambda m: m * np.exp(8 * rng.random(m.size)))
    inspection = inspect_model(noisy)
    assert "structure-broken" in {f.code for f in inspection if f.severity == "defect"}
    assert np.isnan(inspection.figures.large_separation)


@pytest.mark.parametrize("gamma1", [0.9, 1.8])
def test_gamma1_outside_the_range_of_gases_is_found(star, gamma1):
    values = star.gamma1.copy()
    values[400:410] = gamma1
    finding = found(star.with_changes(gamma1=values), "gamma1-range")
    assert finding.severity == "doubt"
    assert "at 10 of" in finding.message
    assert star.fractional_radius[400] <= finding.place <= star.fractional_radius[409]


def test_gamma1_below_four_thirds_is_called_unstable(star):
    assert "gamma1-low" in codes(oscsolve.polytrope(3, gamma1=1.3))
    assert "gamma1-low" not in codes(oscsolve.polytrope(3, gamma1=1.34))


def test_a_band_too_high_for_the_mesh_is_found_with_its_place(star):
    assert "mesh-coarse" not in codes(star, band=(500, 3000))
    finding = found(star, "mesh-coarse", band=(1, 3000), degrees=(2,))
    assert finding.severity == "doubt"
    assert finding.size < 4.0
    # g modes of 1 uHz crowd where N/r is largest: deep inside.
    assert finding.place < 0.5
    assert "l = 2" in finding.message and "1 uHz" in finding.message
    coarse = inspect_model(star, band=(1, 3000), degrees=(2,)).points_per_wavelength
    assert coarse == finding.size


def test_points_per_wavelength_follow_the_wavenumber():
    # A uniform sphere has c^2 = Gamma1 (1 - x^2)/2 (G = M = R = 1): radial waves by hand.
    star = oscsolve.uniform_sphere()
    sigma2 = 5000.0
    nu = np.sqrt(sigma2) * star.nu_dynamical
    x = star.fractional_radius[1:-1]
    middle, h = 0.5 * (x[1:] + x[:-1]), np.diff(x)
    phase = np.sqrt(sigma2 / (5 / 3 * (1 - middle**2) / 2)) * h
    got = inspect_model(star, degrees=(0,), band=(nu, 1.0001 * nu)).points_per_wavelength
    assert got == pytest.approx(2 * np.pi / phase.max(), rel=1e-3)


def without_centre(star, x0):
    keep = star.fractional_radius >= x0
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    return star.with_changes(**{name: getattr(star, name)[keep] for name in names})


@pytest.mark.parametrize(("x0", "severity"), [(0.005, "note"), (0.1, "doubt"), (0.4, "defect")])
def test_a_missing_centre_weighs_as_much_as_it_leaves_out(star, x0, severity):
    finding = found(without_centre(star, x0), "centre-missing")
    assert finding.severity == severity
    assert finding.place == pytest.approx(x0, rel=0.3)


def test_a_point_mass_at_the_centre_is_found(star):
    spoiled = without_centre(star, 0.005)
    finding = found(spoiled.with_changes(mass=spoiled.mass + 1e-4 * star.total_mass),
                    "centre-missing")  # fmt: skip
    assert finding.severity == "defect"
    assert "times that of a ball" in finding.message


def test_an_atmosphere_too_short_for_the_band_is_found(star):
    cut = star.fractional_radius <= 0.9999
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    open_star = star.with_changes(**{name: getattr(star, name)[cut] for name in names})
    cutoff = found_figures(open_star).acoustic_cutoff
    assert "atmosphere-short" in codes(open_star, band=(500, 1.01 * cutoff))
    assert "atmosphere-short" not in codes(open_star, band=(500, 0.99 * cutoff))
    deep = star.fractional_radius <= 0.9
    short = star.with_changes(**{name: getattr(star, name)[deep] for name in names})
    finding = found(short, "atmosphere-missing")
    assert finding.place == pytest.approx(0.9, abs=0.01)
    # A true edge needs no atmosphere.
    assert "atmosphere-short" not in codes(star, band=(500, 1e6))


def with_pair(star, index, **ratio):
    """The star with point `index` doubled and columns of the outer half multiplied."""
    columns = {}
    for name in ("radius", "mass", "pressure", "density", "gamma1", "a_star"):
        column = np.insert(getattr(star, name), index, getattr(star, name)[index])
        column[index + 1 :] = column[index + 1 :] * ratio.get(name, 1.0)
        columns[name] = column
    return star.with_changes(**columns)


def test_density_jumps_and_rounding_are_told_apart(star):
    jump = oscsolve.layered_sphere([(0.6, 3.0), (1.0, 1.0)])
    finding = found(jump, "density-jumps")
    assert finding.place == pytest.approx(0.6)
    assert "factor of 3" in finding.message
    assert "repeated-radii" not in codes(jump, ("note", "doubt", "defect"))
    rounding = found(with_pair(star, 300), "repeated-radii")
    assert rounding.severity == "doubt"
    assert "density-jumps" not in codes(with_pair(star, 300), ("note", "doubt", "defect"))
    nearly = with_pair(star, 300, pressure=1 - 4e-9, density=1 - 3e-9)
    assert "repeated-radii" in codes(nearly)


def test_a_jump_of_pressure_is_a_defect(star):
    finding = found(with_pair(star, 300, pressure=0.9), "pressure-jump")
    assert finding.severity == "defect"
    assert finding.place == pytest.approx(star.fractional_radius[300])


def test_rising_pressure_is_a_defect(star):
    pressure = star.pressure.copy()
    pressure[301] = 1.01 * pressure[300]
    assert found(star.with_changes(pressure=pressure), "pressure-rises").severity == "defect"


def test_density_inversion_is_a_note_where_convection_explains_it(star):
    density, a_star = star.density.copy(), star.a_star.copy()
    density[801:805] = density[800] * (1 + 0.01 * np.arange(1, 5))
    assert found(star.with_changes(density=density), "density-inversion").severity == "doubt"
    a_star[799:806] = -1.0
    convective = star.with_changes(density=density, a_star=a_star)
    assert found(convective, "density-inversion").severity == "note"


def test_a_star_without_stable_layers_is_told():
    neutral = found(oscsolve.polytrope(1.5), "no-stable-layer")
    assert neutral.severity == "note"
    assert found(oscsolve.polytrope(1), "no-stable-layer").severity == "doubt"
    assert "no-stable-layer" not in codes(oscsolve.polytrope(3), ("note", "doubt", "defect"))


def test_convective_zones_are_where_buoyancy_is_negative(star):
    x = star.fractional_radius
    a_star = np.where((x > 0.3) & (x < 0.6), -1e-5, star.a_star)
    # Two lone points of the other sign make no zone and part none.
    a_star[np.searchsorted(x, 0.45)] = 0.1
    a_star[np.searchsorted(x, 0.8)] = -0.1
    ((inner, outer),) = convective_zones(star.with_changes(a_star=a_star))
    assert inner == pytest.approx(0.3, abs=0.01)
    assert outer == pytest.approx(0.6, abs=0.01)
    assert convective_zones(star) == ()


def test_balance_is_exact_for_exact_stars(star):
    balance = measure_balance(star)
    # Splines of fourth order on a thousand points; near the edge ln P falls a hundredfold a cell.
    inside = balance.x < 0.95
    np.testing.assert_allclose(balance.density[inside], 0.0, atol=1e-7)
    assert np.median(np.abs(balance.mass - 1.0)) < 1e-4


def test_wrong_arguments_are_refused(star):
    with pytest.raises(oscsolve.InputError, match="degrees are whole numbers"):
        inspect_model(star, degrees=(-1,))
    with pytest.raises(oscsolve.BandError):
        inspect_model(star, band=(4000, 1000))
    with pytest.raises(oscsolve.InputError, match="unit"):
        inspect_model(star, band=(1, 2), unit="furlong")


@pytest.mark.parametrize("index", [1.5, 3, 4])
@pytest.mark.parametrize("keep_every", [4, 16])
def test_a_coarse_mesh_is_not_mistaken_for_wrong_columns(index, keep_every):
    star = oscsolve.polytrope(index)
    kept = np.unique(np.append(np.arange(0, star.radius.size, keep_every), star.radius.size - 1))
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    coarse = star.with_changes(**{name: getattr(star, name)[kept] for name in names})
    assert codes(coarse) <= {"mesh-coarse"}


@pytest.mark.parametrize("points", [5, 8])
def test_points_too_far_apart_to_judge_are_told(points):
    star = oscsolve.polytrope(3)
    keep = np.unique(np.linspace(0, star.radius.size - 1, points).astype(int))
    names = ("radius", "mass", "pressure", "density", "gamma1", "a_star")
    sparse = star.with_changes(**{name: getattr(star, name)[keep] for name in names})
    assert "balance-unknown" in {finding.code for finding in inspect_model(sparse)}
