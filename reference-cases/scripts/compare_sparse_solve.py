"""Times general-purpose sparse solvers of SciPy on a linear system of the program, to set its own solve against.

    python compare_sparse_solve.py MATRIX.mtx RHS.mtx [--ours SECONDS] [--tolerance 1e-8] [--iterations 20000]
                                   [--only spsolve|splu|cg ...]

MATRIX: symmetric positive definite, Matrix Market, `coordinate real general` or `coordinate real symmetric`.
RHS: Matrix Market `array real general`, one column or several. Both come from the example export_matrix of the solver,
which also prints its own seconds. It solves for both plates, the file holds the side of one: the ratio then favours SciPy.

  spsolve  scipy.sparse.linalg.spsolve with its defaults (SuperLU, column ordering for general matrices)
  splu     scipy.sparse.linalg.splu, the same factorisation set to suit a symmetric positive definite matrix: ordering of
           A^T + A, pivots on the diagonal; once for all columns
  cg       scipy.sparse.linalg.cg, column by column, with the diagonal as preconditioner (Jacobi), stopped at
           |r| <= tolerance |b| or at the largest number of iterations

One line per method: seconds (set-up included, reading not), iterations summed over the columns, largest relative residual
|b - A x| / |b| recomputed from x, and with --ours the ratio to the seconds of the program. Each method uses one thread.
SuperLU needs memory well above that of the matrix: several GB for 10^5 unknowns in space.
"""
import argparse
import os
import sys
import time

os.environ.setdefault("OMP_NUM_THREADS", "1")
import numpy as np
import scipy.io
import scipy.sparse as sp
import scipy.sparse.linalg as sla


def load(path, sparse):
    try:
        item = scipy.io.mmread(path)
    except (OSError, ValueError) as error:
        sys.exit(f"{path} cannot be read as Matrix Market: {error}")
    if sp.issparse(item) != sparse:
        found, expected = ("an array", "coordinates") if sparse else ("coordinates", "an array")
        sys.exit(f"{path} holds {found}, expected {expected}")
    return item


def read(matrix, rhs):
    A, b = sp.csc_array(load(matrix, True)), np.asarray(load(rhs, False), float)
    if A.shape[0] != A.shape[1] or b.shape[0] != A.shape[0]:
        sys.exit(f"the matrix is {A.shape[0]} x {A.shape[1]}, the right-hand side has {b.shape[0]} rows: they must agree")
    skew = abs(A - A.T).max()
    if skew > 1e-12 * abs(A).max():
        sys.exit(f"the matrix is not symmetric: |A - A^T| is up to {skew:.1e}")
    if A.diagonal().min() <= 0:
        sys.exit("the matrix is not positive definite: its diagonal has an element that is not positive")
    return A, b


def spsolve(A, b, args):
    return sla.spsolve(A, b).reshape(b.shape), 0, ""


def splu(A, b, args):
    factors = sla.splu(A, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options=dict(SymmetricMode=True))
    return factors.solve(b), 0, ""


def conjugate_gradient(A, b, args):
    A = sp.csr_array(A)
    scale = 1 / A.diagonal()
    jacobi = sla.LinearOperator(A.shape, matvec=lambda r: scale * r, dtype=float)
    x, count, stopped = np.zeros_like(b), 0, 0

    def tick(_):
        nonlocal count
        count += 1
    for k in range(b.shape[1]):
        x[:, k], flag = sla.cg(A, b[:, k], rtol=args.tolerance, atol=0.0, maxiter=args.iterations, M=jacobi, callback=tick)
        stopped += flag != 0
    return x, count, f"  stopped at the largest number of iterations in {stopped} column(s)" if stopped else ""


METHODS = dict(spsolve=spsolve, splu=splu, cg=conjugate_gradient)


def report(name, method, A, b, args):
    start = time.perf_counter()
    x, iterations, remark = method(A, b, args)
    seconds = time.perf_counter() - start
    residual = np.max(np.linalg.norm(b - A @ x, axis=0) / np.linalg.norm(b, axis=0))
    ratio = f"  {seconds / args.ours:9.1f} x ours" if args.ours else ""
    print(f"{name:8s} {seconds:10.3f} s  {iterations:8d} iterations  residual {residual:8.1e}{ratio}{remark}", flush=True)


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("matrix")
    parser.add_argument("rhs")
    parser.add_argument("--ours", type=float, metavar="SECONDS", help="time of the program for the same system")
    parser.add_argument("--tolerance", type=float, default=1e-8, help="relative residual at which cg stops")
    parser.add_argument("--iterations", type=int, default=20000, help="largest number of iterations of cg per column")
    parser.add_argument("--only", nargs="+", choices=METHODS, default=list(METHODS))
    args = parser.parse_args()
    if args.ours is not None and args.ours <= 0:
        parser.error(f"--ours must be positive, not {args.ours}")
    A, b = read(args.matrix, args.rhs)
    print(f"{A.shape[0]} unknowns, {A.nnz} nonzeros, {b.shape[1]} right-hand side(s)"
          + (f", ours {args.ours:g} s" if args.ours else ""))
    for name in args.only:
        report(name, METHODS[name], A, b, args)


if __name__ == "__main__":
    main()
