"""Declared studies as text, and their rates with many digits, written from docs/methods.md alone.

`Plan` writes itself as a study file and is worked out by `Reference` with mpmath: species to free
energies at 1 mol/L, steps to rate constants by the Eyring equation and detailed balance, held
species to factors, then linear systems and characteristic polynomials, all derivatives by tiny
differences. Nothing of the package is used but in `Plan.load`. Every number is the double nearest to
what the file says.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from copy import copy
from dataclasses import dataclass, field, replace
from itertools import pairwise
from pathlib import Path
from typing import Any

import mpmath as mp
from ase.data import atomic_masses_iupac2016, atomic_numbers
from ase.data.vdw_alvarez import vdw_radii
from ase.formula import Formula

from thermo_pp.study.load import Study

BOLTZMANN, PLANCK, GAS = mp.mpf(1.380649e-23), mp.mpf(6.62607015e-34), mp.mpf(8.31446261815324)
AVOGADRO, ATOMIC_MASS = mp.mpf(6.02214076e23), mp.mpf(1.66053906892e-27)
DIGITS = 300
Counts = Mapping[str, int]


@dataclass(frozen=True)
class Member:
    """A declared species."""

    composition: str
    enthalpy: float  # kJ/mol
    entropy: float  # J/mol/K
    heat_capacity: float | None = None
    standard_state: str | None = None
    ground: float | None = None  # kJ/mol
    imaginary: float | None = None  # cm^-1

    @property
    def atoms(self) -> dict[str, int]:
        """Return how many of each element there are; a charge at the end is left out."""
        return Formula(self.composition.rstrip("+-")).count()


@dataclass(frozen=True)
class Line:
    """A step: its equation, and the line that says what its rate is."""

    equation: str
    key: str  # through, barrier, rate, arrhenius
    value: Any
    viscosity: Any = None
    tunnelling: str | None = None  # the reference itself knows none

    def sides(self) -> tuple[dict[str, int], dict[str, int]]:
        found = []
        for side in self.equation.split(" = "):
            counts: dict[str, int] = {}
            for term in side.split(" + "):
                number, _, name = term.rpartition(" ")
                counts[name] = counts.get(name, 0) + int(number or 1)
            found.append(counts)
        return found[0], found[1]


@dataclass(frozen=True)
class Plan:
    """A study."""

    species: Mapping[str, Member]
    steps: tuple[Line, ...]
    question: Mapping[str, Any]
    held: Mapping[str, str] = field(default_factory=dict)
    temperatures: tuple[float, ...] = (298.15,)
    standard_state: str = "1 bar"
    phase: str = "gas"
    driven: bool = False
    product_of_one_turn: int = 1  # of all listed products, in the net reaction of a cycle

    def text(self) -> str:
        """Return the study file."""
        lines = [
            'title = "test"',
            f'[treatment]\nstandard_state = "{self.standard_state}"\nphase = "{self.phase}"',
            f"[conditions]\ntemperatures = {list(self.temperatures)}",
            "driven = true" if self.driven else "",
            "[conditions.held]",
            *(f'{_key(name)} = "{value}"' for name, value in self.held.items()),
        ]
        for name, member in self.species.items():
            lines += [
                f"[species.{_key(name)}]",
                f'composition = "{member.composition}"',
                f'enthalpy = "{member.enthalpy!r} kJ/mol"',
                f'entropy = "{member.entropy!r} J/mol/K"',
            ]
            if member.heat_capacity is not None:
                lines.append(f'heat_capacity = "{member.heat_capacity!r} J/mol/K"')
            if member.ground is not None:
                lines.append(f'ground = "{member.ground!r} kJ/mol"')
            if member.imaginary is not None:
                lines.append(f'imaginary_mode = "{member.imaginary!r} cm^-1"')
            if member.standard_state is not None:
                lines.append(f'standard_state = "{member.standard_state}"')
        for step in self.steps:
            lines += ["[[steps]]", f'equation = "{step.equation}"']
            value = f'"{step.value}"' if isinstance(step.value, str) else step.value
            if step.key == "arrhenius":
                factor, power, energy = step.value
                value = f'{{ A = "{factor}", n = {power!r}, E = "{energy!r} kJ/mol" }}'
            lines.append(f"{step.key} = {value}")
            if step.tunnelling is not None:
                lines.append(f'tunnelling = "{step.tunnelling}"')
            if step.viscosity is not None:
                pairs = [[t, f"{eta!r} Pa*s"] for t, eta in step.viscosity]
                lines.append(f"viscosity = {pairs}")
        lines.append("[effective]")
        for key, value in self.question.items():
            lines.append(
                f"{key} = {list(value)}" if isinstance(value, tuple) else f'{key} = "{value}"'
            )
        return "\n".join(lines) + "\n"

    def load(self, folder: Path, **options: Any) -> Study:
        """Load the study from a file in `folder`."""
        file = folder / "study.toml"
        file.write_text(self.text(), encoding="utf-8")
        return Study.load(file, **options)

    def at(self, *temperatures: float) -> Plan:
        """Return the plan at other temperatures."""
        return replace(self, temperatures=temperatures)


def _key(name: str) -> str:
    return f'"{name}"'


Shifts = Mapping[str | int, mp.mpf]
"""By how much G/RT of a species (name) or of a step's effective saddle (0-based number) is moved."""


class Reference:
    """The rates of a plan at one temperature."""

    def __init__(
        self, plan: Plan, temperature: mp.mpf, shifts: Shifts | None = None, digits: int = DIGITS
    ) -> None:
        self.plan, self.digits = plan, digits
        self.catalyst = plan.question.get("catalyst")
        product = plan.question["product"]
        self.products = (product,) if isinstance(product, str) else tuple(product)
        self.start = self.catalyst or plan.question["reactant"]
        with mp.workdps(digits):
            self.temperature = mp.mpf(temperature)
            self.rt = GAS * self.temperature
            self.plains = {name: self._plain(name) for name in plan.species}
            self.unmoved = [self._constants(k) for k in range(len(plan.steps))]
        self._move(shifts or {})

    def moved(self, what: str | int, by: mp.mpf) -> Reference:
        """Return the rates with G/RT of a species, or of a step's effective saddle, moved."""
        other = copy(self)
        other._move({what: by})
        return other

    def _move(self, shifts: Shifts) -> None:
        with mp.workdps(self.digits):
            self.shifts = shifts
            self.held = self._concentrations()
            self.constants = [self._moved_constants(k) for k in range(len(self.plan.steps))]
            self._network()

    # ------------------------------------------------------------------ thermochemistry
    def _plain(self, name: str) -> mp.mpf:
        """G/RT at 1 mol/L, not shifted."""
        member, t = self.plan.species[name], self.temperature
        enthalpy, entropy = mp.mpf(member.enthalpy) * 1000, mp.mpf(member.entropy)
        if member.heat_capacity is not None:
            cp, t0 = mp.mpf(member.heat_capacity), mp.mpf(298.15)
            enthalpy, entropy = enthalpy + cp * (t - t0), entropy + cp * mp.log(t / t0)
        form, value = amount(member.standard_state or self.plan.standard_state)
        per_litre = mp.log(1000 * self.rt / value) if form == "pressure" else -mp.log(value)
        return (enthalpy - t * entropy) / self.rt + per_litre

    def gibbs(self, name: str) -> mp.mpf:
        """G/RT at 1 mol/L."""
        return self.plains[name] + self.shifts.get(name, 0)

    def _concentrations(self) -> dict[str, mp.mpf]:
        questioned = set() if self.catalyst else {self.start, *self.products}
        found, waiting = {}, []
        for name, text in self.plan.held.items():
            if text == "equilibrium":
                waiting.append(name)
                continue
            form, value = amount(text)
            found[name] = value / (1000 * self.rt) if form == "pressure" else value
        self.stated = [name for name in found if name not in questioned]
        while waiting:
            for name in waiting:
                known = self._in_equilibrium(name, found, questioned)
                if known is not None:
                    found[name] = known
                    waiting.remove(name)
                    break
            else:
                raise AssertionError(f"{waiting} do not follow from {found}")
        return found

    def _in_equilibrium(
        self, name: str, found: Mapping[str, mp.mpf], questioned: set[str]
    ) -> mp.mpf | None:
        for step in self.plan.steps:
            left, right = step.sides()
            net = {s: right.get(s, 0) - left.get(s, 0) for s in {**left, **right}}
            others = {s: n for s, n in net.items() if n and s != name}
            if net.get(name) and all(s in found and s not in questioned for s in others):
                log = sum(n * (mp.log(found[s]) + self.gibbs(s)) for s, n in others.items())
                return mp.e ** (-log / net[name] - self.gibbs(name))
        return None

    # ------------------------------------------------------------------ rate constants
    def _constants(self, number: int) -> tuple[mp.mpf, mp.mpf]:
        step, t = self.plan.steps[number], self.temperature
        left, right = step.sides()
        g_left = sum(n * self.plains[s] for s, n in left.items())
        g_right = sum(n * self.plains[s] for s, n in right.items())
        balance = mp.e ** (g_left - g_right)  # K
        frequency = BOLTZMANN * t / PLANCK
        if step.key == "rate":
            forward = mp.mpf(float(step.value.split()[0]))
        elif step.key == "arrhenius":
            factor, power, energy = step.value
            forward = mp.mpf(float(factor.split()[0])) * (t / mp.mpf(298.15)) ** mp.mpf(power)
            forward *= mp.e ** (-mp.mpf(energy) * 1000 / self.rt)
        else:
            two = [side for side in (left, right) if sum(side.values()) == 2]
            if len(two) == 2:  # in the downhill direction
                two = [left if g_right <= g_left else right]
            direct = None
            if step.key == "through":
                direct = frequency * mp.e ** (g_left - self.plains[step.value])
            forward = direct
            if two and (self.plan.phase == "gas" or step.viscosity is not None):
                limit = self._limit(step, two[0])
                if two[0] == right:
                    limit *= balance
                forward = limit if direct is None else 1 / (1 / direct + 1 / limit)
        return forward, forward / balance

    def _moved_constants(self, number: int) -> tuple[mp.mpf, mp.mpf]:
        forward, reverse = self.unmoved[number]
        if not self.shifts:
            return forward, reverse
        left, right = self.plan.steps[number].sides()
        moved = -self.shifts.get(number, 0)
        ahead = sum(n * self.shifts.get(s, 0) for s, n in left.items())
        back = sum(n * self.shifts.get(s, 0) for s, n in right.items())
        return forward * mp.e ** (moved + ahead), reverse * mp.e ** (moved + back)

    def _limit(self, step: Line, side: Counts) -> mp.mpf:
        names = [name for name, count in side.items() for _ in range(count)]
        half = mp.mpf(1) / 2 if names[0] == names[1] else mp.mpf(1)
        if self.plan.phase == "solution":
            eta = viscosity(step.viscosity, self.temperature)
            return half * 8 * self.rt / (3 * eta) * 1000
        radii, masses = [], []
        for name in names:
            atoms = self.plan.species[name].atoms
            cubes, mass = mp.mpf(0), mp.mpf(0)
            for element, number in atoms.items():
                z = atomic_numbers[element]
                cubes += number * mp.mpf(float(vdw_radii[z])) ** 3
                mass += number * mp.mpf(float(atomic_masses_iupac2016[z]))
            radii.append(cubes ** (mp.mpf(1) / 3))
            masses.append(mass)
        area = mp.pi * (sum(radii) * mp.mpf("1e-10")) ** 2
        reduced = masses[0] * masses[1] / sum(masses) * ATOMIC_MASS
        speed = mp.sqrt(8 * BOLTZMANN * self.temperature / (mp.pi * reduced))
        return half * area * speed * AVOGADRO * 1000

    # ------------------------------------------------------------------ the network
    def _network(self) -> None:
        """Nodes, and one-way pseudo-first-order constants with what each way gives off."""
        nodes: dict[tuple[tuple[str, int], ...], int] = {}
        self.ways: list[tuple[int, int, mp.mpf, int]] = []  # from, to, constant, product made
        self.joined: list[tuple[int, int, int]] = []  # step, left node, right node
        apart = set(self.held) - (set() if self.catalyst else {self.start, *self.products})
        gone = set(self.products) if self.catalyst else set()
        for number, (step, both) in enumerate(zip(self.plan.steps, self.constants, strict=True)):
            ends, factors, made = [], [], []
            for side in step.sides():
                factor, end = mp.mpf(1), []
                for name, count in side.items():
                    if name in apart:
                        factor *= self.held[name] ** count
                    elif name in gone:
                        factor *= 0  # there is none
                    else:
                        end.append((name, count))
                ends.append(tuple(end))
                factors.append(factor)
                made.append(sum(side.get(p, 0) for p in self.products))
            if not ends[0] and not ends[1]:
                continue
            a, b = (nodes.setdefault(end, len(nodes)) for end in ends)
            self.joined.append((number, a, b))
            given = made[1] - made[0] if self.catalyst else 0
            self.ways.append((a, b, both[0] * factors[0], given))
            self.ways.append((b, a, both[1] * factors[1], -given))
        self.nodes = list(nodes)
        self.place = nodes

    def matrix(self, inside: list[int]) -> mp.matrix:
        """Return M: M[i, i] all ways out of i, M[i, j] minus the ways from i to j."""
        row = {node: k for k, node in enumerate(inside)}
        m = mp.zeros(len(inside), len(inside))
        for a, b, constant, _ in self.ways:
            if a in row and a != b:
                m[row[a], row[a]] += constant
                if b in row:
                    m[row[a], row[b]] -= constant
        return m

    def inside(self) -> list[int]:
        """Return the reactant's node and all that it reaches short of products."""
        found = [self.place[((self.start, 1),)]]
        for node in found:
            for a, b, constant, _ in self.ways:
                if a == node and constant and b not in found and not self.is_product(b):
                    found.append(b)
        return found

    def is_product(self, node: int) -> bool:
        """Tell whether a node is made of products alone."""
        return not self.catalyst and all(name in self.products for name, _ in self.nodes[node])

    def product_level(self, node: int) -> mp.mpf:
        """How much of a product there is beside 1 mol/L, or the held amount, of reactant."""
        level = 1 / self.held.get(self.start, mp.mpf(1))
        for name, count in self.nodes[node]:
            level *= self.held.get(name, mp.mpf(0)) ** count
        return level

    def levels(self) -> dict[int, mp.mpf]:
        """Return the steady state beside a unit of reactant."""
        inside = self.inside()
        known = {inside[0]: mp.mpf(1)}
        known |= {k: self.product_level(k) for k in range(len(self.nodes)) if self.is_product(k)}
        if len(inside) > 1:
            m = self.matrix(inside[1:])
            feed = mp.zeros(len(inside) - 1, 1)
            for a, b, constant, _ in self.ways:
                if a in known and b in inside[1:]:
                    feed[inside.index(b) - 1] += constant * known[a]
            for node, level in zip(inside[1:], mp.lu_solve(m.T, feed), strict=True):
                known[node] = level
        return known

    def products_made(self) -> dict[int, mp.mpf]:
        """Return the net flux into each product."""
        levels, made = self.levels(), {}
        for a, b, constant, _ in self.ways:
            for node, sign, source in ((b, 1, a), (a, -1, a)):
                if self.is_product(node) and source in levels:
                    made[node] = made.get(node, 0) + sign * constant * levels[source]
        return made

    # ------------------------------------------------------------------ the rates
    def free(self) -> mp.mpf:
        with mp.workdps(self.digits):
            return sum(self.products_made().values())

    def pool_matrix(self) -> mp.matrix:
        return self.matrix(self.inside())

    def pool(self) -> mp.mpf:
        with mp.workdps(self.digits):
            return smallest_root(polynomial(self.pool_matrix()))

    def pool_decays(self) -> list[tuple[mp.mpf, mp.mpf]]:
        """Return decay constants and their coefficients after a pulse of the reactant."""
        with mp.workdps(self.digits):
            m = self.pool_matrix()
            found = []
            for value in all_roots(polynomial(m)):
                left, right = null_vector(m.T, value), null_vector(m, value)
                overlap = sum(x * y for x, y in zip(left, right, strict=True))
                found.append((value, right[0] * sum(left) / overlap))
            return found

    def inverse_mean_time(self) -> mp.mpf:
        with mp.workdps(self.digits):
            m = self.pool_matrix()
            return 1 / mp.lu_solve(m, mp.matrix([1] * m.rows))[0]

    def relaxation(self) -> mp.mpf:
        with mp.workdps(self.digits):
            everywhere = [self.place[((self.start, 1),)]]
            for node in everywhere:
                everywhere += [
                    b for a, b, k, _ in self.ways if a == node and k and b not in everywhere
                ]
            # dict keeps the order and drops what stands twice
            coefficients = polynomial(self.matrix(list(dict.fromkeys(everywhere))))
            return smallest_root(coefficients[1:])

    def cycle_shares(self) -> dict[int, mp.mpf]:
        """Return the shares of the catalyst's states."""
        inside = self.inside()
        m = self.matrix(inside).T
        for k in range(len(inside)):
            m[len(inside) - 1, k] = 1
        share = mp.lu_solve(m, mp.matrix([0] * (len(inside) - 1) + [1]))
        return dict(zip(inside, share, strict=True))

    def cycle(self) -> mp.mpf:
        with mp.workdps(self.digits):
            share = self.cycle_shares()
            made = sum(share[a] * k * given for a, _, k, given in self.ways if a in share and k)
            return made / self.plan.product_of_one_turn

    def rate(self, definition: str) -> mp.mpf:
        value: mp.mpf = getattr(self, definition)()
        return value

    def reversibility(self) -> dict[int, mp.mpf]:
        """Return the smaller over the larger one-way flux of every step of the network."""
        with mp.workdps(self.digits):
            levels = self.cycle_shares() if self.catalyst else self.levels()
            found = {}
            for k, (number, a, b) in enumerate(self.joined):
                if a in levels and b in levels:
                    forth = self.ways[2 * k][2] * levels[a]
                    back = self.ways[2 * k + 1][2] * levels[b]
                    found[number] = min(forth, back) / max(forth, back)
            return found


def amount(text: str) -> tuple[str, mp.mpf]:
    """Return "pressure" and Pa, or "concentration" and mol/L."""
    number, unit = text.split()
    if unit == "mol/L":
        return "concentration", mp.mpf(float(number))
    return "pressure", mp.mpf(float(number)) * {"Pa": 1, "bar": 100000, "atm": 101325}[unit]


def viscosity(points: Any, temperature: mp.mpf) -> mp.mpf:
    """Return the viscosity, ln eta linear in 1/T between the points."""
    if len(points) == 1:
        return mp.mpf(points[0][1])
    for (t1, eta1), (t2, eta2) in pairwise(points):
        if t1 <= temperature <= t2:
            share = (1 / temperature - 1 / mp.mpf(t1)) / (1 / mp.mpf(t2) - 1 / mp.mpf(t1))
            return mp.e ** ((1 - share) * mp.log(mp.mpf(eta1)) + share * mp.log(mp.mpf(eta2)))
    raise AssertionError("outside the table")


def polynomial(m: mp.matrix) -> list[mp.mpf]:
    """Return det(M - x) up to its sign, lowest power first (Faddeev, LeVerrier)."""
    n = m.rows
    rows = m.tolist()
    power = [[mp.mpf(i == j) for j in range(n)] for i in range(n)]
    coefficients = [mp.mpf(1)]
    for k in range(1, n + 1):
        columns = list(zip(*power, strict=True))
        power = [[mp.fdot(row, column) for column in columns] for row in rows]
        c = -sum(power[i][i] for i in range(n)) / k
        coefficients.append(c)
        for i in range(n):
            power[i][i] += c
    return coefficients[::-1]


def smallest_root(coefficients: list[mp.mpf]) -> mp.mpf:
    """Newton's method from zero: with all roots real and positive it rises to the smallest one."""
    x = mp.mpf(0)
    for _ in range(10000):
        value, slope = _value_and_slope(coefficients, x)
        step = value / slope
        x -= step
        if abs(step) <= abs(x) * mp.mpf(10) ** (8 - mp.mp.dps // 2):
            break
    for _ in range(3):
        value, slope = _value_and_slope(coefficients, x)
        x -= value / slope
    return x


def _value_and_slope(coefficients: list[mp.mpf], x: mp.mpf) -> tuple[mp.mpf, mp.mpf]:
    value = slope = mp.mpf(0)
    for c in coefficients[::-1]:
        slope = slope * x + value
        value = value * x + c
    return value, slope


def all_roots(coefficients: list[mp.mpf]) -> list[mp.mpf]:
    """Return all roots, ascending, by deflation."""
    rest, found = list(coefficients), []
    while len(rest) > 1:
        root = smallest_root(rest)
        found.append(root)
        quotient, carry = [], mp.mpf(0)
        for c in rest[:-1]:  # from the lowest power up: stable, the smallest root being taken out
            carry = (carry - c) / root
            quotient.append(carry)
        rest = quotient
    return found


def null_vector(m: mp.matrix, value: mp.mpf) -> list[mp.mpf]:
    """Return the vector that M - value sends to zero."""
    shifted = m - value * (1 + mp.mpf(10) ** (-mp.mp.dps // 3)) * mp.eye(m.rows)
    vector = mp.matrix([mp.mpf(k + 2) / (k + 1) for k in range(m.rows)])
    for _ in range(6):
        vector = mp.lu_solve(shifted, vector)
        vector = vector / max(abs(x) for x in vector)
    return list(vector)


def arrhenius_energy(
    plan: Plan, temperature: float, definition: str, digits: int = DIGITS
) -> mp.mpf:
    """Return R T^2 d ln k/dT by a tiny difference, kJ/mol."""
    with mp.workdps(digits):
        t, h = mp.mpf(temperature), mp.mpf(10) ** -(digits // 4)
        up, down = (
            mp.log(abs(Reference(plan, t * (1 + s * h), digits=digits).rate(definition)))
            for s in (1, -1)
        )
        return GAS * t * (up - down) / (2 * h) / 1000


def controls(
    reference: Reference, definition: str, whats: Iterable[str | int]
) -> dict[str | int, float]:
    """Return d ln k/d(-G/RT) of species (names) and steps' effective saddles (numbers), by a tiny difference."""
    with mp.workdps(reference.digits):
        h = mp.mpf(10) ** -(reference.digits // 3)
        here = reference.rate(definition)
        return {
            what: float((1 - reference.moved(what, h).rate(definition) / here) / h)
            for what in whats
        }


# ------------------------------------------------------------------------------------- plans

# three intermediates C1, C2, C3 in a loop with a branch to P, and a dead end D
MEMBERS = {
    "A": Member("CO", 0.0, 200.0),
    "W": Member("H2O", 0.0, 188.5),
    "W2": Member("(H2O)2", -15.0, 290.3),
    "C1": Member("CH2O2", -30.0, 280.0),
    "C2": Member("CH2O2", -20.0, 260.5),
    "C3": Member("CH4O3", -60.0, 330.0),
    "D": Member("CH2O2", -45.0, 250.0),
    "P": Member("CH2O2", -80.0, 270.0),
    "T1": Member("CH2O2", 10.0, 250.0),
    "T2": Member("CH2O2", 25.0, 251.0),
    "T12": Member("CH2O2", 30.0, 245.0),
    "T3": Member("CH4O3", -5.0, 300.0),
    "T4": Member("CH4O3", -10.0, 310.0),
    "TD": Member("CH2O2", 12.0, 240.0),
    "TP": Member("CH2O2", 35.0, 255.0),
}
STEPS = (
    Line("W + W = W2", "barrier", "none"),
    Line("A + W = C1", "through", "T1"),
    Line("A + W = C2", "through", "T2"),
    Line("C1 = C2", "through", "T12"),
    Line("C1 + W = C3", "through", "T3"),
    Line("C3 = P + W", "through", "T4"),
    Line("C1 = D", "through", "TD"),
    Line("C2 = P", "through", "TP"),
)
QUESTION = {"reactant": "A", "product": "P"}
BRANCHED = Plan(MEMBERS, STEPS, QUESTION, {"W": "0.02 mol/L", "W2": "equilibrium"}, (300.0,))

# a catalyst K: S + W = P by way of three states, and a dead end KD
CATALYST = {
    "K": Member("Ar", 0.0, 155.0),
    "S": Member("CO", 0.0, 200.0),
    "W": Member("H2O", 0.0, 188.5),
    "KS": Member("ArCO", -30.0, 230.0),
    "KSW": Member("ArCH2O2", -55.0, 270.0),
    "KP": Member("ArCH2O2", -110.0, 275.0),
    "KD": Member("ArCH2O2", -60.0, 240.0),
    "P": Member("CH2O2", -80.0, 270.0),
    "T1": Member("ArCO", 25.0, 225.0),
    "T2": Member("ArCH2O2", 0.0, 265.0),
    "T3": Member("ArCH2O2", 10.0, 260.0),
    "T4": Member("ArCH2O2", -30.0, 290.0),
    "TD": Member("ArCH2O2", 5.0, 250.0),
}
CYCLE_STEPS = (
    Line("K + S = KS", "through", "T1"),
    Line("KS + W = KSW", "through", "T2"),
    Line("KSW = KP", "through", "T3"),
    Line("KP = K + P", "through", "T4"),
    Line("KSW = KD", "through", "TD"),
)
HELD = {"S": "0.1 mol/L", "W": "0.2 mol/L"}
CYCLE = Plan(
    CATALYST,
    CYCLE_STEPS,
    {"catalyst": "K", "product": "P"},
    {**HELD, "P": "0.01 mol/L"},
    (300.0,),
)


def without(members: dict[str, Member], *names: str) -> dict[str, Member]:
    return {name: member for name, member in members.items() if name not in names}
