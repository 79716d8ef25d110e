/**
 * Lower bounds on the width of a relation.
 *
 * - Before the k-th output leaves, at least as many inputs are there as the k-th smallest row needs: the width
 *   is at least size_(k) - (k - 1); the same for the time reverse (columns).
 * - Where output k needs input k for all k (one carrier each), the pairs that need each other form a graph whose
 *   pathwidth is at most width - 1. Pathwidth is at least treewidth, which is bounded by contracting the vertex
 *   of least degree into its neighbour of least degree again and again (contraction degeneracy; Bodlaender,
 *   Koster, Wolle, "Contraction and treewidth lower bounds", J. Graph Algorithms Appl. 10, 5 (2006)).
 * Cost: n^2 log n or so.
 */
import { bitCount, emptyRelation, type Relation, relate, relates } from './relation.ts';

export function lowerBoundOf(relation: Relation): number {
  const columns = transposed(relation);
  return Math.max(1, sizesBound(relation), sizesBound(columns), contractionBound(relation));
}

/** Outputs and inputs exchanged: the relation of the time reverse. */
export function transposed(relation: Relation): Relation {
  const { outputs, inputs, rows } = relation;
  const out = emptyRelation(inputs, outputs);
  rows.forEach((row, output) => {
    row.forEach((word, w) => {
      for (let rest = word; rest !== 0; rest &= rest - 1) {
        relate(out, 32 * w + (31 - Math.clz32(rest & -rest)), output);
      }
    });
  });
  return out;
}

function sizesBound({ rows }: Relation): number {
  const sizes = rows.map((row) => bitCount(row)).sort((a, b) => a - b);
  return sizes.reduce((most, size, k) => Math.max(most, size - k), 0);
}

function contractionBound(relation: Relation): number {
  const n = relation.outputs;
  if (n !== relation.inputs) return 0;
  for (let k = 0; k < n; k++) if (!relates(relation, k, k)) return 0;
  const columns = transposed(relation);
  const neighbours: Set<number>[] = relation.rows.map((row, k) => {
    const set = new Set<number>();
    row.forEach((word, w) => {
      for (let rest = word & columns.rows[k]![w]!; rest !== 0; rest &= rest - 1) {
        set.add(32 * w + (31 - Math.clz32(rest & -rest)));
      }
    });
    set.delete(k);
    return set;
  });
  const alive = new Set(neighbours.keys());
  let bound = 0;
  while (alive.size > 1) {
    const vertex = leastDegree(alive, neighbours);
    const own = neighbours[vertex]!;
    bound = Math.max(bound, own.size);
    alive.delete(vertex);
    for (const other of own) neighbours[other]!.delete(vertex);
    if (own.size === 0) continue;
    const into = leastDegree(own, neighbours);
    for (const other of own) {
      if (other === into) continue;
      neighbours[other]!.add(into);
      neighbours[into]!.add(other);
    }
  }
  return bound + 1;
}

function leastDegree(among: Iterable<number>, neighbours: readonly Set<number>[]): number {
  let best = -1;
  for (const vertex of among) {
    if (best < 0 || neighbours[vertex]!.size < neighbours[best]!.size) best = vertex;
  }
  return best;
}
