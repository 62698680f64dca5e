#!/usr/bin/env python3
"""The plate of plate.toml by general libraries: triangle, scikit-fem, a sparse direct solver, matplotlib.

Same physics as the sheet: each cell's can is one potential, its disc of metal is fed through an even conductance per area
1 / (joint resistance * disc area), the current of each can is given, the right edge is at zero. The loss (metal and joints) is
that of the discrete potential. The mesh is uniform but for the angle bound. Prints one JSON object.

    python peer.py --area 0.6 [--picture out.png] [--angle 28]
"""
import time

started = time.perf_counter()
import argparse
import json
import resource

import numpy as np
import scipy.sparse as sp
import triangle
from scipy.sparse.linalg import splu
from skfem import Basis, BilinearForm, ElementTriP1, MeshTri
from skfem.helpers import dot, grad

WIDTH, HEIGHT = 240.0, 80.0  # mm
SLOTS = [(90.0, 28.0, 150.0, 32.0), (90.0, 48.0, 150.0, 52.0)]
DISCS = [(12.0 + 24.0 * i, y) for y in (15.0, 65.0) for i in range(10)]
RADIUS, CORNERS = 2.0, 48
THICKNESS, CONDUCTIVITY = 0.2, 58e3  # mm, S/mm
JOINT_OHM, CURRENT_A = 0.05e-3, 1.0
LARGE = 100_000  # unknowns; below, the solver that comes with scipy is as quick


def outline():
    points, segments = [], []

    def ring(corners):
        first, count = len(points), len(corners)
        points.extend(corners)
        segments.extend((first + i, first + (i + 1) % count) for i in range(count))

    ring([(0, 0), (WIDTH, 0), (WIDTH, HEIGHT), (0, HEIGHT)])
    for a, b, c, d in SLOTS:
        ring([(a, b), (c, b), (c, d), (a, d)])
    step = 2 * np.pi / CORNERS
    radius = RADIUS * np.sqrt(step / np.sin(step))  # a polygon of the disc's area
    angle = step * np.arange(CORNERS)
    for x, y in DISCS:
        ring(list(zip(x + radius * np.cos(angle), y + radius * np.sin(angle))))
    return {
        "vertices": np.array(points, float),
        "segments": np.array(segments),
        "holes": np.array([((a + c) / 2, (b + d) / 2) for a, b, c, d in SLOTS]),
        "regions": np.array([[1.0, 1.0, 0, 0]] + [[x, y, k + 1, 0] for k, (x, y) in enumerate(DISCS)]),
    }


def solved(matrix, right):
    """A symmetric positive definite system by the quickest of the usual solvers for its size."""
    if matrix.shape[0] > LARGE:
        try:
            import pypardiso
        except ImportError:
            pass
        else:
            solver = pypardiso.PyPardisoSolver(mtype=2)
            x = solver.solve(sp.triu(matrix, format="csr"), right)
            solver.free_memory(everything=True)
            return x, "pardiso"
    options = {"SymmetricMode": True, "DiagPivotThresh": 0.0}
    return splu(matrix.tocsc(), permc_spec="MMD_AT_PLUS_A", options=options).solve(right), "superlu"


def run(area, angle, picture):
    seconds, now = {}, time.perf_counter

    start = now()
    mesh_data = triangle.triangulate(outline(), f"pq{angle:g}Aa{area:.8f}")
    points, triangles = mesh_data["vertices"], mesh_data["triangles"]
    region = mesh_data["triangle_attributes"].ravel().astype(int)
    seconds["mesh"] = now() - start

    start = now()
    mesh = MeshTri(np.ascontiguousarray(points.T), np.ascontiguousarray(triangles.T))
    basis = Basis(mesh, ElementTriP1(), intorder=1)
    metal = BilinearForm(lambda u, v, w: CONDUCTIVITY * THICKNESS * dot(grad(u), grad(v))).assemble(basis)
    per_area = 1.0 / (JOINT_OHM * np.pi * RADIUS**2)
    discs = Basis(mesh, ElementTriP1(), intorder=2, elements=np.flatnonzero(region > 0))
    interface = BilinearForm(lambda u, v, w: per_area * u * v).assemble(discs)
    a, b = points[triangles[:, 1]] - points[triangles[:, 0]], points[triangles[:, 2]] - points[triangles[:, 0]]
    areas = 0.5 * (a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0])
    inside = np.flatnonzero(region > 0)
    parts = np.repeat(per_area * areas[inside] / 3.0, 3)
    to_can = sp.csr_matrix((parts, (triangles[inside].ravel(), np.repeat(region[inside] - 1, 3))), (basis.N, len(DISCS)))
    cans = sp.diags(np.asarray(to_can.sum(axis=0)).ravel())
    matrix = sp.bmat([[metal + interface, -to_can], [-to_can.T, cans]], format="csr")
    free = np.flatnonzero(np.append(np.abs(points[:, 0] - WIDTH) > 1e-9, np.full(len(DISCS), True)))
    right = np.zeros(matrix.shape[0])
    right[basis.N :] = CURRENT_A
    reduced = matrix[free][:, free]
    seconds["assemble"] = now() - start

    start = now()
    potential = np.zeros(matrix.shape[0])
    potential[free], solver = solved(reduced, right[free])
    seconds["solve"] = now() - start

    start = now()
    corners, phi = points[triangles], potential[triangles]
    edges = np.stack([corners[:, 2] - corners[:, 1], corners[:, 0] - corners[:, 2], corners[:, 1] - corners[:, 0]], 1)
    across = (phi * edges[:, :, 1]).sum(1), (phi * edges[:, :, 0]).sum(1)
    density = CONDUCTIVITY * np.hypot(*across) / (2 * areas)
    seconds["density"] = now() - start

    if picture:
        start = now()
        import matplotlib

        matplotlib.use("Agg")
        import matplotlib.pyplot as plt

        seconds["import_drawing"] = now() - start
        start = now()
        figure = plt.figure(figsize=(16, 16 * HEIGHT / WIDTH), dpi=100)
        axes = figure.add_axes([0, 0, 1, 1])
        axes.tripcolor(points[:, 0], points[:, 1], triangles, facecolors=density, vmax=np.quantile(density, 0.999), edgecolors="none")
        axes.set_xlim(0, WIDTH)
        axes.set_ylim(0, HEIGHT)
        axes.axis("off")
        figure.savefig(picture)
        seconds["draw"] = now() - start
    return {
        "triangles": len(triangles),
        "nodes": len(points),
        "solver": solver,
        "loss_w": float(right @ potential),
        "residual": float(np.linalg.norm(reduced @ potential[free] - right[free]) / np.linalg.norm(right)),
        "seconds": seconds,
    }


def main():
    options = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    options.add_argument("--area", type=float, required=True, help="largest area of a triangle, mm2")
    options.add_argument("--angle", type=float, default=28.0, help="least angle, degrees")
    options.add_argument("--picture", help="where the PNG goes; without it nothing is drawn")
    asked = options.parse_args()
    imports = time.perf_counter() - started
    result = run(asked.area, asked.angle, asked.picture)
    result["seconds"]["import"] = imports
    result["peak_mb"] = round(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024)
    print(json.dumps(result))


if __name__ == "__main__":
    main()
