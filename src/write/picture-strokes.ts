/**
 * Writes a large circuit as strokes: a thin line for every gate over its wires, a mark on each wire it acts
 * on, shaded stretches where qubits share a wire. A few long paths instead of many elements, so that
 * hundreds of wires and thousands of gates still draw at once.
 */
import { type Circuit, wireName } from '../circuit/circuit.ts';
import { type DocumentOptions, svgDocument } from './picture-document.ts';
import { layoutCircuit } from './picture-layout.ts';

/** More operations than this are not drawn. */
export const STROKES_MAX = 20_000;

const STEP = 7;
const LINE = 11;
const LEFT = 70;
const TOP = 34;

export type StrokeOptions = DocumentOptions & { title?: string };

export function strokePicture(circuit: Circuit, options: StrokeOptions = {}): string {
  const isCut = circuit.operations.length > STROKES_MAX;
  const shown = isCut
    ? { ...circuit, operations: circuit.operations.slice(0, STROKES_MAX) }
    : circuit;
  const layout = layoutCircuit(shown, { classical: 'tags', brackets: false });
  const x = (column: number): number => LEFT + 8 + column * STEP;
  const y = (wire: number): number => TOP + wire * LINE;
  const right = x(layout.columns) + 4;
  const links: string[] = [];
  const marks: string[] = [];
  const ends: string[] = [];
  for (const { index, column, wires, top, bottom } of layout.placed) {
    const { kind } = shown.operations[index]!;
    if (kind === 'barrier' || wires.length === 0) continue;
    if (bottom > top) links.push(`M${x(column)} ${y(wires.reduce((a, b) => Math.min(a, b)))}V${y(wires.reduce((a, b) => Math.max(a, b)))}`); // biome-ignore format: one path
    const into = kind === 'gate' ? marks : ends;
    for (const wire of wires) into.push(`M${x(column) - 2} ${y(wire) - 2}h4v4h-4z`);
  }
  const seen = new Int32Array(layout.wires);
  const lives = layout.lifespans.map(({ wire, from, to }) => {
    const odd = seen[wire]!++ % 2 === 1 ? ' odd' : '';
    return `<rect class="life${odd}" x="${x(from) - 3}" y="${y(wire) - 4.5}" width="${x(to) - x(from) + 6}" height="9" rx="2"/>`;
  });
  const wires = Array.from({ length: circuit.wires }, (_, k) => `M${LEFT} ${y(k)}H${right}`);
  const every = circuit.wires > 40 ? 5 : 1;
  const labels = Array.from({ length: circuit.wires }, (_, k) =>
    k % every === 0
      ? `<text class="angle end" x="${LEFT - 6}" y="${y(k) + 3.5}">${wireName(circuit, k)}</text>`
      : '',
  );
  const size = `${circuit.wires} wires, ${circuit.operations.length} operations`;
  const note = isCut
    ? `${size}; the first ${STROKES_MAX} operations, drawn as strokes`
    : `${size}, drawn as strokes`;
  return svgDocument(
    right + 14,
    y(Math.max(circuit.wires - 1, 0)) + 20,
    { title: options.title ?? `Circuit ${circuit.name}`, description: `${note}.` },
    options,
    [
      `<text class="note start" x="14" y="16">${note}</text>`,
      ...lives,
      `<path class="wire" opacity=".35" d="${wires.join('')}"/>`,
      `<path class="link" d="${links.join('')}"/>`,
      `<path class="dot" d="${marks.join('')}"/>`,
      `<path class="flag" d="${ends.join('')}"/>`,
      ...labels,
    ],
  );
}
