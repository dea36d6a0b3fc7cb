"""Which cases a sweep solves: grids, lists, listed rows and samples, against itertools, NumPy and SciPy."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

import transient as tr
from transient.sweep.plan import plan_of, read_plan
from transient.sweep.scatter import DISTRIBUTIONS

BASE = tr.Case(
    {
        "gap": {"shape": "plates", "height": "0.8 mm"},
        "fluid": {"density": "998 kg/m^3", "viscosity": "1 mPa*s"},
        "wall": {"upper": {"speed": {"kind": "ramp", "to": "0.3 m/s", "over": "50 ms"}}},
    }
)


def values(tree):
    """All rows of a plan, by key."""
    plan = plan_of(BASE, tree)
    return plan.values(0, plan.rows)


def test_every_combination_the_last_key_fastest(sweep_file):
    plan = read_plan(
        str(
            sweep_file(
                """
                [vary]
                "gap.height" = { from = "0.4 mm", to = "1.2 mm", count = 3 }
                fluid.viscosity = { values = ["0.8 mPa*s", "1.2 cP"] }
                wall.upper.speed.over = ["10 ms", "0.2 s"]
                """
            )
        )
    )
    rows = plan.values(0, plan.rows)
    expected = list(itertools.product([0.0004, 0.0008, 0.0012], [0.0008, 0.0012], [0.01, 0.2]))
    assert list(rows) == ["gap.height", "fluid.viscosity", "wall.upper.speed.over"]
    np.testing.assert_allclose(np.array(list(rows.values())).T, expected, rtol=1e-15)


def test_spacings_are_those_of_numpy():
    ends = {"from": "0.4 mm", "to": "1.2 mm", "count": 7}
    np.testing.assert_array_equal(values({"vary": {"gap.height": ends}})["gap.height"], np.linspace(4e-4, 1.2e-3, 7))
    log = values({"vary": {"gap.height": {**ends, "spacing": "log"}}})["gap.height"]
    np.testing.assert_array_equal(log, np.geomspace(4e-4, 1.2e-3, 7))
    assert (log[0], log[-1]) == (4e-4, 1.2e-3)


@pytest.mark.parametrize(
    ("key", "listed", "kind"),
    [
        ("gap.height", ["1 mm", "40 mil"], "quantity"),
        ("gap.width", ["1 mm", "2 mm"], "quantity"),  # not in the case at all
        ("run.accuracy", ["1 %", 0.02], "quantity"),
        ("gap.count", [1, 4], "whole"),
        ("start.state", ["rest", "steady"], "choice"),
        ("run.duration", ["auto", "2 s"], "choice"),
        ("wall.upper.speed", ["0.3 m/s", {"kind": "lag", "to": "0.3 m/s", "time_constant": "10 ms"}], "choice"),
        ("wall.lower.shear_free", [True, False], "choice"),
    ],
)
def test_any_key_varies_and_reads_back_as_it_was_typed(key, listed, kind):
    plan = plan_of(BASE, {"vary": {key: listed}})
    (varied,) = plan.frame.keys
    assert varied.kind == kind
    rows = plan.values(0, plan.rows)[key]
    for row, typed in zip(rows, listed, strict=True):
        again, stated = BASE.replace({key: varied.typed(row)}), BASE.replace({key: typed})
        assert [one.value for one in again.inputs()] == [one.value for one in stated.inputs()]


@settings(max_examples=40, deadline=None)
@given(st.floats(1e-9, 1e3))
def test_a_value_reaches_the_case_to_the_last_bit(height):
    (varied,) = plan_of(BASE, {"vary": {"gap.height": ["1 mm"]}}).frame.keys
    assert BASE.replace({"gap.height": varied.typed(height)}).gap.sizes["height"] == height


def test_rows_of_a_csv_file_with_and_without_units(sweep_file):
    csv = "gap.height [mm],run.duration,start.state, gap.count ,wall.upper.speed.over\n" \
          "0.5,auto,rest,2,10 ms\n# a remark\n\n0.75,2 s,steady,1,0.2 s\n"  # fmt: skip
    plan = read_plan(str(sweep_file("", 'case = "case.toml"\nrows = "rows.csv"\n', rows__csv=csv)))
    rows = plan.values(0, plan.rows)
    assert plan.rows == 2
    assert rows["gap.height"].tolist() == [0.0005, 0.00075]
    assert rows["wall.upper.speed.over"].tolist() == [0.01, 0.2]
    assert rows["gap.count"].tolist() == [2, 1]
    kinds = {key.name: (key.kind, key.choices) for key in plan.frame.keys}
    assert kinds["run.duration"] == ("choice", ("auto", "2 s"))
    assert kinds["start.state"] == ("choice", ("rest", "steady"))


def test_cells_that_are_no_value_make_rows_that_say_so(sweep_file):
    csv = "gap.height [mm],gap.count\n0.5,1\nthick,1\n0.6,x\n"
    plan = read_plan(str(sweep_file("", 'case = "case.toml"\nrows = "rows.csv"\n', rows__csv=csv)))
    assert list(plan.faults(0, 3)) == [1, 2]
    assert plan.faults(1, 3)[0] == 'rows.csv:3: gap.height: "thick" is no number; a plain number in mm is needed'
    assert plan.faults(2, 3)[0].startswith("rows.csv:4: gap.count: ")


def test_listed_rows_times_ranges_times_samples():
    plan = plan_of(
        BASE,
        {
            "rows": [
                {"gap.height": "1 mm", "fluid.density": "900 kg/m^3"},
                {"gap.height": "2 mm", "fluid.density": "800 kg/m^3"},
            ],
            "vary": {"fluid.viscosity": ["1 cP", "2 cP", "3 cP"]},
            "scatter": {"samples": 4, "seed": 1, "wall.upper.speed.over": {"uniform": ["1 ms", "2 ms"]}},
        },
    )
    assert (plan.combinations, plan.samples, plan.rows) == (6, 4, 24)
    rows = plan.values(0, 24)
    assert rows["fluid.density"].tolist() == [900.0] * 12 + [800.0] * 12
    assert rows["fluid.viscosity"][:12].tolist() == [0.001] * 4 + [0.002] * 4 + [0.003] * 4


# The distribution functions of scipy.stats, with its own parameters.
LAWS = {
    "normal": ((3.0, 0.5), stats.norm(3.0, 0.5)),
    "uniform": ((2.0, 5.0), stats.uniform(2.0, 3.0)),
    "triangular": ((2.0, 2.5, 5.0), stats.triang(0.5 / 3.0, 2.0, 3.0)),
}


@pytest.mark.parametrize("kind", list(DISTRIBUTIONS))
def test_distributions_are_those_of_scipy(kind):
    u = np.linspace(0.001, 0.999, 333)
    parameters, law = LAWS[kind]
    np.testing.assert_allclose(DISTRIBUTIONS[kind].inverse(u, *parameters), law.ppf(u), rtol=1e-12)


def test_the_samples_of_one_combination_are_scipys_sobol_points():
    unit = {"uniform": ["0 m", "1 m"]}
    spec = {"samples": 100, "seed": 7, "gap.height": unit, "gap.length": unit}
    rows = values({"scatter": spec})
    expected = stats.qmc.Sobol(2, scramble=True, rng=np.random.default_rng(7)).random_base2(7)[:100]
    np.testing.assert_allclose(np.array([rows["gap.height"], rows["gap.length"]]).T, expected, rtol=1e-15)


@pytest.mark.parametrize("points", ["sobol", "random"])
def test_samples_scatter_evenly_within_and_across_combinations(points):
    spec = {"samples": 16, "seed": 3, "points": points, "gap.height": {"uniform": ["0 m", "1 m"]}}
    plan = plan_of(BASE, {"vary": {"fluid.viscosity": {"from": "1 cP", "to": "9 cP", "count": 64}}, "scatter": spec})
    u = plan.values(0, plan.rows)["gap.height"]
    # Kolmogorov-Smirnov against the uniform distribution: all of them, and one of each combination
    assert stats.kstest(u, "uniform").pvalue > 1e-3
    assert stats.kstest(u[::16], "uniform").pvalue > 1e-3
    # neighbours in the two directions have nothing to do with each other
    grid = u.reshape(64, 16)
    assert abs(np.corrcoef(grid[:-1].ravel(), grid[1:].ravel())[0, 1]) < 0.15
    if points == "sobol":  # sixteen points of the plain sequence lie in sixteen different sixteenths
        assert len(set((grid[0] * 16).astype(int))) == 16


def test_parts_of_a_plan_are_parts_of_the_whole():
    spec = {"samples": 8, "seed": 3, "gap.height": {"normal": ["1 mm", "0.1 mm"]}}
    plan = plan_of(BASE, {"vary": {"fluid.viscosity": ["1 cP", "2 cP", "3 cP"]}, "scatter": spec})
    whole = plan.values(0, 24)
    for first, behind in ((0, 5), (5, 6), (6, 24)):
        for key, column in plan.values(first, behind).items():
            np.testing.assert_array_equal(column, whole[key][first:behind])
    other = values({"vary": {"fluid.viscosity": ["1 cP", "2 cP", "3 cP"]}, "scatter": {**spec, "seed": 4}})
    assert not np.any(other["gap.height"] == whole["gap.height"])


def test_chunks_follow_from_the_plan_alone():
    ends = {"from": "1 mm", "to": "2 mm", "count": 50}
    few = plan_of(BASE, {"vary": {"gap.height": ends}, "keep": {"histories": True}})
    assert [few.span(i) for i in range(few.chunks)] == [(0, 16), (16, 32), (32, 48), (48, 50)]


def test_a_file_of_plain_numbers_reads_the_same_as_one_with_texts(sweep_file):
    head = 'case = "case.toml"\nrows = "rows.csv"\n'
    plain = "gap.height [mm],fluid.density [kg/m^3]\n" + "".join(f"{0.3 + 0.1 * i},{900 + i}\n" for i in range(9))
    typed = plain.replace("0.5,", " 0.5 ,").replace("\n0.7", "\n\n# a remark\n0.7")
    rows = []
    for csv in (plain, typed):
        plan = read_plan(str(sweep_file("", head, rows__csv=csv)))
        rows.append(plan.values(0, plan.rows))
        assert plan.rows == 9
        assert rows[-1]["gap.height"][2] == 0.0005
    for key, column in rows[0].items():
        np.testing.assert_array_equal(column, rows[1][key])


AXES = st.lists(st.integers(1, 5), min_size=1, max_size=3)


@settings(max_examples=40, deadline=None)
@given(AXES, st.integers(0, 6), st.data())
def test_rows_are_the_product_of_axes_and_samples_however_they_are_cut(sizes, samples, data):
    keys = ("gap.height", "gap.length", "fluid.viscosity")
    units = ("mm", "mm", "cP")
    listed = {
        key: [f"{i + 1} {unit}" for i in range(size)] for key, unit, size in zip(keys, units, sizes, strict=False)
    }
    scatter = {"samples": samples, "gap.width": {"uniform": ["1 mm", "2 mm"]}} if samples else {}
    plan = plan_of(BASE, {"vary": listed, "scatter": scatter})
    each = list(itertools.product(*(range(1, size + 1) for size in sizes)))
    expected = [row for row in each for _ in range(max(samples, 1))]
    assert plan.rows == len(expected)
    whole = plan.values(0, plan.rows)
    found = np.rint(np.stack([whole[key] for key in listed], axis=1) * 1e3).astype(int)
    assert [tuple(row) for row in found.tolist()] == expected
    first = data.draw(st.integers(0, plan.rows - 1))
    behind = data.draw(st.integers(first + 1, plan.rows))
    for key, column in plan.values(first, behind).items():
        np.testing.assert_array_equal(column, whole[key][first:behind])
