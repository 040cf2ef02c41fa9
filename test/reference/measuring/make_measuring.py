"""Fixtures for the measuring tests, by SciPy: periods of the true nonlinear pendulums, a Welch spectrum, a
first-order step fitted by curve_fit, points of Student's t. Writes measuring.json beside this file."""
import json
import os
import numpy as np
from scipy import integrate, optimize, signal, stats

G = 9.80665


def period_of(rhs, amplitude, guess):
    """Time between two passages through rest in the same sense, from the ODE itself."""
    zero = lambda t, y: y[0]
    zero.direction = -1
    run = integrate.solve_ivp(rhs, [0, 2.6 * guess], [amplitude, 0.0], events=zero, rtol=1e-11, atol=1e-13, max_step=guess / 200)
    a, b = run.t_events[0][:2]
    return b - a


def bifilar(I, m, D, L, amplitude):
    # Lagrangian of a bar on two parallel wires: T = (I th'^2 + m z'^2)/2, V = m g (L - h), h = sqrt(L^2 - D^2 sin^2(th/2)),
    # z' = D^2 sin(th) th'/(4 h). Potential as in Jardin & Mueller, AIAA 2007-6822; the heave is kept here as well.
    def rhs(t, y):
        th, w = y
        h = np.sqrt(L**2 - D**2 * np.sin(th / 2) ** 2)
        a = D**2 * np.sin(th) / (4 * h)
        eps = 1e-6
        def slope(x):
            hx = np.sqrt(L**2 - D**2 * np.sin(x / 2) ** 2)
            return D**2 * np.sin(x) / (4 * hx)
        da = (slope(th + eps) - slope(th - eps)) / (2 * eps)
        return [w, (-m * G * a - m * a * da * w**2) / (I + m * a**2)]
    guess = 4 * np.pi / D * np.sqrt(I * L / (m * G))
    return period_of(rhs, amplitude, guess)


def compound(I, m, d, amplitude):
    J = I + m * d**2
    return period_of(lambda t, y: [y[1], -m * G * d * np.sin(y[0]) / J], amplitude, 2 * np.pi * np.sqrt(J / (m * G * d)))


swings = []
for I, m, D, L, deg in [(0.0152, 1.35, 0.3, 1.2, 5), (0.0152, 1.35, 0.3, 1.2, 30), (0.0278, 1.35, 0.4, 0.9, 45), (0.0009, 0.42, 0.12, 0.8, 20)]:
    swings.append(dict(method="bifilar", I=I, m=m, D=D, L=L, amplitude_deg=deg, period_s=bifilar(I, m, D, L, np.radians(deg))))
for I, m, d, deg in [(0.0152, 1.35, 0.2, 3), (0.0152, 1.35, 0.2, 40)]:
    swings.append(dict(method="compound", I=I, m=m, d=d, amplitude_deg=deg, period_s=compound(I, m, d, np.radians(deg))))

# Welch: a sequence by the same congruential generator as NIST SP 1065's test set.
x = [1234567890]
for _ in range(2047):
    x.append((16807 * x[-1]) % 2147483647)
x = np.array(x) / 2147483647
f, p = signal.welch(x, fs=500, window="hann", nperseg=256, noverlap=128, detrend="constant")
welch = dict(rate_Hz=500, segment=256, density=[float(v) for v in p[:40]])

# A step with a fixed disturbance, fitted by curve_fit.
t = np.arange(0, 0.6, 0.002)
true = np.where(t < 0.1042, 200.0, 200 + 350 * (1 - np.exp(-(t - 0.1042) / 0.05)))
y = np.round(true + 6 * (np.resize(x, t.size) - 0.5), 4)
model = lambda t, a, d, tau, t0: np.where(t <= t0, a, a + d * (1 - np.exp(-(t - t0) / tau)))
p, cov = optimize.curve_fit(model, t, y, p0=[200, 350, 0.05, 0.1045], xtol=1e-12, ftol=1e-12)
step = dict(t=[float(v) for v in np.round(t, 4)], y=[float(v) for v in y], lag_s=float(p[2]), lagSigma_s=float(np.sqrt(cov[2, 2])), onset_s=float(p[3]))

student = [[n, float(stats.t.ppf(0.975, n))] for n in (1, 2, 3, 5, 7, 10, 20, 100)]
path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "measuring.json")
json.dump(dict(gravity=G, swings=swings, welch=welch, step=step, student=student), open(path, "w"))
print(swings, step["lag_s"], step["lagSigma_s"], step["onset_s"], student)
