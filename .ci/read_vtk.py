#!/usr/bin/env python3
"""Reads exported field and wall files with independent readers and checks what they hold.

Usage: read_vtk.py FILE... [--json RESULT.json]

.vti and .vtp files are read with vtk and pyvista, legacy .vtk files with vtk, pyvista and meshio (which
knows no image XML). The .vtu of a route is read with all three, its .vtp by vtk and pyvista, its .pvd by pyvista. Checked: array names and lengths, units, finite values, zeros and the ghost flag on
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
    "pressure": ("Pa",),
    "segment": ("1",),
    "branch": ("1",),
    "parallel": ("1",),
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
    if wall.GetNumberOfPolys():
        check_route_wall(path, wall, result)
        return
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


def check_route_wall(path, wall, result):
    """The .vtp file of a route: closed bands of quadrilaterals that front out of the fluid."""
    found, on_cells = arrays(wall.GetPointData()), arrays(wall.GetCellData())
    if not ({"wall_shear", "pressure"} <= set(found) and {"segment", "branch"} <= set(on_cells)):
        check(False, path, f"arrays are {sorted(found)} and {sorted(on_cells)}")
        return
    check_units(path, {**found, **on_cells})
    shear, pressure = (vtk_to_numpy(found[name]) for name in ("wall_shear", "pressure"))
    check(np.isfinite(shear).all() and (shear >= 0).all(), path, "a wall shear is negative or not finite")
    check(np.isfinite(pressure).all() and (pressure >= 0).all(), path, "a pressure is negative or not finite")
    other = pyvista.read(path)
    check(other.n_cells == wall.GetNumberOfPolys(), path, "not only quadrilaterals")
    check(np.array_equal(np.asarray(other.point_data["wall_shear"]), shear), path, "pyvista and vtk disagree")
    # Ends are open, so the divergence theorem holds across: the integral of x n_x over the walls is the volume.
    sized = other.compute_cell_sizes(length=False, volume=False)
    area = float(np.asarray(sized.cell_data["Area"]).sum())
    normals = other.compute_normals(point_normals=False, cell_normals=True, consistent_normals=False,
                                    auto_orient_normals=False, split_vertices=False)
    centres = other.cell_centers().points
    flux = float((centres[:, 1] * np.asarray(normals.cell_data["Normals"])[:, 1] * np.asarray(sized.cell_data["Area"])).sum())
    check(flux > 0, path, "walls front into the fluid")
    if result:
        shown = sum(b["wall_area"]["value"] for s in result["segments"] for b in s["branches"])
        check(close(area, shown, 0.03), path, f"wall area is {area}, expected {shown}")
        volume = sum(b["volume"]["value"] for s in result["segments"] for b in s["branches"])
        check(close(flux, volume, 0.03), path, f"volume within the walls is {flux}, expected {volume}")
        top = result["operating_points"][0]["wall_shear_max"]["value"]
        check(0.9 * top <= shear.max() <= top * (1 + 1e-9), path, f"largest shear is {shear.max()}, expected {top}")
    print(f"{path}: {other.n_cells} quadrilaterals, wall_shear in {unit_of(found['wall_shear'])}")


def check_route(path, result):
    """The .vtu file of a route."""
    grid = read_with(vtk.vtkXMLUnstructuredGridReader(), path)
    found, on_cells = arrays(grid.GetPointData()), arrays(grid.GetCellData())
    for names, there in ((("velocity", "phi", "pressure"), found), (("fluid_fraction", "segment", "branch", "parallel"), on_cells)):
        if not set(names) <= set(there):
            check(False, path, f"arrays are {sorted(there)}")
            return
    check_units(path, {**found, **on_cells})
    values = {name: vtk_to_numpy(a) for name, a in {**found, **on_cells}.items()}
    for name, v in values.items():
        check(np.isfinite(v).all() and (v >= 0).all(), path, f"array {name} is negative or not finite")
    share = values["fluid_fraction"]
    check(((share > 0) & (share <= 1)).all(), path, "fluid_fraction leaves 0 to 1")
    other, mesh = pyvista.read(path), meshio.read(path)
    check(set(other.celltypes) == {12}, path, "not only hexahedra")
    for name in ("velocity", "phi", "pressure"):
        check(np.array_equal(np.asarray(other.point_data[name]), values[name]), path, f"pyvista and vtk disagree on {name}")
        check(np.array_equal(mesh.point_data[name].ravel(), values[name]), path, f"meshio and vtk disagree on {name}")
    sizes = np.asarray(other.compute_cell_sizes(length=False, area=False).cell_data["Volume"])
    check((sizes > 0).all(), path, "a hexahedron is turned inside out")
    if result:
        volume = sum(b["volume"]["value"] for s in result["segments"] for b in s["branches"])
        check(close((sizes * share).sum(), volume, 0.02), path, f"volume is {(sizes * share).sum()}, expected {volume}")
        # Mean velocity times volume is flow rate times length.
        velocity = np.asarray(other.point_data_to_cell_data().cell_data["velocity"])
        carried = sum(b["flow_rate"]["value"] * b["length"]["value"] for s in result["segments"] for b in s["branches"])
        check(close((velocity * sizes).sum(), carried, 0.06), path, f"flow times length is {(velocity * sizes).sum()}, expected {carried}")
        drop = result["operating_points"][0]["pressure_drop"]["value"]
        check(close(values["pressure"].max(), drop, 1e-9), path, "the pressure at the inlet is not the drop")
    print(f"{path}: {other.n_cells} hexahedra, velocity in {unit_of(found['velocity'])}, read by vtk, pyvista and meshio")


def check_collection(path, result):
    """A .pvd file: every step has a fluid and a wall that can be read."""
    reader = pyvista.get_reader(path)
    for step in reader.time_values:
        reader.set_active_time_value(step)
        blocks = reader.read()
        check(len(blocks) == 2 and all(block.n_cells for block in blocks), path, f"step {step} lacks a file")
    if result:
        rates = [o["flow_rate"]["value"] for o in result["operating_points"]]
        check(np.allclose(sorted(reader.time_values), sorted(rates), rtol=1e-12), path, "steps are not the flow rates")
    print(f"{path}: {len(reader.time_values)} steps")


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
    kinds = {"vti": check_image, "vtp": check_wall, "vtk": check_legacy, "vtu": check_route, "pvd": check_collection}
    for path in options.files:
        kind = kinds.get(path.rsplit(".", 1)[-1])
        if kind is None:
            check(False, path, "neither .vti, .vtp, .vtk, .vtu nor .pvd")
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
