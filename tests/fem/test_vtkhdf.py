"""The compressed series, read back with the reader of the vtk library."""

from pathlib import Path

import h5py
import numpy as np
import pytest
from numpy.testing import assert_allclose
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkIOHDF import vtkHDFReader

from midradius.fem.vtkhdf import ROUNDING, HdfSeries
from midradius.thermo.errors import InputFault

# a unit cube as a hexahedron with a pyramid and a wedge on it, points in mm
POINTS = 10.0 * np.array(
    [
        [0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0],
        [0, 0, 1], [1, 0, 1], [1, 1, 1], [0, 1, 1],
        [0.5, 0.5, 2], [2, 0, 0], [2, 1, 0], [3, 3, 3],
    ]
)  # fmt: skip
CELLS = (
    ("hexahedron", np.array([[0, 1, 2, 3, 4, 5, 6, 7]])),
    ("pyramid", np.array([[4, 5, 6, 7, 8]])),
    ("wedge", np.array([[1, 9, 5, 2, 10, 6]])),
    ("tetra", np.array([[9, 10, 5, 11]])),
    ("quad", np.empty((0, 4), dtype=np.int64)),
    ("triangle", np.array([[9, 10, 11]])),
)
TIMES = (0.0, 0.5, 3600.0)


def temps(time: float) -> np.ndarray:
    return 860.0 * np.exp(-time / 900.0) + np.linspace(0.0, 17.0, len(POINTS)) ** 1.3


def write(path: Path, **how: float | None) -> Path:
    hardness = np.linspace(200.0, 600.0, len(POINTS))
    hardness[3] = np.nan
    with HdfSeries(path, points_mm=POINTS, cells=CELLS, **how) as series:
        for time in TIMES:
            series.add(time, {"temperature_degC": temps(time)})
        series.finish({"hardness_HV": hardness, "ferrite_fraction": np.full(len(POINTS), 0.25)})
    return path


def read(path: Path, step: int) -> tuple[object, dict[str, np.ndarray]]:
    reader = vtkHDFReader()
    assert reader.CanReadFile(str(path))
    reader.SetFileName(str(path))
    reader.UpdateInformation()
    assert reader.GetNumberOfSteps() == len(TIMES)
    reader.SetStep(step)
    reader.Update()
    assert_allclose(reader.GetTimeValue(), TIMES[step], rtol=0.0, atol=0.0)
    grid = reader.GetOutput()
    data = grid.GetPointData()
    names = [data.GetArrayName(k) for k in range(data.GetNumberOfArrays())]
    return grid, {name: vtk_to_numpy(data.GetArray(name)) for name in names}


def test_the_reader_of_vtk_finds_the_mesh_and_every_array_at_every_time(tmp_path: Path) -> None:
    path = write(tmp_path / "fields.vtkhdf")
    for step, time in enumerate(TIMES):
        grid, arrays = read(path, step)
        assert grid.GetNumberOfCells() == 5
        assert [grid.GetCellType(k) for k in range(5)] == [12, 14, 13, 10, 5]
        wedge = grid.GetCell(2)
        corners = [wedge.GetPointId(k) for k in range(wedge.GetNumberOfPoints())]
        assert corners == [1, 9, 5, 2, 10, 6]
        points = vtk_to_numpy(grid.GetPoints().GetData())
        assert_allclose(points, POINTS * 1e-3, rtol=1e-15, atol=0.0)
        assert set(arrays) == {
            "position_mm",
            "temperature_degC",
            "hardness_HV",
            "ferrite_fraction",
        }
        assert_allclose(arrays["temperature_degC"], temps(time), rtol=0.0, atol=0.5 * ROUNDING)
        assert_allclose(arrays["position_mm"], POINTS, rtol=0.0, atol=0.0)
        if step < len(TIMES) - 1:
            assert np.isnan(arrays["hardness_HV"]).all()
    assert_allclose(arrays["hardness_HV"][[0, 11]], [200.0, 600.0], rtol=0.0, atol=0.0)
    assert np.isnan(arrays["hardness_HV"][3])


def test_rounding_is_stated_in_the_file_and_can_be_left_out(tmp_path: Path) -> None:
    with h5py.File(write(tmp_path / "rounded.vtkhdf")) as file:
        stored = file["VTKHDF/PointData/temperature_degC"]
        assert stored.attrs["rounded_to"] == 1.0 / 64.0
        assert stored.attrs["units"] == "degC"
        assert_allclose(stored[:] * 64.0 % 1.0, 0.0, rtol=0.0, atol=0.0)
        assert "rounded_to" not in file["VTKHDF/PointData/hardness_HV"].attrs
    with h5py.File(write(tmp_path / "plain.vtkhdf", rounding=None)) as file:
        stored = file["VTKHDF/PointData/temperature_degC"]
        assert "rounded_to" not in stored.attrs
        exact = np.concatenate([temps(time) for time in TIMES]).astype(np.float32)
        assert_allclose(stored[:], exact, rtol=0.0, atol=0.0)


def test_a_single_time_is_a_series_too(tmp_path: Path) -> None:
    path = tmp_path / "one.vtkhdf"
    with HdfSeries(path, points_mm=POINTS, cells=CELLS) as series:
        series.add(0.0, {"temperature_degC": temps(0.0)})
        series.finish({"hardness_HV": np.arange(12.0)})
    reader = vtkHDFReader()
    reader.SetFileName(str(path))
    reader.Update()
    found = vtk_to_numpy(reader.GetOutput().GetPointData().GetArray("hardness_HV"))
    assert_allclose(found, np.arange(12.0), rtol=0.0, atol=0.0)


def test_a_series_that_ends_with_an_error_leaves_no_file(tmp_path: Path) -> None:
    path = tmp_path / "fields.vtkhdf"
    with (
        pytest.raises(InputFault, match="later than"),
        HdfSeries(path, points_mm=POINTS, cells=CELLS) as series,
    ):
        series.add(1.0, {"temperature_degC": temps(1.0)})
        series.add(1.0, {"temperature_degC": temps(1.0)})
    assert not path.exists()


def test_wrong_arrays_and_cells_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "fields.vtkhdf"
    with HdfSeries(path, points_mm=POINTS, cells=CELLS) as series:
        with pytest.raises(InputFault, match="field name = hardness"):
            series.add(0.0, {"hardness": temps(0.0)})
        with pytest.raises(InputFault, match="shape of hardness_HV"):
            series.add(0.0, {"hardness_HV": temps(0.0)[1:]})
        with pytest.raises(InputFault, match="stored times = none"):
            series.finish({})
    with pytest.raises(InputFault, match="cells = none"):
        HdfSeries(path, points_mm=POINTS, cells=())
    with pytest.raises(InputFault, match="tetra corners = 0 to 99"):
        HdfSeries(path, points_mm=POINTS, cells=(("tetra", np.array([[0, 1, 2, 99]])),))
