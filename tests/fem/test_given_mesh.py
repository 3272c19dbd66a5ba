"""Series on a mesh, written by vtk, meshio and netCDF4, read to the bit; broken ones refused."""

import xml.etree.ElementTree as ElementTree
from collections.abc import Callable
from pathlib import Path
from typing import Any

import h5py
import meshio
import netCDF4
import numpy as np
import pytest
import pyvista
from numpy.testing import assert_allclose, assert_array_equal
from vtkmodules.util.vtkAlgorithm import VTKPythonAlgorithmBase
from vtkmodules.vtkCommonDataModel import vtkUnstructuredGrid
from vtkmodules.vtkCommonExecutionModel import vtkStreamingDemandDrivenPipeline as Pipeline
from vtkmodules.vtkIOExodus import vtkExodusIIReader, vtkExodusIIWriter
from vtkmodules.vtkIOHDF import vtkHDFWriter
from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridWriter

from midradius.fem.givenfields import write_on_mesh
from midradius.fem.givenmesh import read_given_mesh
from midradius.fem.histories import Histories
from midradius.fem.vtkhdf import HdfSeries
from midradius.thermo.arrays import Array
from midradius.thermo.errors import InputFault

TIMES = np.array([0.0, 1.5, 4.0, 10.0, 30.0, 100.0])
# Two triangles and a quad [mm], points in no order of place.
POINTS = np.array(
    [[10.0, 0.0, 0.0], [0.0, 0.0, 0.0], [10.0, 5.0, 0.0], [0.0, 5.0, 0.0], [20.0, 0.0, 0.0]]
    + [[20.0, 5.0, 0.0]]
)
TRIANGLES = np.array([[1, 0, 2], [1, 2, 3]])
QUADS = np.array([[0, 4, 5, 2]])
TAG = np.array([7, 7, 9], dtype=np.int32)


def temps() -> Array:
    """[degC], (n_time, n_node): each node cools at its own pace."""
    pace = np.array([20.0, 10.0, 25.0, 15.0, 40.0, 45.0])
    return 40.0 + 820.0 * np.exp(-TIMES[:, None] / pace[None, :])


def grid(k: int) -> "pyvista.UnstructuredGrid":
    cells = np.concatenate([np.insert(TRIANGLES, 0, 3, axis=1).ravel(), [4], QUADS.ravel()])
    found = pyvista.UnstructuredGrid(cells, [5, 5, 9], POINTS)
    found.point_data["T"] = temps()[k]
    found.point_data["source id"] = np.arange(6, dtype=np.int16)
    found.cell_data["tag"] = TAG
    return found


def write_vtu(path: Path, data: Any, mode: str = "appended", compressor: str = "zlib") -> None:
    writer = vtkXMLUnstructuredGridWriter()
    writer.SetFileName(str(path))
    writer.SetInputData(data)
    {"ascii": writer.SetDataModeToAscii, "binary": writer.SetDataModeToBinary}.get(
        mode, writer.SetDataModeToAppended
    )()
    {"none": writer.SetCompressorTypeToNone, "lz4": writer.SetCompressorTypeToLZ4}.get(
        compressor, writer.SetCompressorTypeToZLib
    )()
    assert writer.Write() == 1


def pvd(folder: Path, mode: str = "appended", compressor: str = "zlib") -> Path:
    (folder / "steps").mkdir()
    rows = []
    for k, time in enumerate(TIMES):
        write_vtu(folder / "steps" / f"s{k}.vtu", grid(k), mode, compressor)
        rows.append(f'<DataSet timestep="{time!r}" part="0" file="steps/s{k}.vtu"/>')
    path = folder / "part.pvd"
    path.write_text(
        '<?xml version="1.0"?><VTKFile type="Collection"><Collection>'
        + "".join(rows).replace("np.float64(", "").replace(")", "")
        + "</Collection></VTKFile>"
    )
    return path


def xdmf(folder: Path) -> Path:
    path = folder / "part.xdmf"
    mesh_cells = [("triangle", TRIANGLES), ("quad", QUADS)]
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)  # the library writes the HDF5 file where the process stands
        with meshio.xdmf.TimeSeriesWriter(path) as writer:
            writer.write_points_cells(POINTS, mesh_cells)
            for k, time in enumerate(TIMES):
                writer.write_data(
                    time, point_data={"T": temps()[k]}, cell_data={"tag": [TAG[:2], TAG[2:]]}
                )
    return path


def exodus(folder: Path, layout: Any = "NETCDF4") -> Path:
    path = folder / "part.e"
    with netCDF4.Dataset(path, "w", format=layout) as file:
        file.setncatts({"api_version": np.float32(8.03), "version": np.float32(8.03)})
        file.setncatts({"floating_point_word_size": np.int32(8), "file_size": np.int32(1)})
        file.title = "an invented part"
        for name, size in (
            *(("len_string", 33), ("time_step", None), ("num_dim", 3), ("num_nodes", 6)),
            *(("num_elem", 3), ("num_el_blk", 2), ("num_nod_var", 2)),
            *(("num_el_in_blk1", 2), ("num_nod_per_el1", 3)),
            *(("num_el_in_blk2", 1), ("num_nod_per_el2", 4)),
        ):
            file.createDimension(name, size)
        file.createVariable("time_whole", "f8", ("time_step",))[:] = TIMES
        for c, column in zip("xyz", POINTS.T, strict=True):
            file.createVariable(f"coord{c}", "f8", ("num_nodes",))[:] = column
        names = file.createVariable("name_nod_var", "S1", ("num_nod_var", "len_string"))
        for k, name in enumerate(("pressure", "T")):
            names[k] = np.array([*name.ljust(33, "\0")], dtype="S1")
        file.createVariable("eb_status", "i4", ("num_el_blk",))[:] = 1
        numbers = file.createVariable("eb_prop1", "i4", ("num_el_blk",))
        numbers[:] = [1, 2]
        numbers.setncattr("name", "ID")
        for k, (kind, block) in enumerate((("TRI3", TRIANGLES), ("QUAD4", QUADS)), start=1):
            dims = (f"num_el_in_blk{k}", f"num_nod_per_el{k}")
            connect = file.createVariable(f"connect{k}", "i4", dims)
            connect[:] = block + 1
            connect.elem_type = kind
        for k, values in enumerate((np.zeros_like(temps()), temps()), start=1):
            variable = file.createVariable(f"vals_nod_var{k}", "f8", ("time_step", "num_nodes"))
            variable[:] = values
    return path


def vtkhdf(folder: Path) -> Path:
    path = folder / "part.vtkhdf"
    n = len(TIMES)
    with h5py.File(path, "w", libver=("v110", "v110")) as file:
        root = file.create_group("VTKHDF")
        root.attrs["Version"] = [2, 3]
        root.attrs.create("Type", np.bytes_("UnstructuredGrid"))
        connectivity = np.concatenate([TRIANGLES.ravel(), QUADS.ravel()])
        for name, values in (
            ("NumberOfPoints", [6]),
            ("NumberOfCells", [3]),
            ("NumberOfConnectivityIds", [len(connectivity)]),
            ("Points", POINTS),
            ("Connectivity", connectivity),
            ("Offsets", [0, 3, 6, 10]),
        ):
            root.create_dataset(name, data=np.asarray(values))
        root.create_dataset("Types", data=np.array([5, 5, 9], dtype=np.uint8))
        root.create_dataset("PointData/T", data=temps().ravel())
        steps = root.create_group("Steps")
        steps.attrs["NSteps"] = n
        steps["Values"] = TIMES
        steps["NumberOfParts"] = np.ones(n, dtype=np.int64)
        for name in ("PartOffsets", "PointOffsets"):
            steps[name] = np.zeros(n, dtype=np.int64)
        for name in ("CellOffsets", "ConnectivityIdOffsets"):
            steps[name] = np.zeros((n, 1), dtype=np.int64)
        steps["PointDataOffsets/T"] = 6 * np.arange(n)
    return path


class Cooling(VTKPythonAlgorithmBase):
    """The cooling as a source of the vtk library."""

    def __init__(self) -> None:
        super().__init__(nInputPorts=0, nOutputPorts=1, outputType="vtkUnstructuredGrid")

    def RequestInformation(self, _: Any, __: Any, out: Any) -> int:
        told = out.GetInformationObject(0)
        told.Set(Pipeline.TIME_STEPS(), list(TIMES), len(TIMES))
        told.Set(Pipeline.TIME_RANGE(), [TIMES[0], TIMES[-1]], 2)
        return 1

    def RequestData(self, _: Any, __: Any, out: Any) -> int:
        told = out.GetInformationObject(0)
        asked = Pipeline.UPDATE_TIME_STEP()
        time = told.Get(asked) if told.Has(asked) else 0.0
        here = grid(int(np.argmin(np.abs(TIMES - time))))
        vtkUnstructuredGrid.GetData(out).ShallowCopy(here)
        return 1


def vtkhdf_of_vtk(folder: Path) -> Path:
    """VTKHDF as the vtk library writes it: its mesh stands there at every time."""
    path = folder / "part.vtkhdf"
    source, writer = Cooling(), vtkHDFWriter()
    writer.SetInputConnection(source.GetOutputPort())
    writer.SetFileName(str(path))
    writer.SetWriteAllTimeSteps(True)
    assert writer.Write() == 1
    return path


def opened(path: Path, array: str = "T") -> Histories:
    return read_given_mesh(
        path, array=array, time_factor=1.0, to_kelvin=(1.0, 273.15), length_factor=1e-3
    )


WRITERS: dict[str, Callable[[Path], Path]] = {
    "PVD, raw appended, zlib": pvd,
    "PVD, raw appended": lambda folder: pvd(folder, compressor="none"),
    "PVD, base64, LZ4": lambda folder: pvd(folder, "binary", "lz4"),
    "PVD, text": lambda folder: pvd(folder, "ascii", "none"),
    "XDMF with HDF5": xdmf,
    "Exodus in HDF5": exodus,
    "Exodus, classic": lambda folder: exodus(folder, "NETCDF3_CLASSIC"),
    "Exodus, 64-bit offsets": lambda folder: exodus(folder, "NETCDF3_64BIT_OFFSET"),
    "VTKHDF, mesh once": vtkhdf,
    "VTKHDF of vtk, mesh at every time": vtkhdf_of_vtk,
}


@pytest.mark.parametrize("writer", WRITERS.values(), ids=WRITERS)
def test_every_sample_of_every_format_is_read_to_the_bit_in_the_order_of_the_nodes(
    writer: Callable[[Path], Path], tmp_path: Path
) -> None:
    given = opened(writer(tmp_path))
    assert_array_equal(given.times, TIMES)
    for _ in range(2):  # anew at every call
        assert_array_equal(np.array(list(given.samples())), temps() + 273.15)
    assert given.points is not None and given.mesh is not None
    assert_array_equal(given.points, POINTS * 1e-3)
    assert [kind for kind, _ in given.mesh.cells] == ["triangle", "quad"]
    assert_array_equal(given.mesh.cells[0][1], TRIANGLES)
    assert_array_equal(given.mesh.cells[1][1], QUADS)
    assert_array_equal(given.mesh.point_data["T"], temps()[-1])


def test_a_series_that_vtk_writes_as_exodus_has_all_its_times(tmp_path: Path) -> None:
    reader = vtkExodusIIReader()
    reader.SetFileName(str(exodus(tmp_path)))
    reader.UpdateInformation()
    reader.SetAllArrayStatus(reader.NODAL, 1)
    path = tmp_path / "again.ex2"
    writer = vtkExodusIIWriter()
    writer.SetFileName(str(path))
    writer.WriteAllTimeStepsOn()
    writer.SetInputConnection(reader.GetOutputPort())
    assert writer.Write() == 1
    given = opened(path)
    assert_array_equal(given.times, TIMES)
    assert given.points is not None
    # its blocks bring their points one after the other: found again by where they lie
    place = [int(np.argmin(np.abs(given.points - p).sum(axis=1))) for p in POINTS * 1e-3]
    assert_array_equal(np.array(list(given.samples()))[:, place], temps() + 273.15)


def test_one_state_is_no_series(tmp_path: Path) -> None:
    write_vtu(tmp_path / "s0.vtu", grid(0))
    path = tmp_path / "part.pvd"
    path.write_text('<VTKFile><DataSet timestep="0" file="s0.vtu"/></VTKFile>')
    with pytest.raises(InputFault, match=r"must be a series of several times"):
        opened(path)


@pytest.mark.parametrize("writer", [pvd, xdmf, exodus, vtkhdf, vtkhdf_of_vtk])
def test_results_come_back_on_the_same_mesh_beside_the_arrays_that_were_there(
    writer: Callable[[Path], Path], tmp_path: Path
) -> None:
    given = opened(writer(tmp_path))
    assert given.mesh is not None
    hardness = np.linspace(200.0, 600.0, 6)
    path = write_on_mesh(tmp_path, given.mesh, {"hardness_HV": hardness})
    seen = pyvista.read(path)  # vtk's own reader
    assert_array_equal(seen.points, POINTS * 1e-3)
    assert_array_equal(seen.celltypes, [5, 5, 9])
    assert_array_equal(seen.cell_connectivity, [*TRIANGLES.ravel(), *QUADS.ravel()])
    assert_array_equal(seen.point_data["hardness_HV"], hardness)
    assert_array_equal(seen.point_data["T"], temps()[-1])
    if writer is pvd:
        assert seen.point_data["source id"].dtype == np.int16
        assert_array_equal(seen.point_data["source id"], np.arange(6))
    if writer in (pvd, xdmf, vtkhdf_of_vtk):
        assert seen.cell_data["tag"].dtype == np.int32
        assert_array_equal(seen.cell_data["tag"], TAG)


def test_an_array_that_bears_our_name_keeps_it(tmp_path: Path) -> None:
    given = opened(exodus(tmp_path))
    assert given.mesh is not None
    mesh = type(given.mesh)(given.points, given.mesh.cells, {"hardness_HV": np.arange(6)}, {})
    seen = pyvista.read(write_on_mesh(tmp_path, mesh, {"hardness_HV": np.full(6, 300.0)}))
    assert_array_equal(seen.point_data["hardness_HV"], np.arange(6))
    assert_array_equal(seen.point_data["computed_hardness_HV"], np.full(6, 300.0))


def test_a_wedge_of_vtk_keeps_the_order_of_its_corners(tmp_path: Path) -> None:
    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1], [1, 0, 1], [0, 1, 1]], float)
    for k in range(2):
        wedge = pyvista.UnstructuredGrid([6, 0, 1, 2, 3, 4, 5], [13], points)
        wedge.point_data["T"] = np.full(6, 800.0 - k)
        write_vtu(tmp_path / f"s{k}.vtu", wedge)
    path = tmp_path / "w.pvd"
    rows = "".join(f'<DataSet timestep="{k}" file="s{k}.vtu"/>' for k in range(2))
    path.write_text(f"<VTKFile><Collection>{rows}</Collection></VTKFile>")
    given = opened(path)
    assert given.mesh is not None
    seen = pyvista.read(write_on_mesh(tmp_path, given.mesh, {}))
    assert_array_equal(seen.cell_connectivity, [0, 1, 2, 3, 4, 5])


def test_cells_of_second_order_come_back_as_they_were(tmp_path: Path) -> None:
    rng = np.random.default_rng(4)
    for kind, n in ((22, 6), (24, 10), (26, 15), (27, 13), (25, 20)):
        cell = pyvista.UnstructuredGrid([n, *range(n)], [kind], rng.random((n, 3)))
        for k in range(2):
            cell.point_data["T"] = np.full(n, 800.0 - k)
            write_vtu(tmp_path / f"s{k}.vtu", cell)
        path = tmp_path / "w.pvd"
        rows = "".join(f'<DataSet timestep="{k}" file="s{k}.vtu"/>' for k in range(2))
        path.write_text(f"<VTKFile><Collection>{rows}</Collection></VTKFile>")
        mesh = opened(path).mesh
        assert mesh is not None
        seen = pyvista.read(write_on_mesh(tmp_path, mesh, {}))
        assert seen.celltypes.tolist() == [kind]
        assert_array_equal(seen.cell_connectivity, np.arange(n))


def refusal(path: Path, array: str = "T") -> str:
    with pytest.raises(InputFault) as caught:
        list(opened(path, array).samples())
    return str(caught.value)


@pytest.mark.parametrize("writer", [pvd, xdmf, exodus, vtkhdf])
def test_an_array_that_is_not_there_is_named_with_those_that_are(
    writer: Callable[[Path], Path], tmp_path: Path
) -> None:
    text = refusal(writer(tmp_path), "NT11")
    assert text.startswith('temperatures.array = "NT11", but must be an array of points')
    assert '"T"' in text


def test_an_array_of_cells_is_no_temperature_at_nodes(tmp_path: Path) -> None:
    assert '"tag" belongs to cells: write it at the points.' in refusal(pvd(tmp_path), "tag")


def test_times_that_do_not_rise_are_named(tmp_path: Path) -> None:
    path = pvd(tmp_path)
    path.write_text(path.read_text().replace('"4.0"', '"1.0"'))
    assert "time 1 after 1.5 (sample 3), but must be times that rise" in refusal(path)


def test_a_mesh_that_moves_has_no_histories(tmp_path: Path) -> None:
    path = pvd(tmp_path)
    moved = grid(3)
    moved.points = moved.points + [0.0, 0.0, 1e-3]
    write_vtu(tmp_path / "steps" / "s3.vtu", moved)
    assert '"s3.vtu", but must be a mesh with the same points' in refusal(path)


def test_a_vtkhdf_whose_points_move_is_refused(tmp_path: Path) -> None:
    path = vtkhdf_of_vtk(tmp_path)
    with h5py.File(path, "r+") as file:
        file["VTKHDF/Points"][6 * 3] += 1e-3
    assert "sample 4 has others" in refusal(path)


def test_the_compressed_series_of_our_own_runs_is_read(tmp_path: Path) -> None:
    path = tmp_path / "fields.vtkhdf"
    cells = (("triangle", TRIANGLES), ("quad", QUADS))
    with HdfSeries(path, points_mm=POINTS, cells=cells) as series:
        for time, values in zip(TIMES, temps(), strict=True):
            series.add(time, {"temperature_degC": values})
        series.finish({"hardness_HV": np.full(6, 300.0)})
    given = opened(path, "temperature_degC")
    # rounded to 1/64 K there
    seen = np.array(list(given.samples())) - 273.15
    assert_allclose(seen, temps(), rtol=0.0, atol=1.0 / 128.0 + 1e-4)


def test_a_file_of_the_series_that_is_missing_is_named(tmp_path: Path) -> None:
    path = pvd(tmp_path)
    (tmp_path / "steps" / "s2.vtu").unlink()
    assert '"s2.vtu"' in refusal(path)


@pytest.mark.parametrize(
    ("index", "said"),
    [
        ('<!DOCTYPE x [<!ENTITY e SYSTEM "/etc/passwd">]><VTKFile>&e;</VTKFile>', "DOCTYPE"),
        ("<VTKFile><Collection>", "It is no XML"),
        ("<VTKFile/>", "It names no file"),
        ('<VTKFile><DataSet timestep="0" file="../x.vtu"/></VTKFile>', "beside part.pvd or below"),
        ('<VTKFile><DataSet timestep="0" file="/x.vtu"/></VTKFile>', "beside part.pvd or below"),
        ('<VTKFile><DataSet timestep="a" file="x.vtu"/></VTKFile>', "gives no time there"),
        (
            '<VTKFile><DataSet timestep="0" part="0" file="a.vtu"/>'
            '<DataSet timestep="0" part="1" file="b.vtu"/></VTKFile>',
            "Merge the parts",
        ),
        ('<VTKFile><DataSet timestep="0" file="x.vts"/></VTKFile>', "VTU files"),
    ],
)
def test_a_strange_index_is_refused(index: str, said: str, tmp_path: Path) -> None:
    path = tmp_path / "part.pvd"
    path.write_text(index)
    assert said in refusal(path)


@pytest.mark.parametrize("suffix", [".e", ".xdmf", ".vtkhdf"])
def test_a_file_that_is_something_else_is_refused(suffix: str, tmp_path: Path) -> None:
    path = tmp_path / f"part{suffix}"
    path.write_bytes(b"hello, this is no mesh")
    assert refusal(path).startswith(f'temperatures.file = "part{suffix}"')


def test_an_xdmf_whose_times_have_meshes_of_their_own_is_refused(tmp_path: Path) -> None:
    path = xdmf(tmp_path)
    tree = ElementTree.parse(path)
    for k, one in enumerate(tree.iterfind(".//Grid[@CollectionType]/Grid")):
        own = ElementTree.SubElement(one, "Geometry")
        own.text = f"points of time {k}"
    tree.write(path)
    assert "a mesh that moves has no histories" in refusal(path)
