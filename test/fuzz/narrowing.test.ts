/**
 * Random programs narrowed by structure alone: the written text reads back, gives the same bits (by the exact
 * simulation of the device room, which shares nothing with the planner), and `compareCircuits` agrees.
 */
import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import { bitName, type Circuit, visibleBits } from '../../src/circuit/circuit.ts';
import { contractOf } from '../../src/circuit/contract.ts';
import { bitDistribution, type Distribution, totalVariation } from '../../src/device/density.ts';
import { type Random, random } from '../../src/numeric/random.ts';
import { narrowByStructure } from '../../src/plan/structure.ts';
import { readCircuit } from '../../src/read/openqasm.ts';
import { writeCircuit } from '../../src/write/openqasm.ts';

const WIRES = 5;
const BITS = 4;

const program = (body: string): Circuit =>
  readCircuit(
    `OPENQASM 3.0;\ninclude "stdgates.inc";\nqubit[${WIRES}] q;\nbit[${BITS}] c;\n${body}\n`,
    'random.qasm',
  ).circuit;

function randomBody(draw: Random, depth: number, length: number): string {
  const below = (n: number): number => Math.floor(draw() * n);
  const bit = (): string => `c[${below(BITS)}]`;
  const statement = (): string => {
    const wire = below(WIRES);
    const other = (wire + 1 + below(WIRES - 1)) % WIRES;
    const kind = below(depth > 0 ? 15 : 13);
    if (kind < 3) return `ry(${(6 * draw()).toFixed(2)}) q[${wire}];`;
    if (kind < 4) return `h q[${wire}];`;
    if (kind < 7) return `cx q[${wire}], q[${other}];`;
    if (kind < 8) return `cz q[${wire}], q[${other}];`;
    if (kind < 11) return `${bit()} = measure q[${wire}];`;
    if (kind < 12) return `reset q[${wire}];`;
    if (kind < 13) return `if (${bit()} ^ ${bit()}) ${draw() < 0.5 ? 'x' : 'z'} q[${wire}];`;
    const otherwise = draw() < 0.5 ? ` else { ${randomBody(draw, depth - 1, 1)} }` : '';
    return `if (${draw() < 0.5 ? '!' : ''}${bit()}) { ${randomBody(draw, depth - 1, 2)} }${otherwise}`;
  };
  return Array.from({ length }, statement).join('\n');
}

/** The distribution of the original's bits, also in a circuit that has further ones. */
function bitsOf(circuit: Circuit): Distribution {
  const own = visibleBits(circuit).filter((bit) => bitName(circuit, bit).startsWith('c['));
  const out: Distribution = new Map();
  for (const [bits, p] of bitDistribution(circuit)) {
    const key = own.map((bit) => bits[bit]).join('');
    out.set(key, (out.get(key) ?? 0) + p);
  }
  return out;
}

function check(circuit: Circuit): number {
  const narrowed = narrowByStructure(circuit, contractOf(circuit), {});
  const again = readCircuit(writeCircuit(narrowed.circuit), 'again.qasm').circuit;
  const distance = totalVariation(bitsOf(circuit), bitsOf(again));
  const { verdict } = compareCircuits(circuit, again, {});
  const text = writeCircuit(circuit);
  expect({ text, isWrong: !(distance < 1e-10), verdict }).toEqual({
    text,
    isWrong: false,
    verdict: 'same',
  });
  return circuit.wires - again.wires;
}

describe('random programs narrowed by structure', () => {
  test('100 programs keep their bits (seed 95)', () => {
    const draw = random(95);
    let saved = 0;
    for (let k = 0; k < 100; k++) saved += check(program(randomBody(draw, 2, 14)));
    expect(saved).toBeGreaterThan(100);
  }, 60_000);

  test.each([
    // a bit that is written again must not stand for its first value
    'ry(0.3) q[0]; ry(0.7) q[1]; ry(1.1) q[2]; cx q[0], q[1]; h q[1]; c[0] = measure q[0]; c[0] = measure q[2]; if (c[0]) ry(0.4) q[1]; c[1] = measure q[1];',
    // a measurement cannot be put off until its wire is gone
    'h q[4]; h q[1]; c[3] = measure q[4]; if (c[0]) { c[3] = measure q[1]; }',
    'h q[0]; h q[2]; c[2] = measure q[0]; c[2] = measure q[2]; c[1] = measure q[2]; c[1] = measure q[0];',
    'if (c[2] ^ c[0]) x q[0]; c[2] = measure q[0]; if (c[2]) c[0] = measure q[2]; cx q[1], q[0];',
  ])('%s', (body) => {
    check(program(body));
  });
});
