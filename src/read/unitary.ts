/**
 * Checks that a matrix is a unitary on whole wires, and says by how much it is not.
 *
 * Convention: the error is max |(u^dag u - 1)_ij|. Up to `UNITARY_ERROR_MAX` a matrix is taken as unitary and
 * replaced by its polar factor when the error is above rounding (files are often written with few digits);
 * beyond, InputError `not-unitary`, unless the caller asks for the nearest unitary (polar factor; Fan, Hoffman,
 * Proc. AMS 6, 111 (1955)).
 */
import { InputError } from '../input-error.ts';
import { unitarityError } from '../numeric/complex-matrix.ts';
import { hilbertSchmidtDistance } from '../numeric/distance.ts';
import { nearestUnitary } from '../numeric/nearest-unitary.ts';
import type { ReadMatrix } from './matrix-market.ts';

/** Eight decimal digits in a file leave about 1e-8. */
export const UNITARY_ERROR_MAX = 1e-7;
export const UNITARY_WIRES_MAX = 12;

export type ReadUnitary = {
  matrix: Float64Array;
  wires: number;
  /** Said to the user when the matrix was replaced by the nearest unitary. */
  notes: string[];
};

export function checkUnitary(
  { matrix, rows, columns }: ReadMatrix,
  name: string,
  { nearest = false }: { nearest?: boolean } = {},
): ReadUnitary {
  const fail = (code: string, message: string, hint?: string): never => {
    throw new InputError({ code, message, file: name, ...(hint ? { hint } : {}) });
  };
  if (rows !== columns)
    return fail('not-square', `expected a square matrix, got ${rows}x${columns}`);
  const wires = Math.round(Math.log2(rows));
  if (2 ** wires !== rows || wires < 1) {
    return fail('not-power-of-two', `expected 2^n rows for n wires, n >= 1, got ${rows}`);
  }
  if (wires > UNITARY_WIRES_MAX) {
    return fail('too-large', `number of wires must be in [1, ${UNITARY_WIRES_MAX}], got ${wires}`);
  }
  const bad = matrix.findIndex((x) => !Number.isFinite(x));
  if (bad >= 0) {
    const at = bad % (rows * columns);
    const place = `row ${Math.floor(at / columns) + 1}, column ${(at % columns) + 1}`;
    return fail('not-finite', `expected finite entries, got ${matrix[bad]} in ${place}`);
  }
  const error = unitarityError(matrix, rows);
  const rounding = 1e-15 * rows;
  if (error <= rounding) return { matrix, wires, notes: [] };
  if (error > UNITARY_ERROR_MAX && !nearest) {
    return fail(
      'not-unitary',
      `expected a unitary matrix, got one that is off by ${error.toExponential(1)} (largest entry of |U^dag U - 1|)`,
      'take the nearest unitary with --nearest',
    );
  }
  const unitary = nearestUnitary(matrix, rows);
  const { distance } = hilbertSchmidtDistance(unitary, matrix);
  const notes =
    error <= 1e-12
      ? []
      : [
          `the matrix is off from unitary by ${error.toExponential(1)}; the nearest unitary is used, at distance ${distance.toExponential(1)}`,
        ];
  return { matrix: unitary, wires, notes };
}
