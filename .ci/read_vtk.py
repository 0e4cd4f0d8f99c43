#!/usr/bin/env python3
"""Reads exported field and wall files with independent readers and checks what they hold.

Usage: read_vtk.py FILE... [--json RESULT.json]

.vti and .vtp files are read with vtk and pyvista, legacy .vtk files with vtk, pyvista and meshio (which
knows no image XML). Checked: array names and lengths, units, finite values, zeros and the ghost flag on
solid cells, unit normals, closed polylines, and that every reader sees the same numbers. With --json the
sums must agree with the machine output: the sum of phi with K, the mean wall shear with A/P, the units
with each other. Needs the packages vtk, pyvista and meshio. Exit status 1 when anything is wrong.
"""
import argparse
import json
import sys

import meshio
import numpy as np
import pyvista
import vtk
from vtk.util.numpy_support import vtk_to_numpy

HIDDEN_CELL = 32
VELOCITY_UNITS = ("m/s", "m/s per Pa/m", "m/s per (Pa/m)/(Pa s)")
SHEAR_UNITS = ("Pa", "Pa per Pa/m")
UNITS = {
    "velocity": VELOCITY_UNITS,
    "velocity_over_mean": ("1",),
    "phi": ("m^2",),
    "fluid_fraction": ("1",),
    "wall_shear": SHEAR_UNITS,
    "normal": ("1",),
    "arc_length": ("m",),
    "loop": ("1",),
    "corner": ("1",),
    "wall": ("1",),
    "sensitivity": ("1/m^2",),
}
problems = []


def check(holds, path, text):
    """Notes a problem unless the claim holds."""
    if not holds:
        problems.append(f"{path}: {text}")


def arrays(data):
    """All arrays of point or cell data by name."""
    found = {data.GetArrayName(i): data.GetArray(i) for i in range(data.GetNumberOfArrays())}
    return {name: a for name, a in found.items() if a is not None}


def unit_of(array):
    """The unit stored with an array, or None."""
    key = vtk.vtkDataArray.UNITS_LABEL()
    information = array.GetInformation()
    return information.Get(key) if information.Has(key) else None


def check_units(path, found):
    """Every array but the ghost flags carries a unit of its kind."""
    for name, array in found.items():
        if name != "vtkGhostType":
            unit = unit_of(array)
            check(unit in UNITS.get(name, ()), path, f"array {name} has the unit {unit!r}")


def read_with(reader, path):
    """Output of a vtk reader; a message of the reader is a problem."""
    log = []
    reader.AddObserver("ErrorEvent", lambda *_: log.append("error"))
    reader.SetFileName(path)
    reader.Update()
    check(not log, path, "the vtk reader reported an error")
    return reader.GetOutput()


def close(a, b, tolerance):
    """Whether two numbers agree relative to the second."""
    return abs(a - b) <= tolerance * abs(b)


def check_image(path, result):
    """A .vti file."""
    image = read_with(vtk.vtkXMLImageDataReader(), path)
    nodes, cells = image.GetNumberOfPoints(), image.GetNumberOfCells()
    check(image.GetDimensions()[2] == 1 and nodes > 3, path, f"dimensions are {image.GetDimensions()}")
    points, on_cells = arrays(image.GetPointData()), arrays(image.GetCellData())
    for names, found, size in (
        (("velocity", "velocity_over_mean", "phi"), points, nodes),
        (("fluid_fraction", "vtkGhostType"), on_cells, cells),
    ):
        for name in names:
            if name not in found:
                check(False, path, f"array {name} is missing")
                return
            check(found[name].GetNumberOfTuples() == size, path, f"array {name} has a wrong length")
    check_units(path, {**points, **on_cells})
    values = {name: vtk_to_numpy(a) for name, a in {**points, **on_cells}.items()}
    for name, v in values.items():
        check(np.isfinite(v).all(), path, f"array {name} is not finite")
    phi, share, ghost = values["phi"], values["fluid_fraction"], values["vtkGhostType"]
    check((phi >= 0).all() and phi.max() > 0, path, "phi is negative or zero everywhere")
    check(((share >= 0) & (share <= 1)).all(), path, "fluid_fraction leaves 0 to 1")
    check(((ghost == HIDDEN_CELL) == (share == 0)).all(), path, "vtkGhostType is not 32 exactly on solid cells")
    check_solid_nodes(path, image, phi, share)
    ratio = values["velocity"].max() / phi.max()
    check(np.allclose(values["velocity"], phi * ratio, rtol=1e-12, atol=0), path, "velocity is not proportional to phi")
    other = pyvista.read(path)
    check(np.array_equal(np.asarray(other.point_data["phi"]), phi), path, "pyvista and vtk disagree on phi")
    check(np.allclose(other.spacing, image.GetSpacing(), rtol=0, atol=0), path, "pyvista and vtk disagree on the spacing")
    if result:
        h, k = image.GetSpacing()[0], result["conductance"]["value"]
        check(close(phi.sum() * h * h, k, 0.02), path, f"sum of phi is {phi.sum() * h * h}, K is {k}")
        check(h >= result["grid"]["spacing"]["value"] * (1 - 1e-12), path, "the spacing is finer than the grid")
        point = result["operating_point"]
        if point:
            check(unit_of(points["velocity"]) == "m/s", path, "velocity is not in m/s despite an operating point")
            peak = point["peak_velocity"]["value"]
            check(close(values["velocity"].max(), peak, 0.02), path, f"largest velocity is not {peak}")
    print(f"{path}: {nodes} nodes, {int((ghost != 0).sum())} solid cells, velocity in {unit_of(points['velocity'])}")


def check_solid_nodes(path, image, phi, share):
    """Nodes whose cells are all solid hold zero."""
    nx, ny, _ = image.GetDimensions()
    solid = np.pad(share.reshape(ny - 1, nx - 1) == 0, 1, constant_values=True)
    all_solid = solid[:-1, :-1] & solid[1:, :-1] & solid[:-1, 1:] & solid[1:, 1:]
    check((phi.reshape(ny, nx)[all_solid] == 0).all(), path, "phi is not zero inside the solid")


def check_wall(path, result):
    """A .vtp file."""
    wall = read_with(vtk.vtkXMLPolyDataReader(), path)
    found = arrays(wall.GetPointData())
    for name in ("wall_shear", "normal", "arc_length", "loop", "corner", "wall"):
        if name not in found:
            check(False, path, f"array {name} is missing")
            return
        check(found[name].GetNumberOfTuples() == wall.GetNumberOfPoints(), path, f"array {name} has a wrong length")
    check_units(path, found)
    v = {name: vtk_to_numpy(a) for name, a in found.items()}
    for name, a in v.items():
        check(np.isfinite(a).all(), path, f"array {name} is not finite")
    check(np.allclose(np.linalg.norm(v["normal"], axis=1), 1, atol=1e-9), path, "a normal is not a unit vector")
    check((v["wall_shear"] >= 0).all(), path, "a wall shear is negative")
    loops = np.unique(v["loop"])
    check(wall.GetNumberOfLines() == len(loops), path, f"{wall.GetNumberOfLines()} lines for {len(loops)} loops")
    positions = vtk_to_numpy(wall.GetPoints().GetData()).astype(float)
    total, length = 0.0, 0.0
    for i in range(wall.GetNumberOfCells()):
        ids = wall.GetCell(i).GetPointIds()
        ids = np.array([ids.GetId(k) for k in range(ids.GetNumberOfIds())])
        check(ids[0] == ids[-1], path, f"polyline {i} is not closed")
        check(len(set(v["loop"][ids])) == 1, path, f"polyline {i} runs over two loops")
        # A row and a column of the grid may meet the wall in one point.
        check((np.diff(v["arc_length"][ids[:-1]]) >= 0).all(), path, f"arc length falls along polyline {i}")
        step = np.linalg.norm(np.diff(positions[ids], axis=0), axis=1)
        shear = v["wall_shear"][ids]
        total += (0.5 * (shear[1:] + shear[:-1]) * step).sum()
        length += step.sum()
    other = pyvista.read(path)
    check(np.array_equal(np.asarray(other.point_data["wall_shear"]), v["wall_shear"]), path, "pyvista and vtk disagree")
    if result:
        point, mean = result["operating_point"], result["wall_shear"]["mean_per_gradient"]["value"]
        mean *= point["pressure_gradient"]["value"] if point else 1.0
        check(close(total / length, mean, 0.03), path, f"mean wall shear is {total / length}, expected {mean}")
        check(unit_of(found["wall_shear"]) == ("Pa" if point else "Pa per Pa/m"), path, "wall_shear has the wrong unit")
    print(f"{path}: {len(loops)} loops, {wall.GetNumberOfPoints()} points, wall_shear in {unit_of(found['wall_shear'])}")


def check_legacy(path, result):
    """A legacy .vtk file, which meshio reads too."""
    image = read_with(vtk.vtkStructuredPointsReader(), path)
    found = {**arrays(image.GetPointData()), **arrays(image.GetCellData())}
    if not {"velocity", "phi", "fluid_fraction"} <= set(found):
        check(False, path, f"arrays are {sorted(found)}")
        return
    phi = vtk_to_numpy(found["phi"])
    mesh = meshio.read(path)
    check(np.array_equal(mesh.point_data["phi"].ravel(), phi), path, "meshio and vtk disagree on phi")
    other = pyvista.read(path)
    check(np.array_equal(np.asarray(other.point_data["phi"]), phi), path, "pyvista and vtk disagree on phi")
    h = image.GetSpacing()[0]
    nx = image.GetDimensions()[0]
    step = mesh.points[1, 0] - mesh.points[0, 0]
    check(nx * image.GetDimensions()[1] == len(mesh.points), path, "meshio and vtk disagree on the number of nodes")
    check(close(step, h, 1e-5), path, "meshio and vtk disagree on the spacing")
    if result:
        k = result["conductance"]["value"]
        check(close(phi.sum() * h * h, k, 0.02), path, f"sum of phi is {phi.sum() * h * h}, K is {k}")
    print(f"{path}: {len(phi)} nodes, read by vtk, pyvista and meshio")


def main():
    """Checks each file by its extension."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("files", nargs="+")
    parser.add_argument("--json", help="machine output of the same run")
    options = parser.parse_args()
    result = None
    if options.json:
        with open(options.json, encoding="utf-8") as file:
            result = json.load(file)
    kinds = {"vti": check_image, "vtp": check_wall, "vtk": check_legacy}
    for path in options.files:
        kind = kinds.get(path.rsplit(".", 1)[-1])
        if kind is None:
            check(False, path, "neither .vti nor .vtp nor .vtk")
            continue
        try:
            kind(path, result)
        except Exception as error:  # A broken file may fail anywhere in a reader; the next file is still checked.
            check(False, path, f"cannot be read: {type(error).__name__}: {error}")
    for problem in problems:
        print(f"wrong: {problem}", file=sys.stderr)
    return 1 if problems else 0


if __name__ == "__main__":
    sys.exit(main())
