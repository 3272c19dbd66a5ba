"""The field series, read back with the vtk library itself and not with its writer."""

import xml.etree.ElementTree as ElementTree
from pathlib import Path

import numpy as np
import pytest
import pyvista
from numpy.testing import assert_allclose
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkIOXML import vtkXMLUnstructuredGridReader

from midradius.fem.fields import write_series
from midradius.thermo.errors import InputFault


def drawing(n_across: int = 5, n_up: int = 4) -> dict[str, np.ndarray]:
    """A grid of quads over 80 by 60 mm, its first cell cut into two triangles."""
    x, y = np.meshgrid(np.linspace(0.0, 80.0, n_across), np.linspace(0.0, 60.0, n_up))
    points = np.column_stack([x.ravel(), y.ravel(), np.zeros(x.size)])
    corner = (np.arange(n_up - 1)[:, None] * n_across + np.arange(n_across - 1)).ravel()
    quads = np.column_stack([corner, corner + 1, corner + n_across + 1, corner + n_across])
    a, b, c, d = quads[0]
    return {
        "points_mm": points,
        "quads": quads[1:],
        "triangles": np.array([[a, b, c], [a, c, d]]),
    }


def series(folder: Path, **changes: object) -> Path:
    mesh = drawing()
    n_point = len(mesh["points_mm"])
    hardness = np.linspace(200.0, 600.0, n_point)
    hardness[3] = np.nan
    content: dict[str, object] = {
        **mesh,
        "times_s": np.array([0.0, 0.1, 3600.0]),
        "each_time": {"temperature_degC": np.arange(3.0 * n_point).reshape(3, n_point) / 3.0},
        "at_end": {"hardness_HV": hardness, "ferrite_fraction": np.full(n_point, 0.25)},
    }
    content |= changes
    content["cells"] = tuple((kind[:-1], content.pop(kind)) for kind in ("quads", "triangles"))
    return write_series(folder, **content)  # type: ignore[arg-type]


def read(path: Path) -> tuple[object, dict[str, np.ndarray]]:
    reader = vtkXMLUnstructuredGridReader()
    reader.SetFileName(str(path))
    assert reader.CanReadFile(str(path))
    reader.Update()
    grid = reader.GetOutput()
    data = grid.GetPointData()
    names = [data.GetArrayName(k) for k in range(data.GetNumberOfArrays())]
    return grid, {name: vtk_to_numpy(data.GetArray(name)) for name in names}


def listed(index: Path) -> list[tuple[float, Path]]:
    """What any reader of the index sees: (time, file)."""
    root = ElementTree.parse(index).getroot()
    assert root.tag == "VTKFile"
    assert root.get("type") == "Collection"
    return [
        (float(item.get("timestep", "")), index.parent / item.get("file", ""))
        for item in root.iter("DataSet")
    ]


def test_index_names_one_existing_file_per_time(tmp_path: Path) -> None:
    entries = listed(series(tmp_path))
    assert [time for time, _ in entries] == [0.0, 0.1, 3600.0]
    assert all(path.is_file() for _, path in entries)
    assert entries[-1][1] == tmp_path / "final.vtu"


def test_vtk_reads_every_file_without_a_complaint(tmp_path: Path, capfd: pytest.CaptureFixture):
    for _, path in listed(series(tmp_path)):
        grid, _ = read(path)
        assert grid.GetNumberOfPoints() == 20
        assert grid.GetNumberOfCells() == 13
    assert capfd.readouterr() == ("", "")


def test_vtk_reads_back_the_same_doubles_and_nan_stays_nan(tmp_path: Path) -> None:
    _, (_, middle), (_, last) = listed(series(tmp_path))
    _, arrays = read(middle)
    assert arrays["temperature_degC"].dtype == np.float64
    assert_allclose(arrays["temperature_degC"], np.arange(20.0, 40.0) / 3.0, rtol=0, atol=0)
    _, arrays = read(last)
    expected = np.linspace(200.0, 600.0, 20)
    expected[3] = np.nan
    assert_allclose(arrays["hardness_HV"], expected, rtol=0, atol=0, equal_nan=True)


def test_coordinates_are_metres_and_an_array_repeats_them_in_millimetres(tmp_path: Path) -> None:
    grid, arrays = read(listed(series(tmp_path))[0][1])
    assert_allclose(grid.GetBounds(), (0.0, 0.08, 0.0, 0.06, 0.0, 0.0), rtol=1e-15, atol=0)
    assert_allclose(arrays["position_mm"], drawing()["points_mm"], rtol=0, atol=0)


def test_cells_keep_their_corners_so_that_areas_add_up_to_the_drawing(tmp_path: Path) -> None:
    mesh = pyvista.read(listed(series(tmp_path))[-1][1])
    assert_allclose(mesh.compute_cell_sizes().cell_data["Area"].sum(), 0.0048, rtol=1e-12, atol=0)


def test_every_file_has_the_same_arrays_and_final_ones_are_nan_before_the_end(
    tmp_path: Path,
) -> None:
    files = [read(path)[1] for _, path in listed(series(tmp_path))]
    assert all(list(arrays) == list(files[0]) for arrays in files)
    assert np.isnan(files[0]["ferrite_fraction"]).all()
    assert np.isnan(files[1]["hardness_HV"]).all()
    assert_allclose(files[2]["ferrite_fraction"], 0.25, rtol=0, atol=0)


def test_a_reader_of_the_index_steps_through_the_times(tmp_path: Path) -> None:
    reader = pyvista.get_reader(series(tmp_path))
    assert reader.time_values == [0.0, 0.1, 3600.0]
    reader.set_active_time_value(0.1)
    assert_allclose(reader.read()[0].point_data["temperature_degC"][0], 20.0 / 3.0, rtol=0, atol=0)


# 4096 doubles are one block of 32 KiB exactly: the border case of the block header.
@pytest.mark.parametrize("n_across", [2047, 2048, 2049])
def test_arrays_that_fill_compressed_blocks_exactly_are_whole(
    tmp_path: Path, n_across: int
) -> None:
    mesh = drawing(n_across, 2)
    temp = np.sqrt(np.arange(2.0 * n_across))
    series(
        tmp_path,
        **mesh,
        times_s=np.array([5.0]),
        each_time={"temperature_degC": temp[None, :]},
        at_end={},
    )
    _, arrays = read(tmp_path / "final.vtu")
    assert_allclose(arrays["temperature_degC"], temp, rtol=0, atol=0)


@pytest.mark.parametrize("empty", ["quads", "triangles"])
def test_a_drawing_of_one_kind_of_cell_is_enough(tmp_path: Path, empty: str) -> None:
    width = {"quads": 4, "triangles": 3}[empty]
    series(tmp_path, **{empty: np.zeros((0, width), dtype=np.int64)})
    grid, _ = read(tmp_path / "final.vtu")
    assert grid.GetNumberOfCells() == {"quads": 2, "triangles": 11}[empty]


@pytest.mark.parametrize(
    ("changes", "quantity"),
    [
        ({"at_end": {"hardness": np.zeros(20)}}, "field name"),
        ({"at_end": {"temperature_degC": np.zeros(20)}}, "field name"),
        ({"at_end": {"position_mm": np.zeros(20)}}, "field name"),
        ({"at_end": {"hardness_HV": np.zeros(19)}}, "shape of hardness_HV"),
        ({"each_time": {"temperature_degC": np.zeros((2, 20))}}, "shape of temperature_degC"),
        ({"times_s": np.array([0.0, 5.0, 5.0])}, "stored times"),
        ({"times_s": np.array([])}, "stored times"),
        ({"points_mm": np.zeros((20, 2))}, "points"),
        ({"points_mm": np.full((20, 3), np.nan)}, "points"),
        ({"triangles": np.array([[0, 1, 20]])}, "triangle corners"),
        ({"triangles": np.array([[-1, 1, 2]])}, "triangle corners"),
    ],
)
def test_content_that_does_not_fit_together_is_refused_before_a_file_is_made(
    tmp_path: Path, changes: dict[str, object], quantity: str
) -> None:
    with pytest.raises(InputFault) as fault:
        series(tmp_path, **changes)
    assert fault.value.quantity == quantity
    assert list(tmp_path.iterdir()) == []


def test_a_wedge_keeps_the_order_of_its_corners_in_every_format(tmp_path: Path) -> None:
    # (0, 1, 2) seen from (3, 4, 5) runs counter-clockwise: as vtk 9.7 documents its wedge, and
    # as gmsh, .inp and bulk data decks have it; up to 9.6 vtk had it the other way round
    import h5py

    from midradius.fem.vtkhdf import HdfSeries

    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1], [1, 0, 1], [0, 1, 1]], float)
    cells = (("wedge", np.arange(6).reshape(1, 6)),)
    temps = np.full((1, 6), 20.0)
    write_series(
        tmp_path,
        points_mm=points,
        cells=cells,
        times_s=np.zeros(1),
        each_time={"temperature_degC": temps},
        at_end={},
    )
    assert pyvista.read(tmp_path / "final.vtu").cell_connectivity.tolist() == list(range(6))
    with HdfSeries(tmp_path / "f.vtkhdf", points_mm=points, cells=cells) as series:
        series.add(0.0, {"temperature_degC": temps[0]})
        series.finish({})
    with h5py.File(tmp_path / "f.vtkhdf") as file:
        assert file["VTKHDF/Connectivity"][:].tolist() == list(range(6))
