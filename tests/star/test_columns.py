"""Labelled tables: names, units, meshes, derived quantities and errors."""

from __future__ import annotations

import numpy as np
import pytest

from oscsolve.errors import InputError
from oscsolve.star.formats import read_model
from oscsolve.star.formats.column_names import COLUMNS, match_names, plain_name
from oscsolve.star.formats.table_text import find_table, split_names
from oscsolve.units import NEWTON_G


def write_table(path, columns, header=None, above="", row="{:.17e}", sep=" "):
    names = header or sep.join(columns)
    rows = [
        sep.join(row.format(v) for v in values) for values in zip(*columns.values(), strict=True)
    ]
    path.write_text(above + names + "\n" + "\n".join(rows) + "\n")
    return path


def cgs_columns(star):
    inner = slice(1, None)
    return {
        "r": star.radius[inner], "m": star.mass[inner], "P": star.pressure[inner],
        "rho": star.density[inner], "Gamma1": star.gamma1[inner], "N2": star.brunt_n2[inner],
    }  # fmt: skip


def test_plain_cgs_table(tmp_path, polytrope_n1):
    star = polytrope_n1()
    read = read_model(write_table(tmp_path / "a.txt", cgs_columns(star)))
    assert np.array_equal(read.radius, star.radius[1:])
    assert np.allclose(read.a_star, star.a_star[1:], rtol=1e-6)
    assert read.gravitational_constant == pytest.approx(NEWTON_G, rel=1e-7)


def test_comma_separated_table_with_units_in_brackets(tmp_path, polytrope_n1):
    star = polytrope_n1()
    columns = cgs_columns(star)
    header = "# r (cm),m (g),P,rho,Gamma1,N2"
    read = read_model(write_table(tmp_path / "a.csv", columns, header, sep=","))
    assert np.array_equal(read.mass, star.mass[1:])


def test_logarithms_solar_units_and_surface_first(tmp_path, polytrope_n1):
    star = polytrope_n1()
    c = {name: column[::-1] for name, column in cgs_columns(star).items()}
    columns = {
        "logR": np.log10(c["r"] / 6.9599e10), "mass": c["m"] / 1.9891e33, "logP": np.log10(c["P"]),
        "logRho": np.log10(c["rho"]), "gamma1": c["Gamma1"], "brunt_N2": c["N2"],
    }  # fmt: skip
    read = read_model(write_table(tmp_path / "a.txt", columns))
    units = next(f for f in read.findings if f.code == "units-assumed")
    assert "solar" in units.message
    # A node mesh tells Msun/Rsun^3 only to its own second order (1e-5 here), so neighbours of the
    # true pair of constants may be taken; none is further than 1e-3.
    assert read.radius[-1] == pytest.approx(star.radius[-1], rel=1e-3)
    assert read.density[-1] == pytest.approx(star.density[-1], rel=1e-13)


def staggered(polytrope_n1, cells=500):
    """Faces and centres of the closed-form polytrope, exact mass and balance of the cells."""
    fine = polytrope_n1(cells + 1)
    r, m = fine.radius[1:], fine.mass[1:]
    dm = np.diff(fine.mass)
    density = dm / (4 * np.pi / 3 * np.diff(fine.radius**3))
    load = NEWTON_G * m[:-1] / (4 * np.pi * r[:-1] ** 4) * 0.5 * (dm[1:] + dm[:-1])
    pressure = fine.pressure[-1] + np.concatenate((np.cumsum(load[::-1])[::-1], [0.0]))
    return r, m, pressure, density


def test_staggered_cells_tell_their_constants_exactly(tmp_path, polytrope_n1):
    r, m, pressure, density = staggered(polytrope_n1)
    columns = {
        "radius": r / 6.9598e10, "mass": m / 1.9892e33, "pressure": pressure, "rho": density,
        "gamma1": np.full(r.size, 5 / 3),
    }  # fmt: skip
    read = read_model(write_table(tmp_path / "a.txt", columns))
    codes = {f.code: f for f in read.findings}
    assert "mesh-staggered" in codes and "a-star-derived" in codes
    assert "6.9598e+10" in codes["units-assumed"].message
    assert read.gravitational_constant == pytest.approx(NEWTON_G, rel=1e-9)
    assert read.photospheric_radius == pytest.approx(r[-1], rel=1e-14)
    # At the centres P and rho follow the closed form to the second order of 500 cells.
    z = read.radius / 2e10
    assert np.allclose(read.density[5:-5], (5.0 * np.sinc(z / np.pi))[5:-5], rtol=1e-4)
    exact = 4 * np.pi * 8e30 * 5.0 * (np.sin(z) - z * np.cos(z))
    assert np.allclose(read.mass[5:], exact[5:], rtol=2e-3)


@pytest.mark.parametrize("place", ["faces", "centres"])
def test_place_of_buoyancy_on_a_staggered_mesh(tmp_path, place, polytrope_n1):
    r, m, pressure, density = staggered(polytrope_n1, 200)
    at = r if place == "faces" else np.cbrt(0.5 * (r**3 + np.concatenate(([0], r[:-1])) ** 3))
    z = at / 2e10
    slope = 1 - z / np.tan(z)
    mass = 4 * np.pi * 8e30 * 5.0 * (np.sin(z) - z * np.cos(z))
    n2 = -0.2 * slope * NEWTON_G * mass / at**3
    columns = {"radius": r, "mass": m, "pressure": pressure, "rho": density,
               "gamma1": np.full(r.size, 5 / 3), "N2": n2}  # fmt: skip
    read = read_model(write_table(tmp_path / "a.txt", columns))
    found = next(f for f in read.findings if f.code == "buoyancy-place")
    assert f"cell {place}" in found.message
    z = read.radius / 2e10
    assert np.allclose(read.a_star[20:-3], (-0.2 * (1 - z / np.tan(z)))[20:-3], rtol=2e-3)


def test_fractions_take_their_scale_from_the_lines_above(tmp_path, polytrope_n1):
    star = polytrope_n1()
    c = cgs_columns(star)
    columns = {"r/R": c["r"] / star.radius[-1], "m/M": c["m"] / star.total_mass,
               "P": c["P"], "rho": c["rho"], "Gamma1": c["Gamma1"], "N2": c["N2"]}  # fmt: skip
    above = (
        f"# Mass.... {star.total_mass:.17e} gm\n# Radius.... {star.radius[-1]:.17e} cm\n"
        "# Teff... 5000 K\n"
    )
    read = read_model(write_table(tmp_path / "a.txt", columns, above=above))
    assert read.total_mass == star.total_mass and read.effective_temperature == 5000.0
    assert np.allclose(read.radius, star.radius[1:], rtol=1e-15)


def test_block_of_run_constants(tmp_path, polytrope_n1):
    columns = cgs_columns(polytrope_n1())
    above = 'Teff photosphere_L version\n 5100.5 2.0 "12 b"\n\n1 2 3 4 5 6\n'
    read = read_model(write_table(tmp_path / "a.txt", columns, above=above))
    assert read.effective_temperature == 5100.5
    assert read.luminosity == pytest.approx(2 * 3.828e33)


def test_gamma1_of_gas_and_radiation(tmp_path, polytrope_n1):
    star = polytrope_n1()
    c = cgs_columns(star)
    del c["Gamma1"], c["N2"]
    c["T"] = np.full(c["r"].size, 3e6)
    c["X"], c["Y"] = np.full(c["r"].size, 0.7), np.full(c["r"].size, 0.28)
    read = read_model(write_table(tmp_path / "a.txt", c))
    found = next(f for f in read.findings if f.code == "gamma1-ideal-gas")
    beta = 1 - 7.565733e-15 * 3e6**4 / 3 / c["P"]
    # Chandrasekhar's general form at gamma = 5/3.
    general = beta + (4 - 3 * beta) ** 2 * (2 / 3) / (beta + 8 * (1 - beta))
    assert np.allclose(read.gamma1, general, rtol=1e-13)
    assert found.severity == "doubt" and found.size > 0.1


def test_aligned_names_with_blanks():
    left = split_names("Shell  Radius Frac.  Mass Frac.   Temp.       Rho",
                       ["    1  1.0000E-01   -2.0000E-01   3.0000E-01  4.0"] * 3)  # fmt: skip
    assert left == ["Shell", "Radius Frac.", "Mass Frac.", "Temp.", "Rho"]
    right = split_names("  Shell  Radius Frac. Mass Frac. Temp. Grad.",
                        ["      1   1.00000E-02   2.0E-001   3.00E-001"] * 3)  # fmt: skip
    assert right == ["Shell", "Radius Frac.", "Mass Frac.", "Temp. Grad."]
    # Names 14 apart over numbers 18 apart, with a name that fills its field.
    names = ["Shell", "Radius Frac.", "Mean Mol. Wt.", "Density", "Ad. T. Grad.", "Gamma1", "V. Sq"]
    header = "".join(f"{name:<14}" for name in names)
    assert "Wt. Density" in header
    assert split_names(header, ["".join(f"{k / 7:18.10E}" for k in range(7))] * 3) == names
    assert split_names("one two three", ["1 2 3 4"] * 3) is None


def test_names_of_the_subgiant_file(shared_data):
    lines = (shared_data / "subgiant" / "structure-columns.txt").read_text().splitlines()
    names = find_table(lines, "").names
    assert names[8:13] == ["Nuc. Reac. Rate", "Opacity", "Temp. Grad.", "Ad. Temp. Grad.", "Gamma1"]
    assert names[-3:] == ["Brunt V. Sq", "Crit Freq + Sq", "Crit Freq - Sq"]


@pytest.mark.parametrize(
    ("name", "expected"),
    [("Radius Frac.", ("radiusfrac", "")), ("[Mass]", ("mass", "")), ("r (cm)", ("r", "cgs")),
     ("brunt_N2", ("bruntn2", "")), ("R [Rsun]", ("r", "solar"))],
)  # fmt: skip
def test_plain_names(name, expected):
    assert plain_name(name) == expected


def test_no_spelling_means_two_things():
    seen = [s.name for spellings in COLUMNS.values() for s in spellings]
    assert len(seen) == len(set(seen))
    found = match_names(["logT", "temperature", "r"], COLUMNS)
    assert found["temperature"][0] == 1 and found["radius"][0] == 2


def without(*names):
    def change(columns):
        for name in names:
            del columns[name]

    return change


def set_value(name, at, value):
    def change(columns):
        columns[name] = columns[name].copy()
        columns[name][at] = value

    return change


def replaced(name, function):
    def change(columns):
        columns[name] = function(columns[name])

    return change


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (without("m"), r"no column of mass among r, P, rho"),
        (without("Gamma1"), r"no column of gamma1, and none of temperature"),
        (set_value("P", 7, np.nan), r"P is not a finite number in row 8"),
        (set_value("r", 50, 1e3), r"radius must increase outward; it falls at point 51"),
        (replaced("rho", lambda v: 3 * v), r"masses do not follow from r and rho in any unit"),
        (replaced("P", lambda v: 2 * v), r"implies G = 1.335e-07"),
        (replaced("m", lambda v: v / 1e28), r"unit of the column of mass"),
    ],
)
def test_tables_that_make_no_star_are_refused(tmp_path, change, message, polytrope_n1):
    columns = cgs_columns(polytrope_n1())
    change(columns)
    with pytest.raises(InputError, match=message) as caught:
        read_model(write_table(tmp_path / "a.txt", columns))
    assert "\n" not in str(caught.value) and "a.txt" in str(caught.value)


def test_radiation_above_pressure_is_refused(tmp_path, polytrope_n1):
    columns = cgs_columns(polytrope_n1())
    del columns["Gamma1"]
    columns["T"] = np.full(columns["r"].size, 1e9)
    with pytest.raises(InputError, match="radiation pressure of the temperature exceeds"):
        read_model(write_table(tmp_path / "a.txt", columns))


@pytest.mark.parametrize(
    ("edit", "message"),
    [
        (lambda x: [*x[:20], "1 2 3", *x[20:]], r"line 21: expected 6 numbers; got 3"),
        (
            lambda x: [*x[:20], "1 2 3 4 5 six", *x[20:]],
            r"line 21: expected a number for N2; got 'six'",
        ),
        (lambda x: ["r m P rho Gamma1 N2 more", *x[1:]], r"line 1: these names cannot be matched"),
    ],
)
def test_damaged_rows_are_named_with_their_line(tmp_path, edit, message, polytrope_n1):
    path = write_table(tmp_path / "a.txt", cgs_columns(polytrope_n1()))
    path.write_text("\n".join(edit(path.read_text().splitlines())) + "\n")
    with pytest.raises(InputError, match=message):
        read_model(path)


def test_fortran_exponents_are_read(tmp_path, polytrope_n1):
    star = polytrope_n1()
    path = write_table(tmp_path / "a.txt", cgs_columns(star))
    path.write_text(path.read_text().replace("e+", "D+").replace("e-", "D-"))
    assert np.array_equal(read_model(path).radius, star.radius[1:])
