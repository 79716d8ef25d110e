/**
 * Pairs of circuits that a publication says are equal, or are not, under the contract it means. The source stands beside each; "NC" is
 * Nielsen, Chuang, Quantum Computation and Quantum Information (2010).
 */
import { describe, expect, test } from 'vitest';
import { compareCircuits } from '../../src/check/compare.ts';
import type { Circuit } from '../../src/circuit/circuit.ts';
import type { ContractOptions, InputRule, OutputRule } from '../../src/contract.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const read = (text: string): Circuit =>
  readCircuit(`OPENQASM 3.0;\ninclude "stdgates.inc";\n${text}`, 'published.qasm').circuit;

type Pair = {
  claim: string;
  source: string;
  first: string;
  second: string;
  contract?: ContractOptions;
  verdict?: 'different';
};

/** Only these inputs and outputs matter; the others start in |0> and are dropped. */
function carrying(
  wires: number,
  inputs: readonly number[],
  outputs: readonly number[],
): ContractOptions {
  const all = Array.from({ length: wires }, (_, k) => k);
  return {
    inputOf: new Map(all.map((k): [number, InputRule] => [k, inputs.includes(k) ? 'any' : 'zero'])),
    outputOf: new Map(all.map((k): [number, OutputRule] => [k, outputs.includes(k) ? 'kept' : 'dropped'])),
  }; // biome-ignore format: two lists
}

const bell = (a: number, b: number): string => `h q[${a}]; cx q[${a}], q[${b}];`;
/** Measures two wires in the Bell basis: first bit from the first wire. */
const bellMeasurement = (a: number, b: number, c: number, d: number): string =>
  `cx q[${a}], q[${b}]; h q[${a}]; c[${c}] = measure q[${a}]; c[${d}] = measure q[${b}];`;

const teleport = (correction: string): string =>
  `qubit[3] q; bit[2] c; ${bell(1, 2)} ${bellMeasurement(0, 1, 0, 1)} ${correction} c[0] = 0; c[1] = 0;`;
const carried = 'qubit[3] q; bit[2] c; swap q[0], q[2];';

const toffoli = `qubit[3] q; h q[2]; cx q[1], q[2]; tdg q[2]; cx q[0], q[2]; t q[2]; cx q[1], q[2]; tdg q[2]; cx q[0], q[2];
  t q[1]; t q[2]; h q[2]; cx q[0], q[1]; t q[0]; tdg q[1]; cx q[0], q[1];`;
const relativePhase = `qubit[3] q; ry(pi/4) q[2]; cx q[1], q[2]; ry(pi/4) q[2]; cx q[0], q[2]; ry(-pi/4) q[2]; cx q[1], q[2]; ry(-pi/4) q[2];`;

function fourier(n: number, how: 'coherent' | 'conditions'): string {
  const lines = [`qubit[${n}] q; bit[${n}] c;`];
  for (let i = n - 1; i >= 0; i--) {
    for (let j = n - 1; j > i; j--) {
      const angle = `pi/${2 ** (j - i)}`;
      if (how === 'coherent') lines.push(`cp(${angle}) q[${j}], q[${i}];`);
      else lines.push(`if (c[${j}]) p(${angle}) q[${i}];`);
    }
    lines.push(`h q[${i}];`);
    if (how === 'conditions') lines.push(`c[${i}] = measure q[${i}];`);
  }
  if (how === 'coherent') lines.push('c = measure q;');
  return lines.join(' ');
}

const anyInput = { inputs: 'any' } as const;
const kept = { inputs: 'any', outputs: 'kept' } as const;

const PAIRS: readonly Pair[] = [
  {
    claim: 'teleportation with both corrections is the identity channel',
    source: 'Bennett et al., PRL 70, 1895 (1993); NC figure 1.13',
    first: teleport('if (c[1]) x q[2]; if (c[0]) z q[2];'),
    second: carried,
    contract: carrying(3, [0], [2]),
  },
  {
    claim: 'teleportation with the correction for one bit only is not',
    source: 'NC section 1.3.7',
    first: teleport('if (c[1]) x q[2];'),
    second: carried,
    contract: carrying(3, [0], [2]),
    verdict: 'different',
  },
  {
    claim: 'without the bits nothing is teleported: the receiver holds 1/2 whatever was sent',
    source: 'NC section 2.4.3',
    first: teleport(''),
    second: 'qubit[3] q; bit[2] c; h q[0]; cx q[0], q[2];',
    contract: carrying(3, [], [2]),
  },
  {
    claim: 'superdense coding carries both bits',
    source: 'Bennett, Wiesner, PRL 69, 2881 (1992); NC section 2.3',
    first: `qubit[4] q; bit[2] c; ${bell(2, 3)} cx q[1], q[2]; cz q[0], q[2]; ${bellMeasurement(2, 3, 0, 1)}`,
    second: 'qubit[4] q; bit[2] c; c[0] = measure q[0]; c[1] = measure q[1];',
    contract: carrying(4, [0, 1], []),
  },
  {
    claim: 'with a separable pair it carries one bit at most',
    source: 'Holevo bound: NC theorem 12.1',
    first: `qubit[4] q; bit[2] c; h q[2]; cx q[1], q[2]; cz q[0], q[2]; ${bellMeasurement(2, 3, 0, 1)}`,
    second: 'qubit[4] q; bit[2] c; c[0] = measure q[0]; c[1] = measure q[1];',
    contract: carrying(4, [0, 1], []),
    verdict: 'different',
  },
  {
    claim: 'deferred measurement: a condition is a control before the measurement',
    source: 'NC section 4.4',
    first: 'qubit[2] q; bit c; h q[0]; c = measure q[0]; if (c) { h q[1]; t q[1]; }',
    second:
      'qubit[2] q; bit c; h q[0]; ctrl @ h q[0], q[1]; ctrl @ t q[0], q[1]; c = measure q[0];',
    contract: { ...carrying(2, [0, 1], [1]) },
  },
  {
    claim: 'a gate on the measured wire after it cannot be put before it',
    source: 'NC section 4.4',
    first: 'qubit[2] q; bit c; c = measure q[0]; h q[0]; if (c) x q[1];',
    second: 'qubit[2] q; bit c; h q[0]; c = measure q[0]; if (c) x q[1];',
    contract: { ...carrying(2, [0, 1], [1]) },
    verdict: 'different',
  },
  {
    claim: 'implicit measurement: what is not looked at may be measured',
    source: 'NC section 4.4, principle of implicit measurement',
    first: 'qubit[2] q; bit c; h q[0]; cx q[0], q[1]; c = measure q[0]; c = 0;',
    second: 'qubit[2] q; bit c; h q[0]; cx q[0], q[1];',
    contract: carrying(2, [0, 1], [1]),
  },
  {
    claim: 'entanglement swapping leaves a Bell pair between wires that never met',
    source: 'Zukowski et al., PRL 71, 4287 (1993)',
    first: `qubit[4] q; bit[2] c; ${bell(0, 1)} ${bell(2, 3)} ${bellMeasurement(1, 2, 0, 1)} if (c[1]) x q[3]; if (c[0]) z q[3]; c[0] = 0; c[1] = 0;`,
    second: `qubit[4] q; bit[2] c; ${bell(0, 3)}`,
    contract: carrying(4, [], [0, 3]),
  },
  {
    claim: 'a T gate teleported: its magic state, one CX, one measurement, S X when it says so',
    source: 'Gottesman, Chuang, Nature 402, 390 (1999); NC section 10.6.2',
    first:
      'qubit[2] q; bit c; h q[1]; t q[1]; cx q[0], q[1]; c = measure q[1]; if (c) s q[0]; c = 0;',
    second: 'qubit[2] q; bit c; t q[0];',
    contract: carrying(2, [0], [0]),
  },
  {
    claim: 'with S inverse in place of S it is another gate',
    source: 'NC section 10.6.2',
    first:
      'qubit[2] q; bit c; h q[1]; t q[1]; cx q[0], q[1]; c = measure q[1]; if (c) sdg q[0]; c = 0;',
    second: 'qubit[2] q; bit c; t q[0];',
    contract: carrying(2, [0], [0]),
    verdict: 'different',
  },
  {
    claim: 'one-bit teleportation',
    source: 'Zhou, Leung, Chuang, PRA 62, 052316 (2000)',
    first: 'qubit[2] q; bit c; h q[1]; cx q[1], q[0]; c = measure q[0]; if (c) x q[1]; c = 0;',
    second: 'qubit[2] q; bit c; swap q[0], q[1];',
    contract: carrying(2, [0], [1]),
  },
  {
    claim: 'a CX between stations by a shared pair and two bits',
    source: 'Eisert, Jacobs, Papadopoulos, Plenio, PRA 62, 052317 (2000)',
    first: `qubit[4] q; bit[2] c; ${bell(1, 2)} cx q[0], q[1]; c[0] = measure q[1]; if (c[0]) x q[2]; cx q[2], q[3]; h q[2]; c[1] = measure q[2]; if (c[1]) z q[0]; c[0] = 0; c[1] = 0;`,
    second: 'qubit[4] q; bit[2] c; cx q[0], q[3];',
    contract: carrying(4, [0, 3], [0, 3]),
  },
  {
    claim: 'the three-bit code corrects one flip',
    source: 'NC section 10.1.1',
    first:
      'qubit[5] q; bit[2] c; cx q[0], q[1]; cx q[0], q[2]; x q[1]; cx q[0], q[3]; cx q[1], q[3]; cx q[1], q[4]; cx q[2], q[4]; c[0] = measure q[3]; c[1] = measure q[4]; if (c[0] && !c[1]) x q[0]; if (c[0] && c[1]) x q[1]; if (!c[0] && c[1]) x q[2]; cx q[0], q[2]; cx q[0], q[1]; c[0] = 0; c[1] = 0;',
    second: 'qubit[5] q; bit[2] c;',
    contract: carrying(5, [0], [0]),
  },
  {
    claim: 'the three-bit code does not correct a phase flip',
    source: 'NC section 10.1.2',
    first: 'qubit[3] q; cx q[0], q[1]; cx q[0], q[2]; z q[1]; cx q[0], q[2]; cx q[0], q[1];',
    second: 'qubit[3] q;',
    contract: carrying(3, [0], [0]),
    verdict: 'different',
  },
  ...[2, 3, 4].map(
    (n): Pair => ({
      claim: `Fourier transform and measurement on ${n} wires: conditions in place of controls`,
      source: 'Griffiths, Niu, PRL 76, 3228 (1996)',
      first: fourier(n, 'coherent'),
      second: fourier(n, 'conditions'),
      contract: anyInput,
    }),
  ),
  {
    claim: 'SWAP is three CX',
    source: 'NC figure 1.7',
    first: 'qubit[2] q; swap q[0], q[1];',
    second: 'qubit[2] q; cx q[0], q[1]; cx q[1], q[0]; cx q[0], q[1];',
  },
  {
    claim: 'SWAP is not two CX',
    source: 'Vatan, Williams, PRA 69, 032315 (2004): SWAP needs three',
    first: 'qubit[2] q; swap q[0], q[1];',
    second: 'qubit[2] q; cx q[0], q[1]; cx q[1], q[0];',
    verdict: 'different',
  },
  ...(
    [
      ['x q[0];', 'x q[0]; x q[1];'],
      ['x q[1];', 'x q[1];'],
      ['z q[0];', 'z q[0];'],
      ['z q[1];', 'z q[0]; z q[1];'],
      ['y q[0];', 'y q[0]; x q[1];'],
      ['y q[1];', 'z q[0]; y q[1];'],
    ] as const
  ).map(
    ([before, after]): Pair => ({
      claim: `CX carries ${before} to ${after}`,
      source: 'NC exercise 4.31 and section 10.5.2',
      first: `qubit[2] q; cx q[0], q[1]; ${before} cx q[0], q[1];`,
      second: `qubit[2] q; ${after}`,
    }),
  ),
  {
    claim: 'Toffoli of H, T and CX',
    source: 'NC figure 4.9',
    first: toffoli,
    second: 'qubit[3] q; ccx q[0], q[1], q[2];',
  },
  {
    claim: 'Toffoli with one T turned round',
    source: 'NC figure 4.9, with a slip',
    first: toffoli.replace('t q[1];', 'tdg q[1];'),
    second: 'qubit[3] q; ccx q[0], q[1], q[2];',
    verdict: 'different',
  },
  {
    claim: 'Toffoli of five two-wire gates',
    source: 'Barenco et al., PRA 52, 3457 (1995), lemma 6.1',
    first:
      'qubit[3] q; ctrl @ sx q[1], q[2]; cx q[0], q[1]; ctrl @ inv @ sx q[1], q[2]; cx q[0], q[1]; ctrl @ sx q[0], q[2];',
    second: 'qubit[3] q; ccx q[0], q[1], q[2];',
  },
  {
    claim: 'the relative-phase Toffoli is no Toffoli',
    source: 'Barenco et al., PRA 52, 3457 (1995), section VI B; NC exercise 4.26',
    first: relativePhase,
    second: 'qubit[3] q; ccx q[0], q[1], q[2];',
    verdict: 'different',
  },
  {
    claim: 'but it is one when all three wires are measured',
    source: 'NC exercise 4.26: phases of basis states only',
    first: relativePhase,
    second: 'qubit[3] q; ccx q[0], q[1], q[2];',
    contract: { inputs: 'zero', outputs: 'measured' },
  },
  {
    claim: 'Fredkin is CX, Toffoli, CX',
    source: 'NC exercise 4.25',
    first: 'qubit[3] q; cswap q[0], q[1], q[2];',
    second: 'qubit[3] q; cx q[2], q[1]; ccx q[0], q[1], q[2]; cx q[2], q[1];',
  },
  {
    claim: 'three controls by a work wire that is given back',
    source: 'NC figure 4.10; Barenco et al., PRA 52, 3457 (1995), section VII',
    first: 'qubit[5] q; ccx q[0], q[1], q[3]; ccx q[3], q[2], q[4]; ccx q[0], q[1], q[3];',
    second: 'qubit[5] q; ctrl(3) @ x q[0], q[1], q[2], q[4];',
    contract: carrying(5, [0, 1, 2, 4], [0, 1, 2, 3, 4]),
  },
  {
    claim: 'with a dirty work wire that circuit is another one',
    source:
      'Barenco et al., PRA 52, 3457 (1995), section VII: a work wire of unknown state needs more',
    first: 'qubit[5] q; ccx q[0], q[1], q[3]; ccx q[3], q[2], q[4]; ccx q[0], q[1], q[3];',
    second: 'qubit[5] q; ctrl(3) @ x q[0], q[1], q[2], q[4];',
    contract: kept,
    verdict: 'different',
  },
  {
    claim: 'a controlled U by its ABC decomposition',
    source: 'NC corollary 4.2 and figure 4.6',
    first: 'qubit[2] q; ctrl @ U(0.7, 1.3, -0.4) q[0], q[1];',
    second:
      'qubit[2] q; rz((-0.4 - 1.3)/2.0) q[1]; cx q[0], q[1]; rz(-(1.3 - 0.4)/2.0) q[1]; ry(-0.35) q[1]; cx q[0], q[1]; ry(0.35) q[1]; rz(1.3) q[1]; p((0.7 + 1.3 - 0.4)/2.0) q[0];',
  },
  {
    claim: 'without the phase on the control it is another gate',
    source: 'NC figure 4.5: a controlled phase is a phase of the control',
    first: 'qubit[2] q; ctrl @ U(0.7, 1.3, -0.4) q[0], q[1];',
    second:
      'qubit[2] q; rz((-0.4 - 1.3)/2.0) q[1]; cx q[0], q[1]; rz(-(1.3 - 0.4)/2.0) q[1]; ry(-0.35) q[1]; cx q[0], q[1]; ry(0.35) q[1]; rz(1.3) q[1];',
    verdict: 'different',
  },
  {
    claim: 'HXH = Z, HYH = -Y, HZH = X at once',
    source: 'NC exercise 4.13',
    first: 'qubit[3] q; h q; x q[0]; y q[1]; z q[2]; h q;',
    second: 'qubit[3] q; z q[0]; y q[1]; x q[2];',
  },
  {
    claim: 'a CX turned round by H on both wires',
    source: 'NC exercise 4.20',
    first: 'qubit[2] q; h q; cx q[0], q[1]; h q;',
    second: 'qubit[2] q; cx q[1], q[0];',
  },
  {
    claim: 'the bits of a GHZ state, one wire measured and used again',
    source: 'Greenberger, Horne, Zeilinger (1989); reuse as in arXiv:2210.08039',
    first: 'qubit[3] q; bit[3] c; h q[0]; cx q[0], q[1]; cx q[1], q[2]; c = measure q;',
    second:
      'qubit[2] q; bit[3] c; h q[0]; cx q[0], q[1]; c[0] = measure q[0]; reset q[0]; cx q[1], q[0]; c[1] = measure q[1]; c[2] = measure q[0];',
  },
];

describe('published pairs', () => {
  test.each(PAIRS.map((pair) => [`${pair.claim} (${pair.source})`, pair] as const))(
    '%s',
    (_, { first, second, contract = {}, verdict = 'same' }) => {
      const [a, b] = [read(first), read(second)];
      const report = compareCircuits(a, b, { contract });
      expect(report).toMatchObject({ verdict, proof: true });
      if (verdict === 'same') expect(report.distance!.hilbertSchmidt).toBeLessThan(1e-28);
      else {
        expect(report.distance!.hilbertSchmidt).toBeGreaterThan(1e-3);
        const { probabilityOriginal: p, probabilityRewritten: q } = report.witness!;
        expect(Math.abs(p - q)).toBeGreaterThan(1e-2);
      }
    },
  );

  test('are more than twenty, and some are not equal', () => {
    expect(PAIRS.length).toBeGreaterThan(20);
    expect(PAIRS.filter(({ verdict }) => verdict === 'different').length).toBeGreaterThan(8);
  });
});
