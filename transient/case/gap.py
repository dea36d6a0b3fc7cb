"""[gap] and [fluid]: sizes and properties."""

from __future__ import annotations

from transient.case.inputs import FluidInput, GapInput
from transient.case.keys import COUNT, FLUID, Key
from transient.case.later import LATER_SHAPES
from transient.case.reading import Reading, Section
from transient.case.source import CaseError, nearest
from transient.fluid import LAWS
from transient.gap.shapes import SHAPES, Shape, ShapeError, Size
from transient.units import typed


def read_gap(reading: Reading) -> GapInput:
    """The gap; raises ``CaseError``."""
    if "gap" not in reading.tree:
        raise reading.source.refuse(
            ("gap",), 'is missing; a [gap] is needed, such as shape = "plates", height = "0.80 mm"'
        )
    shape = _shape(reading)
    head = ("shape",) if shape.motion is None else ("shape", "motion")
    section = reading.section(("gap",), (*head, *(size.name for size in shape.sizes), "count"))
    for name in head:
        reading.echo(("gap", name), section.tree[name])
    sizes = {size.name: section.read(size_key(size)) for size in shape.sizes if size.name in section or size.required}
    count = section.read(COUNT)
    try:
        ends = shape.ends(sizes)
    except ShapeError as error:
        raise _contradiction(section, error) from None
    if not 0.0 <= ends.inner < ends.outer:
        raise reading.source.refuse(("gap",), "the gap is too narrow for its radii; a wider clearance is needed")
    return GapInput(shape, sizes, ends, count, shape.areas(ends, sizes), shape.section(ends, sizes), shape.radii(ends))


def size_key(size: Size) -> Key:
    """The key that reads one size of a shape."""
    return Key(
        size.name,
        "quantity",
        size.doc,
        size.dimension,
        example=f'"{size.example}"',
        required=size.required,
        least="positive",
    )


def _contradiction(section: Section, error: ShapeError) -> CaseError:
    if error.key in section:
        return section.fault(error.key, error.fault, error.need)
    return section.refuse(error.key, f"{error.fault}; {error.need}")


def _shape(reading: Reading) -> Shape:
    tree = reading.tree["gap"]
    if not isinstance(tree, dict):
        raise reading.source.fault(("gap",), tree, "is no table", "a [gap] is needed")
    words = list(dict.fromkeys(shape.word for shape in SHAPES.values()))
    word = tree.get("shape")
    listed = ", ".join(f'"{one}"' for one in words)
    if word is None:
        raise reading.source.refuse(("gap", "shape"), f"is missing; a shape is needed, one of {listed}")
    if isinstance(word, str) and word in LATER_SHAPES:
        raise reading.source.fault(
            ("gap", "shape"),
            word,
            f"({LATER_SHAPES[word]}) is not available in this version",
            f"one of {listed} is needed",
        )
    if not isinstance(word, str) or word not in words:
        raise reading.source.refuse(("gap", "shape"), f"{typed(word)} is no shape; {nearest(str(word), words)}")
    found = [shape for shape in SHAPES.values() if shape.word == word]
    motions = [str(shape.motion) for shape in found]
    if found[0].motion is None:
        return found[0]
    listed = " or ".join(f'"{one}"' for one in motions)
    if "motion" not in tree:
        raise reading.source.refuse(("gap", "motion"), f"is missing; {listed} is needed")
    if tree["motion"] not in motions:
        raise reading.source.fault(
            ("gap", "motion"), tree["motion"], "is no motion of this shape", f"{listed} is needed"
        )
    return found[motions.index(tree["motion"])]


def read_fluid(reading: Reading) -> FluidInput:
    """The fluid, with a constant viscosity; raises ``CaseError``."""
    if "fluid" not in reading.tree:
        raise reading.source.refuse(
            ("fluid",), 'is missing; a [fluid] is needed, such as density = "998 kg/m^3", viscosity = "1.002 mPa*s"'
        )
    section = reading.section(("fluid",), [key.name for key in FLUID])
    density, viscosity, kinematic = (section.read(key) for key in FLUID)
    if viscosity is not None and kinematic is not None:
        raise section.refuse("kinematic_viscosity", "is given beside viscosity; one of them is needed")
    if viscosity is None and kinematic is None:
        raise section.refuse(
            "viscosity", 'is missing; viscosity or kinematic_viscosity is needed, such as "1.002 mPa*s"'
        )
    if viscosity is None:
        viscosity = kinematic * density
    return FluidInput(density, "constant", LAWS["constant"].parameters(viscosity=viscosity), viscosity)
