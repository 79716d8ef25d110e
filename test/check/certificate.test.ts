import { createHash } from 'node:crypto';
import { describe, expect, test } from 'vitest';
import {
  certificateOf,
  checkHashes,
  disagreements,
  readCertificate,
} from '../../src/check/certificate.ts';
import { compareCircuits } from '../../src/check/compare.ts';
import { sha256 } from '../../src/check/sha256.ts';
import { InputError } from '../../src/input-error.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

test('SHA-256: the published vectors, and every length across two blocks', () => {
  // FIPS 180-4 examples, from memory
  expect(sha256('abc')).toBe('ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad');
  expect(sha256('')).toBe('e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855');
  for (let length = 0; length < 140; length++) {
    const text = `${'aé€😀'.repeat(40).slice(0, length)}x`;
    const whole = text.replace(/[\ud800-\udbff](?![\udc00-\udfff])/g, '');
    expect(sha256(whole)).toBe(createHash('sha256').update(whole, 'utf8').digest('hex'));
  }
});

const texts = {
  original: {
    name: 'a.qasm',
    text: 'OPENQASM 3;\ninclude "stdgates.inc";\nqubit q;\nh q;\nx q;\nh q;\n',
  },
  rewritten: { name: 'b.qasm', text: 'OPENQASM 3;\ninclude "stdgates.inc";\nqubit q;\nz q;\n' },
};
const compare = (second = texts.rewritten.text) =>
  compareCircuits(
    readCircuit(texts.original.text, 'a.qasm').circuit,
    readCircuit(second, 'b.qasm').circuit,
  );

test('a certificate is read back, and holds against the same texts', () => {
  const certificate = certificateOf(compare(), texts, { tolerance: 1e-10 }, '0.1.0');
  const again = readCertificate(JSON.stringify(certificate), 'c.json');
  expect(again).toEqual(certificate);
  expect(() => checkHashes(again, texts)).not.toThrow();
  expect(disagreements(again, compare())).toEqual([]);
});

test('another text, another answer and half a certificate are told', () => {
  const certificate = certificateOf(compare(), texts, { tolerance: 1e-10 }, '0.1.0');
  const changed = { ...texts, rewritten: { name: 'b.qasm', text: `${texts.rewritten.text}// x` } };
  expect(() => checkHashes(certificate, changed)).toThrow('expected the rewritten text with hash');
  const wrong = compare('OPENQASM 3;\ninclude "stdgates.inc";\nqubit q;\ns q;\n');
  expect(disagreements(certificate, wrong)[0]).toBe('the verdict was same and is different');
  expect(() => readCertificate('{', 'c.json')).toThrow('expected a certificate as JSON');
  expect(() => readCertificate('{"schema": "x"}', 'c.json')).toThrow('got "x"');
  expect(() => certificateOf({ ...compare(), verdict: 'undecided' }, texts, { tolerance: 1e-10 }, '0')).toThrow('got an undecided one'); // biome-ignore format: one check
});

describe('a certificate that was tampered with', () => {
  const whole = () =>
    certificateOf(
      compare('OPENQASM 3;\ninclude "stdgates.inc";\nqubit q;\ns q;\n'),
      texts,
      { tolerance: 1e-10, inputOf: new Map([[0, 'any']]) },
      '0.1.0',
    );
  const different = compare('OPENQASM 3;\ninclude "stdgates.inc";\nqubit q;\ns q;\n');

  test.each<[string, (answer: ReturnType<typeof whole>['answer']) => void]>([
    ['the verdict', (a) => Object.assign(a, { verdict: 'same' })],
    ['the contract', (a) => Object.assign(a, { contract: 'any/measured' })],
    ['the road', (a) => Object.assign(a, { method: 'tableau' })],
    ['the distance', (a) => Object.assign(a.distance!, { hilbertSchmidt: a.distance!.hilbertSchmidt * (1 + 1e-7) })], // biome-ignore format: one line each
    ['the process infidelity', (a) => Object.assign(a.distance!, { processInfidelity: 0.25 })],
    ['the angle', (a) => Object.assign(a.distance!, { angle: a.distance!.angle + 1e-6 })],
    ['the worst case', (a) => Object.assign(a.distance!, { worstCase: null })],
    ['the phase', (a) => Object.assign(a, { phase: (a.phase ?? 0) + 1e-6 })],
    ['the witness', (a) => Object.assign(a.witness!, { input: 'q=0' })],
    ['the probabilities of the witness', (a) => Object.assign(a.witness!, { probabilityOriginal: 0.123 })], // biome-ignore format: one line each
    ['the relabelling', (a) => Object.assign(a, { relabelling: [0] })],
  ])('%s is told', (what, spoil) => {
    const certificate = whole();
    expect(disagreements(certificate, different)).toEqual([]);
    spoil(certificate.answer);
    const again = readCertificate(JSON.stringify(certificate), 'c.json');
    expect(disagreements(again, different).map((said) => said.split(/ (?:was|were) /)[0])).toEqual([
      what,
    ]);
  });

  test('another version may take another road, but not to another answer', () => {
    const certificate = { ...whole(), version: '0.0.9' };
    Object.assign(certificate.answer, { method: 'tableau', distance: null, witness: null });
    expect(disagreements(certificate, different, '0.1.0')).toEqual([]);
    Object.assign(certificate.answer, { verdict: 'same' });
    expect(disagreements(certificate, different, '0.1.0')).toHaveLength(1);
  });

  test('whatever is taken out or put in its place is refused with the name of the part', () => {
    const paths = (value: unknown, before: string[] = []): string[][] =>
      typeof value === 'object' && value !== null && !Array.isArray(value)
        ? Object.entries(value).flatMap(([key, inner]) => [[...before, key], ...paths(inner, [...before, key])]) // biome-ignore format: one list
        : [];
    let refused = 0;
    for (const path of paths(whole())) {
      for (const value of [undefined, null, 7, -1, 'x', [], [[]], [['0', 'any']], {}, true]) {
        const copy = structuredClone(whole()) as unknown as { [key: string]: unknown };
        let place = copy;
        for (const key of path.slice(0, -1)) place = place[key] as { [key: string]: unknown };
        if (value === undefined) delete place[path.at(-1)!];
        else place[path.at(-1)!] = value;
        try {
          const again = readCertificate(JSON.stringify(copy), 'c.json');
          disagreements(again, different);
        } catch (error) {
          if (!(error instanceof InputError)) throw error;
          expect(error.message).toMatch(/^expected a (whole certificate|certificate of schema)/);
          refused++;
        }
      }
    }
    expect(refused).toBeGreaterThan(150);
    for (const text of ['', 'null', '[]', '7', '"x"', '{"__proto__": {"schema": "x"}}', '['.repeat(50_000)]) {
      expect(() => readCertificate(text, 'c.json')).toThrow(InputError);
    } // biome-ignore format: one loop
  });
});
