"""Whether the Python tools are there; prints their versions."""

import meshio
import numpy
from vtkmodules.vtkCommonCore import vtkVersion

print(f"meshio {meshio.__version__}, numpy {numpy.__version__}, VTK {vtkVersion.GetVTKVersion()}")
