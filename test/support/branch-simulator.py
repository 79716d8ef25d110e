"""Simulates programs with measurements, resets and conditions branch by branch; nothing of the tool is used.

Standard input: a JSON list of pairs {wires, bits, any, kept, ended, circuits: [first, second]}; a circuit is a list of statements
  ["gate", modifiers, name, angles, wires]   modifiers outermost first: "ctrl", "negctrl", "inv", ["pow", k]
  ["measure", wire, bit]  ["reset", wire]  ["assign", bit, expression]  ["if", expression, statements, statements]
and an expression is ["constant", v], ["bit", b], ["not", e], ["xor" | "and" | "or", e, e] or ["equals", first, size, value].
`any` are the inputs that may be in any state (paired with a reference each), `kept` the outputs somebody keeps, `ended` wires
that are measured in the end; the first `bits` bits are seen. Everything else is traced out.
Standard output: for each pair {trace, fidelity, weights}: the trace distance and root fidelity of the two outcomes (over bits,
kept outputs and references), and for each circuit the probability of each string of seen bits, bit 0 first.

Each classical state (a string of all bits) holds one matrix whose columns are the unnormalised branches that lead to it, so the
density operator of that string is M M^dagger. Wire 0 is the most significant.
"""
import json
import sys

import numpy as np

I2 = np.eye(2, dtype=complex)
X = np.array([[0, 1], [1, 0]], dtype=complex)
Y = np.array([[0, -1j], [1j, 0]])
Z = np.diag([1, -1]).astype(complex)
GATES = {
    'x': lambda: X, 'y': lambda: Y, 'z': lambda: Z, 'h': lambda: (X + Z) / np.sqrt(2),
    's': lambda: np.diag([1, 1j]), 'sdg': lambda: np.diag([1, -1j]),
    't': lambda: np.diag([1, np.exp(0.25j * np.pi)]), 'tdg': lambda: np.diag([1, np.exp(-0.25j * np.pi)]),
    'sx': lambda: 0.5 * np.array([[1 + 1j, 1 - 1j], [1 - 1j, 1 + 1j]]),
    'rx': lambda a: np.cos(a / 2) * I2 - 1j * np.sin(a / 2) * X,
    'ry': lambda a: np.cos(a / 2) * I2 - 1j * np.sin(a / 2) * Y,
    'rz': lambda a: np.diag([np.exp(-0.5j * a), np.exp(0.5j * a)]),
    'p': lambda a: np.diag([1, np.exp(1j * a)]),
    'cx': lambda: block(I2, X), 'cz': lambda: block(I2, Z), 'cp': lambda a: block(I2, np.diag([1, np.exp(1j * a)])),
    'swap': lambda: np.eye(4, dtype=complex)[[0, 2, 1, 3]],
}


def block(a, b):
    d = len(a)
    out = np.zeros((2 * d, 2 * d), dtype=complex)
    out[:d, :d] = a
    out[d:, d:] = b
    return out


def principal(u, k):
    # exact for the one-wire gates used here: u = e^{i a}(cos b - i sin b n.sigma), distinct eigenvalues or a multiple of 1
    w, v = np.linalg.eig(u)
    phases = np.angle(w)
    phases = np.where(phases <= -np.pi + 1e-9, np.pi, phases)
    return v @ np.diag(np.exp(1j * k * phases)) @ np.linalg.inv(v)


def matrix(modifiers, name, angles):
    u = GATES[name](*angles)
    for modifier in reversed(modifiers):
        if modifier == 'ctrl': u = block(np.eye(len(u)), u)
        elif modifier == 'negctrl': u = block(u, np.eye(len(u)))
        elif modifier == 'inv': u = u.conj().T
        else: u = principal(u, modifier[1])
    return u


def value(expression, bits):
    kind, *rest = expression
    if kind == 'constant': return bool(rest[0])
    if kind == 'bit': return bits[rest[0]]
    if kind == 'not': return not value(rest[0], bits)
    if kind == 'equals':
        first, size, wanted = rest
        return sum(2 ** k for k in range(size) if bits[first + k]) == wanted
    a, b = value(rest[0], bits), value(rest[1], bits)
    return {'xor': a != b, 'and': a and b, 'or': a or b}[kind]


def on_wires(state, u, wires, lines):
    k = len(wires)
    columns = state.shape[1]
    t = state.reshape([2] * lines + [columns])
    t = np.tensordot(u.reshape([2] * (2 * k)), t, axes=(list(range(k, 2 * k)), wires))
    return np.moveaxis(t, range(k), wires).reshape(2 ** lines, columns)


def merged(states):
    """Adds up what leads to the same bits; keeps no more columns than rows."""
    out = {}
    for bits, state in states:
        out.setdefault(bits, []).append(state)
    joined = {}
    for bits, parts in out.items():
        state = parts[0] if len(parts) == 1 else np.concatenate(parts, axis=1)
        weights = np.sum(np.abs(state) ** 2, axis=0)
        state = state[:, weights > 1e-32]
        if state.shape[1] == 0: continue
        joined[bits] = squared(state)
    return joined


def squared(m):
    """The same m m^dagger with no more columns than rows."""
    return m if m.shape[1] <= m.shape[0] else np.linalg.qr(m.conj().T, mode='r').conj().T


def run(statements, states, lines):
    for kind, *rest in statements:
        after = []
        if kind == 'if':
            condition, then, otherwise = rest
            for bits, state in states.items():
                chosen = then if value(condition, bits) else otherwise
                after.extend(run(chosen, {bits: state}, lines).items())
        elif kind == 'gate':
            modifiers, name, angles, wires = rest
            u = matrix(modifiers, name, angles)
            after = [(bits, on_wires(state, u, wires, lines)) for bits, state in states.items()]
        else:
            for bits, state in states.items():
                after.extend(step(kind, rest, bits, state, lines))
        states = merged(after)
    return states


def step(kind, rest, bits, state, lines):
    if kind == 'assign':
        return [(bits[:rest[0]] + (value(rest[1], bits),) + bits[rest[0] + 1:], state)]
    zero = on_wires(state, np.diag([1, 0]), [rest[0]], lines)
    one = on_wires(state, np.diag([0, 1]), [rest[0]], lines)
    if kind == 'reset':
        return [(bits, zero), (bits, on_wires(one, X, [rest[0]], lines))]
    bit = rest[1]
    return [(bits[:bit] + (False,) + bits[bit + 1:], zero), (bits[:bit] + (True,) + bits[bit + 1:], one)]


def outcome(pair, statements):
    """Seen bits and measured ends -> factor of the density operator over kept outputs and references."""
    wires, references = pair['wires'], len(pair['any'])
    lines = wires + references
    state = np.zeros([2] * lines, dtype=complex)
    for k in range(2 ** references):
        index = [0] * lines
        for r, wire in enumerate(pair['any']):
            index[wire] = index[wires + r] = (k >> r) & 1
        state[tuple(index)] = 2 ** (-references / 2)
    scratch = len(pair['ended'])
    bits = pair['allBits']
    start = {(False,) * (bits + scratch): state.reshape(-1, 1)}
    ends = [['measure', wire, bits + k] for k, wire in enumerate(pair['ended'])]
    final = run(statements + ends, start, lines)
    seen = {}
    keep = pair['kept'] + list(range(wires, lines))
    drop = [wire for wire in range(wires) if wire not in pair['kept']]
    for values, state in final.items():
        t = state.reshape([2] * lines + [state.shape[1]]).transpose(keep + drop + [lines])
        seen.setdefault(values[:pair['bits']] + values[bits:], []).append(t.reshape(2 ** len(keep), -1))
    return {key: squared(np.concatenate(parts, axis=1)) for key, parts in seen.items()}


def compare(pair):
    a, b = (outcome(pair, statements) for statements in pair['circuits'])
    trace, fidelity = 0.0, 0.0
    for key in set(a) | set(b):
        x, y = a.get(key), b.get(key)
        rows = len(x if x is not None else y)
        p = x @ x.conj().T if x is not None else np.zeros((rows, rows))
        q = y @ y.conj().T if y is not None else np.zeros((rows, rows))
        trace += 0.5 * np.sum(np.abs(np.linalg.eigvalsh(p - q)))
        if x is not None and y is not None:
            fidelity += np.sum(np.linalg.svd(x.conj().T @ y, compute_uv=False))
    weights = []
    for side in (a, b):
        table = {}
        for key, m in side.items():
            text = ''.join('1' if v else '0' for v in key)
            table[text] = float(np.sum(np.abs(m) ** 2))
        weights.append(table)
    return {'trace': float(trace), 'fidelity': float(fidelity), 'weights': weights}


print(json.dumps([compare(pair) for pair in json.load(sys.stdin)]))
