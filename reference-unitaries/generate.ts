/**
 * Makes the reference unitaries again from their formulas: `npx tsx reference-unitaries/generate.ts`.
 *
 * Every file is a Matrix Market matrix; manifest.json says what it is, from where, how many CX it is known to need
 * and its checksum. Convention: wire 0 is the most significant bit; `line` means links 0-1, 1-2, ... only.
 * The random samples come from `haarUnitary` (Gaussian matrix, Gram-Schmidt; Mezzadri 2007) with the generator
 * `random(seed, name)` of src/numeric/random.ts (xoshiro128++), so they can be made again anywhere.
 */
import { createHash } from 'node:crypto';
import { writeFileSync } from 'node:fs';
import { random } from '../src/numeric/random.ts';
import { haarUnitary } from '../src/numeric/svd.ts';
import { readExpression } from '../src/read/expression.ts';
import { writeMatrixMarket } from '../src/write/matrix-market.ts';

type Count = {
  cx: number;
  /** theorem: cannot be beaten; published: best in print; found: an upper bound found by search. */
  known: 'theorem' | 'published' | 'found';
  source: string;
};

type Row = {
  name: string;
  wires: number;
  what: string;
  source: string;
  /** An expression, or a permutation of basis states (image of each), or a maker's name. */
  formula: string;
  all?: Count;
  line?: Count;
};

const shende2004 = 'Shende, Bullock, Markov, PRA 70, 012310 (2004)';
const shende2009 = 'Shende, Markov, QIC 9, 461 (2009)';
const counted = (cx: number, known: Count['known'], source: string): Count => ({
  cx,
  known,
  source,
});
const search = 'exhaustive placement with 60 to 240 random starts each';
const dimension =
  'dimension bound of Shende, Markov, Bullock, PRA 69, 062321 (2004), reached by search';

const rows: Row[] = [
  { name: 'cx', wires: 2, what: 'controlled X', source: 'textbook', formula: 'cx', all: counted(1, 'theorem', shende2004) },
  { name: 'cz', wires: 2, what: 'controlled Z', source: 'textbook', formula: 'cz', all: counted(1, 'theorem', shende2004) },
  { name: 'controlled-s', wires: 2, what: 'controlled S', source: 'Makhlin, Quantum Inf. Process. 1, 243 (2002)', formula: 'cp(pi/2)', all: counted(2, 'theorem', shende2004) },
  { name: 'swap', wires: 2, what: 'exchange of two wires', source: 'textbook', formula: 'swap', all: counted(3, 'theorem', shende2004) },
  { name: 'sqrt-swap', wires: 2, what: 'square root of SWAP, principal', source: 'Makhlin, Quantum Inf. Process. 1, 243 (2002)', formula: 'swap^0.5', all: counted(3, 'theorem', shende2004) },
  { name: 'iswap', wires: 2, what: 'exp(i pi/4 (XX + YY))', source: 'Makhlin, Quantum Inf. Process. 1, 243 (2002)', formula: 'expm(i*pi/4*(kron(x,x)+kron(y,y)))', all: counted(2, 'theorem', shende2004) },
  { name: 'sqrt-iswap', wires: 2, what: 'exp(i pi/8 (XX + YY))', source: 'Huang et al., PRL 130, 070601 (2023)', formula: 'expm(i*pi/8*(kron(x,x)+kron(y,y)))', all: counted(2, 'theorem', shende2004) },
  { name: 'b-gate', wires: 2, what: 'exp(i pi/4 XX + i pi/8 YY)', source: 'Zhang, Vala, Sastry, Whaley, PRL 93, 020502 (2004)', formula: 'expm(i*pi/4*kron(x,x)+i*pi/8*kron(y,y))', all: counted(2, 'theorem', shende2004) },
  { name: 'fourier-2', wires: 2, what: 'Fourier transform with reversal', source: 'textbook', formula: 'fourier', all: counted(3, 'theorem', shende2004) },
  { name: 'haar-2', wires: 2, what: 'random, Haar measure, seed 1', source: 'Mezzadri, Notices AMS 54, 592 (2007)', formula: 'haar', all: counted(3, 'theorem', shende2004) },
  { name: 'toffoli', wires: 3, what: 'controls 0 and 1, target 2', source: 'textbook', formula: 'ccx', all: counted(6, 'theorem', shende2009), line: counted(8, 'published', 'Shende, Markov 2009; search agrees') },
  { name: 'ccz', wires: 3, what: 'doubly controlled Z', source: 'textbook', formula: 'ccz', all: counted(6, 'theorem', shende2009), line: counted(8, 'found', search) },
  { name: 'fredkin', wires: 3, what: 'control 0 exchanges 1 and 2', source: 'textbook', formula: 'cswap', all: counted(7, 'found', search), line: counted(8, 'found', search) },
  { name: 'fredkin-middle', wires: 3, what: 'control 1 exchanges 0 and 2', source: 'textbook', formula: 'permutation 0 1 2 6 4 5 3 7', all: counted(7, 'found', search), line: counted(10, 'found', search) },
  { name: 'peres', wires: 3, what: '|a, b, c> to |a, a xor b, c xor ab>', source: 'Peres, PRA 32, 3266 (1985)', formula: 'kron(cx,id)*ccx', all: counted(5, 'found', search), line: counted(7, 'found', search) },
  { name: 'peres-middle', wires: 3, what: 'the same with the last target on wire 1: |a, c, b> to |a, c xor ab, a xor b>', source: 'Peres, PRA 32, 3266 (1985)', formula: 'permutation 0 1 2 3 5 6 7 4', all: counted(5, 'found', search), line: counted(6, 'found', search) },
  { name: 'relative-phase-toffoli', wires: 3, what: 'Toffoli up to phases, controls 0 and 1, target 2', source: 'Song, Klappenecker, quant-ph/0312225', formula: 'rccx', all: counted(3, 'theorem', 'Song, Klappenecker, quant-ph/0312225'), line: counted(5, 'found', search) },
  { name: 'relative-phase-toffoli-middle', wires: 3, what: 'the same, controls 0 and 2, target 1', source: 'Song, Klappenecker, quant-ph/0312225', formula: 'kron(id,swap)*rccx*kron(id,swap)', all: counted(3, 'theorem', 'Song, Klappenecker, quant-ph/0312225'), line: counted(3, 'theorem', 'Song, Klappenecker, quant-ph/0312225') },
  { name: 'fourier-3', wires: 3, what: 'Fourier transform with reversal', source: 'textbook', formula: 'fourier', all: counted(6, 'found', search), line: counted(7, 'found', search) },
  { name: 'fourier-3-unreversed', wires: 3, what: 'Fourier transform without reversal', source: 'textbook', formula: 'fourier unreversed', all: counted(5, 'found', search), line: counted(6, 'found', search) },
  { name: 'cyclic-shift-3', wires: 3, what: 'wire k to wire k+1 mod 3', source: 'textbook', formula: 'permutation 0 4 1 5 2 6 3 7', all: counted(6, 'theorem', 'arXiv:2408.07898 (with CX only)') },
  { name: 'haar-3', wires: 3, what: 'random, Haar measure, seed 1', source: 'Mezzadri, Notices AMS 54, 592 (2007)', formula: 'haar', all: counted(14, 'theorem', dimension), line: counted(14, 'theorem', dimension) },
  { name: 'cccz', wires: 4, what: 'three-controlled Z', source: 'textbook', formula: 'diag([1,1,1,1,1,1,1,1,1,1,1,1,1,1,1,-1])', all: counted(14, 'published', 'Madden, Simonetto, ACM TQC 3(2) (2022)'), line: counted(18, 'published', 'phase polynomial') },
  { name: 'fourier-4', wires: 4, what: 'Fourier transform with reversal', source: 'textbook', formula: 'fourier', all: counted(11, 'found', search), line: counted(14, 'found', search) },
  { name: 'fourier-4-unreversed', wires: 4, what: 'Fourier transform without reversal', source: 'textbook', formula: 'fourier unreversed', all: counted(9, 'found', search) },
  { name: 'haar-4', wires: 4, what: 'random, Haar measure, seed 1', source: 'Mezzadri, Notices AMS 54, 592 (2007)', formula: 'haar', all: counted(61, 'theorem', dimension), line: counted(61, 'theorem', dimension) },
  { name: 'four-controlled-x', wires: 5, what: 'controls 0 to 3, target 4', source: 'textbook', formula: 'c4x', line: counted(48, 'published', 'Quantum 7, 993 (2023)') },
]; // biome-ignore format: a table

function permutation(images: readonly number[]): Float64Array {
  const n = images.length;
  const out = new Float64Array(2 * n * n);
  images.forEach((to, from) => {
    out[to * n + from] = 1;
  });
  return out;
}

/** exp(2 pi i j k / d) / sqrt d; unreversed: output bits in the opposite order. */
function fourier(wires: number, isReversed: boolean): Float64Array {
  const d = 2 ** wires;
  const out = new Float64Array(2 * d * d);
  for (let j = 0; j < d; j++) {
    const row = isReversed ? j : reverseBits(j, wires);
    for (let k = 0; k < d; k++) {
      const angle = (2 * Math.PI * ((j * k) % d)) / d;
      out[row * d + k] = Math.cos(angle) / Math.sqrt(d);
      out[d * d + row * d + k] = Math.sin(angle) / Math.sqrt(d);
    }
  }
  return out;
}

function reverseBits(index: number, wires: number): number {
  let out = 0;
  for (let k = 0; k < wires; k++) if (index & (1 << k)) out |= 1 << (wires - 1 - k);
  return out;
}

export async function referenceMatrix({ name, wires, formula }: Row): Promise<Float64Array> {
  const [kind, ...rest] = formula.split(' ');
  if (kind === 'permutation') return permutation(rest.map(Number));
  if (kind === 'fourier') return fourier(wires, rest[0] !== 'unreversed');
  if (kind === 'haar') return haarUnitary(2 ** wires, random(1, name));
  return (await readExpression(formula)).matrix;
}

export { rows as referenceRows };

const isMain = process.argv[1]?.endsWith('reference-unitaries/generate.ts');
if (isMain) {
  const entries = [];
  for (const row of rows) {
    const d = 2 ** row.wires;
    const matrix = await referenceMatrix(row);
    const text = writeMatrixMarket(matrix, d, d, [
      `${row.name}: ${row.what}`,
      `source: ${row.source}`,
    ]);
    const file = `${row.name}.mtx`;
    writeFileSync(new URL(file, import.meta.url), text);
    const sha256 = createHash('sha256').update(text).digest('hex');
    const { all, line } = row;
    entries.push({
      file,
      wires: row.wires,
      what: row.what,
      source: row.source,
      formula: row.formula,
      toleranceAbs: 1e-15 * d,
      entanglers: { ...(all ? { all } : {}), ...(line ? { line } : {}) },
      sha256,
    });
  }
  const manifest = {
    convention:
      'wire 0 is the most significant bit; entries column by column; CX counts without one-wire gates',
    generator: 'npx tsx reference-unitaries/generate.ts',
    unitaries: entries,
  };
  writeFileSync(
    new URL('manifest.json', import.meta.url),
    `${JSON.stringify(manifest, null, 2)}\n`,
  );
}
