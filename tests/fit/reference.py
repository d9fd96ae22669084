"""An independent weighted least squares (numpy, scipy.optimize.least_squares) of one noisy frame.

Writes reference.json: the frame, and the state that agrees best with it. Run: python3 reference.py > reference.json
"""

import json

import numpy as np
from scipy.optimize import least_squares
from scipy.stats import chi2

NOMINAL_KV = 400.0
BUSES = ["Skarn", "Velm", "Mid"]
# name, buses, km, ohm/km, ohm/km, uS/km, A, series capacitor (ohm, at)
CIRCUITS = [
    ("A", (0, 2), 140.0, 0.028, 0.31, 3.7, 1900.0, None),
    ("B", (0, 2), 155.0, 0.030, 0.33, 3.5, 1700.0, (11.0, 0.4)),
    ("C", (2, 1), 120.0, 0.025, 0.30, 3.9, 2100.0, None),
    ("D", (1, 0), 270.0, 0.020, 0.29, 4.1, 2500.0, None),
]
LOAD = {2: 0.0011 - 0.0002j}  # at the station, S


def line(z, y):
    g, zc = np.sqrt(z * y), np.sqrt(z / y)
    return np.array([[np.cosh(g), zc * np.sinh(g)], [np.sinh(g) / zc, np.cosh(g)]])


def admittance(circuit):
    _, _, km, r, x, b, _, bank = circuit
    z, y = (r + 1j * x) * km, 1j * b * 1e-6 * km
    port = line(z, y)
    if bank:
        ohm, at = bank
        port = line(z * at, y * at) @ np.array([[1, -1j * ohm], [0, 1]]) @ line(z * (1 - at), y * (1 - at))
    (a, b_), (_, d) = port
    return np.array([[d / b_, -1 / b_], [-1 / b_, a / b_]])


Y = [admittance(c) for c in CIRCUITS]


def model(x):
    """Every channel's value: kV, degrees, station load, flows."""
    kv, rad = x[:3], np.array([x[3], 0.0, x[4]])
    v = kv * np.exp(1j * rad)
    out = {f"{bus}.kv": kv[i] for i, bus in enumerate(BUSES)}
    out |= {f"{bus}.deg": np.degrees(rad[i] + x[5]) for i, bus in enumerate(BUSES)}
    drawn = 0
    for (name, pair, *_), y in zip(CIRCUITS, Y):
        s = v[list(pair)] * np.conj(y @ v[list(pair)])
        for end, bus, power in zip(("from", "to"), pair, s):
            out[f"{name}.{end}.mw"], out[f"{name}.{end}.mvar"] = power.real, power.imag
            drawn -= power if bus == 2 else 0
    out["Mid.mw"], out["Mid.mvar"] = drawn.real, drawn.imag
    return out


def sigma(name):
    if name.endswith(".kv"):
        return 0.0015 * NOMINAL_KV
    if name.endswith(".deg"):
        return 0.1
    mva = {c[0]: np.sqrt(3) * NOMINAL_KV * c[6] * 1e-3 for c in CIRCUITS}
    return 0.003 * mva.get(name.split(".")[0], max(mva["A"], mva["B"], mva["C"]))


# A true state: terminals given, the station's by its balance.
terminal = np.array([407.0 * np.exp(0.31j), 401.0])
bus_y = np.zeros((3, 3), complex)
for (_, pair, *_), y in zip(CIRCUITS, Y):
    bus_y[np.ix_(pair, pair)] += y
mid = -bus_y[2, :2] @ terminal / (bus_y[2, 2] + LOAD[2])
truth = np.array([407.0, 401.0, abs(mid), 0.31, np.angle(mid), 0.7])

rng = np.random.default_rng(20310314)
frame = {name: value + sigma(name) * rng.standard_normal() for name, value in model(truth).items()}


def residuals(x):
    return [(frame[name] - value) / sigma(name) for name, value in model(x).items()]


fit = least_squares(residuals, truth, x_scale=[400, 400, 400, 1, 1, 1], xtol=1e-15, ftol=1e-15, gtol=1e-15)
dof = len(frame) - len(truth)
print(
    json.dumps(
        {
            "provenance": "tests/fit/reference.py; numpy " + np.__version__ + ", scipy.optimize.least_squares",
            "values": frame,
            "kv": dict(zip(BUSES, fit.x[:3])),
            "deg": {"Skarn": np.degrees(fit.x[3]), "Velm": 0.0, "Mid": np.degrees(fit.x[4])},
            "chi2": 2 * fit.cost,
            "dof": dof,
            "limit": chi2.ppf(0.99, dof),
        },
        indent=1,
    )
)
