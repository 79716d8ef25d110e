/**
 * Reads a matrix from an expression such as `kron(h, id) * cx`, `expm(i*pi/4*kron(x, x))` or
 * `[[1, 0], [0, exp(i*pi/8)]]`.
 *
 * Shape: the result is planar and row-major. A number counts as a 1 x 1 matrix.
 * Method: mathjs parses (loaded when first needed), and only the node types, operators, functions and names
 * listed here are then evaluated, by our own complex arithmetic; nothing of the text is ever run.
 * Names: i, pi, tau, e, and every gate of the table (`cx`, `swap`, `rz(pi/4)`, ...). Functions: kron, expm,
 * adjoint, transpose, conj, inv, diag, identity, trace, exp, sqrt, sin, cos, tan, abs. Operators: + - * / ^ and
 * ' (conjugate transpose). A matrix to a fractional power needs a unitary matrix: the principal power.
 * expm: through the eigenvectors for i times a Hermitian matrix, else Taylor series with scaling and squaring
 * (Moler, Van Loan, SIAM Review 45, 3 (2003), method 3).
 * Fails: InputError with the column where it is known; sizes beyond `EXPRESSION_SIZE_MAX` rows and more work than
 * `EXPRESSION_WORK_MAX` are refused before they are computed.
 */
import { gateTable } from '../circuit/gates.ts';
import { InputError, nearestWord } from '../input-error.ts';
import {
  adjoint,
  identity,
  kron,
  mul,
  normSquared,
  unitarityError,
} from '../numeric/complex-matrix.ts';
import { fromEigen, hermitianEigen } from '../numeric/hermitian-eigen.ts';
import { unitaryPower } from '../numeric/unitary-eigen.ts';
import type { ReadMatrix } from './matrix-market.ts';

export const EXPRESSION_SIZE_MAX = 256;
export const EXPRESSION_LENGTH_MAX = 100_000;
const NESTING_MAX = 200;
/** Multiplications of two numbers in the matrix products of one expression: 30 products of 256 x 256 matrices. */
export const EXPRESSION_WORK_MAX = 5e8;

/** What we use of a parsed node: mathjs's own types are wider and need its DOM-free build to be loaded. */
type Node = {
  readonly type: string;
  readonly name?: string;
  readonly value?: unknown;
  readonly op?: string;
  readonly fn?: unknown;
  readonly args?: readonly Node[];
  readonly items?: readonly Node[];
  readonly content?: Node;
};

type Value = ReadMatrix;

export async function readExpression(text: string): Promise<ReadMatrix> {
  checkSize(text);
  const { parse } = await import('mathjs/number');
  let root: Node;
  try {
    root = parse(text) as unknown as Node; // only the fields of Node are read, and each is checked
  } catch (error) {
    const reason = error instanceof Error ? error.message : String(error);
    const place = /\(char (\d+)\)$/.exec(reason);
    throw new InputError({
      code: 'bad-expression',
      message: `expected a matrix expression, got a mistake in it: ${lowerFirst(reason.replace(/ \(char \d+\)$/, ''))}`,
      file: 'expression',
      ...(place ? { line: 1, column: Number(place[1]) } : {}),
      hint: 'for example: kron(h, id) * cx',
    });
  }
  return evaluate(root, { work: 0 });
}

function lowerFirst(text: string): string {
  return text.charAt(0).toLowerCase() + text.slice(1);
}

function fail(code: string, message: string, hint?: string): never {
  throw new InputError({ code, message, file: 'expression', ...(hint ? { hint } : {}) });
}

function checkSize(text: string): void {
  if (text.length > EXPRESSION_LENGTH_MAX) {
    fail(
      'too-large',
      `expression must be at most ${EXPRESSION_LENGTH_MAX} characters, got ${text.length}`,
    );
  }
  let depth = 0;
  for (const character of text) {
    if (character === '(' || character === '[') depth++;
    if (character === ')' || character === ']') depth--;
    if (depth > NESTING_MAX)
      fail('too-deep', `expected at most ${NESTING_MAX} open brackets, got more`);
  }
}

function scalar(re: number, im = 0): Value {
  return { matrix: new Float64Array([re, im]), rows: 1, columns: 1 };
}

function isScalar({ rows, columns }: Value): boolean {
  return rows === 1 && columns === 1;
}

const CONSTANTS = new Map<string, Value>([
  ['i', scalar(0, 1)],
  ['pi', scalar(Math.PI)],
  ['tau', scalar(2 * Math.PI)],
  ['e', scalar(Math.E)],
]);

/** A constant as messages show it; an empty expression parses to a constant without a value. */
function shownConstant(value: unknown): string {
  if (value === undefined) return 'nothing';
  return (typeof value === 'string' ? JSON.stringify(value) : String(value)).slice(0, 60);
}

/** What the expression has cost so far, in multiplications of numbers. */
type Spent = { work: number };

/** Counts an operation before it is done; its cost is that of the slowest way it may take. */
function spend(spent: Spent, name: string, args: readonly Value[]): void {
  const [a, b] = args;
  if (!a) return;
  const cube = a.rows * a.columns * Math.max(a.rows, a.columns);
  const size = args.reduce((product, { rows, columns }) => product * rows * columns, 1);
  const exponent = Math.log2(2 + Math.abs(b?.matrix[0] ?? 0));
  const costs: { readonly [name: string]: number } = {
    multiply: a.rows * a.columns * (b?.columns ?? 1),
    divide: 2 * (b ? b.rows ** 3 : 1) + cube,
    pow: cube * (20 + 2 * Math.min(exponent, 32)),
    expm: 20 * cube,
    inv: 2 * cube,
    kron: size,
  };
  const isListed = Object.hasOwn(costs, name);
  spent.work += args.every(isScalar) ? 1 : isListed ? costs[name]! : 30 * a.rows * a.columns;
  if (spent.work <= EXPRESSION_WORK_MAX) return;
  fail(
    'too-large',
    `an expression of more than ${EXPRESSION_WORK_MAX} multiplications of numbers`,
    'compute it beforehand and write it to a .mtx file',
  );
}

function evaluate(node: Node, spent: Spent, depth = 0): Value {
  if (depth > 10 * NESTING_MAX)
    fail('too-deep', 'expected a shorter expression, got one nested too deeply');
  const inner = (child: Node): Value => evaluate(child, spent, depth + 1);
  switch (node.type) {
    case 'ConstantNode':
      if (typeof node.value === 'number' && Number.isFinite(node.value)) return scalar(node.value);
      return fail('bad-constant', `expected a finite number, got ${shownConstant(node.value)}`);
    case 'ParenthesisNode':
      return inner(node.content!); // a ParenthesisNode has content
    case 'SymbolNode':
      return named(node.name ?? '', []);
    case 'ArrayNode':
      return matrixOf(node, inner);
    case 'OperatorNode':
      return operator(node, spent, (node.args ?? []).map(inner));
    case 'FunctionNode': {
      const name = typeof node.fn === 'object' ? ((node.fn as Node).name ?? '') : String(node.fn);
      const args = (node.args ?? []).map(inner);
      spend(spent, name, args);
      return named(name, args);
    }
    default:
      return fail(
        'not-allowed',
        `expected numbers, matrices, operators and functions, got ${kindOf(node)}`,
      );
  }
}

function kindOf({ type }: Node): string {
  const words = type.replace(/Node$/, '').replace(/([a-z])([A-Z])/g, '$1 $2');
  return words.toLowerCase();
}

function matrixOf(node: Node, inner: (child: Node) => Value): Value {
  const rowNodes = node.items ?? [];
  const rows = rowNodes.map((row) => (row.type === 'ArrayNode' ? (row.items ?? []) : [row]));
  const columns = rows[0]?.length ?? 0;
  if (columns === 0) fail('empty-matrix', 'expected a matrix with entries, got an empty one');
  if (rows.length > EXPRESSION_SIZE_MAX || columns > EXPRESSION_SIZE_MAX)
    tooLarge(rows.length, columns);
  const out = new Float64Array(2 * rows.length * columns);
  rows.forEach((row, i) => {
    if (row.length !== columns) {
      fail('ragged-matrix', `expected ${columns} entries in row ${i + 1}, got ${row.length}`);
    }
    row.forEach((entry, j) => {
      const value = inner(entry);
      if (!isScalar(value)) fail('bad-entry', `expected a number in row ${i + 1}, got a matrix`);
      out[i * columns + j] = value.matrix[0]!;
      out[rows.length * columns + i * columns + j] = value.matrix[1]!;
    });
  });
  return { matrix: out, rows: rows.length, columns };
}

function tooLarge(rows: number, columns: number): never {
  return fail(
    'too-large',
    `matrices in an expression must be at most ${EXPRESSION_SIZE_MAX} rows, got ${rows}x${columns}`,
    'write a larger one to a .mtx file',
  );
}

function operator(node: Node, spent: Spent, args: readonly Value[]): Value {
  spend(spent, String(node.fn), args);
  const [a, b] = args;
  if (args.length === 1 && a) {
    if (node.fn === 'unaryMinus') return times(scalar(-1), a);
    if (node.fn === 'unaryPlus') return a;
    if (node.fn === 'ctranspose') return dagger(a);
  }
  if (a && b) {
    if (node.fn === 'add') return sum(a, b, 1);
    if (node.fn === 'subtract') return sum(a, b, -1);
    if (node.fn === 'multiply') return times(a, b);
    if (node.fn === 'divide') return times(a, reciprocal(b));
    if (node.fn === 'pow') return power(a, b);
  }
  return fail('unknown-operator', `unknown operator: ${node.op}`, "known: + - * / ^ '");
}

function dagger({ matrix, rows, columns }: Value): Value {
  return { matrix: adjoint(matrix, rows, columns), rows: columns, columns: rows };
}

function sum(a: Value, b: Value, sign: number): Value {
  if (a.rows !== b.rows || a.columns !== b.columns) mismatch('a sum', a, b);
  const matrix = new Float64Array(a.matrix.length);
  for (let k = 0; k < matrix.length; k++) matrix[k] = a.matrix[k]! + sign * b.matrix[k]!;
  return { ...a, matrix };
}

function mismatch(what: string, a: Value, b: Value): never {
  const sizes = `${a.rows}x${a.columns} and ${b.rows}x${b.columns}`;
  return fail('size-mismatch', `expected sizes that fit for ${what}, got ${sizes}`);
}

function times(a: Value, b: Value): Value {
  if (isScalar(a)) return scale(b, a.matrix[0]!, a.matrix[1]!);
  if (isScalar(b)) return scale(a, b.matrix[0]!, b.matrix[1]!);
  if (a.columns !== b.rows) mismatch('a product', a, b);
  const matrix = mul(a.matrix, b.matrix, a.rows, a.columns, b.columns);
  return { matrix, rows: a.rows, columns: b.columns };
}

function scale({ matrix, rows, columns }: Value, re: number, im: number): Value {
  const half = rows * columns;
  const out = new Float64Array(2 * half);
  for (let k = 0; k < half; k++) {
    out[k] = re * matrix[k]! - im * matrix[half + k]!;
    out[half + k] = re * matrix[half + k]! + im * matrix[k]!;
  }
  return { matrix: out, rows, columns };
}

function reciprocal(value: Value): Value {
  if (!isScalar(value)) return inverse(value);
  const [re, im] = value.matrix as unknown as [number, number]; // a scalar has two entries
  const size = re * re + im * im;
  if (size === 0) fail('division-by-zero', 'expected a divisor other than zero, got 0');
  return scalar(re / size, -im / size);
}

function requireSquare(value: Value, what: string): number {
  if (value.rows !== value.columns) {
    fail('not-square', `expected a square matrix for ${what}, got ${value.rows}x${value.columns}`);
  }
  return value.rows;
}

/** Gauss-Jordan elimination with row pivoting. */
function inverse(value: Value): Value {
  const n = requireSquare(value, 'inv');
  const a = value.matrix.slice();
  const out = identity(n);
  const im = n * n;
  const size = Math.sqrt(normSquared(a));
  for (let k = 0; k < n; k++) {
    let pivot = k;
    const sizeAt = (row: number): number => Math.hypot(a[row * n + k]!, a[im + row * n + k]!);
    for (let row = k + 1; row < n; row++) if (sizeAt(row) > sizeAt(pivot)) pivot = row;
    if (sizeAt(pivot) <= 1e-15 * size)
      fail('singular', 'expected a matrix with an inverse, got a singular one');
    for (const m of [a, out]) swapRows(m, n, k, pivot);
    const [re, imag] = [a[k * n + k]!, a[im + k * n + k]!];
    const norm = re * re + imag * imag;
    for (const m of [a, out]) scaleRow(m, n, k, re / norm, -imag / norm);
    for (let row = 0; row < n; row++) {
      if (row === k) continue;
      const [x, y] = [a[row * n + k]!, a[im + row * n + k]!];
      if (x === 0 && y === 0) continue;
      for (const m of [a, out]) subtractRow(m, n, row, k, x, y);
    }
  }
  return { ...value, matrix: out };
}

function swapRows(m: Float64Array, n: number, p: number, q: number): void {
  if (p === q) return;
  for (const base of [0, n * n]) {
    const row = m.slice(base + p * n, base + p * n + n);
    m.copyWithin(base + p * n, base + q * n, base + q * n + n);
    m.set(row, base + q * n);
  }
}

function scaleRow(m: Float64Array, n: number, row: number, re: number, im: number): void {
  for (let k = row * n; k < row * n + n; k++) {
    const [x, y] = [m[k]!, m[n * n + k]!];
    m[k] = re * x - im * y;
    m[n * n + k] = re * y + im * x;
  }
}

function subtractRow(
  m: Float64Array,
  n: number,
  row: number,
  from: number,
  x: number,
  y: number,
): void {
  for (let k = 0; k < n; k++) {
    const [a, b] = [m[from * n + k]!, m[n * n + from * n + k]!];
    m[row * n + k]! -= x * a - y * b;
    m[n * n + row * n + k]! -= x * b + y * a;
  }
}

function power(base: Value, exponent: Value): Value {
  if (!isScalar(exponent) || exponent.matrix[1] !== 0) {
    return fail('bad-exponent', 'expected a real number as exponent, got something else');
  }
  const x = exponent.matrix[0]!;
  if (isScalar(base)) {
    const [re, im] = [base.matrix[0]!, base.matrix[1]!];
    const size = Math.hypot(re, im);
    if (size === 0) return scalar(x === 0 ? 1 : 0);
    if (im === 0 && Number.isInteger(x)) return scalar(re ** x);
    const angle = x * Math.atan2(im, re);
    return scalar(size ** x * Math.cos(angle), size ** x * Math.sin(angle));
  }
  const n = requireSquare(base, '^');
  if (!Number.isInteger(x)) {
    if (unitarityError(base.matrix, n) > 1e-9) {
      fail('bad-exponent', `expected a whole exponent for a matrix that is not unitary, got ${x}`);
    }
    return { ...base, matrix: unitaryPower(base.matrix, n, x) };
  }
  if (Math.abs(x) > 1e9) fail('bad-exponent', `exponent must be in [-1e9, 1e9], got ${x}`);
  let square = x < 0 ? inverse(base) : base;
  let result: Value = { ...base, matrix: identity(n) };
  for (let k = Math.abs(x); k >= 1; k = Math.floor(k / 2)) {
    if (k % 2 === 1) result = times(square, result);
    square = times(square, square);
  }
  return result;
}

/** Functions of one argument that work on numbers only. */
const NUMBER_FUNCTIONS: { readonly [name: string]: (x: number, y: number) => Value } = {
  exp: (x, y) => scalar(Math.exp(x) * Math.cos(y), Math.exp(x) * Math.sin(y)),
  sqrt: (x, y) => {
    const [size, angle] = [Math.sqrt(Math.hypot(x, y)), Math.atan2(y, x) / 2];
    return y === 0 && x >= 0
      ? scalar(size)
      : scalar(size * Math.cos(angle), size * Math.sin(angle));
  },
  cos: (x, y) => scalar(Math.cos(x) * Math.cosh(y), -Math.sin(x) * Math.sinh(y)),
  sin: (x, y) => scalar(Math.sin(x) * Math.cosh(y), Math.cos(x) * Math.sinh(y)),
  abs: (x, y) => scalar(Math.hypot(x, y)),
};

const MATRIX_FUNCTIONS: { readonly [name: string]: (a: Value) => Value } = {
  expm: exponential,
  adjoint: dagger,
  ctranspose: dagger,
  inv: (a) => (isScalar(a) ? reciprocal(a) : inverse(a)),
  conj: (a) => dagger(transpose(a)),
  transpose,
  trace: (a) => {
    const n = requireSquare(a, 'trace');
    let [re, im] = [0, 0];
    for (let k = 0; k < n; k++) {
      re += a.matrix[k * n + k]!;
      im += a.matrix[n * n + k * n + k]!;
    }
    return scalar(re, im);
  },
  diag: (a) => {
    const n = a.rows * a.columns;
    if (Math.min(a.rows, a.columns) !== 1)
      fail('bad-argument', 'expected a list of numbers for diag');
    if (n > EXPRESSION_SIZE_MAX) tooLarge(n, n);
    const matrix = new Float64Array(2 * n * n);
    for (let k = 0; k < n; k++) {
      matrix[k * n + k] = a.matrix[k]!;
      matrix[n * n + k * n + k] = a.matrix[n + k]!;
    }
    return { matrix, rows: n, columns: n };
  },
  identity: (a) => {
    const n = a.matrix[0]!;
    if (!isScalar(a) || !Number.isInteger(n) || n < 1) {
      return fail(
        'bad-argument',
        `expected a size for identity, got ${isScalar(a) ? n : 'a matrix'}`,
      );
    }
    if (n > EXPRESSION_SIZE_MAX) tooLarge(n, n);
    return { matrix: identity(n), rows: n, columns: n };
  },
};

function transpose({ matrix, rows, columns }: Value): Value {
  const out = new Float64Array(matrix.length);
  for (const base of [0, rows * columns]) {
    for (let i = 0; i < rows; i++) {
      for (let j = 0; j < columns; j++) out[base + j * rows + i] = matrix[base + i * columns + j]!;
    }
  }
  return { matrix: out, rows: columns, columns: rows };
}

function named(name: string, args: readonly Value[]): Value {
  const [first] = args;
  if (args.length === 0) {
    const constant = CONSTANTS.get(name);
    if (constant) return constant;
  }
  const numberFunction = Object.hasOwn(NUMBER_FUNCTIONS, name) ? NUMBER_FUNCTIONS[name] : undefined;
  const matrixFunction = Object.hasOwn(MATRIX_FUNCTIONS, name) ? MATRIX_FUNCTIONS[name] : undefined;
  if (name === 'tan' && first) return times(named('sin', args), reciprocal(named('cos', args)));
  if (numberFunction || matrixFunction) {
    if (args.length !== 1 || !first)
      fail('bad-argument', `expected 1 argument for ${name}, got ${args.length}`);
    if (matrixFunction) return matrixFunction(first);
    if (!isScalar(first)) fail('bad-argument', `expected a number for ${name}, got a matrix`, 'the exponential of a matrix is expm'); // biome-ignore format: one call
    return numberFunction!(first.matrix[0]!, first.matrix[1]!); // one of the two is there
  }
  if (name === 'kron') {
    if (args.length < 2)
      fail('bad-argument', `expected 2 arguments or more for kron, got ${args.length}`);
    return args.reduce((a, b) => {
      if (a.rows * b.rows > EXPRESSION_SIZE_MAX || a.columns * b.columns > EXPRESSION_SIZE_MAX) {
        tooLarge(a.rows * b.rows, a.columns * b.columns);
      }
      const matrix = kron(a.matrix, b.matrix, a.rows, b.rows, a.columns, b.columns);
      return { matrix, rows: a.rows * b.rows, columns: a.columns * b.columns };
    });
  }
  return gateNamed(name, args);
}

function gateNamed(name: string, args: readonly Value[]): Value {
  const entry = gateTable.get(name);
  if (!entry) {
    const known = [
      ...CONSTANTS.keys(),
      ...Object.keys(NUMBER_FUNCTIONS),
      ...Object.keys(MATRIX_FUNCTIONS),
      'tan',
      'kron',
      ...gateTable.keys(),
    ];
    const near = nearestWord(name, known);
    return fail(
      'unknown-name',
      `unknown name in an expression: ${name.slice(0, 60)}`,
      near && `did you mean ${near}?`,
    );
  }
  if (args.length !== entry.angles) {
    fail('bad-argument', `expected ${entry.angles} angles for gate ${name}, got ${args.length}`);
  }
  const angles = args.map((a) => {
    if (!isScalar(a) || a.matrix[1] !== 0)
      fail('bad-argument', `expected real angles for gate ${name}`);
    return a.matrix[0]!;
  });
  const size = 2 ** entry.wires;
  return { matrix: entry.matrix(angles), rows: size, columns: size };
}

function exponential(a: Value): Value {
  const n = requireSquare(a, 'expm');
  const size = Math.sqrt(normSquared(a.matrix));
  if (!Number.isFinite(size)) return fail('not-finite', 'expected finite entries for expm');
  // i (-i a): Hermitian when a is anti-Hermitian
  const h = scale(a, 0, -1);
  const gap = sum(h, dagger(h), -1);
  if (Math.sqrt(normSquared(gap.matrix)) <= 1e-13 * (size || 1)) {
    const { values, vectors } = hermitianEigen(h.matrix, n);
    return { ...a, matrix: fromEigen(vectors, values.map(Math.cos), values.map(Math.sin), n) };
  }
  const halvings = Math.max(0, Math.ceil(Math.log2(size || 1)) + 1);
  if (halvings > 60)
    return fail('too-large', `expected entries of moderate size for expm, got norm ${size}`);
  const small = scale(a, 2 ** -halvings, 0);
  let term: Value = { ...a, matrix: identity(n) };
  let result = term;
  for (let k = 1; k <= 20; k++) {
    term = scale(times(term, small), 1 / k, 0);
    result = sum(result, term, 1);
  }
  for (let k = 0; k < halvings; k++) result = times(result, result);
  return result;
}
