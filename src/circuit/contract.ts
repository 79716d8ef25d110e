/**
 * Decides which contract holds for a circuit: what the caller asked for, or else what the file says. A
 * circuit with measurements is a program (inputs zero; an output whose last operation is a measurement into
 * a bit is measured; the others are dropped); a circuit without is a block (inputs any, outputs kept). Inputs and outputs are
 * decided one by one: asking for `inputs any` leaves the outputs to the file.
 */
import type { Contract, ContractOptions, InputRule, OutputRule } from '../contract.ts';
import type { Circuit } from './circuit.ts';

/** True when the circuit measures or resets: its wires then start in |0> unless the caller says otherwise. */
export function isProgram(circuit: Circuit): boolean {
  return circuit.operations.some(({ kind }) => kind === 'measure' || kind === 'reset');
}

export function contractOf(circuit: Circuit, options: ContractOptions = {}): Contract {
  const { inputs, outputs, inputOf, outputOf } = options;
  const program = isProgram(circuit);
  const measured = new Array<boolean>(circuit.wires).fill(false);
  for (const operation of circuit.operations) {
    if (operation.kind === 'measure') measured[operation.wire] = operation.bit >= 0;
    else if (operation.kind === 'reset') measured[operation.wire] = false;
    else if (operation.kind === 'gate') for (const wire of operation.wires) measured[wire] = false;
  }
  const inputRules: InputRule[] = [];
  const outputRules: OutputRule[] = [];
  for (let wire = 0; wire < circuit.wires; wire++) {
    inputRules.push(inputOf?.get(wire) ?? inputs ?? (program ? 'zero' : 'any'));
    // a measurement in the file is a fact: that output is measured, whatever is asked of the others
    const byFile: OutputRule = measured[wire] ? 'measured' : program ? 'dropped' : 'kept';
    const output = measured[wire] ? byFile : (outputs ?? byFile);
    outputRules.push(outputOf?.get(wire) ?? output);
  }
  const asked = inputs || outputs || inputOf?.size || outputOf?.size;
  return { inputs: inputRules, outputs: outputRules, decidedBy: asked ? 'options' : 'file' };
}
