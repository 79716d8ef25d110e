import { createHash } from 'node:crypto';
import { readdirSync, readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { referenceMatrix, referenceRows } from '../../reference-unitaries/generate.ts';
import { unitarityError } from '../../src/numeric/complex-matrix.ts';
import { readMatrixMarket } from '../../src/read/matrix-market.ts';
import { checkUnitary } from '../../src/read/unitary.ts';

const folder = new URL('../../reference-unitaries/', import.meta.url);
const manifest = JSON.parse(readFileSync(new URL('manifest.json', folder), 'utf8')) as {
  unitaries: {
    file: string;
    wires: number;
    source: string;
    toleranceAbs: number;
    sha256: string;
    entanglers: { all?: { cx: number }; line?: { cx: number } };
  }[];
};

test('every file of the folder is in the manifest, and the other way round', () => {
  const files = readdirSync(folder).filter((file) => file.endsWith('.mtx'));
  expect(files.sort()).toEqual(manifest.unitaries.map(({ file }) => file).sort());
  expect(manifest.unitaries.length).toBeGreaterThanOrEqual(15);
});

describe.each(manifest.unitaries)(
  '$file',
  ({ file, wires, source, toleranceAbs, sha256, entanglers }) => {
    const text = readFileSync(new URL(file, folder), 'utf8');
    const read = readMatrixMarket(text, file);

    test('has its checksum, a source, and is unitary within its tolerance', () => {
      expect(createHash('sha256').update(text).digest('hex')).toBe(sha256);
      expect(source).not.toBe('');
      expect(checkUnitary(read, file)).toMatchObject({ wires, notes: [] });
      expect(unitarityError(read.matrix, 2 ** wires)).toBeLessThan(toleranceAbs);
    });

    test('is what its formula gives', async () => {
      const row = referenceRows.find(({ name }) => `${name}.mtx` === file)!;
      const made = await referenceMatrix(row);
      const gap = made.reduce((worst, x, k) => Math.max(worst, Math.abs(x - read.matrix[k]!)), 0);
      expect(gap).toBeLessThan(toleranceAbs);
    });

    test('a known count respects the bound for generic gates: (4^n - 3n - 1)/4 CX suffice', () => {
      // Shende, Markov, Bullock, PRA 69, 062321 (2004); on a line more may be needed for special gates
      const generic = Math.ceil((4 ** wires - 3 * wires - 1) / 4);
      if (entanglers.all) expect(entanglers.all.cx).toBeLessThanOrEqual(generic);
    });
  },
);
