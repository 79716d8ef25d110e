/**
 * What must stay the same when a circuit is rewritten.
 *
 * `inputs` and `outputs` hold one entry per wire of the original circuit.
 *
 * | input | meaning |
 * |---|---|
 * | any  | the circuit must act the same for every state of this wire |
 * | zero | this wire starts in |0>; only that matters |
 *
 * | output | meaning |
 * |---|---|
 * | kept     | somebody may still use this qubit: equality as an operator, up to one global phase |
 * | measured | measured in the Z basis and thrown away: only the joint distribution of bits counts |
 * | dropped  | nobody looks at it: it is traced out |
 */
export type InputRule = 'any' | 'zero';
export type OutputRule = 'kept' | 'measured' | 'dropped';

export type Contract = {
  inputs: readonly InputRule[];
  outputs: readonly OutputRule[];
  /** Who decided: the options of the caller, or the file (see `contractOf` in circuit/). */
  decidedBy: 'options' | 'file';
};

/** What a caller may ask for: one rule for all wires, or nothing, and overrides by wire. */
export type ContractOptions = {
  inputs?: InputRule;
  outputs?: 'kept' | 'measured';
  inputOf?: ReadonlyMap<number, InputRule>;
  outputOf?: ReadonlyMap<number, OutputRule>;
};

/** The short name used in reports: `any/kept`, `any/measured`, `zero/kept`, `zero/measured`, `program` or `mixed`. */
export function contractName(contract: Contract): string {
  const inputs = new Set(contract.inputs);
  const outputs = new Set(contract.outputs);
  if (inputs.size <= 1 && outputs.size <= 1 && !outputs.has('dropped')) {
    const [input = 'any'] = inputs;
    const [output = 'kept'] = outputs;
    if (contract.decidedBy === 'file' && input === 'zero') return 'program';
    return `${input}/${output}`;
  }
  return !inputs.has('any') && !outputs.has('kept') ? 'program' : 'mixed';
}
