"""Read a field file back with VTK and hold it against itself.

    tiltgap draw --what field -o field.vts
    python check_field_file.py field.vts

VTK (package `vtk`) is a general-purpose library; what is checked is that it reads the file, that the grid is sound,
that the field is minus the gradient of the potential as VTK takes it, and that the grid is its own mirror image if it
says so. Prints one line; exit code 1 if something is off.
"""

import sys

import numpy as np
from vtkmodules.util.numpy_support import vtk_to_numpy
from vtkmodules.vtkFiltersGeneral import vtkCellDerivatives
from vtkmodules.vtkFiltersVerdict import vtkCellSizeFilter
from vtkmodules.vtkIOXML import vtkXMLStructuredGridReader

# The gradient of VTK is that at the centre of a cell, the field of the file a mean over its corners: the same where a cell
# is a parallelepiped, as most are. Limit on the median of the relative difference, far above rounding.
AGREEMENT = 1e-6


def main(path):
    reader = vtkXMLStructuredGridReader()
    reader.SetFileName(path)
    reader.Update()
    grid = reader.GetOutput()
    shape = [0, 0, 0]
    grid.GetDimensions(shape)
    assert min(shape) > 1 and grid.GetNumberOfPoints() == np.prod(shape), f"{path}: no grid"
    points = vtk_to_numpy(grid.GetPoints().GetData())
    potential = vtk_to_numpy(grid.GetPointData().GetArray("potential_V"))
    field = vtk_to_numpy(grid.GetCellData().GetArray("field_V_per_m"))
    assert np.isfinite(points).all() and np.isfinite(potential).all() and np.isfinite(field).all()

    sizes = vtkCellSizeFilter()
    sizes.SetInputData(grid)
    sizes.Update()
    volume = vtk_to_numpy(sizes.GetOutput().GetCellData().GetArray("Volume"))
    assert (volume > 0).all(), f"{(volume <= 0).sum()} cells without volume"

    grid.GetPointData().SetActiveScalars("potential_V")
    derivatives = vtkCellDerivatives()
    derivatives.SetInputData(grid)
    derivatives.SetVectorModeToComputeGradient()
    derivatives.SetTensorModeToPassTensors()
    derivatives.Update()
    gradient = vtk_to_numpy(derivatives.GetOutput().GetCellData().GetVectors())
    off = np.linalg.norm(field + gradient, axis=1) / np.linalg.norm(gradient, axis=1)
    assert np.median(off) < AGREEMENT, f"field and gradient differ by {np.median(off):.1e} in the median"

    y = points[:, 1].reshape(shape[::-1])
    if np.allclose(y, -y[:, ::-1, :]):
        v = potential.reshape(shape[::-1])
        assert np.allclose(v, v[:, ::-1, :]), "the potential is not mirrored"
    print(
        f"{path}: {shape[0]} x {shape[1]} x {shape[2]} nodes, potential {potential.min():.6g} to {potential.max():.6g} V, "
        f"strongest field {np.linalg.norm(field, axis=1).max():.4g} V/m, "
        f"median difference from the gradient {np.median(off):.1e}"
    )


if __name__ == "__main__":
    try:
        main(sys.argv[1])
    except (AssertionError, IndexError) as error:
        sys.exit(f"check failed: {error}" if error.args else __doc__)
