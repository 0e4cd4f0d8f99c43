#!/usr/bin/env python3
"""Compares how etchwise reads x3p and SDF files with two independent open readers.

Usage: compare_surface_readers.py PROGRAM [FILE...]

Writes invented surfaces with the packages x3pio and sdfio (every number type, missing points, several
sizes, profiles apart), has `PROGRAM map FILE --heights FILE.csv` read them, and compares every height.
Files named besides are read by both sides as they are; one that is not in metres may be given with its
unit as FILE:mm. The table of heights has one line for each row in the order of rising y, heights along x
in metres, separated by commas, and `NaN` where missing. Needs the packages x3pio, sdfio and numpy. Exit
status 1 when anything differs.
"""
import os
import subprocess
import sys
import tempfile

import numpy as np
import sdfio
import x3pio

METRES = {"m": 1.0, "mm": 1e-3, "um": 1e-6, "nm": 1e-9}
SIZES = [(2, 3), (5, 4), (31, 17), (64, 129)]
problems = []


def surface(shape, missing):
    """Invented heights of some micrometres, metres."""
    rows, columns = np.indices(shape)
    heights = 3e-6 * np.sin(0.7 * columns) + 1e-6 * np.cos(0.3 * rows) + 4.1e-6
    if missing:
        heights[(rows * 7 + columns * 3) % 11 == 1] = np.nan
    return heights


def read_by_program(program, path, folder, unit=None):
    """Heights as the program reads them, or None with its message."""
    table = os.path.join(folder, "heights.csv")
    if os.path.exists(table):
        os.remove(table)
    command = [program, "map", path, "--heights", table]
    if unit:
        command += ["--unit", unit]
    done = subprocess.run(command, capture_output=True, text=True, check=False)
    if not os.path.exists(table):
        return None, (done.stdout + done.stderr).strip()
    return np.loadtxt(table, delimiter=",", ndmin=2), ""


def compare(name, mine, theirs, tolerance):
    """Notes a problem unless both agree on size, missing points and every height."""
    heights, message = mine
    if heights is None:
        problems.append(f"{name}: not read: {message.splitlines()[-2:]}")
    elif heights.shape != theirs.shape:
        problems.append(f"{name}: {heights.shape} read, {theirs.shape} expected")
    elif not np.array_equal(np.isnan(heights), np.isnan(theirs)):
        problems.append(f"{name}: other points are missing")
    else:
        worst = np.nanmax(np.abs(heights - theirs))
        print(f"{name}: {theirs.shape[1]} x {theirs.shape[0]}, {np.isnan(theirs).sum()} missing, {worst:.1e} m")
        if worst > tolerance:
            problems.append(f"{name}: heights differ by up to {worst:g} m, {tolerance:g} m allowed")


def x3p_heights(path):
    """Heights of an x3p file by x3pio, with the offset of z that it keeps apart."""
    read = x3pio.read(path, verify=False)
    return np.asarray(read.layers[0].z) + read.placement.offset[2]


def compare_x3p(program, folder):
    """Every number type, as binary files and as lists in XML."""
    for shape in SIZES:
        for kind in x3pio.DataType:
            for storage in x3pio.DataStorage:
                for missing in (False, True):
                    path = os.path.join(folder, "surface.x3p")
                    heights = surface(shape, missing)
                    x3pio.write(path, heights, x_scale=2e-6, y_scale=3e-6, z_type=kind, storage=storage)
                    name = f"x3p {kind.name} {storage.name}"
                    mine = read_by_program(program, path, folder)
                    compare(name, mine, x3p_heights(path), 1e-18)


def compare_clouds(program, folder):
    """Point clouds on a grid, in no order."""
    for shape in SIZES[1:]:
        for kind in (x3pio.DataType.FLOAT32, x3pio.DataType.FLOAT64):
            path = os.path.join(folder, "cloud.x3p")
            heights = surface(shape, False)
            rows, columns = np.indices(shape)
            points = np.stack([columns * 2e-6, rows * 3e-6, heights], axis=-1).reshape(-1, 3)
            np.random.default_rng(1).shuffle(points)
            x3pio.write_points(path, points, data_type=kind)
            mine = read_by_program(program, path, folder)
            stored = heights.astype(np.float32) if kind is x3pio.DataType.FLOAT32 else heights
            compare(f"cloud {kind.name}", mine, stored.astype(float), 1e-18)


def compare_sdf(program, folder):
    """Every number type of every version, as text and binary."""
    for revision in sdfio.Revision:
        for kind in revision.rules.data_types:
            for form in sdfio.FileFormat:
                for shape in SIZES:
                    for missing in (False, True):
                        path = os.path.join(folder, "surface.sdf")
                        heights = surface(shape, missing)
                        metadata = sdfio.Metadata(revision=revision, data_type=kind)
                        sdfio.write(
                            path,
                            heights,
                            x_scale=2e-6,
                            y_scale=3e-6,
                            format=form,
                            metadata=metadata,
                        )
                        name = f"sdf {revision} {kind.name} {form.name}"
                        mine = read_by_program(program, path, folder)
                        compare(name, mine, sdfio.read(path).data, 1e-18)


def compare_file(program, folder, argument):
    """A file as it is."""
    path, _, unit = argument.partition(":")
    try:
        theirs = sdfio.read(path).data if path.endswith(".sdf") else x3p_heights(path)
    except (sdfio.SdfError, x3pio.X3pError) as refusal:
        print(f"{os.path.basename(path)}: not compared, the other reader refuses it: {refusal}")
        return
    mine = read_by_program(program, path, folder, unit or None)
    compare(os.path.basename(path), mine, theirs * METRES[unit or "m"], 1e-18)


def main():
    """Runs all comparisons."""
    program, *files = sys.argv[1:]
    with tempfile.TemporaryDirectory() as folder:
        compare_x3p(program, folder)
        compare_clouds(program, folder)
        compare_sdf(program, folder)
        for argument in files:
            compare_file(program, folder, argument)
    for problem in problems:
        print("PROBLEM", problem)
    print(f"{len(problems)} problems")
    return 1 if problems else 0


if __name__ == "__main__":
    sys.exit(main())
