/** Reads texts (a JSON list on standard input) and prints what came of each; run by a test under a memory limit. */
import { readFileSync } from 'node:fs';
import { InputError } from '../../src/input-error.ts';
import { readCircuit } from '../../src/read/openqasm.ts';

const texts = JSON.parse(readFileSync(0, 'utf8')) as string[];
const outcomes = texts.map((text) => {
  try {
    return `${readCircuit(text, 'memory.qasm').circuit.operations.length} operations`;
  } catch (error) {
    if (error instanceof InputError) return error.code;
    throw error;
  }
});
process.stdout.write(JSON.stringify(outcomes));
