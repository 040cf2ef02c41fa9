"""ADS-33E bandwidth and phase delay, disturbance rejection, levelled-loop margins, poles and attitude step of a few
loops, on dense grids and by the difference equations, independent of the program; plant and filters from loops.py.
Writes closed.json beside it. Needs numpy and scipy."""
import json
import os
import numpy as np
from scipy.optimize import brentq
import loops as ref


def parts(case, w):
    """Plant P, feedback F*C and forward path of the setpoint (P and I; D on measurement) at w."""
    T = 1 / case["loop_Hz"]
    z = np.exp(1j * np.atleast_1d(w) * T)
    A, G0, G1, m = ref.sampled(case, T)
    lhs = z[:, None, None] * np.eye(len(A)) - A
    P = np.linalg.solve(lhs, G0[None] + G1[None] / z[:, None, None])[:, 0, 0] / z**m
    L = ref.response(case, w)
    forward = case["p"] + case["i"] * T / 2 * (z + 1) / (z - 1)
    return z, P, L / P, forward


def unwrapped(v, start):
    ph = np.degrees(np.unwrap(np.angle(v)))
    return ph - 360 * np.round((ph[0] - start) / 360)


def handling(f, low, top, rate):
    w = np.geomspace(low, top, 60000)
    v = f(w)
    ph = unwrapped(v, -90 if rate else 0)
    k = int(np.argmax(ph <= -180))
    near = lambda x, i: np.degrees(np.angle(f(x)[0])) + 360 * np.round((ph[i] - np.degrees(np.angle(f(x)[0]))) / 360)
    w180 = brentq(lambda x: near(x, k) + 180, w[k - 1], w[k])
    j = int(np.argmax(ph <= -135))
    w135 = brentq(lambda x: near(x, j) + 135, w[j - 1], w[j])
    level = abs(f(w180)[0]) * 10 ** (6 / 20)
    below = np.where((w < w180) & (np.abs(v) >= level))[0]
    w6 = brentq(lambda x: abs(f(x)[0]) - level, w[below[-1]], min(w[below[-1] + 1], w180))
    i2 = int(np.searchsorted(w, 2 * w180))
    delay = (-180 - near(2 * w180, i2)) * np.pi / 180 / (2 * w180) if 2 * w180 <= top else None
    bw = min(w135, w6) if rate else w135
    return dict(bandwidth_Hz=bw / 2 / np.pi, phaseDelay_s=delay)


def rejection(L, low, top):
    w = np.geomspace(low, top, 60000)
    s = 1 / np.abs(1 + L(w))
    k = int(np.argmax(s >= np.sqrt(0.5)))
    x = brentq(lambda x: 1 / abs(1 + L(x)[0]) - np.sqrt(0.5), w[k - 1], w[k])
    return dict(bandwidth_Hz=x / 2 / np.pi, peak_dB=float(20 * np.log10(s.max())))


def margins(L, low, top):
    w = np.unique(np.concatenate([np.geomspace(low, top, 40000), np.linspace(low, top, 40000)]))
    v = L(w)
    k = np.where((np.abs(v[:-1]) - 1) * (np.abs(v[1:]) - 1) < 0)[0]
    xs = [brentq(lambda x: abs(L(x)[0]) - 1, w[i], w[i + 1]) for i in k]
    pms = [((np.degrees(np.angle(L(x)[0])) + 360) % 360) - 180 for x in xs]
    kk = np.where((v.imag[:-1] * v.imag[1:] < 0) & (v.real[:-1] < 0) & (v.real[1:] < 0))[0]
    f = [-1 / L(brentq(lambda x: L(x)[0].imag, w[i], w[i + 1]))[0].real for i in kk]
    end = L(top)[0].real
    f += [-1 / end] if end < 0 else []
    up = [g for g in f if g > 1]
    return dict(pm=float(min(pms, key=abs)), gm_dB=float(20 * np.log10(min(up))), ms=float((1 / np.abs(1 + v)).max()))


def levelled_step(case, kappa, count):
    """Attitude after each tick's sample, wanted attitude 1."""
    T = 1 / case["loop_Hz"]
    A, G0, G1, m = ref.sampled(case, T)
    x = np.zeros(len(A))
    past = [0.0] * (m + 2)
    a = 1 - np.exp(-2 * np.pi * case["dcut"] * T)
    att = integral = last_e = last_y = dlp = 0.0
    out = np.zeros(count)
    for k in range(count):
        y = x[0]
        att += T * y
        out[k] = att
        sp = kappa * (1 - att)
        e = sp - y
        integral += case["i"] * T / 2 * (e + last_e)
        dlp += a * (case["d"] * (last_y - y) / T - dlp)
        u = case["p"] * e + integral + dlp
        last_e, last_y = e, y
        past = [u] + past[:-1]
        x = A @ x + G0[:, 0] * past[m] + G1[:, 0] * past[m + 1]
    return out


cases = []
for fs, K, tau, Td, wc, ti, td, cut, kappa in [
    (250, 30, 0.03, 0.004, 22, 2.0, 0.016, 50, 4.0),
    (400, 30, 0.016, 0.0018, 40, 4.0, 0.011, 60, 4.5),
    (500, 60, 0.04, 0.0007, 30, 3.0, 0.02, 90, 6.0),
    (1000, 140, 0.013, 0.0008, 80, 9.0, 0.008, 90, 5.0),
    (2000, 90, 0.02, 0.0031, 45, 5.0, 0.01, 120, 7.0),
    (1000, 140, 0.013, 0.0008, 80, 9.0, 0.008, 90, 30.0),
]:
    p = wc / K
    case = dict(loop_Hz=fs, K=K, tau=tau, Td=Td, p=p, i=ti * p, d=td * p, dcut=cut, dkind="first-order", gyro=0, notches=[])
    T = 1 / fs
    top = np.pi / T
    low = 0.05
    closed = lambda w: (lambda z, P, F, fw: P * fw / (1 + P * F))(*parts(case, w))
    attitude = lambda w: closed(w) / (1j * np.atleast_1d(w))
    outer = lambda w: kappa * T / (1 - np.exp(-1j * np.atleast_1d(w) * T)) * closed(w)
    motors = lambda w: (lambda z, P, F, fw: P * (F + kappa * T * z / (z - 1) * fw))(*parts(case, w))
    step = levelled_step(case, kappa, int(6 * fs))
    settled = bool(abs(step[-1] - 1) < 0.05)
    outside = np.where(np.abs(step - 1) > 0.02)[0]
    expected = dict(
        handling=handling(attitude, low, top, True),
        rejection=rejection(lambda w: ref.response(case, w), low, top),
        motors=margins(motors, low, top),
        attitude=margins(outer, low, top),
        attitudeRejection=rejection(outer, 0.01, top),
        attitudeHandling=handling(lambda w: outer(w) / (1 + outer(w)), low, top, False),
        overshoot_pct=float(max(0, (step.max() - 1) * 100)) if settled else None,
        settled=settled,
        last_outside_s=float(outside[-1] * T) if settled else None,
    )
    cases.append(dict(**case, kappa=kappa, expected=expected))
path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "closed.json")
json.dump(cases, open(path, "w"), indent=1)
for c in cases:
    print(c["loop_Hz"], c["expected"])
