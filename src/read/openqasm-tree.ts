/** The statements and expressions of an OpenQASM text, as read; `at` is the offset of their first character. */

export type Expression = { at: number } & (
  | { kind: 'number'; value: number; integer: boolean }
  | { kind: 'boolean'; value: boolean }
  | { kind: 'bitString'; text: string }
  | { kind: 'operand'; operand: Operand }
  | { kind: 'unary'; operator: string; of: Expression }
  | { kind: 'power'; base: Expression; exponent: Expression }
  /** Left-associative operators of one rank: first op operand op operand ... */
  | { kind: 'chain'; first: Expression; rest: { operator: string; at: number; of: Expression }[] }
  | { kind: 'call'; name: string; arguments: Expression[] }
  | { kind: 'measure'; operand: Operand }
);

/** `[i]`, `[a:b]`, `[a:step:b]` or `[{i, j}]`. */
export type IndexPart = { at: number } & (
  | { kind: 'one'; value: Expression }
  | {
      kind: 'range';
      first: Expression | null;
      step: Expression | null;
      last: Expression | null;
    }
  | { kind: 'set'; items: Expression[] }
);

/** A register, an alias, or parts of one: `q`, `q[2]`, `q[0:2]`. */
export type Operand = { at: number; name: string; indices: IndexPart[] };

export type Modifier = { at: number } & (
  | { kind: 'control'; positive: boolean; count: Expression | null }
  | { kind: 'inverse' }
  | { kind: 'power'; exponent: Expression }
);

export type Named = { at: number; name: string };

export type GateDefinition = {
  kind: 'gate';
  name: Named;
  parameters: Named[];
  operands: Named[];
  body: Statement[];
};

export type GateCall = {
  kind: 'call';
  modifiers: Modifier[];
  name: Named;
  angles: Expression[];
  operands: Operand[];
};

export type Statement = { at: number; annotations?: string[] } & (
  | { kind: 'version'; text: string }
  | { kind: 'include'; file: string }
  | { kind: 'qubits'; name: Named; size: Expression | null }
  | { kind: 'bits'; name: Named; size: Expression | null; value: Expression | null }
  | { kind: 'constant'; type: string; name: Named; value: Expression }
  | { kind: 'alias'; name: Named; parts: Operand[] }
  | GateDefinition
  | { kind: 'opaque'; name: Named }
  | GateCall
  | { kind: 'measure'; operand: Operand; target: Operand | null }
  | { kind: 'reset'; operand: Operand }
  | { kind: 'barrier'; operands: Operand[] }
  | { kind: 'assign'; target: Operand; operator: string; value: Expression }
  | { kind: 'if'; condition: Expression; then: Statement[]; otherwise: Statement[] }
  | { kind: 'for'; name: Named; over: IndexPart; body: Statement[] }
  | { kind: 'pragma'; text: string }
);
