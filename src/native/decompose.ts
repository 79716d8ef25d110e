/**
 * Takes gates on three wires or more, and gates with extra controls, apart into gates on one and two wires, exactly.
 *
 * Method: published networks where there are good ones (Toffoli in 6 CX: Nielsen, Chuang, figure 4.9; a relative-phase
 * Toffoli in 3 CX: Song, Klappenecker, quant-ph/0312225); controlled gates by the square-root recursion of Barenco et al.,
 * PRA 52, 3457 (1995), lemmas 6.1 and 7.5. Phases are kept, because they matter under a control.
 * Cost: controlled gates with k controls take about 3^k two-wire gates; `CONTROLS_MAX` is the limit here.
 * Fails: InputError for more controls, and for matrices on three wires or more, which need a fit.
 */
import { type GateOperation, gate, unitaryGate } from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';
import { baseMatrix } from '../circuit/unitary.ts';
import { InputError } from '../input-error.ts';
import { adjoint } from '../numeric/complex-matrix.ts';
import { unitaryPower } from '../numeric/unitary-eigen.ts';

export const CONTROLS_MAX = 8;

/** The same gate in gates on at most two wires without extra controls; the phase is exact. */
export function decompose(operation: GateOperation): GateOperation[] {
  const { wires, controls, name, power } = operation;
  if (controls.length === 0 && wires.length <= 2) return [operation];
  const negated = controls.flatMap((isOn, k) => (isOn ? [] : [gate('x', [wires[k]!])]));
  if (negated.length > 0) {
    const positive = { ...operation, controls: controls.map(() => true) };
    return [...negated, ...decompose(positive), ...negated];
  }
  const outer = wires.slice(0, controls.length);
  const inner = wires.slice(controls.length);
  const network = power === 1 ? networkOf(name, inner) : undefined;
  if (network) {
    if (outer.length === 0) return network.flatMap((step) => decompose(step));
    // controlling every gate of an exact network controls the whole
    return network.flatMap((step) => decompose(underControls(step, outer)));
  }
  if (inner.length === 1) return controlledOneWire(outer, inner[0]!, baseMatrix(operation));
  if (inner.length === 2 && outer.length > 0) {
    throw tooLarge(operation, `a controlled two-wire gate ${name} without a known network`);
  }
  throw tooLarge(operation, `a gate on ${wires.length} wires without a known network`);
}

function tooLarge({ line, column }: GateOperation, what: string): InputError {
  return new InputError({
    code: 'no-network',
    message: `expected gates that can be written in native gates exactly, got ${what}`,
    ...(line === undefined ? {} : { line }),
    ...(column === undefined ? {} : { column }),
    hint: 'wiregauge build makes native gates for any unitary',
  });
}

function underControls(step: GateOperation, outer: readonly number[]): GateOperation {
  return {
    ...step,
    wires: [...outer, ...step.wires],
    controls: [...outer.map(() => true), ...step.controls],
  };
}

/** Networks of table gates, exact including the phase, from smaller ones. */
function networkOf(name: string, w: readonly number[]): GateOperation[] | undefined {
  const [a, b, c, d, e] = w as [number, number, number, number, number];
  switch (name) {
    case 'cx':
    case 'CX':
      return [underControls(gate('x', [b]), [a])];
    case 'cy':
      return [underControls(gate('y', [b]), [a])];
    case 'cz':
      return [underControls(gate('z', [b]), [a])];
    case 'ch':
      return [underControls(gate('h', [b]), [a])];
    case 'swap':
      return [gate('cx', [b, a]), gate('cx', [a, b]), gate('cx', [b, a])];
    case 'ccx':
      return toffoli(a, b, c);
    case 'ccz':
      return [gate('h', [c]), ...toffoli(a, b, c), gate('h', [c])];
    case 'cswap':
      return [gate('cx', [c, b]), gate('ccx', [a, b, c]), gate('cx', [c, b])];
    case 'rccx':
      return [
        gate('h', [c]),
        gate('t', [c]),
        gate('cx', [b, c]),
        gate('tdg', [c]),
        gate('cx', [a, c]),
        gate('t', [c]),
        gate('cx', [b, c]),
        gate('tdg', [c]),
        gate('h', [c]),
      ];
    case 'c3x':
      return [underControls(gate('x', [d]), [a, b, c])];
    case 'c4x':
      return [underControls(gate('x', [e]), [a, b, c, d])];
    case 'c3sqrtx':
      return [underControls(gate('sx', [d]), [a, b, c])];
    case 'c3sqrtxdg':
      return [underControls(gate('sxdg', [d]), [a, b, c])];
    default:
      return undefined;
  }
}

function toffoli(a: number, b: number, c: number): GateOperation[] {
  return [
    gate('h', [c]),
    gate('cx', [b, c]),
    gate('tdg', [c]),
    gate('cx', [a, c]),
    gate('t', [c]),
    gate('cx', [b, c]),
    gate('tdg', [c]),
    gate('cx', [a, c]),
    gate('t', [b]),
    gate('t', [c]),
    gate('h', [c]),
    gate('cx', [a, b]),
    gate('t', [a]),
    gate('tdg', [b]),
    gate('cx', [a, b]),
  ];
}

/** u on `target` under positive controls. */
function controlledOneWire(
  controls: readonly number[],
  target: number,
  u: Float64Array,
): GateOperation[] {
  if (controls.length > CONTROLS_MAX) {
    throw new InputError({
      code: 'too-many-controls',
      message: `number of controls must be at most ${CONTROLS_MAX}, got ${controls.length}`,
    });
  }
  if (controls.length === 0) return [unitaryGate(u, [target])];
  if (controls.length === 1) return [unitaryGate(controlledMatrix(u), [controls[0]!, target])];
  if (controls.length === 2 && isMatrix(u, 'x')) return toffoli(controls[0]!, controls[1]!, target);
  if (controls.length === 2 && isMatrix(u, 'z')) {
    return [
      gate('h', [target]),
      ...toffoli(controls[0]!, controls[1]!, target),
      gate('h', [target]),
    ];
  }
  // C^k(u) = C(v) C^{k-1}X C(v^dag) C^{k-1}X C^{k-1}(v), v^2 = u, with the last control taken apart
  const v = unitaryPower(u, 2, 0.5);
  const [last] = controls.slice(-1) as [number];
  const others = controls.slice(0, -1);
  const flip = controlledOneWire(others, last, gateTable.get('x')!.matrix([]));
  return [
    ...controlledOneWire([last], target, v),
    ...flip,
    ...controlledOneWire([last], target, adjoint(v, 2)),
    ...flip,
    ...controlledOneWire(others, target, v),
  ];
}

function controlledMatrix(u: Float64Array): Float64Array {
  const out = new Float64Array(32);
  out[0] = out[5] = 1;
  for (let i = 0; i < 2; i++) {
    for (let j = 0; j < 2; j++) {
      out[(i + 2) * 4 + j + 2] = u[i * 2 + j]!;
      out[16 + (i + 2) * 4 + j + 2] = u[4 + i * 2 + j]!;
    }
  }
  return out;
}

function isMatrix(u: Float64Array, name: string): boolean {
  return gateTable
    .get(name)!
    .matrix([])
    .every((x, k) => x === u[k]);
}
