/**
 * Brings a chain of blocks as near to a unitary as its shape allows, one block at a time.
 *
 * Method: with all blocks but one fixed, |Tr(U^dag V)| is largest for the unitary polar factor of that block's
 * environment E, Tr(U^dag V) = Tr(B E). Blocks are updated forth and back until a sweep gains nothing. This is
 * the alternating scheme of variational tensor networks (Evenbly, Vidal, PRB 79, 144108 (2009), section IV).
 * With R and L the products before and after block b, M_b = R_b U^dag L_b passes to the next block as
 * M_(b+1) = B_b M_b B_(b+1)^dag, so an update costs two applications of a small block to a 2^n x 2^n matrix.
 * Convergence: |Tr| never falls. The limit is a local optimum; from the factorisation of a nearby chain it
 * is the nearest chain to first order.
 * Fails: never; stops after `sweepsMax`.
 */
import { applyMatrixInto } from '../circuit/unitary.ts';
import { adjoint } from '../numeric/complex-matrix.ts';
import { polarFactor } from '../numeric/svd.ts';
import { type Chain, type ChainBlock, chainBlocks, chainDistance, onCarriers } from './chain.ts';
import { bitOffsets, otherPlaces } from './residual.ts';

/** Stop when a whole sweep lowers D by less than this part of it. */
const GAIN_MIN = 1e-4;

export function improveChain(
  u: Float64Array,
  chain: Chain,
  sweepsMax = 200,
  stopped: () => boolean = () => false,
): { chain: Chain; distance: number; sweeps: number } {
  const n = chain.wires;
  const target = onCarriers(u, chain);
  let blocks = chainBlocks(chain);
  let distance = chainDistance(u, chain);
  let sweeps = 0;
  while (sweeps < sweepsMax && distance > 1e-15 && !stopped()) {
    sweeps++;
    const swept = sweepForward(target, blocks, n);
    const candidate = withBlocks(chain, swept);
    const reached = chainDistance(u, candidate);
    if (!(reached < distance)) break;
    const gain = distance - reached;
    blocks = swept;
    distance = reached;
    if (gain < GAIN_MIN * distance) break;
  }
  return { chain: withBlocks(chain, blocks), distance, sweeps };
}

/** One update of every block, first to last. */
function sweepForward(
  target: Float64Array,
  before: readonly ChainBlock[],
  n: number,
): ChainBlock[] {
  const d = 2 ** n;
  const blocks = [...before];
  // M for the first block is U^dag L = (L^dag U)^dag
  const pulled = target.slice();
  for (const { matrix, wires } of blocks.slice(1).reverse()) {
    applyMatrixInto(pulled, adjoint(matrix, 2 ** wires.length), wires, n, d);
  }
  let m = adjoint(pulled, d);
  for (let b = 0; b < blocks.length; b++) {
    const { wires } = blocks[b]!;
    const size = 2 ** wires.length;
    const matrix = polarFactor(adjoint(environment(m, wires, n), size), size);
    blocks[b] = { wires, matrix };
    const next = blocks[b + 1];
    if (!next) break;
    applyMatrixInto(m, matrix, wires, n, d);
    m = adjoint(m, d);
    applyMatrixInto(m, next.matrix, next.wires, n, d);
    m = adjoint(m, d);
  }
  return blocks;
}

/** The trace of m over every wire that is not in `wires`. */
function environment(m: Float64Array, wires: readonly number[], n: number): Float64Array {
  const d = 2 ** n;
  const inside = bitOffsets(wires, n);
  const outside = bitOffsets(otherPlaces(wires, n), n);
  const size = inside.length;
  const out = new Float64Array(2 * size * size);
  for (let a = 0; a < size; a++) {
    for (let b = 0; b < size; b++) {
      for (const rest of outside) {
        const at = (inside[a]! + rest) * d + inside[b]! + rest;
        out[a * size + b]! += m[at]!;
        out[size * size + a * size + b]! += m[d * d + at]!;
      }
    }
  }
  return out;
}

/** The chain with its blocks replaced, in order. */
export function withBlocks(chain: Chain, blocks: readonly ChainBlock[]): Chain {
  let next = 0;
  const stages = chain.stages.map((stage) => {
    const first = next;
    next += stage.blocks.length;
    return { ...stage, blocks: blocks.slice(first, next) };
  });
  return { wires: chain.wires, stages };
}
