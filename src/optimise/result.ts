/** What every optimiser returns, and the sentences behind its statuses. */
export type Status =
  | 'converged'
  | 'stalled'
  | 'iteration-limit'
  | 'evaluation-limit'
  | 'not-finite'
  | 'aborted';

export type OptimiserResult = {
  /** The best point seen. */
  x: Float64Array;
  /** The objective there. */
  value: number;
  status: Status;
  iterations: number;
  /** Evaluations of the objective. */
  evaluations: number;
};

export const STATUS_SENTENCES: { readonly [S in Status]: string } = Object.freeze({
  converged: 'reached the goal',
  stalled: 'no step lowers the objective any more: try other starts or more parameters',
  'iteration-limit': 'stopped at the limit of iterations: raise it or relax the goal',
  'evaluation-limit': 'stopped at the limit of evaluations: raise it or relax the goal',
  'not-finite': 'the objective is not a finite number here',
  aborted: 'stopped on request',
});
