import { createHash } from 'node:crypto';
import { expect, test } from 'vitest';
import {
  certificateOf,
  checkHashes,
  disagreements,
  readCertificate,
} from '../../src/check/certificate.ts';
import { compareCircuits } from '../../src/check/compare.ts';
import { sha256 } from '../../src/check/sha256.ts';
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
