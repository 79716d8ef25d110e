/**
 * Puts carriers on physical wires: who enters where, who leaves when, and which wire is used again.
 *
 * Events come in one order; each carrier enters once and leaves once. A carrier takes a wire just before its
 * first operation: a wire not used yet while there are any within the limit, else the free wire that is free
 * earliest.
 * Written: a reset under `wiregauge.enters k` where input k starts (the first ones too), a measurement under
 * `wiregauge.leaves i` where output i ends: into its own bit where the original measures it, into `out[i]`
 * where it is kept or measured without a bit. A dropped output is named at the next reset of its wire.
 */
import { assert } from '../assert.ts';
import {
  bitsRead,
  bitWritten,
  type Circuit,
  moved,
  type Operation,
  operationWires,
  type Register,
} from '../circuit/circuit.ts';
import type { Contract } from '../contract.ts';

/**
 * `input` -1 is a fresh |0> that is no input of the original, `output` -1 ends without a trace. Operations act
 * on carrier numbers.
 */
export type WireEvent =
  | { kind: 'enter'; input: number; carrier: number }
  | { kind: 'leave'; output: number; carrier: number }
  | { kind: 'operation'; operation: Operation };

export type NarrowedCircuit = {
  circuit: Circuit;
  /** On which wire output `leaves` makes room for input `enters`. */
  reuse: { wire: number; leaves: number; enters: number }[];
  /** Rules that were used, in words. */
  rules: string[];
};

export type AssembleOptions = {
  /** Wires that may be used before one is used again; at least as many as are needed at once are taken. */
  wires?: number;
  rules?: readonly string[];
};

/** The bit into which output `output` is measured in a narrowed circuit: its own, or `out[output]`. */
export function bitOfOutput(original: Circuit, contract: Contract, output: number): number {
  const own = contract.outputs[output] === 'measured' ? measuredBits(original).get(output) : -1;
  return own === undefined || own < 0 ? original.bits + output : own;
}

/** For every wire whose last operation is a plain measurement into a bit: that bit. */
export function measuredBits(circuit: Circuit): Map<number, number> {
  const found = new Map<number, number>();
  for (const operation of circuit.operations) {
    if (operation.kind === 'barrier') continue;
    for (const wire of operationWires(operation)) found.delete(wire);
    if (operation.kind === 'measure' && operation.bit >= 0 && !operation.condition) {
      found.set(operation.wire, operation.bit);
    }
  }
  return found;
}

export function assembleWires(
  events: readonly WireEvent[],
  original: Circuit,
  contract: Contract,
  options: AssembleOptions = {},
): NarrowedCircuit {
  const late = enterLate(events);
  const limit = Math.max(options.wires ?? 0, mostAtOnce(late));
  const run = new Assembly(original, contract, limit);
  for (const event of late) run.step(event);
  return run.finish(options.rules ?? []);
}

/** Moves every entering to just before the carrier is first needed. */
function enterLate(events: readonly WireEvent[]): WireEvent[] {
  const waiting = new Map<number, WireEvent>();
  const out: WireEvent[] = [];
  const call = (carrier: number): void => {
    const event = waiting.get(carrier);
    if (!event) return;
    waiting.delete(carrier);
    out.push(event);
  };
  for (const event of events) {
    if (event.kind === 'enter') waiting.set(event.carrier, event);
    else {
      if (event.kind === 'leave') call(event.carrier);
      else for (const carrier of operationWires(event.operation)) call(carrier);
      out.push(event);
    }
  }
  assert(waiting.size === 0, () => `${waiting.size} carriers enter and never leave`);
  return out;
}

function mostAtOnce(events: readonly WireEvent[]): number {
  let present = 0;
  let most = 0;
  for (const { kind } of events) {
    if (kind === 'enter') most = Math.max(most, ++present);
    else if (kind === 'leave') present--;
  }
  return most;
}

class Assembly {
  private readonly original: Circuit;
  private readonly contract: Contract;
  private readonly limit: number;
  private readonly ownBits: ReadonlyMap<number, number>;
  private readonly operations: Operation[] = [];
  private readonly reuse: NarrowedCircuit['reuse'] = [];
  private readonly wireOf: Map<number, number> = new Map();
  private readonly free: number[] = [];
  private used = 0;
  /** When each wire, and each bit, is done with what was written so far. */
  private readonly level: number[] = [];
  private readonly bitLevel: Map<number, number> = new Map();
  /** The output that left each wire last, and whether its name is still to be written. */
  private readonly lastOutput: { output: number; isUnnamed: boolean }[] = [];
  private usesOut = false;

  constructor(original: Circuit, contract: Contract, limit: number) {
    this.original = original;
    this.contract = contract;
    this.limit = limit;
    this.ownBits = measuredBits(original);
  }

  step(event: WireEvent): void {
    if (event.kind === 'enter') this.enter(event.carrier, event.input);
    else if (event.kind === 'leave') this.leave(event.carrier, event.output);
    else this.write(this.onWires(event.operation));
  }

  private enter(carrier: number, input: number): void {
    assert(!this.wireOf.has(carrier), () => `carrier ${carrier} enters twice`);
    const wire = this.used < this.limit ? this.used++ : this.earliestFree();
    this.level[wire] ??= 0;
    this.wireOf.set(carrier, wire);
    const last = this.lastOutput[wire];
    const annotations: string[] = [];
    if (last?.isUnnamed) annotations.push(`wiregauge.leaves ${last.output}`);
    if (input >= 0) annotations.push(`wiregauge.enters ${input}`);
    if (last && last.output >= 0 && input >= 0) {
      this.reuse.push({ wire, leaves: last.output, enters: input });
    }
    this.write({ kind: 'reset', wire, ...(annotations.length > 0 ? { annotations } : {}) });
  }

  private earliestFree(): number {
    assert(this.free.length > 0, () => 'more carriers at once than wires');
    let best = 0;
    this.free.forEach((wire, k) => {
      const [a, b] = [this.level[wire]!, this.level[this.free[best]!]!];
      if (a < b || (a === b && wire < this.free[best]!)) best = k;
    });
    return this.free.splice(best, 1)[0]!;
  }

  private leave(carrier: number, output: number): void {
    const wire = this.wireOf.get(carrier);
    assert(wire !== undefined, () => `carrier ${carrier} leaves before it enters`);
    this.wireOf.delete(carrier);
    this.free.push(wire);
    const rule = output < 0 ? 'dropped' : this.contract.outputs[output]!;
    this.lastOutput[wire] = { output, isUnnamed: rule === 'dropped' && output >= 0 };
    if (rule === 'dropped') return;
    const own = rule === 'measured' ? this.ownBits.get(output) : undefined;
    if (own === undefined) this.usesOut = true;
    const bit = own ?? this.original.bits + output;
    this.write({ kind: 'measure', wire, bit, annotations: [`wiregauge.leaves ${output}`] });
  }

  private onWires(operation: Operation): Operation {
    const place = (carrier: number): number => {
      const wire = this.wireOf.get(carrier);
      assert(wire !== undefined, () => `an operation on carrier ${carrier}, which is not there`);
      return wire;
    };
    for (const bit of bitsRead(operation)) if (bit >= this.original.bits) this.usesOut = true;
    return moved(operation, place);
  }

  /** Writes an operation on physical wires and keeps the levels. */
  private write(operation: Operation): void {
    const wires = operationWires(operation);
    const bits = bitsRead(operation);
    const written = bitWritten(operation);
    let top = 0;
    for (const wire of wires) top = Math.max(top, this.level[wire]!);
    for (const bit of bits) top = Math.max(top, this.bitLevel.get(bit) ?? 0);
    if (operation.kind !== 'assign' && operation.kind !== 'barrier') top++;
    for (const wire of wires) this.level[wire] = top;
    for (const bit of written >= 0 ? [...bits, written] : bits) this.bitLevel.set(bit, top);
    this.operations.push(operation);
  }

  finish(rules: readonly string[]): NarrowedCircuit {
    const { original } = this;
    // a circuit of whose qubits nobody sees anything needs no wire, but a text without one is none
    const wires = Math.max(1, this.used);
    const start: Operation[] =
      this.used > 0 ? [] : [{ kind: 'reset', wire: 0, annotations: ['wiregauge.enters 0'] }];
    const bitRegisters = [...original.bitRegisters];
    const taken = new Set(bitRegisters.map(({ name }) => name));
    let bits = original.bits;
    if (this.usesOut) {
      const size = original.wires;
      bitRegisters.push({ name: freeName('out', taken), first: bits, size, scalar: false });
      bits += size;
    }
    taken.add('out');
    const qubits: Register[] = [
      { name: freeName('q', taken), first: 0, size: wires, scalar: false },
    ];
    return {
      circuit: {
        name: original.name,
        wires,
        bits,
        qubitRegisters: qubits,
        bitRegisters,
        operations: [...start, ...this.operations],
        globalPhase: original.globalPhase,
      },
      reuse: this.reuse,
      rules: [...rules],
    };
  }
}

function freeName(wanted: string, taken: ReadonlySet<string>): string {
  let name = wanted;
  while (taken.has(name)) name += '_';
  return name;
}
