"""Writes transverse.json: exact discretisation of the transverse Dryden gust with its gradient filter by the
block-matrix exponential of Van Loan (1978), and the stationary covariance by the Lyapunov equation, with SciPy.

The system is written from the transfer functions, in SciPy's own realisation, and turned into the states
(y, y', e) of the bench by its definition: (y, y') are the states of 1/(1+s)^2, e = sqrt(beta) g with
beta g' = d/dt(y + sqrt(3) y') - g.
Run: /usr/bin/python3 make_transverse.py > transverse.json
"""
import json
import numpy as np
from scipy.linalg import expm, solve_continuous_lyapunov

def system(beta):
    r3 = np.sqrt(3.0)
    A = np.zeros((3, 3))
    A[0, 1] = 1.0
    A[1] = [-1.0, -2.0, 0.0]
    B = np.array([[0.0], [1.0], [0.0]])
    gust = np.array([1.0, r3, 0.0])
    # e' = sqrt(beta) g' = (gust' - g)/sqrt(beta) = (gust A x + gust B w)/sqrt(beta) - e/beta
    A[2] = gust @ A / np.sqrt(beta)
    A[2, 2] = -1.0 / beta
    B[2, 0] = (gust @ B)[0] / np.sqrt(beta)
    return A, B

def van_loan(A, B, h):
    n = A.shape[0]
    M = np.zeros((2 * n, 2 * n))
    M[:n, :n] = -A
    M[:n, n:] = B @ B.T
    M[n:, n:] = A.T
    E = expm(M * h)
    F = E[n:, n:].T
    return F, F @ E[:n, n:]

cases = []
for beta, h in [(0.1, 0.001), (0.1, 0.02), (0.01, 0.01), (0.3, 0.5), (0.9, 2.0), (2.0, 1.0)]:
    A, B = system(beta)
    F, Q = van_loan(A, B, h)
    P = solve_continuous_lyapunov(A, -B @ B.T)
    cases.append({"beta": beta, "h": h, "transition": F.ravel().tolist(), "covariance": Q.ravel().tolist(),
                  "stationary": P.ravel().tolist()})
print(json.dumps({"source": "SciPy, make_transverse.py", "cases": cases}, indent=1))
