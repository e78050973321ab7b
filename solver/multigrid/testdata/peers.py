"""The test problems A1 and A2 of campaign_test.go solved by general libraries:

    peers.py superlu|hypre|gamg A1|A2 CELLS DIM

prints one JSON line with the processor seconds of set-up and solution (the
assembly of the matrix is not counted). superlu fixes one unknown; hypre
(BoomerAMG) and gamg precondition GMRES on the singular system in the unknown
A p, started from p = 1/A, to a relative residual of 1e-10, with the constant left
null vector attached. Needs Debian's python3-scipy and python3-petsc4py.
"""
import json, os, sys, time
os.environ.setdefault('OMP_NUM_THREADS', '1')
os.environ.setdefault('OPENBLAS_NUM_THREADS', '1')
import numpy as np, scipy.sparse as sp, scipy.sparse.linalg as sla

solver, case, n, dim = sys.argv[1], sys.argv[2], int(sys.argv[3]), int(sys.argv[4])
swirl = 20.0 if case == 'A2' else 0.0
tau = 2 * np.pi


def speed(x):
    s = np.sin(tau * x[0])
    for y in x[1:]:
        s = s * np.cos(tau * y)
    return 1 + 0.5 * s


def drift(x, axis, v):
    g = np.pi * (np.cos if axis == 0 else np.sin)(tau * x[axis]) * (1 if axis == 0 else -1)
    for d, y in enumerate(x):
        if d != axis:
            g = g * (np.sin if d == 0 else np.cos)(tau * y)
    b = 0.5 * v * g
    if axis == 0:
        b = b + swirl * np.sin(np.pi * x[0]) * np.cos(np.pi * x[1])
    if axis == 1:
        b = b - swirl * np.cos(np.pi * x[0]) * np.sin(np.pi * x[1])
    return b


def bernoulli(z):
    small = np.abs(z) < 1e-4
    safe = np.where(small, 1.0, z)
    return np.where(small, 1 - z / 2 + z * z / 12, safe / np.expm1(safe))


h = 1.0 / n
centre = (np.arange(n) + 0.5) * h
X = np.meshgrid(*[centre] * dim, indexing='ij')
a = speed(X) ** 2
N = n ** dim
index = np.arange(N, dtype=np.int32).reshape((n,) * dim)
rows, cols, vals = [], [], []
diag = np.zeros((n,) * dim)
for axis in range(dim):
    lo = tuple(slice(0, n - 1) if d == axis else slice(None) for d in range(dim))
    hi = tuple(slice(1, n) if d == axis else slice(None) for d in range(dim))
    F = np.meshgrid(*[np.arange(1, n) * h if d == axis else centre for d in range(dim)], indexing='ij')
    v = speed(F)
    z = 2 * drift(F, axis, v) * h / v ** 2
    out = 0.5 * bernoulli(-z) * a[lo]
    back = 0.5 * bernoulli(z) * a[hi]
    diag[lo] += out
    diag[hi] += back
    L, R = index[lo].ravel(), index[hi].ravel()
    rows += [L, R]
    cols += [R, L]
    vals += [-back.ravel(), -out.ravel()]
rows.append(index.ravel()); cols.append(index.ravel()); vals.append(diag.ravel())
M = sp.csr_matrix((np.concatenate(vals), (np.concatenate(rows), np.concatenate(cols))), shape=(N, N))
M.sort_indices()
a = a.ravel()
its = 0
if solver == 'superlu':
    k = N // 2 + n // 2
    keep = np.flatnonzero(np.arange(N) != k)
    Mk, rhs = M[keep][:, keep].tocsc(), -np.asarray(M[keep][:, [k]].todense()).ravel()
    start = time.process_time()
    lu = sla.splu(Mk, permc_spec='MMD_AT_PLUS_A', diag_pivot_thresh=0.0, options=dict(SymmetricMode=True))
    p = np.ones(N)
    p[keep] = lu.solve(rhs)
    seconds = time.process_time() - start
else:
    import petsc4py
    petsc4py.init(['peers'])
    from petsc4py import PETSc
    K = (M @ sp.diags(1 / a)).tocsr()
    K.sort_indices()
    rhs = -(K @ np.ones(N))
    start = time.process_time()
    A = PETSc.Mat().createAIJ(size=K.shape, csr=(K.indptr, K.indices, K.data))
    A.assemble()
    null = PETSc.NullSpace().create(constant=True)
    A.setTransposeNullSpace(null)
    A.setNearNullSpace(null)
    ksp = PETSc.KSP().create()
    ksp.setOperators(A)
    ksp.setType('gmres')
    ksp.setPCSide(PETSc.PC.Side.RIGHT)
    pc = ksp.getPC()
    pc.setType(solver)
    if solver == 'hypre':
        pc.setHYPREType('boomeramg')
        if dim == 3:
            PETSc.Options()['pc_hypre_boomeramg_strong_threshold'] = 0.5
    ksp.setTolerances(rtol=1e-10, max_it=1000)
    ksp.setFromOptions()
    b = PETSc.Vec().createWithArray(rhs)
    x = b.duplicate()
    ksp.solve(b, x)
    seconds = time.process_time() - start
    its = ksp.getIterationNumber()
    p = (1 + x.getArray()) / a
eta = np.linalg.norm(M @ p) / np.linalg.norm(M @ (1 / a)) * (1 / a).sum() / abs(p.sum())
print(json.dumps(dict(solver=solver, case=case, cells=n, dim=dim, seconds=round(seconds, 3), iterations=its, reduction=float(eta))))
