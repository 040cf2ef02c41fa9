"""Margins, poles, Ms, step metrics and noise of discrete rate loops, independent of the program: plant by SciPy
matrix exponentials, frequency response factor by factor (numpy.linalg.solve), margins on a dense frequency grid
with root finding, poles by numpy.roots of the loop's polynomial at 250 to 1000 Hz and by the simulated decay
above, where polynomials in z lose their digits; step and noise by running the difference equations.
Writes loops.json beside it. Needs numpy and scipy."""
import json
import os
import numpy as np
from scipy.linalg import expm
from scipy.optimize import brentq, minimize_scalar

rng = np.random.default_rng(20)


def plant_poly(K, tau, Td, T):
    m = int(np.floor(Td / T + 1e-9))
    d = max(0.0, Td - m * T)
    if tau > 0:
        A = np.array([[0, 1.0], [0, -1 / tau]])
        B = np.array([[0], [K / tau]])
        C = np.array([[1.0, 0]])
    else:
        A, B, C = np.array([[0.0]]), np.array([[K]]), np.array([[1.0]])
    n = len(A)

    def phi_gamma(t):
        M = np.zeros((n + 1, n + 1))
        M[:n, :n] = A
        M[:n, n:] = B
        E = expm(M * t)
        return E[:n, :n], E[:n, n:]

    P1, G0 = phi_gamma(T - d)
    P2, Ge = phi_gamma(d)
    P, G1 = P1 @ P2, P1 @ Ge
    den = np.poly(P)

    def num(G):
        # C adj(zI-P) G from det(zI - P + G C) - det(zI - P)
        return np.poly(P - G @ C) - den

    N = np.polyadd(np.polymul(num(G0), [1, 0]), num(G1))
    D = np.polymul(den, [1] + [0] * (m + 1))
    return N, D


def first_order(fc, fs):
    a = 1 - np.exp(-2 * np.pi * fc / fs)
    return np.array([a, 0]), np.array([1, -(1 - a)])


def biquad(fc, fs, q, kind):
    w = 2 * np.pi * fc / fs
    al = np.sin(w) / (2 * q)
    c = np.cos(w)
    if kind == "lp":
        b = np.array([(1 - c) / 2, 1 - c, (1 - c) / 2])
    else:
        b = np.array([1, -2 * c, 1])
    a = np.array([1 + al, -2 * c, 1 - al])
    return b / a[0], a / a[0]


def loop(case):
    fs = case["loop_Hz"]
    T = 1 / fs
    N, D = plant_poly(case["K"], case["tau"], case["Td"], T)
    fN, fD = np.array([1.0]), np.array([1.0])
    if case["gyro"]:
        b, a = first_order(case["gyro"], fs)
        fN, fD = np.polymul(fN, b), np.polymul(fD, a)
    for c, q in case["notches"]:
        b, a = biquad(c, fs, q, "notch")
        fN, fD = np.polymul(fN, b), np.polymul(fD, a)
    # controller P + I T/2 (z+1)/(z-1) + D (z-1)/(zT) LP
    dN, dD = np.array([1.0, -1]) * case["d"] / T, np.array([1.0, 0])
    if case["dcut"]:
        b, a = biquad(case["dcut"], fs, np.sqrt(0.5), "lp") if case["dkind"] == "biquad" else first_order(case["dcut"], fs)
        dN, dD = np.polymul(dN, b), np.polymul(dD, a)
    pi_N, pi_D = np.array([case["p"] + case["i"] * T / 2, -case["p"] + case["i"] * T / 2]), np.array([1.0, -1])
    if case["i"] == 0:
        pi_N, pi_D = np.array([case["p"]]), np.array([1.0])
    if case["d"] == 0:
        cN, cD = pi_N, pi_D
    else:
        cN = np.polyadd(np.polymul(pi_N, dD), np.polymul(dN, pi_D))
        cD = np.polymul(pi_D, dD)
    LN = np.polymul(np.polymul(N, fN), cN)
    LD = np.polymul(np.polymul(D, fD), cD)
    # forward path of the setpoint, derivative on measurement: P b + I (b = 1)
    rN, rD = pi_N, pi_D
    return N, D, fN, fD, cN, cD, LN, LD, rN, rD, T


def response(case, w):
    """L at w (array), each factor by itself."""
    fs = case["loop_Hz"]
    T = 1 / fs
    z = np.exp(1j * np.atleast_1d(w) * T)
    A, G0, G1, m = sampled(case, T)
    n = len(A)
    lhs = z[:, None, None] * np.eye(n) - A
    rhs = G0[None] + G1[None] / z[:, None, None]
    G = np.linalg.solve(lhs, rhs)[:, 0, 0] / z**m
    F = np.ones_like(z)
    if case["gyro"]:
        a = 1 - np.exp(-2 * np.pi * case["gyro"] * T)
        F = F * a / (1 - (1 - a) / z)
    for c, q in case["notches"]:
        b, a = biquad(c, fs, q, "notch")
        F = F * np.polyval(b, z) / np.polyval(a, z)
    D = case["d"] / T * (1 - 1 / z)
    if case["dcut"]:
        if case["dkind"] == "biquad":
            b, a = biquad(case["dcut"], fs, np.sqrt(0.5), "lp")
            D = D * np.polyval(b, z) / np.polyval(a, z)
        else:
            a = 1 - np.exp(-2 * np.pi * case["dcut"] * T)
            D = D * a / (1 - (1 - a) / z)
    I = case["i"] * T / 2 * (z + 1) / (z - 1)
    return G * F * (case["p"] + I + D)


def sampled(case, T):
    K, tau, Td = case["K"], case["tau"], case["Td"]
    m = int(np.floor(Td / T + 1e-9))
    d = max(0.0, Td - m * T)
    if tau > 0:
        A, B = np.array([[0, 1.0], [0, -1 / tau]]), np.array([[0], [K / tau]])
    else:
        A, B = np.array([[0.0]]), np.array([[K]])
    n = len(A)

    def phi_gamma(t):
        M = np.zeros((n + 1, n + 1))
        M[:n, :n], M[:n, n:] = A, B
        E = expm(M * t)
        return E[:n, :n], E[:n, n:]

    P1, G0 = phi_gamma(T - d)
    P2, Ge = phi_gamma(d)
    return P1 @ P2, G0, P1 @ Ge, m


def simulate(case, count, sp, noise_at_0):
    """Plant output and command, tick by tick, from rest."""
    fs = case["loop_Hz"]
    T = 1 / fs
    A, G0, G1, m = sampled(case, T)
    A, G0, G1 = A.tolist(), G0[:, 0].tolist(), G1[:, 0].tolist()
    n = len(A)
    x = [0.0] * n
    past = [0.0] * (m + 2)
    filters = []
    if case["gyro"]:
        a = 1 - np.exp(-2 * np.pi * case["gyro"] * T)
        filters.append(([a, 0, 0], [1, a - 1, 0]))
    for c, q in case["notches"]:
        b, a = biquad(c, fs, q, "notch")
        filters.append((b.tolist(), a.tolist()))
    dfilters = []
    if case["dcut"]:
        if case["dkind"] == "biquad":
            b, a = biquad(case["dcut"], fs, np.sqrt(0.5), "lp")
            dfilters.append((b.tolist(), a.tolist()))
        else:
            a = 1 - np.exp(-2 * np.pi * case["dcut"] * T)
            dfilters.append(([a, 0, 0], [1, a - 1, 0]))
    fm = [[0.0, 0.0] for _ in filters]
    dm = [[0.0, 0.0] for _ in dfilters]

    def run(fl, mem, v):
        for (b, a), q in zip(fl, mem):
            y = b[0] * v + q[0]
            q[0] = b[1] * v - a[1] * y + q[1]
            q[1] = b[2] * v - a[2] * y
            v = y
        return v

    integral, last_e, last_y = 0.0, 0.0, 0.0
    ys, us = np.zeros(count), np.zeros(count)
    p, i, d = case["p"], case["i"], case["d"]
    for k in range(count):
        y = x[0]
        ym = run(filters, fm, y + (noise_at_0 if k == 0 else 0.0))
        e = sp - ym
        integral += i * T / 2 * (e + last_e)
        u = p * e + integral + run(dfilters, dm, d * (last_y - ym) / T)
        last_e, last_y = e, ym
        past = [u] + past[:-1]
        x = [sum(A[r][c] * x[c] for c in range(n)) + G0[r] * past[m] + G1[r] * past[m + 1] for r in range(n)]
        ys[k], us[k] = y, u
    return ys, us


def analyse(case):
    N, D, fN, fD, cN, cD, LN, LD, rN, rD, T = loop(case)
    L = lambda w: response(case, w)[0]
    out = {}
    exact = case["loop_Hz"] <= 1000
    radius = float(np.max(np.abs(np.roots(np.polyadd(LN, LD)))))
    out.update(radius=radius if exact else None, stable=bool(radius < 1 - 1e-9))
    top = np.pi / T
    w = np.unique(np.concatenate([np.geomspace(top * 3e-5, top * 0.999999, 30000), np.linspace(top * 1e-3, top * 0.999999, 30000)]))
    v = response(case, w)
    mag = np.abs(v)
    idx = np.where((mag[:-1] - 1) * (mag[1:] - 1) < 0)[0]
    crossings = [brentq(lambda x: abs(L(x)) - 1, w[k], w[k + 1], xtol=1e-13 * w[k]) for k in idx]
    pms = [((np.degrees(np.angle(L(x))) + 180 + 180) % 360) - 180 for x in crossings]
    dms = [1000 * ((np.angle(L(x)) + np.pi) % (2 * np.pi)) / x for x in crossings]
    if crossings:
        best = int(np.argmin(np.abs(pms)))
        out.update(pm=float(pms[best]), wc=float(crossings[best]), dm=float(min(dms)))
    im = v.imag
    kk = np.where((im[:-1] * im[1:] < 0) & (v.real[:-1] < 0) & (v.real[1:] < 0))[0]
    factors = [-1 / L(brentq(lambda x: L(x).imag, w[k], w[k + 1], xtol=1e-13 * w[k])).real for k in kk]
    end = L(top).real
    if end < 0:
        factors.append(-1 / end)
    up = [f for f in factors if f > 1]
    down = [f for f in factors if f <= 1]
    out["gm_dB"] = float(20 * np.log10(min(up))) if up else None
    out["gr_dB"] = float(20 * np.log10(max(down))) if down else None
    s = 1 / np.abs(1 + v)
    k = int(np.argmax(s))
    r = minimize_scalar(lambda x: -1 / abs(1 + L(x)), bounds=(w[max(0, k - 1)], w[min(len(w) - 1, k + 1)]), method="bounded", options=dict(xatol=1e-12 * w[k]))
    out["ms"] = float(max(-r.fun, s[k]))
    if out["stable"]:
        count = int(min(60000, max(200, 9 / -np.log(radius) + 40)))
        y, _ = simulate(case, count, 1.0, 0.0)
        t = np.arange(count) * T
        def at(level):
            k = int(np.argmax(y >= level))
            return t[k - 1] + (level - y[k - 1]) / (y[k] - y[k - 1]) * T
        out["rise"] = float(at(0.9) - at(0.1))
        out["overshoot"] = float(max(0, (y.max() - 1) * 100))
        outside = np.where(np.abs(y - 1) > 0.02)[0]
        k = int(outside[-1])
        edge = 1.02 if y[k] > 1 else 0.98
        out["settle"] = float(t[k] + (edge - y[k]) / (y[k + 1] - y[k]) * T) if k + 1 < count else None
        _, u = simulate(case, count, 0.0, 1.0)
        out["noise"] = float(np.sqrt(np.sum(u**2)) * case["noise"] * np.sqrt(fs_half(case)))
    return out


def fs_half(case):
    return case["loop_Hz"] / 2


if __name__ == "__main__":
    cases = []
    for fs in [250, 400, 500, 1000, 2000, 4000, 8000]:
        for k in range(10):
            tau = float(rng.choice([0, 0.008, 0.015, 0.03, 0.06]))
            K = float(np.exp(rng.uniform(np.log(5), np.log(300))))
            Td = float(rng.choice([0, 0.0003, 0.001, 0.0025, 0.004, 0.011]))
            wc = float(np.exp(rng.uniform(np.log(10), np.log(90))))
            p = wc / K
            case = dict(
                loop_Hz=fs, K=K, tau=tau, Td=Td, p=p,
                i=float(rng.choice([0.0, 0.6, 2.5, 8.0])) * p,
                d=float(rng.choice([0.0, 0.4, 0.9])) * p * max(tau, 0.005),
                dcut=float(rng.choice([0, 40, 90])), dkind=str(rng.choice(["first-order", "biquad"])),
                gyro=float(rng.choice([0, 60, 110])),
                notches=[[float(fs * 0.17), 3.0]] if rng.uniform() < 0.3 else [],
                noise=0.01,
            )
            if k == 8:
                case.update(p=p * 12, d=0.0)  # far too much gain
            if k == 9:
                case.update(i=60 * p, tau=0.03, d=p * 0.04, dcut=0.0, Td=0.0005)  # much integral: conditionally stable
            cases.append(case)
    for case in cases:
        case["expected"] = analyse(case)
    path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "loops.json")
    json.dump(cases, open(path, "w"))
    st = sum(c["expected"]["stable"] for c in cases)
    cond = sum(1 for c in cases if c["expected"]["stable"] and c["expected"]["gr_dB"] is not None)
    print(len(cases), "loops", st, "stable", cond, "conditionally")
