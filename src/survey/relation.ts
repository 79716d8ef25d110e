/**
 * A relation between outputs and inputs as bit sets: which inputs each output needs.
 *
 * Shape: rows[output] holds one bit per input, 32 inputs a word, input k in word k >> 5 at bit k & 31.
 */
export type Relation = { outputs: number; inputs: number; rows: readonly Uint32Array[] };

export function wordsFor(inputs: number): number {
  return Math.ceil(inputs / 32);
}

export function emptyRelation(outputs: number, inputs: number): Relation {
  const words = wordsFor(inputs);
  return { outputs, inputs, rows: Array.from({ length: outputs }, () => new Uint32Array(words)) };
}

export function relates({ rows }: Relation, output: number, input: number): boolean {
  return ((rows[output]![input >> 5]! >>> (input & 31)) & 1) === 1;
}

export function relate({ rows }: Relation, output: number, input: number): void {
  rows[output]![input >> 5]! |= 1 << (input & 31);
}

export function bitCount(words: Uint32Array): number {
  let count = 0;
  for (let x of words) {
    x -= (x >>> 1) & 0x55555555;
    x = (x & 0x33333333) + ((x >>> 2) & 0x33333333);
    count += (((x + (x >>> 4)) & 0x0f0f0f0f) * 0x01010101) >>> 24;
  }
  return count;
}

/** The inputs of one row, ascending. */
export function inputsOf(relation: Relation, output: number): number[] {
  const found: number[] = [];
  for (let k = 0; k < relation.inputs; k++) if (relates(relation, output, k)) found.push(k);
  return found;
}

/** Table entries above the threshold count as related: table[output * n + input]. */
export function relationFromTable(table: Float64Array, n: number, threshold: number): Relation {
  const relation = emptyRelation(n, n);
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) if (table[i * n + j]! > threshold) relate(relation, i, j);
  }
  return relation;
}

/** relation[output][input] as plain booleans, for reports. */
export function relationMatrix(relation: Relation): boolean[][] {
  return Array.from({ length: relation.outputs }, (_, i) =>
    Array.from({ length: relation.inputs }, (__, j) => relates(relation, i, j)),
  );
}
