/** Interaction graphs for tests, and the relation of one layer of commuting two-wire gates on them. */
import { random } from '../../src/numeric/random.ts';
import { emptyRelation, type Relation, relate } from '../../src/survey/relation.ts';

export type Edge = readonly [number, number];

/** Closed neighbourhoods: a wire leaves when all its gates are done. */
export function layerRelation(vertices: number, edges: readonly Edge[]): Relation {
  const relation = emptyRelation(vertices, vertices);
  for (let k = 0; k < vertices; k++) relate(relation, k, k);
  for (const [a, b] of edges) {
    relate(relation, a, b);
    relate(relation, b, a);
  }
  return relation;
}

export function path(n: number): Edge[] {
  return Array.from({ length: n - 1 }, (_, k) => [k, k + 1] as const);
}

export function ring(n: number): Edge[] {
  return [...path(n), [n - 1, 0]];
}

export function grid(k: number, m: number): Edge[] {
  const edges: Edge[] = [];
  for (let a = 0; a < k; a++) {
    for (let b = 0; b < m; b++) {
      if (a + 1 < k) edges.push([a * m + b, (a + 1) * m + b]);
      if (b + 1 < m) edges.push([a * m + b, a * m + b + 1]);
    }
  }
  return edges;
}

/** Every vertex but the last level has two or three children. */
export function tree(children: number, levels: number): { vertices: number; edges: Edge[] } {
  const edges: Edge[] = [];
  let [first, size, vertices] = [0, 1, 1];
  for (let level = 1; level < levels; level++) {
    for (let parent = first; parent < first + size; parent++) {
      for (let c = 0; c < children; c++) edges.push([parent, vertices++]);
    }
    first += size;
    size *= children;
  }
  return { vertices, edges };
}

/** A random cubic graph by pairing stubs, drawn again until it is simple. */
export function cubic(n: number, seed: number): Edge[] {
  const draw = random('cubic', n, seed);
  for (;;) {
    const stubs = Array.from({ length: 3 * n }, (_, k) => Math.floor(k / 3));
    for (let k = stubs.length - 1; k > 0; k--) {
      const j = Math.floor(draw() * (k + 1));
      [stubs[k], stubs[j]] = [stubs[j]!, stubs[k]!];
    }
    const edges = Array.from(
      { length: stubs.length / 2 },
      (_, k) => [stubs[2 * k]!, stubs[2 * k + 1]!].sort((a, b) => a - b) as [number, number],
    );
    const isSimple = edges.every(([a, b]) => a !== b);
    if (isSimple && new Set(edges.map((edge) => edge.join())).size === edges.length) return edges;
  }
}
