"""Mesh files written by other programs, read to the bit; broken ones, refused with a reason."""

import numpy as np
import pytest

from midradius.fem.meshguard import guarded, read_mesh
from midradius.fem.meshinp import element_type, read_inp
from midradius.thermo.errors import InputFault

SQUARE = np.array([[0, 0, 0], [1, 0, 0], [1, 1, 0], [0, 1, 0], [2, 0, 0], [2, 1, 0]], dtype=float)


def the_same(found, points, cells):
    np.testing.assert_array_equal(found.points, points)
    assert [kind for kind, _ in found.cells] == [kind for kind, _ in cells]
    for (_, got), (_, want) in zip(found.cells, cells, strict=True):
        np.testing.assert_array_equal(got, want)


@pytest.fixture(scope="module")
def written_by_gmsh(tmp_path_factory):
    """A plate of two materials by gmsh itself, in each of its formats."""
    gmsh = pytest.importorskip("gmsh")
    folder = tmp_path_factory.mktemp("gmsh")
    gmsh.initialize(interruptible=False)
    try:
        gmsh.option.setNumber("General.Terminal", 0)
        gmsh.model.add("plate")
        box = gmsh.model.occ.addRectangle(0, 0, 0, 2.0, 1.0)
        other = gmsh.model.occ.addRectangle(2.0, 0, 0, 1.0, 1.0)
        gmsh.model.occ.fragment([(2, box)], [(2, other)])
        gmsh.model.occ.synchronize()
        gmsh.model.addPhysicalGroup(2, [1, 2], name="body")
        left = [t for d, t in gmsh.model.getEntities(1) if gmsh.model.getBoundingBox(d, t)[3] < 0.1]
        gmsh.model.addPhysicalGroup(1, left, name="wet face")
        gmsh.option.setNumber("Mesh.MeshSizeMax", 0.4)
        gmsh.model.mesh.generate(2)
        tags, xyz, _ = gmsh.model.mesh.getNodes()
        kinds, _, nodes = gmsh.model.mesh.getElements(2)
        truth = {int(t): p for t, p in zip(tags, xyz.reshape(-1, 3), strict=True)}
        corners = [tuple(row) for row in nodes[0].reshape(-1, 3).astype(int)]
        for version, binary in ((2.2, 0), (2.2, 1), (4.1, 0), (4.1, 1)):
            gmsh.option.setNumber("Mesh.MshFileVersion", version)
            gmsh.option.setNumber("Mesh.Binary", binary)
            gmsh.write(str(folder / f"v{version}-{binary}.msh"))
        gmsh.option.setNumber("Mesh.Binary", 0)
        for suffix in ("bdf", "inp", "vtk", "med"):
            if suffix == "inp":
                gmsh.option.setNumber("Mesh.SaveGroupsOfElements", 1)
            try:
                gmsh.write(str(folder / f"plate.{suffix}"))
            except Exception:  # this build of gmsh lacks the format
                assert suffix == "med"
    finally:
        gmsh.finalize()
    return folder, truth, corners


@pytest.mark.parametrize("name", ["v2.2-0", "v2.2-1", "v4.1-0", "v4.1-1"])
def test_every_msh_that_gmsh_writes_is_read_with_its_groups(written_by_gmsh, name):
    folder, truth, corners = written_by_gmsh
    mesh = read_mesh(folder / f"{name}.msh")
    for number, point in zip(mesh.point_ids, mesh.points, strict=True):
        # gmsh prints 16 digits: the last bit of a text file may differ
        rtol = 0.0 if name.endswith("1") else 1e-15
        np.testing.assert_allclose(point, truth[int(number)], rtol=rtol, atol=0.0)
    triangles = np.concatenate([c for kind, c in mesh.cells if kind == "triangle"])
    ours = {tuple(mesh.point_ids[row]) for row in triangles}
    assert ours == set(corners)
    assert set(mesh.groups) == {"body", "wet face"}
    assert len(mesh.groups["body"].cells) == len(corners)
    rows = np.concatenate([np.full(len(c), k) for k, (_, c) in enumerate(mesh.cells)])
    assert {mesh.cells[k][0] for k in rows[mesh.groups["wet face"].cells]} == {"line"}


def test_a_bulk_data_deck_of_gmsh_without_begin_bulk_is_read(written_by_gmsh):
    folder, truth, corners = written_by_gmsh
    assert "BEGIN BULK" not in (folder / "plate.bdf").read_text()
    mesh = read_mesh(folder / "plate.bdf")
    triangles = np.concatenate([c for kind, c in mesh.cells if kind == "triangle"])
    assert len(triangles) == len(corners)
    for number, point in zip(mesh.point_ids, mesh.points, strict=True):
        # gmsh prints bulk data with few digits
        np.testing.assert_allclose(point, truth[int(number)], rtol=1e-5, atol=1e-6)


def test_a_deck_of_gmsh_is_read_with_its_element_sets(written_by_gmsh):
    folder, truth, corners = written_by_gmsh
    mesh = read_mesh(folder / "plate.inp")
    triangles = np.concatenate([c for kind, c in mesh.cells if kind == "triangle"])
    assert {tuple(mesh.point_ids[row]) for row in triangles} == set(corners)
    assert {"body", "wet_face"} <= set(mesh.groups)  # gmsh itself puts the underscore
    assert len(mesh.groups["body"].cells) == len(corners)


def test_a_legacy_file_of_gmsh_is_read(written_by_gmsh):
    folder, truth, corners = written_by_gmsh
    mesh = read_mesh(folder / "plate.vtk")
    triangles = np.concatenate([c for kind, c in mesh.cells if kind == "triangle"])
    assert len(triangles) == len(corners)


def grid_of_vtk(mixed=True):
    vtk = pytest.importorskip("vtkmodules.all")
    from vtkmodules.util.numpy_support import numpy_to_vtk

    grid = vtk.vtkUnstructuredGrid()
    points = vtk.vtkPoints()
    points.SetDataTypeToDouble()
    x, y, z = np.meshgrid(np.linspace(0, 1, 9), np.linspace(0, 2, 9), [0.0, 0.5, 0.7])
    xyz = np.stack([x.ravel(), y.ravel(), z.ravel()], axis=1)
    points.SetData(numpy_to_vtk(xyz, deep=1))
    grid.SetPoints(points)
    kinds = [(10, 4), (12, 8), (13, 6), (14, 5)] if mixed else [(10, 4)]
    cells = []
    for k in range(60):
        kind, n = kinds[k // 4 % len(kinds)]
        row = np.arange(k, k + n)
        cells.append(row)
        grid.InsertNextCell(kind, n, [int(i) for i in row])
    for owner, count in ((grid.GetPointData(), len(xyz)), (grid.GetCellData(), 60)):
        array = numpy_to_vtk(np.sin(np.arange(count)) * 1e3, deep=1)
        array.SetName("given")
        owner.AddArray(array)
    return vtk, grid, xyz, cells


@pytest.mark.parametrize("mode", ["ascii", "binary", "appended", "raw"])
@pytest.mark.parametrize("packing", ["none", "zlib", "lzma", "lz4"])
def test_every_vtu_that_vtk_writes_is_read_to_the_bit(tmp_path, mode, packing):
    vtk, grid, xyz, cells = grid_of_vtk()
    writer = vtk.vtkXMLUnstructuredGridWriter()
    writer.SetInputData(grid)
    writer.SetFileName(str(tmp_path / "given.vtu"))
    set_mode = {"ascii": "SetDataModeToAscii", "binary": "SetDataModeToBinary"}
    getattr(writer, set_mode.get(mode, "SetDataModeToAppended"))()
    writer.SetEncodeAppendedData(mode == "appended")
    kinds = {"none": 0, "zlib": 1, "lz4": 2, "lzma": 3}
    writer.SetCompressorType(kinds[packing])
    writer.SetBlockSize(1024)
    if mode == "raw":
        writer.SetHeaderTypeToUInt64()
        writer.SetByteOrderToBigEndian()
    writer.Write()
    mesh = read_mesh(tmp_path / "given.vtu")
    np.testing.assert_array_equal(mesh.points, xyz)
    ours = [row for _, block in mesh.cells for row in block]
    assert len(ours) == len(cells)
    assert all(np.array_equal(a, b) for a, b in zip(ours, cells, strict=True))
    given = np.sin(np.arange(len(xyz))) * 1e3
    np.testing.assert_array_equal(mesh.point_data["given"], given)
    np.testing.assert_array_equal(mesh.cell_data["given"], given[:60])


@pytest.mark.parametrize("version", [42, 51])
@pytest.mark.parametrize("text", [True, False])
def test_every_legacy_file_that_vtk_writes_is_read(tmp_path, text, version):
    vtk, grid, xyz, cells = grid_of_vtk()
    writer = vtk.vtkUnstructuredGridWriter()
    writer.SetInputData(grid)
    writer.SetFileVersion(version)
    writer.SetFileName(str(tmp_path / "given.vtk"))
    writer.SetFileTypeToASCII() if text else writer.SetFileTypeToBinary()
    writer.Write()
    mesh = read_mesh(tmp_path / "given.vtk")
    np.testing.assert_allclose(mesh.points, xyz, rtol=1e-5 if text else 0.0, atol=0.0)
    ours = [row for _, block in mesh.cells for row in block]
    assert all(np.array_equal(a, b) for a, b in zip(ours, cells, strict=True))


@pytest.mark.parametrize("flat", [True, False])
@pytest.mark.parametrize("suffix", ["vtu", "vtk"])
def test_pixels_and_voxels_become_quads_and_hexahedra(tmp_path, flat, suffix):
    vtk = pytest.importorskip("vtkmodules.all")
    image = vtk.vtkImageData()
    image.SetDimensions(4, 3, 1 if flat else 3)
    cast = vtk.vtkAppendFilter()
    cast.AddInputData(image)
    cast.Update()
    wide = {"vtu": vtk.vtkXMLUnstructuredGridWriter, "vtk": vtk.vtkUnstructuredGridWriter}[suffix]()
    wide.SetInputData(cast.GetOutput())
    wide.SetFileName(str(tmp_path / f"image.{suffix}"))
    wide.Write()
    mesh = read_mesh(tmp_path / f"image.{suffix}")
    ((kind, cells),) = mesh.cells
    assert (kind, len(cells)) == (("quad", 6) if flat else ("hexahedron", 12))
    sides = np.diff(mesh.points[cells][:, [0, 1, 2, 3, 0]], axis=1)
    np.testing.assert_allclose(np.linalg.norm(sides, axis=2), 1.0, rtol=1e-6, atol=0.0)


HEAT = [
    *(["DC2D3", "DC2D4", "DC2D6", "DC2D8", "DCAX3", "DCAX4", "DCAX6", "DCAX8"]),
    *(["DC3D4", "DC3D5", "DC3D6", "DC3D8", "DC3D10", "DC3D15", "DC3D20"]),
]


@pytest.mark.parametrize("name", [*HEAT, "CAX4", "CAX4R", "CPE8T", "C3D8I", "CPS3", "DCCAX4D"])
def test_heat_transfer_elements_are_cells_with_as_many_nodes(name):
    import re

    from midradius.fem.meshraw import SHAPES, family

    kind = element_type(name)
    number = re.search(r"(?:AX|D|PE|PS)(\d+)[A-Z]*$", name)
    size = int(re.sub(r"\D", "", kind) or SHAPES[family(kind)].n_corner)
    assert size == int(number[1])
    assert SHAPES[family(kind)].dim == (3 if "3D" in name else 2)


DECK = """*Heading
** made by hand
*Node, NSET=all
 10, 0., 0.
 20, 1., 0.
 30, 1., 1.
 40, 0., 1.
 50, 2., 0.
 60, 2., 1.
*Element, type=DC2D4, elset=left part
 7, 10, 20, 30, 40
*Element, TYPE=DCAX3
 8, 20, 50, 60
 9, 20, 60, 30
*Elset, elset=right, generate
 8, 9, 1
*Nset, nset=foot
 10, 20,
 50
*Surface, name=rim, type=ELEMENT
 right, S2
 7, S4
*Material, name=steel
*Conductivity
 30.
"""


def test_a_deck_keeps_numbers_sets_and_surfaces():
    mesh = read_inp(DECK, "deck.inp")
    the_same(
        mesh,
        SQUARE,
        [("quad", [[0, 1, 2, 3]]), ("triangle", [[1, 4, 5], [1, 5, 2]])],
    )
    np.testing.assert_array_equal(mesh.point_ids, [10, 20, 30, 40, 50, 60])
    np.testing.assert_array_equal(mesh.cell_ids, [7, 8, 9])
    np.testing.assert_array_equal(mesh.groups["foot"].points, [0, 1, 4])
    np.testing.assert_array_equal(mesh.groups["right"].cells, [1, 2])
    facets = {tuple(row[row >= 0]) for row in mesh.groups["rim"].facets}
    assert facets == {(4, 5), (5, 2), (3, 0)}


INSTANCES = """*Part, name=block
*Node
 1, 0., 0., 0.
 2, 1., 0., 0.
 3, 0., 1., 0.
*Element, type=DC2D3
 1, 1, 2, 3
*Elset, elset=one
 1
*End Part
*Assembly, name=whole
*Instance, name=a, part=block
*End Instance
*Instance, name=b, part=block
 5., 0., 0.
 5., 0., 0., 5., 0., 1., 90.
*End Instance
*Nset, nset=tip, instance=b
 2
*Elset, elset=_face_S1, instance=b
 1
*Surface, type=ELEMENT, name=face
 _face_S1, S1
*End Assembly
"""


def test_instances_are_moved_and_turned_as_the_deck_says():
    mesh = read_inp(INSTANCES, "deck.inp")
    corners = [[0, 0, 0], [1, 0, 0], [0, 1, 0], [5, 0, 0], [5, 1, 0], [4, 0, 0]]
    np.testing.assert_allclose(mesh.points, corners, rtol=0.0, atol=1e-12)
    np.testing.assert_array_equal(mesh.groups["tip"].points, [4])
    assert {tuple(row[row >= 0]) for row in mesh.groups["face"].facets} == {(3, 4)}
    assert any("instance b moved" in note for note in mesh.notes)


BULK = """SOL 101
CEND
BEGIN BULK
GRID           1             0.0     0.0     0.0
GRID*                  2                           1.5-1             0.0
*                    0.0
GRID,3,,0.15,2.5+1,0.
GRID           4              0.    25.0      0.
CQUAD4        11       5       1       2       3       4
CTRIA3,12,6,1,2,3
ENDDATA
"""


def test_bulk_data_is_read_in_small_wide_and_free_fields(tmp_path):
    (tmp_path / "deck.bdf").write_text(BULK)
    mesh = read_mesh(tmp_path / "deck.bdf")
    points = [[0, 0, 0], [0.15, 0, 0], [0.15, 25.0, 0], [0, 25.0, 0]]
    the_same(mesh, points, [("quad", [[0, 1, 2, 3]]), ("triangle", [[0, 1, 2]])])
    np.testing.assert_array_equal(mesh.groups["property 6"].cells, [1])


def test_an_exodus_file_keeps_blocks_sets_and_side_sets(tmp_path):
    netcdf_file = pytest.importorskip("scipy.io").netcdf_file
    with netcdf_file(tmp_path / "part.exo", "w", version=2) as file:
        for name, size in (
            *(("num_nodes", 6), ("num_el1", 1), ("num_el2", 2), ("four", 4), ("three", 3)),
            *(("len", 33), ("two", 2), ("one", 1)),
        ):
            file.createDimension(name, size)
        for k, axis in enumerate("xy"):
            file.createVariable(f"coord{axis}", "f8", ("num_nodes",))[:] = SQUARE[:, k]
        quad = file.createVariable("connect1", "i4", ("num_el1", "four"))
        quad[:], quad.elem_type = [[1, 2, 3, 4]], "QUAD4"
        tri = file.createVariable("connect2", "i4", ("num_el2", "three"))
        tri[:], tri.elem_type = [[2, 5, 6], [2, 6, 3]], "TRI3"
        names = file.createVariable("eb_names", "c", ("two", "len"))
        names[:] = np.array(
            [list("left".ljust(33, "\0")), list("right".ljust(33, "\0"))], dtype="S1"
        )
        file.createVariable("node_ns1", "i4", ("two",))[:] = [1, 2]
        file.createVariable("elem_ss1", "i4", ("two",))[:] = [1, 2]
        file.createVariable("side_ss1", "i4", ("two",))[:] = [4, 2]
    mesh = read_mesh(tmp_path / "part.exo")
    the_same(mesh, SQUARE, [("quad", [[0, 1, 2, 3]]), ("triangle", [[1, 4, 5], [1, 5, 2]])])
    np.testing.assert_array_equal(mesh.groups["right"].cells, [1, 2])
    np.testing.assert_array_equal(mesh.groups["node set 1"].points, [0, 1])
    sides = {tuple(row[row >= 0]) for row in mesh.groups["side set 1"].facets}
    assert sides == {(3, 0), (4, 5)}


@pytest.mark.parametrize("format", ["xdmf", "med", "exodus", "vtk", "vtu", "nastran", "abaqus"])
def test_what_meshio_writes_is_read_to_the_bit(tmp_path, format):
    meshio = pytest.importorskip("meshio")
    if format == "exodus":
        pytest.importorskip("netCDF4")
    suffix = {"exodus": "exo", "nastran": "bdf", "abaqus": "inp"}.get(format, format)
    cells = [("quad", np.array([[0, 1, 2, 3]])), ("triangle", np.array([[1, 4, 5], [1, 5, 2]]))]
    points = SQUARE * np.sqrt(2.0)
    path = tmp_path / f"mesh.{suffix}"
    meshio.write(path, meshio.Mesh(points, cells), file_format=format)
    mesh = read_mesh(path)
    rtol = 1e-6 if format == "nastran" else 0.0
    np.testing.assert_allclose(mesh.points, points, rtol=rtol, atol=0.0)
    the_same(mesh, mesh.points, cells)


REFUSED = {
    "empty.vtu": b"",
    "broken.vtu": b"<VTKFile type='UnstructuredGrid'><UnstructuredGrid>",
    "poly.vtu": b"<VTKFile type='PolyData'></VTKFile>",
    "ends.msh": b"$MeshFormat\n4.1 0 8\n$EndMeshFormat\n$Nodes\n1 4 1 4\n2 1 0 4\n1\n$EndNodes\n",
    "other.msh": b'(0 "made elsewhere")\n',
    "no_elements.inp": b"*NODE\n1, 0., 0.\n",
    "strange.inp": b"*NODE\n1, 0., 0.\n*ELEMENT, TYPE=XY7\n1, 1\n",
    "missing.inp": b"*NODE\n1, 0., 0.\n*ELEMENT, TYPE=DC2D3\n1, 1, 2, 3\n",
    "include.inp": b"*INCLUDE, INPUT=/etc/passwd\n",
    "input.inp": b"*NODE, INPUT=/etc/passwd\n",
    "local.inp": b"*SYSTEM\n1., 0., 0.\n*NODE\n1, 0., 0.\n",
    "include.bdf": b"BEGIN BULK\nINCLUDE '/etc/passwd'\n",
    "system.bdf": b"GRID           1       7     0.0     0.0     0.0\n",
    "none.e": b"not an exodus file at all",
    "cut.vtk": b"# vtk DataFile Version 5.1\n\nASCII\nDATASET UNSTRUCTURED_GRID\nPOINTS 3 float\n0",
    "bad.xdmf": b"<Xdmf><Domain/></Xdmf>",
    "bad.med": b"\x89HDF nothing",
    "solid.step": b"ISO-10303-21;",
    "shell.stl": b"solid x",
}


@pytest.mark.parametrize("name", REFUSED)
def test_a_broken_file_is_refused_with_one_message_and_no_word_printed(tmp_path, capfd, name):
    path = tmp_path / name
    path.write_bytes(REFUSED[name])
    with pytest.raises(InputFault) as caught:
        read_mesh(path)
    assert name in str(caught.value)
    assert "\n" not in str(caught.value)
    out, err = capfd.readouterr()
    assert (out, err) == ("", "")


def test_a_missing_file_and_a_folder_are_refused(tmp_path):
    with pytest.raises(InputFault, match="There is no such file"):
        read_mesh(tmp_path / "none.msh")
    (tmp_path / "folder.msh").mkdir()
    with pytest.raises(InputFault, match="a folder"):
        read_mesh(tmp_path / "folder.msh")


def test_a_reader_that_ends_the_process_is_stopped(capfd):
    def leave():
        print("trouble here")
        raise SystemExit(1)

    with pytest.raises(InputFault, match="trouble here"):
        guarded(leave, "some.vtk", "VTK")
    assert capfd.readouterr() == ("", "")


def test_lost_cells_are_noticed(tmp_path, monkeypatch):
    meshio = pytest.importorskip("meshio")
    path = tmp_path / "mesh.vtk"
    cells = [("triangle", np.array([[0, 1, 2], [0, 2, 3]]))]
    meshio.write(path, meshio.Mesh(SQUARE, cells), file_format="vtk")

    def loses_one(name):
        return meshio.Mesh(SQUARE, [("triangle", np.array([[0, 1, 2]]))])

    monkeypatch.setitem(meshio._helpers.reader_map, "vtk", loses_one)
    with pytest.raises(InputFault, match="1 of 2 were"):
        read_mesh(path)


def test_a_line_of_second_order_has_its_middle_node_second_in_a_deck(tmp_path):
    # T3D3: ends are the first and the last node
    rows = "".join(f"{k + 1},{x},{y}\n" for k, (x, y) in enumerate([(0, 0), (2, 0), (0, 2)]))
    middles = "4,1.,0.\n5,1.,1.\n6,0.,1.\n"
    deck = f"*NODE\n{rows}{middles}*ELEMENT,TYPE=CPS6\n1,1,2,3,4,5,6\n"
    deck += "*ELEMENT,TYPE=T3D3,ELSET=below\n2,1,4,2\n"
    mesh = read_inp(deck, "deck.inp")
    line = next(block for kind, block in mesh.cells if kind == "line3")
    np.testing.assert_array_equal(mesh.point_ids[line], [[1, 2, 4]])


def test_element_lines_of_another_length_than_their_type_are_refused():
    nodes = "".join(f"{k},{k}.,{k * k}.,0.\n" for k in range(1, 20))
    rows = "".join(
        ", ".join(str(k) for k in (n, *range(1, 16))) + ",\n16, 17, 18\n" for n in range(1, 8)
    )
    with pytest.raises(InputFault) as caught:
        read_inp(f"*NODE\n{nodes}*ELEMENT,TYPE=C3D6\n{rows}", "deck.inp")
    assert str(caught.value) == (
        'mesh file = "deck.inp", but must be a deck whose C3D6 elements have 6 nodes each. '
        "An element line is cut short, has nodes too many, or a number stands twice."
    )


@pytest.fixture(scope="module")
def second_order_of_gmsh(tmp_path_factory):
    """A plate of 9-node quads without groups, in the formats of gmsh."""
    gmsh = pytest.importorskip("gmsh")
    folder = tmp_path_factory.mktemp("quad9")
    gmsh.initialize(interruptible=False)
    try:
        gmsh.option.setNumber("General.Terminal", 0)
        gmsh.model.occ.addRectangle(0, 0, 0, 3.0, 2.0)
        gmsh.model.occ.synchronize()
        for _, tag in gmsh.model.getEntities(1):
            gmsh.model.mesh.setTransfiniteCurve(tag, 5)
        gmsh.model.mesh.setTransfiniteSurface(1)
        gmsh.model.mesh.setRecombine(2, 1)
        gmsh.model.mesh.generate(2)
        gmsh.model.mesh.setOrder(2)
        for suffix in ("bdf", "med", "msh"):
            try:
                gmsh.write(str(folder / f"plate.{suffix}"))
            except Exception:  # this build of gmsh lacks the format
                assert suffix == "med"
    finally:
        gmsh.finalize()
    return folder


@pytest.mark.parametrize("suffix", ["bdf", "med", "msh"])
def test_quads_of_nine_nodes_without_groups_are_read(second_order_of_gmsh, suffix):
    path = second_order_of_gmsh / f"plate.{suffix}"
    if not path.exists():
        pytest.skip("this build of gmsh lacks the format")
    mesh = read_mesh(path)
    quads = np.concatenate([block for kind, block in mesh.cells if kind == "quad9"])
    assert quads.shape == (16, 9)
    corners = mesh.points[quads[:, :4], :2]
    ahead, up = corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1]
    areas = 0.5 * np.abs(ahead[:, 0] * up[:, 1] - ahead[:, 1] * up[:, 0])
    np.testing.assert_allclose(areas.sum(), 6.0, rtol=1e-5, atol=0.0)


def test_a_mixed_topology_of_second_order_is_read_and_meshio_is_left_as_it_was(tmp_path):
    import meshio
    from meshio.xdmf import main

    before = main.translate_mixed_cells
    points = np.array([[0, 0], [2, 0], [2, 2], [0, 2], [1, 0], [2, 1], [1, 2], [0, 1], [1, 1]])
    cells = [("triangle6", [[0, 1, 3, 4, 8, 7]]), ("line3", [[0, 1, 4]])]
    meshio.write(tmp_path / "part.xdmf", meshio.Mesh(np.array(points, dtype=float), cells))
    mesh = read_mesh(tmp_path / "part.xdmf")
    assert [kind for kind, _ in mesh.cells] == ["triangle6", "line3"]
    np.testing.assert_array_equal(mesh.cells[0][1], cells[0][1])
    np.testing.assert_array_equal(mesh.cells[1][1], cells[1][1])
    assert main.translate_mixed_cells is before


def test_a_wedge_of_a_legacy_file_keeps_the_order_of_its_corners(tmp_path):
    points = "0 0 0 1 0 0 0 1 0 0 0 1 1 0 1 0 1 1"
    (tmp_path / "part.vtk").write_text(
        "# vtk DataFile Version 2.0\nwedge\nASCII\nDATASET UNSTRUCTURED_GRID\n"
        f"POINTS 6 double\n{points}\nCELLS 1 7\n6 0 1 2 3 4 5\nCELL_TYPES 1\n13\n"
    )
    np.testing.assert_array_equal(
        read_mesh(tmp_path / "part.vtk").cells[0][1], [[0, 1, 2, 3, 4, 5]]
    )


def test_solid_cells_of_med_run_as_those_of_all_other_formats(tmp_path):
    import meshio

    points = np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1], [1, 1, 1]], dtype=float)
    inward = [("tetra", np.array([[0, 2, 1, 3], [1, 3, 2, 4]]))]  # as MED draws its TE4
    meshio.write(tmp_path / "part.med", meshio.Mesh(points, inward))
    a, b, c, d = (points[column] for column in read_mesh(tmp_path / "part.med").cells[0][1].T)
    six = np.einsum("ij,ij->i", np.cross(b - a, c - a), d - a)
    np.testing.assert_allclose(six, [1.0, 2.0], rtol=1e-12, atol=0.0)
