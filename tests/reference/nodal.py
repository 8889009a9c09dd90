"""A small nodal analysis in numpy, used where a deck would be clumsy (peaks, corners, group delay, time constants).

It is itself held against ngspice by nodal_test.py and in every response check.
"""

import numpy as np
import scipy.linalg
import scipy.optimize

from hookup_model import EMF, GROUND

BOLTZMANN = 1.380649e-23  # J/K, exact (SI since 2019)


def _matrices(circuit, extra_nodes=()):
    """Conductance, capacitance and inverse-inductance matrices over the free nodes and, last column, the emf."""
    index = {n: i for i, n in enumerate(list(circuit.nodes))}
    n = len(index)
    index[EMF] = n
    matrices = {k: np.zeros((n + 1, n + 1)) for k in "RCL"}
    for p in circuit.parts:
        value = p.value if p.kind == "C" else 1.0 / p.value
        a, b = index.get(p.a), index.get(p.b)
        m = matrices[p.kind]
        for i, j in ((a, b), (b, a)):
            if i is not None:
                m[i, i] += value
                if j is not None:
                    m[i, j] -= value
    return index, n, matrices


def transfer(circuit, hertz, delay=False):
    """H = V(output)/emf at each frequency; with `delay` also the group delay in seconds, analytic."""
    hertz = np.atleast_1d(np.asarray(hertz, float))
    if circuit.silent or circuit.output == EMF:
        h = np.full(hertz.shape, 0.0 if circuit.silent else 1.0, complex)
        return (h, np.zeros(hertz.shape)) if delay else h
    index, n, m = _matrices(circuit)
    w = 2.0 * np.pi * hertz[:, None, None]
    y = m["R"] + 1j * w * m["C"] + m["L"] / (1j * w)
    v = np.linalg.solve(y[:, :n, :n], -y[:, :n, n:])
    h = v[:, index[circuit.output], 0]
    if not delay:
        return h
    dy = 1j * m["C"] + 1j * m["L"] / w**2
    full = np.concatenate([v, np.ones((len(hertz), 1, 1))], axis=1)
    dv = np.linalg.solve(y[:, :n, :n], -(dy @ full)[:, :n])
    with np.errstate(divide="ignore", invalid="ignore"):  # no signal, no delay
        return h, -np.imag(dv[:, index[circuit.output], 0] / h)


def impedance(circuit, hertz):
    """Looking back into the output with the emf silent."""
    hertz = np.atleast_1d(np.asarray(hertz, float))
    if circuit.silent or circuit.output == EMF:
        return np.zeros(hertz.shape, complex)
    index, n, m = _matrices(circuit)
    w = 2.0 * np.pi * hertz[:, None, None]
    y = (m["R"] + 1j * w * m["C"] + m["L"] / (1j * w))[:, :n, :n]
    unit = np.zeros((n, 1))
    unit[index[circuit.output]] = 1.0
    return np.linalg.solve(y, np.broadcast_to(unit.astype(complex), (len(hertz), n, 1)))[:, index[circuit.output], 0]


def decibel(h):
    with np.errstate(divide="ignore"):
        return 20.0 * np.log10(np.abs(h))


def slowest_seconds(circuit):
    """The longest time constant of the circuit (0 when it has no memory)."""
    index, n, m = _matrices(circuit)
    g, c, l = (m[k][:n, :n] for k in "RCL")
    # Node voltages v and their flux integrals f: C dv/dt = -G v - (1/L) f, df/dt = v.
    # Fluxes are scaled by the microsecond so that both halves are of one size.
    if n == 0:
        return 0.0
    s = 1e-4
    zero, one = np.zeros((n, n)), np.eye(n)
    a = np.block([[-g, -l * s], [one / s, zero]])
    b = np.block([[c, zero], [zero, one]])
    alpha, beta = scipy.linalg.eig(a, b, right=False, homogeneous_eigvals=True)
    with np.errstate(divide="ignore", invalid="ignore"):
        poles = alpha / beta
    poles = poles[np.isfinite(poles) & (np.abs(poles) < 1e12)]
    decaying = poles[poles.real < -1e-3]  # a pole at 0 is a flux loop nobody hears
    return float(1.0 / np.min(-decaying.real)) if decaying.size else 0.0


def mean_power_db(circuit, low, high, points=4001):
    """Mean of |H|^2 over log frequency, dB, by Simpson's rule."""
    from scipy.integrate import simpson
    x = np.linspace(np.log(low), np.log(high), points)
    power = np.abs(transfer(circuit, np.exp(x))) ** 2
    return 10.0 * np.log10(simpson(power, x=x) / (x[-1] - x[0]))


def corner_hz(circuit, drop_db=3.0103, start=1e3, stop=1e6):
    """Lowest frequency above `start` where the level is `drop_db` below that at `start`; None when there is none."""
    goal = decibel(transfer(circuit, start))[0] - drop_db

    def above(hertz):
        return decibel(transfer(circuit, hertz)) - goal

    grid = np.geomspace(start, stop, 6001)
    below = np.flatnonzero(above(grid) <= 0.0)
    if below.size == 0:
        return None
    i = below[0]
    return float(scipy.optimize.brentq(lambda f: above(f)[0], grid[i - 1], grid[i], xtol=1e-9, rtol=1e-13))


def peaks(circuit, low=20.0, high=1e5, points=20001):
    """All local maxima of the level strictly inside (low, high): list of (hertz, dB), highest first."""
    grid = np.geomspace(low, high, points)
    level = decibel(transfer(circuit, grid))
    found = []
    for i in np.flatnonzero((level[1:-1] > level[:-2]) & (level[1:-1] >= level[2:])) + 1:
        # The derivative of ln|H|^2 crosses zero at the peak: better placed than the flat top of the level.
        def slope(f, d=1e-5):
            return float(np.diff(decibel(transfer(circuit, [f * (1 - d), f * (1 + d)])))[0])
        a, b = grid[i - 1], grid[i + 1]
        if slope(a) > 0 > slope(b):
            f = scipy.optimize.brentq(slope, a, b, rtol=1e-10)
        else:
            f = grid[i]
        found.append((float(f), float(decibel(transfer(circuit, f))[0])))
    return sorted(found, key=lambda p: -p[1])


def johnson_volts(circuit, low=20.0, high=20e3, kelvin=293.15, points=6001):
    """Integrated Johnson noise at the output, from 4kT Re Z."""
    from scipy.integrate import simpson
    x = np.linspace(np.log(low), np.log(high), points)
    f = np.exp(x)
    density = 4.0 * BOLTZMANN * kelvin * np.real(impedance(circuit, f))
    return float(np.sqrt(simpson(density * f, x=x)))
