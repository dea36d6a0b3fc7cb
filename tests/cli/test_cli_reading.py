"""``transient check``, ``template`` and ``schema``: what reads and explains case files without solving."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

import pytest

from transient.case.read import read_case

CASES = Path(__file__).resolve().parents[2] / "cases"
# Reynolds number, areas and diffusion time by hand: 0.3 x 0.8e-3 / (1.002e-3 / 998) = 239.04,
# 60 x 25 mm, 0.64e-6 / 1.004e-6.
CHECKED = """\
Flow cell brought up to speed

Input                   as typed      in SI
gap.shape               plates
gap.height              0.80 mm       0.0008 m
gap.length              60 mm         0.06 m
gap.width               25 mm         0.025 m
fluid.density           998 kg/m^3    998 kg/m^3
fluid.viscosity         1.002 mPa*s   0.001002 Pa*s
wall.upper.speed.kind   ramp
wall.upper.speed.to     0.30 m/s      0.3 m/s
wall.upper.speed.over   50 ms         0.05 s
run.duration            auto
run.settle_within       1 %           0.01
run.accuracy            0.1 %         0.001

Follows from it
gap height                    0.8 mm         distance across which momentum diffuses
kinematic viscosity           1.004 mm^2/s   viscosity / density
diffusion time                0.6374 s       gap^2 / kinematic viscosity
wetted area, lower            15 cm^2        of one gap
wetted area, upper            15 cm^2        of one gap
flow section                  0.2 cm^2       of one gap
peak speed, upper             0.3 m/s        largest magnitude of its history
Reynolds number of the wall   239            peak wall speed x gap / kinematic viscosity

Limits of the model, judged by the steady flow of each instant: 4 looked at
  no caution
"""


def test_check_prints_what_was_read_to_the_letter(call):
    said = call("check", CASES / "flow_cell.toml")
    assert (said.status, said.out, said.err) == (0, CHECKED, "")


@pytest.mark.parametrize("path", sorted(CASES.glob("*.toml")), ids=lambda path: path.stem)
def test_every_case_reads_within_the_limits_of_the_model(call, path):
    said = call("check", path)
    assert said.status == 0
    assert "no caution" in said.out


def test_check_warns_of_turbulence_before_anything_is_solved(call):
    # 0.3 m/s x 10 mm in water: Reynolds number 2988, above the 1300 of plates with one moving wall
    # (Dauchot & Daviaud 1995: 325 on half the gap and half the speed; attribution from memory).
    said = call("check", CASES / "flow_cell.toml", "--set", "gap.height=10 mm")
    assert said.status == 0
    assert "OUTSIDE" in said.out
    assert "2.99e+03" in said.out


def test_check_refuses_in_one_line(call):
    said = call("check", CASES / "flow_cell.toml", "--set", "gap.height=3 kg")
    assert said.status == 2
    assert said.out == ""
    assert said.err.count("\n") == 1
    assert '"3 kg" is a mass' in said.err


@pytest.mark.parametrize("shape", ["plates", "pipe", "annulus"])
def test_a_template_is_a_case_that_reads(call, tmp_path, shape):
    said = call("template", shape)
    assert said.status == 0
    assert tomllib.loads(said.out)["gap"]["shape"] == shape
    assert "#" in said.out
    (tmp_path / "case.toml").write_text(said.out, encoding="utf-8")
    assert read_case(tmp_path / "case.toml").problem().gap > 0.0


def test_a_template_of_no_shape_names_those_there_are(call):
    said = call("template", "tube")
    assert said.status == 2
    assert said.out == ""
    assert said.err.count("\n") == 1
    for shape in ("plates", "pipe", "annulus"):
        assert shape in said.err


def test_the_schema_is_json_schema(call):
    schema = json.loads(call("schema").out)
    assert schema["$schema"].startswith("https://json-schema.org/")
    assert set(schema["properties"]) >= {"title", "gap", "fluid", "wall", "pressure", "start", "run"}
