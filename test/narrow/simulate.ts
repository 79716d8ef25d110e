/**
 * A plain simulation of narrowed texts for tests: its own parsing of the few statements that narrowed circuits in
 * cx, rz, sx contain, its own state vector; nothing of the tool is used.
 *
 * Each `reset` starts a fresh qubit that holds the input named by its annotation; a measured qubit stays where it
 * is, and a condition on its bit becomes a control.
 */
export type Played = {
  /** Columns of the map from inputs (input 0 most significant) to outputs: [input state][output state]. */
  columns: { re: Float64Array; im: Float64Array }[];
  counts: Map<string, number>;
  wires: number;
};

type Gate = {
  name: string;
  angle: number;
  wires: number[];
  when: { qubit: number; value: boolean }[];
};

/** Plays the text for n original qubits; outputs are ordered by their annotations. */
export function play(text: string, n: number): Played {
  const { gates, outputQubit, wires } = parse(text);
  const columns = Array.from({ length: 2 ** n }, (_, input) => {
    const re = new Float64Array(2 ** n);
    const im = new Float64Array(2 ** n);
    re[input] = 1;
    for (const gate of gates) apply(gate, re, im, n);
    return reordered(re, im, outputQubit, n);
  });
  const counts = new Map<string, number>();
  for (const { name } of gates) counts.set(name, (counts.get(name) ?? 0) + 1);
  return { columns, counts, wires };
}

function parse(text: string): { gates: Gate[]; outputQubit: number[]; wires: number } {
  const gates: Gate[] = [];
  const outputQubit: number[] = [];
  // which original input the qubit on each wire started as; which qubit each bit was measured from
  const qubitOn = new Map<string, number>();
  const qubitOfBit = new Map<string, number>();
  let wires = 0;
  let entering = -1;
  let leaving = -1;
  const conditions: { qubit: number; value: boolean }[][] = [];
  for (const raw of text.split('\n')) {
    const line = raw.replace(/\/\/.*$/, '').trim();
    const annotation = /^@wiregauge\.(enters|leaves) (\d+)$/.exec(line);
    if (annotation) {
      if (annotation[1] === 'enters') entering = Number(annotation[2]);
      else leaving = Number(annotation[2]);
      continue;
    }
    let rest = line;
    const opened = /^if \((.*)\) \{(.*)$/.exec(rest);
    if (opened) {
      conditions.push(conditionOf(opened[1]!, qubitOfBit));
      rest = opened[2]!.trim();
    }
    const closes = rest.endsWith('}');
    if (closes) rest = rest.slice(0, -1).trim();
    for (const statement of rest.split(';').map((s) => s.trim())) {
      if (statement === '' || /^(OPENQASM|include|bit)/.test(statement)) continue;
      const declared = /^qubit\[(\d+)\]/.exec(statement) ?? /^qubit/.exec(statement);
      if (declared) {
        wires += declared[1] ? Number(declared[1]) : 1;
        continue;
      }
      const reset = /^reset (.+)$/.exec(statement);
      const measure = /^(.+) = measure (.+)$/.exec(statement);
      const plain = /^(cx|sx|rz|x|gphase)(?:\(([^)]*)\))? ?(.*)$/.exec(statement);
      if (reset) {
        if (entering < 0) throw new Error(`no input enters at: ${line}`);
        qubitOn.set(reset[1]!, entering);
        entering = -1;
      } else if (measure) {
        const qubit = qubitOn.get(measure[2]!)!;
        qubitOfBit.set(measure[1]!, qubit);
        if (leaving >= 0) outputQubit[leaving] = qubit;
        leaving = -1;
      } else if (plain) {
        if (plain[1] === 'gphase') continue;
        const names = plain[3]!.split(',').map((s) => s.trim());
        const operands = names.map((name) => qubitOn.get(name) ?? Number.NaN);
        const angle = plain[2] ? angleOf(plain[2]) : 0;
        gates.push({ name: plain[1]!, angle, wires: operands, when: conditions.flat() });
      } else throw new Error(`the test's simulation does not know: ${line}`);
    }
    if (closes) conditions.pop();
  }
  return { gates, outputQubit, wires };
}

function conditionOf(
  text: string,
  qubitOfBit: Map<string, number>,
): { qubit: number; value: boolean }[] {
  return text.split('&&').map((part) => {
    const bare = part.replaceAll(/[()]/g, ' ').trim();
    const value = !bare.startsWith('!') && !/== (0|false)$/.test(bare);
    const name = bare
      .replace(/^!\s*/, '')
      .replace(/ == .*$/, '')
      .trim();
    const qubit = qubitOfBit.get(name);
    if (qubit === undefined) throw new Error(`no bit was measured into ${name}`);
    return { qubit, value };
  });
}

function angleOf(text: string): number {
  const match = /^(-?)(?:([\d.e+-]+)\s*\*\s*)?pi(?:\s*\/\s*([\d.]+))?$/.exec(
    text.replaceAll(' ', ''),
  );
  if (!match) return Number(text);
  const sign = match[1] === '-' ? -1 : 1;
  return (sign * Number(match[2] ?? 1) * Math.PI) / Number(match[3] ?? 1);
}

function apply(
  { name, angle, wires, when }: Gate,
  re: Float64Array,
  im: Float64Array,
  n: number,
): void {
  const bit = (qubit: number): number => 2 ** (n - 1 - qubit);
  const target = bit(wires.at(-1)!);
  for (let s = 0; s < re.length; s++) {
    if (s & target || when.some(({ qubit, value }) => ((s & bit(qubit)) !== 0) !== value)) continue;
    if (name === 'cx' && !(s & bit(wires[0]!))) continue;
    const t = s + target;
    const [a, b, c, d] = [re[s]!, im[s]!, re[t]!, im[t]!];
    if (name === 'rz') {
      const [x, y] = [Math.cos(angle / 2), Math.sin(angle / 2)];
      [re[s], im[s], re[t], im[t]] = [a * x + b * y, b * x - a * y, c * x - d * y, d * x + c * y];
    } else if (name === 'sx') {
      // ((1+i) u + (1-i) v) / 2 and with u, v exchanged
      [re[s], im[s]] = [(a - b + c + d) / 2, (a + b - c + d) / 2];
      [re[t], im[t]] = [(a + b + c - d) / 2, (b - a + c + d) / 2];
    } else [re[s], im[s], re[t], im[t]] = [c, d, a, b];
  }
}

function reordered(
  re: Float64Array,
  im: Float64Array,
  outputQubit: readonly number[],
  n: number,
): { re: Float64Array; im: Float64Array } {
  const out = { re: new Float64Array(re.length), im: new Float64Array(re.length) };
  for (let s = 0; s < re.length; s++) {
    let to = 0;
    for (let k = 0; k < n; k++) if (s & (2 ** (n - 1 - outputQubit[k]!))) to += 2 ** (n - 1 - k);
    out.re[to] = re[s]!;
    out.im[to] = im[s]!;
  }
  return out;
}

/** D between a planar matrix and what was played. */
export function distanceTo(u: Float64Array, { columns }: Played): number {
  const d = columns.length;
  let [re, im] = [0, 0];
  columns.forEach((column, c) => {
    for (let r = 0; r < d; r++) {
      const [x, y] = [u[r * d + c]!, u[d * d + r * d + c]!];
      re += x * column.re[r]! + y * column.im[r]!;
      im += x * column.im[r]! - y * column.re[r]!;
    }
  });
  const size = Math.hypot(re, im);
  let sum = 0;
  columns.forEach((column, c) => {
    for (let r = 0; r < d; r++) {
      const [x, y] = [u[r * d + c]!, u[d * d + r * d + c]!];
      const p = column.re[r]! * (re / size) + column.im[r]! * (im / size);
      const q = column.im[r]! * (re / size) - column.re[r]! * (im / size);
      sum += (x - p) ** 2 + (y - q) ** 2;
    }
  });
  return sum / (2 * d);
}

/** For outputs that are only measured: how far any row is from the played one when its phase does not count. */
export function worstRowError(u: Float64Array, { columns }: Played): number {
  const d = columns.length;
  let worst = 0;
  for (let r = 0; r < d; r++) {
    let [re, im] = [0, 0];
    columns.forEach((column, c) => {
      const [x, y] = [u[r * d + c]!, u[d * d + r * d + c]!];
      re += x * column.re[r]! + y * column.im[r]!;
      im += x * column.im[r]! - y * column.re[r]!;
    });
    worst = Math.max(worst, Math.abs(1 - Math.hypot(re, im)));
  }
  return worst;
}
