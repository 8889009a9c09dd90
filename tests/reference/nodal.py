"""A small nodal analysis in numpy, used where a deck would be clumsy (peaks, corners, group delay, time constants).

It is itself held against ngspice by nodal_test.py and in every response check.
"""

import numpy as np
import scipy.linalg
import scipy.optimize

from hookup_model import GROUND

BOLTZMANN = 1.380649e-23  # J/K, exact (SI since 2019)


class _System:
    """Conductance, capacitance and inverse-inductance over the free node voltages and, last column, the emf.

    A generator's node follows its other node and the take, an amplifier's follows its control; `voltages` says how every
    node follows the free ones, `currents` which nodes' currents add up to zero (a generator with its other node).
    """

    def __init__(self, circuit):
        names = sorted({n for p in [*circuit.parts, *circuit.generators] for n in (p.a, p.b)} - {GROUND} | {circuit.output})
        self.row = {n: i for i, n in enumerate(names)}
        led = {p.a: (p.b, 1.0, p.value) for p in circuit.generators}
        led |= {p.a: (p.control, p.value, 0.0) for p in circuit.parts if p.kind == "E"}
        free = [n for n in names if n not in led and n != GROUND]
        n = self.unknowns = len(free)
        self.voltages = np.zeros((len(names), n + 1))
        self.currents = np.zeros((n, len(names)))
        for i, name in enumerate(free):
            self.currents[i, self.row[name]] = 1.0
        for p in circuit.generators:
            if p.b in free:
                self.currents[free.index(p.b), self.row[p.a]] = 1.0

        def follow(name):
            """How a node's voltage follows the free ones and the emf."""
            line = np.zeros(n + 1)
            if name in led:
                master, gain, own = led[name]
                line += gain * follow(master)
                line[n] += own
            elif name != GROUND:
                line[free.index(name)] = 1.0
            return line

        for name in names:
            self.voltages[self.row[name]] = follow(name)
        self.full = {k: np.zeros((len(names), len(names))) for k in "RCL"}
        for p in circuit.parts:
            if p.kind == "E":
                continue
            value = p.value if p.kind == "C" else 1.0 / p.value
            a, b = self.row.get(p.a), self.row.get(p.b)
            m = self.full[p.kind]
            for i, j in ((a, b), (b, a)):
                if i is not None:
                    m[i, i] += value
                    if j is not None:
                        m[i, j] -= value
        self.matrices = {k: self.currents @ m @ self.voltages for k, m in self.full.items()}

    def admittance(self, hertz):
        w = 2.0 * np.pi * hertz[:, None, None]
        return self.matrices["R"] + 1j * w * self.matrices["C"] + self.matrices["L"] / (1j * w)


def _system_of(circuit):
    """Made once a circuit: peaks and corners ask for one frequency at a time."""
    if not hasattr(circuit, "system"):
        circuit.system = _System(circuit)
    return circuit.system


def transfer(circuit, hertz, delay=False):
    """H = V(output)/emf at each frequency; with `delay` also the group delay in seconds, analytic."""
    hertz = np.atleast_1d(np.asarray(hertz, float))
    if circuit.silent:
        h = np.zeros(hertz.shape, complex)
        return (h, np.zeros(hertz.shape)) if delay else h
    s = _system_of(circuit)
    n, m = s.unknowns, s.matrices
    y = s.admittance(hertz)
    out = s.voltages[s.row[circuit.output]]
    v = np.linalg.solve(y[:, :, :n], -y[:, :, n:])
    full = np.concatenate([v, np.ones((len(hertz), 1, 1))], axis=1)
    h = (full[:, :, 0] @ out)
    if not delay:
        return h
    w = 2.0 * np.pi * hertz[:, None, None]
    dy = 1j * m["C"] + 1j * m["L"] / w**2
    dv = np.linalg.solve(y[:, :, :n], -(dy @ full))
    with np.errstate(divide="ignore", invalid="ignore"):  # no signal, no delay
        return h, -np.imag(dv[:, :, 0] @ out[:n] / h)


def _from_currents(circuit, hertz):
    """(system, V(output) for one ampere into every node: frequencies by nodes)."""
    s = _system_of(circuit)
    n = s.unknowns
    out = np.broadcast_to(s.voltages[s.row[circuit.output], :n, None].astype(complex), (len(hertz), n, 1))
    z = np.linalg.solve(np.swapaxes(s.admittance(hertz)[:, :, :n], 1, 2), out)[:, :, 0]
    return s, z @ s.currents


def impedance(circuit, hertz):
    """Looking back into the output with the emf silent."""
    hertz = np.atleast_1d(np.asarray(hertz, float))
    if circuit.output == GROUND:
        return np.zeros(hertz.shape, complex)
    s, z = _from_currents(circuit, hertz)
    return z[:, s.row[circuit.output]]


def decibel(h):
    with np.errstate(divide="ignore"):
        return 20.0 * np.log10(np.abs(h))


def slowest_seconds(circuit):
    """The longest time constant of the circuit (0 when it has no memory)."""
    s = _system_of(circuit)
    n = s.unknowns
    g, c, l = (s.matrices[k][:, :n] for k in "RCL")
    # Node voltages v and their flux integrals f: C dv/dt = -G v - (1/L) f, df/dt = v.
    # Fluxes are scaled by the microsecond so that both halves are of one size.
    if n == 0:
        return 0.0
    unit = 1e-4
    zero, one = np.zeros((n, n)), np.eye(n)
    a = np.block([[-g, -l * unit], [one / unit, zero]])
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
    """Integrated Johnson noise at the output: 4kT/R of every resistor through its own way to the output."""
    from scipy.integrate import simpson
    if circuit.output == GROUND:
        return 0.0
    x = np.linspace(np.log(low), np.log(high), points)
    f = np.exp(x)
    s, z = _from_currents(circuit, f)
    z = np.concatenate([z, np.zeros((points, 1))], axis=1)  # last: ground
    density = np.zeros(points)
    for p in circuit.parts:
        if p.kind == "R":
            density += 4.0 * BOLTZMANN * kelvin / p.value * np.abs(z[:, s.row.get(p.a, -1)] - z[:, s.row.get(p.b, -1)]) ** 2
    return float(np.sqrt(simpson(density * f, x=x)))
