/**
 * Makes one order of events from a plan: which carrier enters, which operation happens, which carrier leaves.
 *
 * Given the order in which carriers are to end and a number of wires, carriers enter in the order in which the
 * plan needs them, as soon as there is room; every operation happens as soon as it can; a carrier ends when
 * nothing is left to do on it. Only when no more can happen does a measured carrier end early, and what is
 * left on it becomes conditions on its bit. So with room enough no condition appears, and with the plan's own
 * width it never gets stuck: when the first m carriers of the plan are there, everything that the ended ones
 * need has happened.
 * Cost: (operations + carriers^2 / 32) steps.
 */
import { assert } from '../assert.ts';
import {
  type BitExpression,
  type GateOperation,
  type Operation,
  operationWires,
} from '../circuit/circuit.ts';
import type { AxisFinder } from '../survey/axes.ts';
import { unmerged } from '../survey/blocks.ts';
import type { LifeCircuit } from '../survey/lives.ts';
import { MinimumHeap } from '../survey/minimum-heap.ts';
import { type OrderGraph, orderGraph } from '../survey/order.ts';
import { inputsOf, type Relation } from '../survey/relation.ts';
import { restrictGate } from '../survey/restrict.ts';
import type { WireEvent } from './assemble.ts';

export type SchedulePlan = {
  circuit: LifeCircuit;
  /** Carriers x carriers: who must be there before whom ends. */
  relation: Relation;
  graph: OrderGraph;
  /** Bit of the end of each measured carrier. */
  bitOf(carrier: number): number;
};

export type Schedule = {
  events: WireEvent[];
  /** How many conditions early measurement made. */
  conditions: number;
};

export function planGraph(
  circuit: LifeCircuit,
  rules: { commute: boolean; early: boolean },
  axesOf: AxisFinder,
): OrderGraph {
  return orderGraph(circuit, rules, axesOf);
}

/** Carriers in the order in which the plan needs them. */
export function entranceOrder(relation: Relation, order: readonly number[]): number[] {
  const seen = new Uint8Array(relation.inputs);
  const out: number[] = [];
  for (const end of order) {
    for (const carrier of inputsOf(relation, end)) {
      if (seen[carrier]) continue;
      seen[carrier] = 1;
      out.push(carrier);
    }
  }
  return out;
}

export function schedule(plan: SchedulePlan, order: readonly number[], wires: number): Schedule {
  const run = new Scheduling(plan, order, wires);
  return run.finish();
}

class Scheduling {
  private readonly plan: SchedulePlan;
  private readonly order: readonly number[];
  private readonly wires: number;
  private readonly entering: number[];
  private next = 0;
  private held = 0;
  private readonly events: WireEvent[] = [];
  private conditions = 0;
  private readonly ready: MinimumHeap = new MinimumHeap();
  /** Per node: carriers not there or groups not open yet, and bits not settled. */
  private readonly waits: Int32Array;
  private readonly entered: Uint8Array;
  private readonly ended: Uint8Array;
  /** Per carrier: the open group, and how many of its nodes are still to happen. */
  private readonly group: Int32Array;
  private readonly left: Int32Array;
  private readonly endWaits: Int32Array;

  constructor(plan: SchedulePlan, order: readonly number[], wires: number) {
    this.plan = plan;
    this.order = order;
    this.wires = wires;
    this.entering = entranceOrder(plan.relation, order);
    const { lives, nodes } = plan.circuit;
    this.waits = Int32Array.from(nodes, ({ operation, end }) =>
      end >= 0 || !operation ? 0 : operationWires(operation).length,
    );
    for (const targets of plan.graph.afterByBits.values()) {
      for (const node of targets) this.waits[node]!++;
    }
    this.endWaits = Int32Array.from(plan.graph.ends, ({ node }) => this.waits[node]!);
    this.entered = new Uint8Array(lives.length);
    this.ended = new Uint8Array(lives.length);
    this.group = new Int32Array(lives.length).fill(-1);
    this.left = new Int32Array(lives.length);
    nodes.forEach(({ end }, node) => {
      if (end < 0 && this.waits[node] === 0) this.ready.push(node);
    });
  }

  finish(): Schedule {
    const { lives } = this.plan.circuit;
    let done = 0;
    while (done < lives.length) {
      while (this.held < this.wires && this.next < this.entering.length) {
        this.enter(this.entering[this.next++]!);
      }
      this.happen();
      const over = this.endFinished();
      done += over;
      if (over > 0 || this.ready.size > 0) continue;
      if (this.held < this.wires && this.next < this.entering.length) continue;
      this.endEarly();
      done++;
    }
    this.happen();
    return { events: this.events, conditions: this.conditions };
  }

  private enter(carrier: number): void {
    const { input } = this.plan.circuit.lives[carrier]!;
    this.entered[carrier] = 1;
    this.held++;
    if (!this.isIdle(carrier)) this.events.push({ kind: 'enter', input, carrier });
    this.openNext(carrier);
  }

  /** Nothing happens on it and nobody looks at it: it needs no wire. */
  private isIdle(carrier: number): boolean {
    const { groups } = this.plan.graph;
    return groups[carrier]!.length === 0 && this.plan.circuit.lives[carrier]!.rule === 'dropped';
  }

  /** Opens the next group of a carrier that is there. */
  private openNext(carrier: number): void {
    const groups = this.plan.graph.groups[carrier]!;
    const k = ++this.group[carrier]!;
    if (k >= groups.length) {
      this.finished.push(carrier);
      return;
    }
    this.left[carrier] = groups[k]!.length;
    for (const node of groups[k]!) this.release(node);
  }

  private readonly finished: number[] = [];

  private release(node: number): void {
    const { end } = this.plan.circuit.nodes[node]!;
    if (end >= 0) {
      this.endWaits[end]!--;
      if (this.endWaits[end] === 0) this.finished.push(end);
      return;
    }
    this.waits[node]!--;
    if (this.waits[node] === 0) this.ready.push(node);
  }

  private happen(): void {
    for (let node = this.ready.pop(); node >= 0; node = this.ready.pop()) {
      const operation = this.plan.circuit.nodes[node]!.operation!; // only operations become ready
      for (const part of this.withConditions(operation)) {
        this.events.push({ kind: 'operation', operation: part });
      }
      for (const carrier of operationWires(operation)) {
        this.left[carrier]!--;
        if (this.left[carrier] === 0) this.openNext(carrier);
      }
      this.settle(node);
    }
  }

  private settle(node: number): void {
    for (const later of this.plan.graph.afterByBits.get(node) ?? []) this.release(later);
  }

  private endFinished(): number {
    let count = 0;
    for (const carrier of this.finished.splice(0)) {
      const isOver = this.group[carrier]! >= this.plan.graph.groups[carrier]!.length;
      if (!isOver || this.ended[carrier] || !this.entered[carrier]) continue;
      if (this.endWaits[carrier]! > 0) continue;
      this.end(carrier);
      count++;
    }
    return count;
  }

  private end(carrier: number): void {
    const { lives } = this.plan.circuit;
    const { output, rule, bit } = lives[carrier]!;
    const { node } = this.plan.graph.ends[carrier]!;
    this.ended[carrier] = 1;
    this.held--;
    if (output < 0 && rule === 'measured') {
      const operation: Operation = { kind: 'measure', wire: carrier, bit };
      this.events.push({ kind: 'operation', operation });
    }
    if (!this.isIdle(carrier)) this.events.push({ kind: 'leave', output, carrier });
    this.settle(node);
  }

  /** Nothing else can happen: the first carrier of the plan that may be measured before its last group. */
  private endEarly(): void {
    const { graph } = this.plan;
    const carrier = this.order.find((k) => {
      const isOpen = this.entered[k] === 1 && this.ended[k] === 0;
      const atLast = this.group[k] === graph.groups[k]!.length - 1;
      return isOpen && atLast && graph.ends[k]!.isEarly && this.endWaits[k] === 0;
    });
    assert(carrier !== undefined, () => `a plan for ${this.wires} wires got stuck`);
    this.end(carrier);
  }

  /** The operation with every carrier that has ended replaced by a condition on its bit. */
  private withConditions(operation: Operation): Operation[] {
    if (operation.kind !== 'gate') return [operation];
    const gone = operation.wires.filter((carrier) => this.ended[carrier]);
    if (gone.length === 0) return unmerged(operation);
    const { condition, ...bare } = operation;
    let parts: { gate: GateOperation; bits: BitExpression[] }[] = [
      { gate: bare, bits: condition ? [condition] : [] },
    ];
    for (const carrier of gone) {
      const bit: BitExpression = { kind: 'bit', bit: this.plan.bitOf(carrier) };
      parts = parts.flatMap(({ gate, bits }) =>
        [true, false].flatMap((value) => {
          const place = gate.wires.indexOf(carrier);
          const rest = gate.wires.length === 1 ? null : restrictGate(gate, place, value);
          if (!rest) return [];
          const wanted: BitExpression = value ? bit : { kind: 'not', of: bit };
          return [{ gate: rest, bits: [...bits, wanted] }];
        }),
      );
    }
    this.conditions += parts.length;
    return parts.map(({ gate, bits }) => ({
      ...gate,
      condition: bits.length === 1 ? bits[0]! : { kind: 'and', of: bits },
    }));
  }
}
