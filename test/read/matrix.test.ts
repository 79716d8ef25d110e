import { describe, expect, test } from 'vitest';
import { gateTable } from '../../src/circuit/gates.ts';
import { InputError } from '../../src/input-error.ts';
import { unitarityError } from '../../src/numeric/complex-matrix.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { readExpression } from '../../src/read/expression.ts';
import { isMatrixMarket, readMatrixMarket } from '../../src/read/matrix-market.ts';
import { checkUnitary } from '../../src/read/unitary.ts';
import { writeMatrixMarket } from '../../src/write/matrix-market.ts';

const HEADER = '%%MatrixMarket matrix array complex general';

/** `message at line:column` of the one problem. */
async function messageOf(run: () => unknown): Promise<string> {
  try {
    await run();
  } catch (error) {
    if (error instanceof InputError) return error.message;
    throw error;
  }
  return 'no error';
}

describe('Matrix Market', () => {
  test.each([1, 2, 3, 4])('%i wires: what is written reads back to the same bits', (wires) => {
    const n = 2 ** wires;
    const u = haarUnitary(n, random(wires, 'write'));
    const text = writeMatrixMarket(u, n, n, ['gauge 7', 'two\nlines']);
    expect(isMatrixMarket(text)).toBe(true);
    expect(readMatrixMarket(text, 'u.mtx')).toEqual({ matrix: u, rows: n, columns: n });
  });

  test('entries come column by column; real files, comments and spacing are fine', () => {
    const text = `%%MatrixMarket  matrix array real general\n% a comment\n\n 2 2 \n1\n2\n\n3 % here\n4\n`;
    const { matrix } = readMatrixMarket(text, 'r.mtx');
    expect([...matrix]).toEqual([1, 3, 2, 4, 0, 0, 0, 0]);
  });

  test('coordinate files give entries with their places; the rest is 0', () => {
    const text =
      '%%MatrixMarket matrix coordinate complex general\n2 2 3\n1 1 1 0\n2 2 0 -1\n1 2 0.5 2\n';
    const { matrix } = readMatrixMarket(text, 's.mtx');
    expect([...matrix]).toEqual([1, 0.5, 0, 0, 0, 2, 0, -1]);
    const real = readMatrixMarket(
      '%%MatrixMarket matrix coordinate real general\n2 2 1\n2 1 7\n',
      's',
    );
    expect([...real.matrix]).toEqual([0, 0, 7, 0, 0, 0, 0, 0]);
  });

  const SPARSE = '%%MatrixMarket matrix coordinate real general\n2 2 2\n';
  test.each([
    [`${SPARSE}1 1 1\n`, 'expected 2 entries, got 1 at m.mtx:3:6'],
    [`${SPARSE}1 1 1\n1 1 2\n`, 'expected each entry once, got row 1, column 1 again at m.mtx:4:1'],
    [`${SPARSE}1 3 1\n`, 'column must be in [1, 2], got 3 at m.mtx:3:3'],
    [`${SPARSE}0 1 1\n`, 'row must be in [1, 2], got 0 at m.mtx:3:1'],
    [`${SPARSE}1 1 1\n2 2 1\n1 2 1\n`, 'expected 2 entries and no more, got 1 at m.mtx:5:1'],
    [
      `${SPARSE.replace('2 2 2', '2 2 5')}`,
      'number of entries must be in [0, 4], got 5 at m.mtx:2:5',
    ],
  ])('sparse: %j', async (text, message) => {
    expect(await messageOf(() => readMatrixMarket(text, 'm.mtx'))).toContain(message);
  });

  test.each([
    ['', 'expected %%MatrixMarket, got an empty line at m.mtx:1:1'],
    ['1 2', 'expected %%MatrixMarket, got 1 2 at m.mtx:1:1'],
    [
      '%%MatrixMarket matrix list complex general\n',
      'expected array or coordinate, got list at m.mtx:1:23',
    ],
    [
      '%%MatrixMarket matrix array complex\n',
      'expected general, got the end of the line at m.mtx:1:36',
    ],
    [`${HEADER}\n2 x\n`, 'expected the number of columns, got x at m.mtx:2:3'],
    [`${HEADER}\n5000 2\n`, 'number of rows must be in [1, 4096], got 5000 at m.mtx:2:1'],
    [`${HEADER}\n1 1\n1\n`, 'expected 2 numbers, got 1 at m.mtx:3:2'],
    [`${HEADER}\n1 1\n1 0 7\n`, 'expected 2 numbers and no more, got 7 at m.mtx:3:5'],
    [`${HEADER}\n1 1\n1 nan\n`, 'expected a finite number, got nan at m.mtx:3:3'],
    [`${HEADER}\n1 1\n1 1e999\n`, 'expected a finite number, got 1e999 at m.mtx:3:3'],
  ])('%j', async (text, message) => {
    expect(await messageOf(() => readMatrixMarket(text, 'm.mtx'))).toContain(message);
  });
});

describe('checkUnitary', () => {
  const square = (n: number, ...entries: number[]) => {
    const matrix = new Float64Array(2 * n * n);
    matrix.set(entries);
    return { matrix, rows: n, columns: n };
  };

  test.each([
    [{ matrix: new Float64Array(12), rows: 2, columns: 3 }, 'expected a square matrix, got 2x3'],
    [square(3), 'expected 2^n rows for n wires, n >= 1, got 3'],
    [square(1, 1), 'expected 2^n rows for n wires, n >= 1, got 1'],
    [square(2, 1, 0, 0, Number.NaN), 'expected finite entries, got NaN in row 2, column 2'],
    [square(2, 1, 0, 0, 1.5), 'expected a unitary matrix, got one that is off by 1.3e+0'],
  ])('%#: says what is wrong', async (read, message) => {
    expect(await messageOf(() => checkUnitary(read, 'm.mtx'))).toContain(message);
  });

  test('--nearest takes the polar factor and says how far that was', () => {
    const { matrix, notes } = checkUnitary(square(2, 1, 0, 0, 1.5), 'm.mtx', { nearest: true });
    expect(unitarityError(matrix, 2)).toBeLessThan(1e-15);
    expect(matrix[3]).toBeCloseTo(1, 14);
    expect(notes[0]).toContain('off from unitary by 1.3e+0');
  });

  test('few digits in a file are mended with a note, rounding without one', () => {
    const u = haarUnitary(4, random(3));
    const digits = (k: number) => ({
      matrix: u.map((x) => Number(x.toFixed(k))),
      rows: 4,
      columns: 4,
    });
    expect(checkUnitary(digits(9), 'm.mtx').notes).toHaveLength(1);
    expect(checkUnitary(digits(15), 'm.mtx').notes).toHaveLength(0);
    expect(unitarityError(checkUnitary(digits(9), 'm.mtx').matrix, 4)).toBeLessThan(4e-15);
  });
});

describe('expressions', () => {
  const near = (a: Float64Array, b: Float64Array): number =>
    a.reduce((worst, x, k) => Math.max(worst, Math.abs(x - b[k]!)), 0);
  const matrixOf = async (text: string): Promise<Float64Array> =>
    (await readExpression(text)).matrix;
  const table = (name: string, ...angles: number[]): Float64Array =>
    gateTable.get(name)!.matrix(angles);

  // published identities
  test.each([
    ['expm(i*pi/4*(kron(x,x)+kron(y,y)))', table('iswap')], // Makhlin (2002)
    ['expm(i*pi/8*(2*kron(x,x)+kron(y,y)))', table('b')], // Zhang et al. (2004)
    ["kron(id,h)*cz*kron(id,h)'", table('cx')], // textbook
    ['iswap^0.5', table('sqrtiswap')],
    ['x^0.5', table('sx')], // OpenQASM 3: pow(0.5) @ x
    ['[[1,0],[0,exp(i*pi/4)]]', table('t')],
    ['(kron(id,id)+kron(x,x)+kron(y,y)+kron(z,z))/2', table('swap')],
    ['expm(-i*0.3/2*kron(z,z))', table('rzz', 0.3)],
    ['diag([1,1,1,-1])', table('cz')],
    ['conj(s)', table('sdg')],
    ['inv(t)*t^3', table('s')],
    ['transpose(y)', table('y').map((x) => -x)],
    ['cos(0.2)*id - i*sin(0.2)*x', table('rx', 0.4)],
    ['x^-1', table('x')],
  ])('%s', async (text, expected) => {
    expect(near(await matrixOf(text), expected)).toBeLessThan(1e-14);
  });

  test('expm of a matrix that is not anti-Hermitian', async () => {
    // exp [[0,1],[0,0]] = [[1,1],[0,1]]; exp diag(3,-2)
    expect([...(await matrixOf('expm([[0,1],[0,0]])'))].slice(0, 4)).toEqual([1, 1, 0, 1]);
    const d = await matrixOf('expm(diag([3,-2]))');
    expect(d[0]).toBeCloseTo(Math.exp(3), 11);
    expect(d[3]).toBeCloseTo(Math.exp(-2), 14);
  });

  test.each([
    ['kron(x', 'parenthesis ) expected at expression:1:7'],
    ['constructor', 'unknown name in an expression: constructor'],
    ['sqt(2)', 'did you mean sqrt?'],
    ['a = 3', 'got assignment'],
    ['"x"', 'expected a finite number, got "x"'],
    ['1e400', 'expected a finite number, got Infinity'],
    ['h + cx', 'expected sizes that fit for a sum, got 2x2 and 4x4'],
    ['h * cx', 'expected sizes that fit for a product, got 2x2 and 4x4'],
    ['identity(1000)', 'at most 256 rows, got 1000x1000'],
    ['kron(c4x, c4x)', 'at most 256 rows, got 1024x1024'],
    ['exp(x)', 'expected a number for exp, got a matrix'],
    ['x^(1/0)', 'expected a divisor other than zero, got 0'],
    ['[[1, 2], [3]]', 'expected 2 entries in row 2, got 1'],
    ['rz', 'expected 1 angles for gate rz, got 0'],
    ['inv([[1,1],[1,1]])', 'expected a matrix with an inverse'],
    ['f(x) = x', 'got function assignment'],
    [`${'('.repeat(500)}1`, 'expected at most 200 open brackets'],
  ])('%s is refused', async (text, message) => {
    expect(await messageOf(() => readExpression(text))).toContain(message);
  });
});
