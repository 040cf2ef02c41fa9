"""Fixtures from SciPy: Welch spectra, cross spectra and coherence; exact responses to a held command.

Run with a Python that has SciPy (1.10 was used): python3 spectra_and_response.py > spectra_and_response.json
"""
import json
import numpy as np
from scipy import signal

rng = np.random.default_rng(5)
fs, n, nperseg = 200.0, 2048, 256
x = rng.standard_normal(n)
b, a = signal.butter(2, 20, fs=fs)
y = signal.lfilter(b, a, x) + 0.2 * rng.standard_normal(n)
x, y = np.round(x, 6), np.round(y, 6)
args = dict(fs=fs, window=signal.get_window('hann', nperseg), nperseg=nperseg, noverlap=nperseg // 2,
            detrend='constant', scaling='density')
f, pxx = signal.welch(x, **args)
_, pyy = signal.welch(y, **args)
_, pxy = signal.csd(x, y, **args)
args.pop('scaling')
_, cxy = signal.coherence(x, y, **args)

# Held command, delay a whole number of ticks: cont2discrete with a zero-order hold is exact.
T, K, tau, lag_ticks = 0.0025, 18.0, 0.045, 3
u = np.round(np.cumsum(rng.standard_normal(300)) * 4, 3)
cases = []
for lead, damping in [(0.0, 0.0), (0.0, 3.0), (0.17, 0.0), (0.1, 2.0)]:
    delayed = np.concatenate([np.full(lag_ticks, u[0]), u])[:len(u)]
    # States: rate and lagged command. The program starts at rest with the lag already at the first command.
    out = []
    rate, acc = 0.0, delayed[0]
    aa = np.array([[-damping, 1.0], [0.0, -1.0 / tau]])
    bb = np.array([[0.0], [1.0 / tau]])
    d2 = signal.cont2discrete((aa, bb, np.eye(2), np.zeros((2, 1))), T)
    s = np.array([[rate], [acc]])
    for k in range(len(u)):
        value = s[0, 0] + lead * (s[1, 0] - damping * s[0, 0])
        out.append(K * value)
        s = d2[0] @ s + d2[1] * delayed[k]
    cases.append(dict(lead_s=lead, damping_per_s=damping, rate_dps=[float('%.9g' % v) for v in out]))

print(json.dumps(dict(
    fs=fs, nperseg=nperseg, x=x.tolist(), y=y.tolist(), f=f.tolist(), pxx=pxx.tolist(), pyy=pyy.tolist(),
    pxyRe=pxy.real.tolist(), pxyIm=pxy.imag.tolist(), coherence=cxy.tolist(),
    plant=dict(T=T, K=K, tau=tau, delay_ticks=lag_ticks, u=u.tolist(), cases=cases))))
