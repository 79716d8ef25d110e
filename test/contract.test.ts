import { describe, expect, test } from 'vitest';
import { emptyCircuit, gate, type Operation } from '../src/circuit/circuit.ts';
import { contractOf } from '../src/circuit/contract.ts';
import { contractName } from '../src/contract.ts';

const measure = (wire: number, bit: number): Operation => ({ kind: 'measure', wire, bit });
const block = { ...emptyCircuit(2), operations: [gate('cx', [0, 1])] };
const program = { ...emptyCircuit(3, 2), operations: [...block.operations, measure(0, 0)] };

describe('contractOf', () => {
  test('a circuit without measurements is a block', () => {
    const contract = contractOf(block);
    expect(contract).toEqual({
      inputs: ['any', 'any'],
      outputs: ['kept', 'kept'],
      decidedBy: 'file',
    });
    expect(contractName(contract)).toBe('any/kept');
  });

  test('a circuit with measurements is a program; what nobody measures is dropped', () => {
    const contract = contractOf(program);
    expect(contract.inputs).toEqual(['zero', 'zero', 'zero']);
    expect(contract.outputs).toEqual(['measured', 'dropped', 'dropped']);
    expect(contractName(contract)).toBe('program');
  });

  test('a wire that is used again after its measurement is not a measured output', () => {
    const reused = { ...program, operations: [...program.operations, gate('h', [0])] };
    expect(contractOf(reused).outputs[0]).toBe('dropped');
  });

  test('an option for one side leaves the other to the file, and the measurement stays a fact', () => {
    const anyInput = contractOf(program, { inputs: 'any' });
    expect(anyInput.inputs).toEqual(['any', 'any', 'any']);
    expect(anyInput.outputs).toEqual(['measured', 'dropped', 'dropped']);
    expect(contractOf(program, { outputs: 'kept' }).outputs).toEqual(['measured', 'kept', 'kept']);
    expect(contractName(contractOf(block, { outputs: 'measured' }))).toBe('any/measured');
    expect(contractName(contractOf(block, { inputs: 'zero' }))).toBe('zero/kept');
  });

  test('overrides by wire win over everything', () => {
    const contract = contractOf(program, {
      inputOf: new Map([[1, 'any']]),
      outputOf: new Map([[2, 'kept']]),
    });
    expect(contract.inputs).toEqual(['zero', 'any', 'zero']);
    expect(contract.outputs).toEqual(['measured', 'dropped', 'kept']);
    expect(contractName(contract)).toBe('mixed');
  });
});
