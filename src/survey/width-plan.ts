/** What a plan for the order of outputs is, and the wires that an order needs. */
import { bitCount, type Relation } from './relation.ts';

export type WidthPlan = {
  /** Outputs in the order in which they leave. */
  order: number[];
  width: number;
  lowerBound: number;
  exact: boolean;
  /** In words: how the order was found. */
  method: string;
};

export type WidthOptions = {
  /** Steps the search may take, in millions; 60 unless given (about a second). */
  effort?: number;
  stopped?: () => boolean;
};

/** The largest number of wires held at once when outputs leave in this order. */
export function widthOfOrder(relation: Relation, order: readonly number[]): number {
  const union = new Uint32Array(relation.rows[0]?.length ?? 0);
  let width = 1;
  order.forEach((output, k) => {
    relation.rows[output]!.forEach((word, w) => {
      union[w]! |= word;
    });
    width = Math.max(width, bitCount(union) - k);
  });
  return width;
}
