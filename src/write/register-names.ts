/** Gives registers names that a written text may use, and registers to wires and bits that have none. */
import type { Circuit, Register } from '../circuit/circuit.ts';
import { gateTable } from '../circuit/gates.ts';

/** Words of either language that are no names of registers, and the constants of both. */
const RESERVED = new Set(
  (
    'OPENQASM include defcalgrammar def cal defcal gate extern box let break continue if else end return for ' +
    'while in switch case default nop pragma input output const readonly mutable qreg qubit creg bool bit int ' +
    'uint float angle complex array void duration stretch gphase inv pow ctrl negctrl dim durationof delay ' +
    'reset measure barrier true false im pi tau euler opaque U CX sin cos tan exp ln log sqrt arcsin arccos ' +
    'arctan mod floor ceiling popcount rotl rotr sizeof real imag u0 rc3x'
  ).split(' '),
);

/** The same circuit with registers that cover all wires and bits under names free for use. */
export function safelyNamed(circuit: Circuit, language: '2.0' | '3'): Circuit {
  const taken = new Set<string>();
  const fix = (registers: readonly Register[], count: number, fallback: string): Register[] => {
    const list = covers(registers, count)
      ? registers
      : count > 0
        ? [{ name: fallback, first: 0, size: count, scalar: false }]
        : [];
    return list.map((register) => {
      let name = register.name.replaceAll(/[^\p{L}\p{N}_]/gu, '_');
      if (language === '2.0')
        name = name.replaceAll(/[^A-Za-z0-9_]/g, '_').replace(/^([^a-z])/, 'r$1');
      if (!/^[\p{L}_]/u.test(name)) name = `r${name}`;
      while (RESERVED.has(name) || gateTable.has(name) || taken.has(name)) name += '_';
      taken.add(name);
      // 2.0 knows no single qubits: a register of one then
      return { ...register, name, scalar: register.scalar && language === '3' };
    });
  };
  const qubitRegisters = fix(circuit.qubitRegisters, circuit.wires, 'q');
  const bitRegisters = fix(circuit.bitRegisters, circuit.bits, 'c');
  return { ...circuit, qubitRegisters, bitRegisters };
}

/** True when the registers hold the places 0 .. count-1 in order. */
function covers(registers: readonly Register[], count: number): boolean {
  let next = 0;
  for (const { first, size, scalar } of registers) {
    if (first !== next || size < 1 || (scalar && size !== 1)) return false;
    next += size;
  }
  return next === count;
}
