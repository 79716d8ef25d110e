/**
 * Searches for an order of outputs that needs few wires, where sets of outputs are too many to go through.
 *
 * A state is the set of inputs that have entered: every output whose inputs are all there has left. Two moves
 * are always right and taken at once: letting such an output leave, and, when there is none, entering the one
 * input that some output still waits for alone (whatever comes next needs at least one more wire too, and
 * afterwards no more are held than before).
 * Beam search: layers by the number of outputs that have left; each keeps the best states by width, wires
 * held, and what the next output costs; equal sets of inputs are kept once. Run forward and on the time
 * reverse.
 * Branch and bound: depth first for a width one below the best known, remembering dead sets; when it comes to
 * an end without a plan the lower bound is raised. It stops after a number of steps, never by time.
 * Cost: `effort` million steps.
 */
import { random } from '../numeric/random.ts';
import { inputsOf, type Relation } from './relation.ts';
import { transposed } from './width-bound.ts';
import { type WidthOptions, type WidthPlan, widthOfOrder } from './width-plan.ts';

const EFFORT_DEFAULT = 60;
const BEAM_MIN = 8;
const BEAM_MAX = 4000;
/** Outputs considered as the next one to leave, per state. */
const CHOICES = 12;
/** Share of the effort for branch and bound. */
const PROOF_SHARE = 0.3;

type State = {
  /** Inputs each output waits for, -1 once it has left; then 1 for each input that is there. */
  need: Int16Array;
  held: number;
  width: number;
  left: number;
  hash: number;
  parent: State | null;
  /** Inputs that entered on the way from the parent. */
  entered: number[];
};

export function searchOrder(
  relation: Relation,
  lowerBound: number,
  options: WidthOptions = {},
): WidthPlan {
  const { effort = EFFORT_DEFAULT, stopped = () => false } = options;
  const forward = new Search(relation);
  const backward = new Search(transposed(relation));
  let best = Array.from({ length: relation.outputs }, (_, k) => k);
  let width = widthOfOrder(relation, best);
  const keep = (inputs: readonly number[] | null, isReverse: boolean): void => {
    if (!inputs) return;
    const order = isReverse ? reversedOrder(relation, inputs) : forward.outputsOf(inputs);
    const found = widthOfOrder(relation, order);
    if (found < width) [best, width] = [order, found];
  };
  const size = relation.outputs;
  const full = ((1 - PROOF_SHARE) * effort * 1e6) / (size * size * CHOICES);
  // a narrow beam first: often it is enough
  for (const share of [0.02, 0.5]) {
    const beam = Math.round(Math.min(BEAM_MAX, Math.max(BEAM_MIN, share * full)));
    for (const isReverse of [false, true]) {
      if (width <= lowerBound || stopped()) break;
      keep((isReverse ? backward : forward).beam(beam, width - 1, stopped), isReverse);
    }
  }
  let bound = lowerBound;
  let steps = Math.round((PROOF_SHARE * effort * 1e6) / (2 * size));
  while (bound < width && steps > 0 && !stopped()) {
    // raise the bound as long as the steps last
    const answer = forward.prove(bound, steps);
    steps -= answer.steps;
    if (answer.kind === 'found') keep(answer.inputs, false);
    if (answer.kind === 'found') break;
    if (answer.kind === 'limit') break;
    bound++;
  }
  const exact = bound >= width;
  const method = exact
    ? 'exact: search that meets its lower bound'
    : `beam search in both directions; lower bound ${bound}`;
  return { order: best, width, lowerBound: Math.min(bound, width), exact, method };
}

/** Inputs leaving in the reverse direction, last first, are inputs entering forward. */
function reversedOrder(relation: Relation, leaving: readonly number[]): number[] {
  return new Search(relation).outputsOf([...leaving].reverse());
}

class Search {
  private readonly outputs: number;
  private readonly inputs: number;
  private readonly needs: number[][];
  private readonly neededBy: number[][];
  private readonly keys: Int32Array;

  constructor(relation: Relation) {
    this.outputs = relation.outputs;
    this.inputs = relation.inputs;
    this.needs = relation.rows.map((_, output) => inputsOf(relation, output));
    this.neededBy = Array.from({ length: relation.inputs }, () => []);
    this.needs.forEach((list, output) => {
      for (const input of list) this.neededBy[input]!.push(output);
    });
    const draw = random('width search', relation.outputs);
    this.keys = Int32Array.from({ length: 2 * relation.inputs }, () => draw() * 2 ** 32);
  }

  /** Outputs in the order in which they can leave when inputs enter in this order. */
  outputsOf(inputs: readonly number[]): number[] {
    const need = Int32Array.from(this.needs, (list) => list.length);
    const order: number[] = [];
    for (let k = 0; k < this.outputs; k++) if (need[k] === 0) order.push(k);
    for (const input of inputs) {
      for (const output of this.neededBy[input]!) {
        need[output]!--;
        if (need[output] === 0) order.push(output);
      }
    }
    return order;
  }

  private leave(state: State, output: number): void {
    state.need[output] = -1;
    state.left++;
    state.held--;
  }

  /** Lets all inputs of an output enter and every output that is complete leave. */
  private take(state: State, output: number): void {
    const fresh: number[] = [];
    for (const input of this.needs[output]!) if (!this.isIn(state, input)) fresh.push(input);
    for (const input of fresh) {
      state.entered.push(input);
      this.mark(state, input);
    }
    state.held += fresh.length;
    state.width = Math.max(state.width, state.held);
    const complete: number[] = [];
    for (const input of fresh) {
      for (const other of this.neededBy[input]!) {
        state.need[other]!--;
        if (state.need[other] === 0) complete.push(other);
      }
    }
    for (const other of complete) this.leave(state, other);
  }

  private isIn(state: State, input: number): boolean {
    return state.need[this.outputs + input] === 1;
  }

  private mark(state: State, input: number): void {
    state.need[this.outputs + input] = 1;
    state.hash ^= this.keys[input]!;
  }

  /** Takes outputs that wait for a single input, again and again. */
  private settle(state: State, most: number): void {
    for (let again = true; again; ) {
      again = false;
      for (let k = 0; k < this.outputs; k++) {
        if (state.need[k]! > 0 && state.need[k]! <= most) {
          this.take(state, k);
          again = true;
        }
      }
    }
  }

  private child(parent: State, output: number): State {
    const state: State = {
      need: parent.need.slice(),
      held: parent.held,
      width: parent.width,
      left: parent.left,
      hash: parent.hash,
      parent,
      entered: [],
    };
    this.take(state, output);
    return state;
  }

  /** Outputs that wait for the fewest inputs, nearest first; each set of missing inputs once. */
  private choices(state: State, most: number): number[] {
    const found: number[] = [];
    for (let k = 0; k < this.outputs; k++) if (state.need[k]! > 0) found.push(k);
    found.sort((a, b) => state.need[a]! - state.need[b]! || a - b);
    return found.slice(0, most);
  }

  private leastNeed(state: State): number {
    let least = this.inputs;
    for (let k = 0; k < this.outputs; k++) {
      const need = state.need[k]!;
      if (need > 0 && need < least) least = need;
    }
    return least;
  }

  /** Inputs in order of entry of the best plan with width <= `target` that the beam sees, or null. */
  beam(beamWidth: number, target: number, stopped: () => boolean): number[] | null {
    let aim = target;
    let best: State | null = null;
    const layers: Map<number, State>[] = Array.from({ length: this.outputs + 1 }, () => new Map());
    const first = this.start();
    layers[first.left]!.set(first.hash, first);
    for (let layer = 0; layer < this.outputs; layer++) {
      if (stopped()) break;
      const states = this.ranked(layers[layer]!, beamWidth);
      layers[layer] = new Map();
      for (const state of states) {
        if (state.width > aim) continue;
        for (const output of this.choices(state, CHOICES)) {
          if (state.held + state.need[output]! > aim) break;
          const next = this.child(state, output);
          this.settle(next, 1);
          if (next.width > aim) continue;
          if (next.left === this.outputs) {
            if (!best || next.width < best.width) best = next;
            aim = Math.min(aim, next.width - 1);
            continue;
          }
          const known = layers[next.left]!.get(next.hash);
          if (!known || next.width < known.width) layers[next.left]!.set(next.hash, next);
        }
      }
    }
    return best && pathOf(best);
  }

  /** Nothing has entered but what may at once. */
  private start(): State {
    // how many inputs each output waits for (-1: it has left), then 1 for every input that is there
    const need = new Int16Array(this.outputs + this.inputs);
    const state: State = {
      need,
      held: 0,
      width: 1,
      left: 0,
      hash: 0,
      parent: null,
      entered: [],
    };
    this.needs.forEach((list, k) => {
      need[k] = list.length;
      if (list.length === 0) this.leave(state, k);
    });
    this.settle(state, 1);
    return state;
  }

  private ranked(layer: Map<number, State>, beamWidth: number): State[] {
    const states = [...layer.values()];
    if (states.length <= 1) return states;
    const scored = states.map((state) => {
      const least = this.leastNeed(state);
      return { state, peak: Math.max(state.width, state.held + least), least };
    });
    scored.sort(
      (a, b) =>
        a.peak - b.peak ||
        a.state.held - b.state.held ||
        a.least - b.least ||
        a.state.hash - b.state.hash,
    );
    return scored.slice(0, beamWidth).map(({ state }) => state);
  }

  /** Is there a plan of at most this width? Depth first, within a number of steps. */
  prove(
    width: number,
    stepsMax: number,
  ):
    | { kind: 'found'; inputs: number[]; steps: number }
    | { kind: 'none' | 'limit'; steps: number } {
    const dead = new Set<string>();
    let steps = 0;
    const visit = (state: State): State | 'none' | 'limit' => {
      if (state.width > width) return 'none';
      if (state.left === this.outputs) return state;
      const key = this.keyOf(state);
      if (dead.has(key)) return 'none';
      for (const output of this.choices(state, this.outputs)) {
        if (state.held + state.need[output]! > width) break;
        if (++steps > stepsMax) return 'limit';
        const next = this.child(state, output);
        this.settle(next, 1);
        const answer = visit(next);
        if (answer !== 'none') return answer;
      }
      dead.add(key);
      return 'none';
    };
    const answer = visit(this.start());
    if (answer === 'none' || answer === 'limit') return { kind: answer, steps };
    return { kind: 'found', inputs: pathOf(answer), steps };
  }

  /** The set of inputs there, exactly. */
  private keyOf(state: State): string {
    let key = '';
    for (let k = 0; k < this.inputs; k += 15) {
      let word = 0;
      for (let b = 0; b < 15 && k + b < this.inputs; b++) {
        if (state.need[this.outputs + k + b] === 1) word |= 1 << b;
      }
      key += String.fromCharCode(word);
    }
    return key;
  }
}

function pathOf(state: State): number[] {
  const parts: number[][] = [];
  for (let at: State | null = state; at; at = at.parent) parts.push(at.entered);
  return parts.reverse().flat();
}
