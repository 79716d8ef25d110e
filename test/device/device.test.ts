import { describe, expect, test } from 'vitest';
import { type Circuit, emptyCircuit, gate, type Operation } from '../../src/circuit/circuit.ts';
import { bitDistribution, totalVariation } from '../../src/device/density.ts';
import type { Device } from '../../src/device/device.ts';
import { breakEven, estimateSuccess, idleFidelity } from '../../src/device/estimate.ts';
import {
  depolarising,
  depolarisingProbability,
  idleKraus,
  superoperator,
} from '../../src/device/noise.ts';
import { scheduleCircuit } from '../../src/device/schedule.ts';
import { runTrajectories, wilsonInterval } from '../../src/device/trajectories.ts';
import { InputError } from '../../src/input-error.ts';
import { random } from '../../src/numeric/random.ts';
import { readDevice } from '../../src/read/device.ts';
import { python, pythonTest } from '../support/python.ts';

// typical orders of magnitude of a superconducting device (common practice, no source)
const device: Device = {
  name: 'typical',
  wires: Array.from({ length: 4 }, (_, k) => ({
    t1Us: 100 + 10 * k,
    t2Us: 80,
    readoutError: 0.01 + 0.002 * k,
    gateError: 3e-4,
    gateDurationNs: 30,
  })),
  links: [
    { between: [0, 1], error: 5e-3, durationNs: 200 },
    { between: [1, 2], error: 8e-3, durationNs: 300 },
    { between: [0, 2], error: 7e-3, durationNs: 250 },
  ],
  measureDurationNs: 700,
  resetDurationNs: 300,
  resetError: 5e-3,
};

const measure = (wire: number, bit: number): Operation => ({ kind: 'measure', wire, bit });
const reset = (wire: number): Operation => ({ kind: 'reset', wire });
const ifBit = (bit: number, operation: Operation): Operation => ({
  ...operation,
  condition: { kind: 'bit', bit },
});
const circuitOf = (wires: number, bits: number, operations: Operation[]): Circuit => ({
  ...emptyCircuit(wires, bits),
  operations,
});

describe('noise channels', () => {
  test('idle channel: process fidelity as published for T1/T2', () => {
    // Tr(S)/4 of a superoperator S on one wire is its process fidelity
    for (const [t, t1, t2] of [
      [100, 50, 70],
      [5000, 30, 10],
      [0, 10, 10],
      [40, 20, undefined],
    ] as const) {
      const s = superoperator(idleKraus(t, t1, t2), 1);
      const trace = (s[0]! + s[5]! + s[10]! + s[15]!) / 4;
      expect(trace).toBeCloseTo(idleFidelity(t, t1, t2), 14);
    }
  });

  test('depolarising: average infidelity p (D - 1)/D', () => {
    for (const k of [1, 2]) {
      const d = 2 ** k;
      const p = depolarisingProbability(0.01, k);
      const s = depolarising(p, k);
      let trace = 0;
      for (let i = 0; i < d * d; i++) trace += s[i * d * d + i]!;
      const process = trace / (d * d);
      expect(1 - (d * process + 1) / (d + 1)).toBeCloseTo(0.01, 14);
    }
  });
});

describe('schedule', () => {
  test('a wire waits only between its first entangler and its measurement', () => {
    const circuit = circuitOf(3, 3, [
      gate('h', [2]),
      gate('cx', [0, 1]),
      gate('cx', [1, 2]),
      measure(0, 0),
      measure(1, 1),
      measure(2, 2),
    ]);
    const schedule = scheduleCircuit(circuit, device, [0, 1, 2]);
    // the h on wire 2 is moved up to its cx at 200 ns, so wire 2 never waits
    expect(schedule.startNs[0]).toBe(170);
    expect(schedule.idles).toEqual([]);
    expect(schedule.totalNs).toBe(1200);
    const later = circuitOf(3, 0, [gate('cx', [0, 1]), gate('cx', [1, 2]), gate('cx', [0, 2])]);
    expect(scheduleCircuit(later, device, [0, 1, 2]).idles).toEqual([
      { wire: 0, beforeOperation: 2, durationNs: 300 },
    ]);
  });
});

describe('estimate', () => {
  test('is the product of the process fidelities of the pieces', () => {
    const circuit = circuitOf(2, 2, [gate('sx', [0]), gate('cx', [0, 1]), measure(0, 0)]);
    const { success, parts, missing } = estimateSuccess(circuit, device);
    expect(parts.oneWireGates).toBeCloseTo(1 - 1.5 * 3e-4, 14);
    expect(parts.entanglers).toBeCloseTo(1 - 1.25 * 5e-3, 14);
    expect(success).toBeCloseTo((1 - 4.5e-4) * (1 - 6.25e-3) * 0.99, 12);
    expect(missing).toEqual([]);
  });

  test('names what the device file does not give', () => {
    const bare: Device = { name: 'bare', wires: [{}, {}], links: [{ between: [0, 1] }] };
    const circuit = circuitOf(2, 1, [gate('h', [0]), gate('cx', [0, 1]), measure(0, 0)]);
    const { success, missing } = estimateSuccess(circuit, bare);
    expect(success).toBe(1);
    expect(missing).toEqual([
      'entangler duration',
      'entangler error',
      'measure duration',
      'one-wire gate duration',
      'one-wire gate error',
      'readout error',
    ]);
  });

  test('break-even: at the threshold both circuits are equally good', () => {
    const links = [0, 1, 2, 3, 4, 5].map((k) => gate('cx', [k % 3, (k + 1) % 3]));
    const before = circuitOf(3, 2, links);
    const after = circuitOf(2, 2, [
      gate('cx', [0, 1]),
      gate('cx', [0, 1]),
      measure(0, 0),
      reset(0),
      gate('h', [0]),
      gate('cx', [0, 1]),
    ]);
    const rows = breakEven({ circuit: before }, { circuit: after }, device);
    const duration = rows.find(({ figure }) => figure === 'reset duration')!;
    const error = rows.find(({ figure }) => figure === 'reset error')!;
    for (const [row, changed] of [
      [duration, { ...device, resetDurationNs: duration.threshold ?? 0 }],
      [error, { ...device, resetError: error.threshold ?? 0 }],
    ] as const) {
      if (row.threshold === null) continue;
      const ratio =
        estimateSuccess(after, changed).success / estimateSuccess(before, changed).success;
      expect(ratio).toBeCloseTo(1, 5);
    }
    expect(rows.some(({ threshold }) => threshold !== null)).toBe(true);
  });
});

/** A random circuit with resets, conditions and reuse on n wires. */
function randomProgram(n: number, length: number, seed: number): Circuit {
  const draw = random(seed, 'program');
  const pick = (k: number): number => Math.min(k - 1, Math.floor(k * draw()));
  const operations: Operation[] = [];
  let bit = 0;
  for (let k = 0; k < length; k++) {
    const kind = pick(8);
    const wire = pick(n);
    const other = (wire + 1 + pick(n - 1)) % n;
    if (kind < 2) operations.push(gate('ry', [wire], 3 * draw()));
    else if (kind < 3) operations.push(gate('rz', [wire], 3 * draw()));
    else if (kind < 6) operations.push(gate('cx', [wire, other]));
    else if (kind < 7 && bit < 3) {
      operations.push(measure(wire, bit), reset(wire));
      bit++;
    } else if (bit > 0) operations.push(ifBit(pick(bit), gate('x', [wire])));
  }
  for (let wire = 0; wire < n; wire++) operations.push(measure(wire, bit + wire));
  return circuitOf(n, bit + n, operations);
}

const reference = `
import sys, json
import numpy as np
job = json.load(sys.stdin)
n = job['wires']; dev = job['device']
def on(m, wires):
    k = len(wires); t = np.eye(2**n, dtype=complex).reshape([2]*(2*n))
    t = np.tensordot(m.reshape([2]*(2*k)), t, axes=(range(k, 2*k), wires))
    return np.moveaxis(t, range(k), wires).reshape(2**n, 2**n)
I=np.eye(2); X=np.array([[0,1],[1,0]]); Y=np.array([[0,-1j],[1j,0]]); Z=np.diag([1,-1])
P=[I,X,Y,Z]
def kraus(rho, ks, wires): return sum(on(k, wires) @ rho @ on(k, wires).conj().T for k in ks)
def depol(rho, e, wires):
    D = 2**len(wires); p = e*D/(D-1)
    ps = P if len(wires)==1 else [np.kron(a,b) for a in P for b in P]
    return (1-p)*rho + p/len(ps)*kraus(rho, ps, wires)
def idle(rho, t, w):
    t1, t2 = dev['wires'][w]['t1Us']*1000, dev['wires'][w]['t2Us']*1000
    g = 1-np.exp(-t/t1)
    rho = kraus(rho, [np.array([[1,0],[0,np.sqrt(1-g)]]), np.array([[0,np.sqrt(g)],[0,0]])], [w])
    f = np.exp(-t/t2)/np.sqrt(1-g); q=(1-f)/2
    return (1-q)*rho + q*kraus(rho,[Z],[w])
rho0 = np.zeros((2**n,2**n),dtype=complex); rho0[0,0]=1
branches = {(): rho0}
bits = job['bits']
def link(a,b):
    return next(l for l in dev['links'] if set(l['between'])=={a,b})
branches = {tuple([0]*bits): rho0}
for k,op in enumerate(job['operations']):
    for i in job['idles']:
        if i['beforeOperation']==k:
            for b in branches: branches[b] = idle(branches[b], i['durationNs'], i['wire'])
    new = {}
    def put(b, r): new[b] = new.get(b, 0) + r
    for b, r in branches.items():
        c = op.get('condition')
        if c is not None and not b[c['bit']]: put(b, r); continue
        if op['kind']=='gate':
            w = op['wires']; nm = op['name']
            if nm=='cx': m = np.array([[1,0,0,0],[0,1,0,0],[0,0,0,1],[0,0,1,0]])
            elif nm=='x': m = X
            elif nm=='ry': t=op['angles'][0]; m=np.array([[np.cos(t/2),-np.sin(t/2)],[np.sin(t/2),np.cos(t/2)]])
            elif nm=='rz': t=op['angles'][0]; m=np.diag([np.exp(-.5j*t),np.exp(.5j*t)])
            m = on(m, w); r = m@r@m.conj().T
            if nm!='rz': r = depol(r, dev['wires'][w[0]]['gateError'] if len(w)==1 else link(*w)['error'], w)
            put(b, r)
        elif op['kind']=='measure':
            w = op['wire']; e = dev['wires'][w]['readoutError']
            for o in (0,1):
                pr = on(np.diag([1-o,o]), [w]); rr = pr@r@pr
                for rec in (0,1):
                    bb = list(b); bb[op['bit']] = rec
                    put(tuple(bb), rr*(1-e if rec==o else e))
        else:
            w = op['wire']; e = dev['resetError']
            s = kraus(r, [np.array([[1,0],[0,0]]), np.array([[0,1],[0,0]])], [w])
            put(b, (1-e)*s + e*kraus(s,[X],[w]))
    branches = new
print(json.dumps({''.join(map(str,b)): float(np.trace(r).real) for b,r in branches.items()}))
`;

pythonTest('noisy simulation equals an independent NumPy calculation to 1e-10', () => {
  for (const seed of [1, 2, 3, 4]) {
    const circuit = randomProgram(3, 24, seed);
    const idles = scheduleCircuit(circuit, device, [0, 1, 2]).idles;
    const job = { wires: 3, bits: circuit.bits, operations: circuit.operations, idles, device };
    const expected = new Map(Object.entries(python(reference, job) as { [key: string]: number }));
    const found = bitDistribution(circuit, device);
    expect([...found.values()].reduce((sum, x) => sum + x, 0)).toBeCloseTo(1, 12);
    expect(totalVariation(found, expected)).toBeLessThan(1e-10);
    // and noise is seen at all
    expect(totalVariation(found, bitDistribution(circuit))).toBeGreaterThan(1e-3);
  }
});

test('trajectories agree with the density matrix within sampling error', async () => {
  const circuit = randomProgram(3, 20, 9);
  const shots = 4000;
  const { counts, clean } = await runTrajectories(circuit, device, { shots, seed: 5 });
  const exact = bitDistribution(circuit, device);
  let chiSquare = 0;
  let cells = 0;
  for (const [key, p] of exact) {
    if (p * shots < 5) continue;
    chiSquare += ((counts.get(key) ?? 0) - p * shots) ** 2 / (p * shots);
    cells++;
  }
  // mean cells, variance 2 cells: five standard deviations, and the seed is fixed
  expect(chiSquare).toBeLessThan(cells + 5 * Math.sqrt(2 * cells));
  // the share of histories without any error is what the estimate gives
  const { success } = estimateSuccess(circuit, device);
  expect(success).toBeGreaterThan(clean.low - 0.02);
  expect(success).toBeLessThan(clean.high + 0.02);
  const again = await runTrajectories(circuit, device, { shots: 50, seed: 5 });
  const twice = await runTrajectories(circuit, device, { shots: 50, seed: 5 });
  expect(again).toEqual(twice);
});

test('score interval: published example 81 of 263 gives 0.2553 to 0.3662', () => {
  // Newcombe, Statistics in Medicine 17, 857 (1998), table I, method 3
  const { low, high } = wilsonInterval(81, 263);
  expect(low).toBeCloseTo(0.2553, 4);
  expect(high).toBeCloseTo(0.3662, 4);
});

describe('readDevice', () => {
  const problemsOf = (text: string): string[] => {
    try {
      readDevice(text, 'valley.json');
    } catch (error) {
      if (error instanceof InputError) return error.problems.map(({ message }) => message);
      throw error;
    }
    return [];
  };

  test('links alone are enough; figures for all are overridden one by one', () => {
    const bare = readDevice('{"links": [[0, 1], [1, 2]]}', 'bare.json');
    expect(bare.wires).toHaveLength(3);
    expect(bare.name).toBe('bare.json');
    const text = JSON.stringify({
      name: 'ring',
      allWires: { t1Us: 100, readoutError: 0.01 },
      allLinks: { error: 0.01 },
      wires: [{ readoutError: 0.02 }],
      links: [[0, 1], { between: [1, 2], error: 0.02, durationNs: 300 }],
      resetError: 0.01,
    });
    const ring = readDevice(text, 'ring.json');
    expect(ring.wires[0]).toEqual({ t1Us: 100, readoutError: 0.02 });
    expect(ring.wires[2]).toEqual({ t1Us: 100, readoutError: 0.01 });
    expect(ring.links[0]).toEqual({ between: [0, 1], error: 0.01 });
    expect(ring.links[1]).toEqual({ between: [1, 2], error: 0.02, durationNs: 300 });
    expect(ring.resetError).toBe(0.01);
  });

  test.each([
    ['{ links: }', '1:3'],
    ['{"links": [[0, 1]\n  , 3x]}', '2:6'],
    ['{"links": [', '1:12'],
    ['', '1:1'],
  ])('text that is no JSON: %j has its place', (text, place) => {
    expect(() => readDevice(text, 'valley.json')).toThrow(new RegExp(` at valley.json:${place}$`));
  });

  test('every mistake is named, with the path of the value', () => {
    expect(problemsOf('{')[0]).toMatch(/^expected a device as JSON/);
    expect(problemsOf('[]')[0]).toBe('expected an object for the device, got []');
    expect(problemsOf('{}')).toEqual(['missing links']);
    expect(
      problemsOf(
        '{"links": [[0, 0], {"between": [0, 1], "error": 2}], "wires": [{"t1": 3}], "resetErorr": 0}',
      ),
    ).toEqual([
      'unknown key in the device: resetErorr',
      'expected two different wire numbers in links[0], got [0,0]',
      'links[1].error must be in [0, 1], got 2',
      'unknown key in wires[0]: t1',
    ]);
    expect(problemsOf('{"links": [], "wires": [{"t1Us": 10, "t2Us": 30}]}')).toEqual([
      'wires[0].t2Us must be at most twice t1Us (20), got 30',
    ]);
    expect(problemsOf('{"links": [[0, 5]], "wireCount": 3}')).toEqual([
      'wireCount must be in [6, 10000], got 3',
    ]);
  });
});
