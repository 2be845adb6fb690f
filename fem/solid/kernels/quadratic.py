"""Shape functions of the 10-node tetrahedron and their gradients at any point of one element."""

from __future__ import annotations

from fem.solid.kernels.jit import kernel


@kernel
def shape_values(L, N):  # type: ignore[no-untyped-def]
    """Values N (10,) of the shape functions at barycentric coordinates L (4,)."""
    for a in range(4):
        N[a] = L[a] * (2.0 * L[a] - 1.0)
    N[4] = 4.0 * L[0] * L[1]
    N[5] = 4.0 * L[1] * L[2]
    N[6] = 4.0 * L[0] * L[2]
    N[7] = 4.0 * L[0] * L[3]
    N[8] = 4.0 * L[1] * L[3]
    N[9] = 4.0 * L[2] * L[3]


@kernel
def barycentric_slopes(points, tets, e, L, curved, J, out):  # type: ignore[no-untyped-def]
    """Gradients (4, 3) of the barycentric coordinates at L (4,); the determinant of the Jacobian J (3, 3)."""
    J[:] = 0.0  # dx_i / dxi_j
    if curved:
        for i in range(3):
            for j in range(4):
                v = (4.0 * L[j] - 1.0) * points[tets[e, j], i]
                # edges 01 12 02 03 13 23
                if j == 0:
                    v += 4.0 * (L[1] * points[tets[e, 4], i] + L[2] * points[tets[e, 6], i]
                                + L[3] * points[tets[e, 7], i])  # fmt: skip
                elif j == 1:
                    v += 4.0 * (L[0] * points[tets[e, 4], i] + L[2] * points[tets[e, 5], i]
                                + L[3] * points[tets[e, 8], i])  # fmt: skip
                elif j == 2:
                    v += 4.0 * (L[1] * points[tets[e, 5], i] + L[0] * points[tets[e, 6], i]
                                + L[3] * points[tets[e, 9], i])  # fmt: skip
                else:
                    v += 4.0 * (L[0] * points[tets[e, 7], i] + L[1] * points[tets[e, 8], i]
                                + L[2] * points[tets[e, 9], i])  # fmt: skip
                if j == 0:
                    for c in range(3):
                        J[i, c] -= v
                else:
                    J[i, j - 1] += v
    else:
        for i in range(3):
            for j in range(3):
                J[i, j] = points[tets[e, j + 1], i] - points[tets[e, 0], i]
    out[1, 0] = J[1, 1] * J[2, 2] - J[1, 2] * J[2, 1]
    out[1, 1] = J[2, 1] * J[0, 2] - J[2, 2] * J[0, 1]
    out[1, 2] = J[0, 1] * J[1, 2] - J[0, 2] * J[1, 1]
    det = J[0, 0] * out[1, 0] + J[1, 0] * out[1, 1] + J[2, 0] * out[1, 2]
    out[2, 0] = J[1, 2] * J[2, 0] - J[1, 0] * J[2, 2]
    out[2, 1] = J[2, 2] * J[0, 0] - J[2, 0] * J[0, 2]
    out[2, 2] = J[0, 2] * J[1, 0] - J[0, 0] * J[1, 2]
    out[3, 0] = J[1, 0] * J[2, 1] - J[1, 1] * J[2, 0]
    out[3, 1] = J[2, 0] * J[0, 1] - J[2, 1] * J[0, 0]
    out[3, 2] = J[0, 0] * J[1, 1] - J[0, 1] * J[1, 0]
    for c in range(3):
        for k in range(1, 4):
            out[k, c] /= det
        out[0, c] = -(out[1, c] + out[2, c] + out[3, c])
    return det


@kernel
def node_slopes(L, slopes, g):  # type: ignore[no-untyped-def]
    """Gradients (10, 3) of the shape functions, from those of the barycentric coordinates."""
    for c in range(3):
        for a in range(4):
            g[a, c] = (4.0 * L[a] - 1.0) * slopes[a, c]
        g[4, c] = 4.0 * (L[0] * slopes[1, c] + L[1] * slopes[0, c])
        g[5, c] = 4.0 * (L[1] * slopes[2, c] + L[2] * slopes[1, c])
        g[6, c] = 4.0 * (L[0] * slopes[2, c] + L[2] * slopes[0, c])
        g[7, c] = 4.0 * (L[0] * slopes[3, c] + L[3] * slopes[0, c])
        g[8, c] = 4.0 * (L[1] * slopes[3, c] + L[3] * slopes[1, c])
        g[9, c] = 4.0 * (L[2] * slopes[3, c] + L[3] * slopes[2, c])
