"""``[output] format`` and what a run keeps of its fields."""

from pathlib import Path

import numpy as np
import pytest
from numpy.testing import assert_allclose
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkIOHDF import vtkHDFReader

from midradius.study import fieldsink, job
from midradius.study.archive import write_fields
from midradius.study.fieldsink import FieldSink, compared_moments
from midradius.thermo.errors import InputFault


@pytest.fixture
def compressed(tmp_path: Path, small: str) -> Path:
    path = tmp_path / "stud.toml"
    path.write_text(small.replace("[output]", '[output]\nformat = "vtkhdf"'))
    return path


def at(path: Path, step: int) -> dict[str, np.ndarray]:
    reader = vtkHDFReader()
    reader.SetFileName(str(path))
    reader.UpdateInformation()
    reader.SetStep(step)
    reader.Update()
    data = reader.GetOutput().GetPointData()
    names = [data.GetArrayName(k) for k in range(data.GetNumberOfArrays())]
    return {name: vtk_to_numpy(data.GetArray(name)) for name in names}


@pytest.mark.parametrize("held_most", [0, fieldsink.HELD_MOST])
def test_a_compressed_series_holds_what_the_run_without_it_finds(
    tmp_path: Path, small: str, compressed: Path, held_most: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "plain.toml").write_text(small)
    plain = job.solve(tmp_path / "plain.toml")
    monkeypatch.setattr(fieldsink, "HELD_MOST", held_most)
    result = job.run(compressed, tmp_path / "out")
    assert_allclose(result.times_s, plain.times_s, rtol=0.0, atol=0.0)
    assert_allclose(
        [result.time_error_K, result.grid_error_K],
        [plain.time_error_K, plain.grid_error_K],
        rtol=1e-12,
        atol=0.0,
    )
    assert result.notes == plain.notes
    assert len(result.temp_degC) == (3 if held_most else 0)
    path = tmp_path / "out" / "fields.vtkhdf"
    node = plain.view.node
    for step in range(3):
        arrays = at(path, step)
        expected = plain.temp_degC[step, node]
        assert_allclose(arrays["temperature_degC"], expected, rtol=0.0, atol=1.0 / 128.0 + 1e-4)
    assert_allclose(arrays["hardness_HV"], plain.hardness_hv[node], rtol=1e-6, atol=0.0)
    names = {entry.name for entry in (tmp_path / "out").iterdir()}
    assert "fields.pvd" not in names
    assert "record.h5" in names


def test_fields_that_went_to_a_file_cannot_be_written_again(
    tmp_path: Path, compressed: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(fieldsink, "HELD_MOST", 0)
    result = job.run(compressed, tmp_path / "out")
    with pytest.raises(InputFault, match="They were written to fields.vtkhdf as they came"):
        write_fields(result, tmp_path)


def test_an_unknown_format_is_refused_with_the_known_ones(call, tmp_path: Path, small: str) -> None:
    (tmp_path / "stud.toml").write_text(small.replace("[output]", '[output]\nformat = "vtkhfd"'))
    answer = call("run", "stud.toml")
    assert answer.code == 2
    assert 'Write "vtkhdf" if that is meant.' in answer.err


def test_a_sink_compares_with_the_nodes_that_the_other_run_has() -> None:
    sink = FieldSink(
        np.array([1.0]),
        against=np.array([[10.0, 20.0], [30.0, 40.0]]),
        share=lambda field: field[:, ::2],
    )
    sink(0.0, np.array([10.5, 99.0, 20.0]))
    sink(1.0, np.array([30.0, 99.0, 37.0]))
    assert_allclose(sink.worst, 3.0, rtol=0.0, atol=0.0)
    assert_allclose(sink.extremes, [[30.0, 99.0]], rtol=0.0, atol=0.0)
    assert sink.wanted is not None
    assert_allclose(sink.wanted, [[30.0, 99.0, 37.0]], rtol=0.0, atol=0.0)


def test_a_large_run_compares_at_fewer_moments() -> None:
    assert compared_moments(200, 10_000) == 200
    assert compared_moments(200, 1_000_000) == 60
    assert compared_moments(200, 100_000_000) == 24
