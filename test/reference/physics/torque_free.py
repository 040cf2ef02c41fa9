"""Torque-free rotation of an asymmetric body, exact, by Jacobi elliptic functions (Landau & Lifshitz,
Mechanics, section 37), evaluated with SciPy. Writes torque_free.json beside it."""
import json
import os
import numpy as np
from scipy.special import ellipj, ellipk

I1, I2, I3 = 0.010, 0.017, 0.024  # kg m2, smallest to largest
w1, w3 = 0.9, 3.1  # rad/s at t = 0 with w2 = 0: M2 > 2 E I2, rotation about the largest axis
E2 = I1 * w1**2 + I3 * w3**2
M2 = (I1 * w1) ** 2 + (I3 * w3) ** 2
assert M2 > E2 * I2
k2 = (I2 - I1) * (E2 * I3 - M2) / ((I3 - I2) * (M2 - E2 * I1))
rate = np.sqrt((I3 - I2) * (M2 - E2 * I1) / (I1 * I2 * I3))
a1 = np.sqrt((E2 * I3 - M2) / (I1 * (I3 - I1)))
a2 = np.sqrt((E2 * I3 - M2) / (I2 * (I3 - I2)))
a3 = np.sqrt((M2 - E2 * I1) / (I3 * (I3 - I1)))
rows = []
for t in np.linspace(0, 10, 41):
    sn, cn, dn, _ = ellipj(rate * t, k2)
    rows.append([t, a1 * cn, a2 * sn, a3 * dn])
out = dict(I=[I1, I2, I3], start=[w1, 0.0, w3], period_s=4 * ellipk(k2) / rate, rows=rows)
path = os.path.join(os.path.dirname(os.path.abspath(__file__)), "torque_free.json")
json.dump(out, open(path, "w"))
print(rows[0], rows[-1])
