/** The distance of every start of every fit, iteration by iteration, as it comes in. */
import { signal } from '@preact/signals';
import type { Progress } from '../control.ts';

export type Curve = { label: string; iterations: number[]; distances: number[] };

/** More curves than this are not kept apart: the picture would be a wall. */
const CURVES_MAX = 60;

export class ConvergenceData {
  readonly curves = new Map<string, Curve>();
  /** Starts beyond those that are drawn. */
  readonly undrawn = new Set<string>();
  /** The least distance any start has come to. */
  best = Number.POSITIVE_INFINITY;
  /** Counts up, at most once a frame, when there is something new to show. */
  readonly version = signal(0);
  private isPending = false;

  clear(): void {
    this.curves.clear();
    this.undrawn.clear();
    this.best = Number.POSITIVE_INFINITY;
    this.version.value++;
  }

  readonly add = ({ stage, job = stage, start, iteration, distance }: Progress): void => {
    if (iteration === undefined || distance === undefined) return;
    const key = `${job}/${start ?? 0}`;
    this.best = Math.min(this.best, distance);
    let curve = this.curves.get(key);
    if (!curve) {
      if (this.curves.size >= CURVES_MAX) {
        this.undrawn.add(key);
        return;
      }
      curve = { label: job, iterations: [], distances: [] };
      this.curves.set(key, curve);
    }
    curve.iterations.push(iteration);
    curve.distances.push(distance);
    if (this.isPending) return;
    this.isPending = true;
    requestAnimationFrame(() => {
      this.isPending = false;
      this.version.value++;
    });
  };
}
