"""Pixels of an off-screen plotter: rendered once, or in tiles where a picture is larger than the graphics memory bears."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Pixels = NDArray[np.uint8]

PEELS = 4  # translucent surfaces told apart behind each other; each costs a rendering, and a fifth one is not seen
TILE = 2100  # pixels; smoothing renders each sixteenfold


def smooth(plotter: Any) -> None:
    """Let translucent surfaces lie in order and edges be smooth; depth peeling needs supersampling, not multisampling."""
    plotter.enable_depth_peeling(PEELS)
    plotter.enable_anti_aliasing("ssaa")


def picture(plotter: Any) -> Pixels:
    """Return the pixels (H, W, 3) of one rendering, from the top down; the plotter's own way renders twice."""
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkRenderingCore import vtkWindowToImageFilter

    plotter.render_window.Render()
    reader = vtkWindowToImageFilter()
    reader.SetInput(plotter.render_window)
    reader.ReadFrontBufferOff()
    reader.ShouldRerenderOff()
    reader.Update()
    output = reader.GetOutput()
    width, height, _ = output.GetDimensions()
    pixels = vtk_to_numpy(output.GetPointData().GetScalars())
    return np.asarray(pixels.reshape(height, width, -1)[::-1, :, :3]).copy()


def tiles_of(size: tuple[int, int]) -> tuple[int, tuple[int, int]]:
    """Return into how many tiles a side a picture of that size is cut, and the size of a tile, pixels.

    >>> tiles_of((4000, 2801))
    (2, (2000, 1401))
    """
    count = -(-max(size) // TILE)
    return count, (-(-size[0] // count), -(-size[1] // count))


def mosaic(plotter: Any, size: tuple[int, int]) -> Pixels:
    """Return the pixels (H, W, 3) of a picture of that size from a plotter whose window has the size of a tile.

    The camera, in parallel projection, is moved to each tile and put back; it must be aimed with the aspect of the size.
    """
    count, (wide, high) = tiles_of(size)
    camera, whole = plotter.camera, np.empty((high * count, wide * count, 3), np.uint8)
    scale = camera.parallel_scale
    try:
        camera.parallel_scale = scale / count * (high * count / size[1])
        for i in range(count):
            for j in range(count):
                camera.SetWindowCenter(2 * i + 1 - count, 2 * j + 1 - count)
                top = (count - 1 - j) * high
                whole[top : top + high, i * wide : (i + 1) * wide] = picture(plotter)
    finally:
        camera.SetWindowCenter(0.0, 0.0)
        camera.parallel_scale = scale
    left, top = (wide * count - size[0]) // 2, (high * count - size[1]) // 2
    return whole[top : top + size[1], left : left + size[0]]


def projector(plotter: Any, size: tuple[float, float]) -> Callable[[Floats], Floats]:
    """Return a function from places (N, 3) to places (N, 2) in a picture of that size, from its lower left, as the camera stands."""
    matrix = plotter.camera.GetCompositeProjectionTransformMatrix(size[0] / size[1], -1, 1)
    m = np.array([[matrix.GetElement(i, j) for j in range(4)] for i in range(4)])

    def project(places: Floats) -> Floats:
        homogeneous = np.concatenate([np.atleast_2d(places), np.ones((len(np.atleast_2d(places)), 1))], 1) @ m.T
        return (homogeneous[:, :2] / homogeneous[:, 3:] + 1) / 2 * size

    return project
