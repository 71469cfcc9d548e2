#!/usr/bin/python3
"""Files written and read by VTK and meshio (Debian: python3-vtk9, python3-meshio), for the tests beside this one.

    vtk_files.py write DIR     writes surfaces in every encoding, and DIR/manifest.json with their figures
    vtk_files.py read FILE...  prints a JSON list with what VTK (and meshio, where it can) reads in each file
"""
import json
import os
import sys

import numpy as np
import vtk
from vtk.util.numpy_support import numpy_to_vtk, vtk_to_numpy


def arrays_of(data, on):
    out = []
    for k in range(data.GetNumberOfArrays()):
        array = data.GetArray(k)
        if array is None or array is data.GetNormals():
            continue
        values = vtk_to_numpy(array).astype(float)
        out.append({"name": array.GetName(), "on": on, "components": array.GetNumberOfComponents(),
                    "tuples": array.GetNumberOfTuples(), "sum": float(values.sum()),
                    "first": np.atleast_1d(values[0]).tolist() if len(values) else [],
                    "last": np.atleast_1d(values[-1]).tolist() if len(values) else []})
    return out


def figures(poly):
    split = vtk.vtkTriangleFilter()
    split.SetInputData(poly)
    split.PassVertsOff()
    split.PassLinesOff()
    split.Update()
    mass = vtk.vtkMassProperties()
    mass.SetInputConnection(split.GetOutputPort())
    mass.Update()
    return {"points": poly.GetNumberOfPoints(), "polys": poly.GetNumberOfPolys(), "strips": poly.GetNumberOfStrips(),
            "triangles": split.GetOutput().GetNumberOfCells(), "area": mass.GetSurfaceArea(), "volume": mass.GetVolume(),
            "arrays": arrays_of(poly.GetPointData(), "point") + arrays_of(poly.GetCellData(), "cell")}


def with_arrays(poly, strips=False):
    points = vtk_to_numpy(poly.GetPoints().GetData()).astype(float)
    scalar = numpy_to_vtk(np.sin(points[:, 0]) + points[:, 2], deep=True)
    scalar.SetName("surface sensitivity")
    poly.GetPointData().AddArray(scalar)
    vector = numpy_to_vtk((points * 0.25).astype(np.float32), deep=True)
    vector.SetName("gradient")
    poly.GetPointData().AddArray(vector)
    cells = poly.GetNumberOfCells()
    region = numpy_to_vtk((np.arange(cells) * 3 // max(1, cells)).astype(np.int32), deep=True)
    region.SetName("region")
    poly.GetCellData().AddArray(region)
    return poly


def sphere(resolution, precision=vtk.vtkAlgorithm.SINGLE_PRECISION):
    source = vtk.vtkSphereSource()
    source.SetRadius(1.5)
    source.SetThetaResolution(resolution)
    source.SetPhiResolution(resolution)
    source.SetOutputPointsPrecision(precision)
    source.Update()
    poly = vtk.vtkPolyData()
    poly.DeepCopy(source.GetOutput())
    poly.GetPointData().SetNormals(None)
    return with_arrays(poly)


def prism():
    """Polygons of several corner counts, one of them concave: an L-shaped prism, with a line and a vertex beside."""
    outline = [(0, 0), (3, 0), (3, 1), (1, 1), (1, 2), (0, 2)]
    points = vtk.vtkPoints()
    for z in (0.0, 0.5):
        for x, y in outline:
            points.InsertNextPoint(x, y, z)
    polys = vtk.vtkCellArray()
    rings = [list(range(5, -1, -1)), list(range(6, 12))]
    rings += [[k, (k + 1) % 6, 6 + (k + 1) % 6, 6 + k] for k in range(6)]
    for ring in rings:
        polys.InsertNextCell(len(ring), ring)
    lines = vtk.vtkCellArray()
    lines.InsertNextCell(2, [0, 7])
    verts = vtk.vtkCellArray()
    verts.InsertNextCell(1, [3])
    poly = vtk.vtkPolyData()
    poly.SetPoints(points)
    poly.SetVerts(verts)
    poly.SetLines(lines)
    poly.SetPolys(polys)
    return with_arrays(poly)


def stripped(poly):
    strip = vtk.vtkStripper()
    strip.SetInputData(poly)
    strip.Update()
    out = vtk.vtkPolyData()
    out.DeepCopy(strip.GetOutput())
    out.GetCellData().Initialize()
    region = numpy_to_vtk(np.arange(out.GetNumberOfCells(), dtype=float), deep=True)
    region.SetName("strip number")
    out.GetCellData().AddArray(region)
    return out


def xml(path, poly, mode, compressor=None, header=32, encode=False, big=False, block=None):
    writer = vtk.vtkXMLPolyDataWriter()
    writer.SetFileName(path)
    writer.SetInputData(poly)
    {"ascii": writer.SetDataModeToAscii, "binary": writer.SetDataModeToBinary, "appended": writer.SetDataModeToAppended}[mode]()
    writer.SetEncodeAppendedData(1 if encode else 0)
    writer.SetCompressor({None: None, "zlib": vtk.vtkZLibDataCompressor, "lz4": vtk.vtkLZ4DataCompressor}[compressor]()
                         if compressor else None)
    (writer.SetHeaderTypeToUInt64 if header == 64 else writer.SetHeaderTypeToUInt32)()
    (writer.SetByteOrderToBigEndian if big else writer.SetByteOrderToLittleEndian)()
    if block:
        writer.SetBlockSize(block)
    assert writer.Write() == 1, path


def legacy(path, poly, binary, version):
    writer = vtk.vtkPolyDataWriter()
    writer.SetFileName(path)
    writer.SetInputData(poly)
    writer.SetFileVersion(version)
    (writer.SetFileTypeToBinary if binary else writer.SetFileTypeToASCII)()
    assert writer.Write() == 1, path


def simple(writer, path, poly, setup=None):
    writer.SetFileName(path)
    writer.SetInputData(poly)
    if setup:
        setup(writer)
    writer.Write()


def write(folder):
    small, large = sphere(12), sphere(90)
    double = sphere(12, vtk.vtkAlgorithm.DOUBLE_PRECISION)
    ell = prism()
    strips = stripped(small)
    shapes = {"small": small, "large": large, "double": double, "ell": ell, "strips": strips}
    files = {}

    def put(name, shape, **more):
        files[name] = dict(figures(shapes[shape]), **more)
        return os.path.join(folder, name)

    for shape in ("small", "ell", "double", "strips"):
        for mode in ("ascii", "binary", "appended"):
            xml(put(f"{shape}-{mode}.vtp", shape), shapes[shape], mode)
    for header in (32, 64):
        for big in (False, True):
            tag = f"{header}{'-big' if big else ''}"
            xml(put(f"raw-{tag}.vtp", "large"), large, "appended", header=header, big=big)
            xml(put(f"encoded-{tag}.vtp", "large"), large, "appended", header=header, big=big, encode=True)
            xml(put(f"zlib-{tag}.vtp", "large"), large, "appended", "zlib", header=header, big=big, block=32768)
            xml(put(f"zlib-encoded-{tag}.vtp", "large"), large, "appended", "zlib", header, True, big, 32768)
            xml(put(f"zlib-inline-{tag}.vtp", "large"), large, "binary", "zlib", header, False, big, 32768)
    xml(put("lz4.vtp", "small", refused="file-unsupported"), small, "appended", "lz4")
    for shape in ("small", "ell", "double", "strips", "large"):
        for binary in (False, True):
            for version in (42, 51):
                tag = f"{shape}-{'binary' if binary else 'ascii'}-{version}.vtk"
                legacy(put(tag, shape), shapes[shape], binary, version)
    bare = vtk.vtkPolyData()
    bare.CopyStructure(small)
    shapes["bare"] = bare
    simple(vtk.vtkSTLWriter(), put("ascii.stl", "bare"), bare, lambda w: w.SetFileTypeToASCII())
    simple(vtk.vtkSTLWriter(), put("binary.stl", "bare"), bare, lambda w: w.SetFileTypeToBinary())
    simple(vtk.vtkOBJWriter(), put("vtk.obj", "bare"), bare)

    def ply(binary, big):
        def setup(writer):
            (writer.SetFileTypeToBinary if binary else writer.SetFileTypeToASCII)()
            (writer.SetDataByteOrderToBigEndian if big else writer.SetDataByteOrderToLittleEndian)()
        return setup

    simple(vtk.vtkPLYWriter(), put("ascii.ply", "bare"), bare, ply(False, False))
    simple(vtk.vtkPLYWriter(), put("little.ply", "bare"), bare, ply(True, False))
    simple(vtk.vtkPLYWriter(), put("big.ply", "bare"), bare, ply(True, True))

    import meshio
    points = vtk_to_numpy(small.GetPoints().GetData())
    triangles = vtk_to_numpy(small.GetPolys().GetConnectivityArray()).reshape(-1, 3)
    value = points[:, 0] * 2.0
    mesh = meshio.Mesh(points.astype(float), [("triangle", triangles)], point_data={"value": value})
    for name, options in (("meshio-binary.ply", {"binary": True}), ("meshio-ascii.ply", {"binary": False})):
        meshio.write(os.path.join(folder, name), mesh, file_format="ply", **options)
        files[name] = dict(figures(bare), arrays=[{"name": "value", "on": "point", "components": 1, "tuples": len(value),
                           "sum": float(value.sum()), "first": [float(value[0])], "last": [float(value[-1])]}])
    plain = meshio.Mesh(points, [("triangle", triangles)])
    meshio.write(os.path.join(folder, "meshio.obj"), plain)
    files["meshio.obj"] = figures(bare)
    meshio.write(os.path.join(folder, "meshio.stl"), plain, binary=True)
    files["meshio.stl"] = figures(bare)
    meshio.write(os.path.join(folder, "grid.vtk"), plain)
    files["grid.vtk"] = {"refused": "file-unsupported"}
    with open(os.path.join(folder, "manifest.json"), "w") as out:
        json.dump(files, out)


READERS = {".vtp": vtk.vtkXMLPolyDataReader, ".vtk": vtk.vtkPolyDataReader, ".ply": vtk.vtkPLYReader,
           ".obj": vtk.vtkOBJReader, ".stl": vtk.vtkSTLReader}


def read(paths):
    out = []
    for path in paths:
        ending = os.path.splitext(path)[1]
        reader = READERS[ending]()
        reader.SetFileName(path)
        reader.Update()
        result = figures(reader.GetOutput())
        poly = reader.GetOutput()
        result["positions"] = vtk_to_numpy(poly.GetPoints().GetData()).astype(float).ravel().tolist()
        result["connectivity"] = vtk_to_numpy(poly.GetPolys().GetConnectivityArray()).tolist()
        field = poly.GetFieldData()
        result["fields"] = {field.GetAbstractArray(k).GetName(): [field.GetAbstractArray(k).GetValue(i)
                            for i in range(field.GetAbstractArray(k).GetNumberOfValues())]
                            for k in range(field.GetNumberOfArrays())}
        if ending in (".obj", ".stl") or os.path.basename(path) == "plain.ply":
            import meshio
            mesh = meshio.read(path)
            result["meshio"] = {"points": len(mesh.points), "cells": sum(len(block.data) for block in mesh.cells),
                                "arrays": {name: float(np.sum(values)) for name, values in mesh.point_data.items()}}
        out.append(result)
    # Readers print to standard output too.
    print("\nRESULT " + json.dumps(out))


if sys.argv[1] == "write":
    write(sys.argv[2])
else:
    read(sys.argv[2:])
