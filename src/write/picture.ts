/**
 * Writes a circuit as SVG in textbook notation: wires from left to right, dots, targets, crosses, boxes,
 * dials, double lines for bits. On a narrowed circuit the stretch of every qubit on a shared wire is shaded,
 * with a filled flag where it enters and an outlined one where it leaves, and blocks are bracketed.
 *
 * Every operation is a group with `data-op` (its index), `data-line` (its line in the text) and `data-wires`,
 * so that a page can link drawing, text and tables. Beyond `WIRES_MAX` wires or `OPERATIONS_MAX` operations
 * the drawing is simplified to strokes, and beyond `STROKES_MAX` it is cut, and says so.
 */
import { type Circuit, wireName } from '../circuit/circuit.ts';
import { countCircuit } from '../circuit/counts.ts';
import { type DocumentOptions, svgDocument } from './picture-document.ts';
import { escapeXml, type Glyph, operationGlyph, ROW, textWidth } from './picture-glyphs.ts';
import { operationText } from './picture-labels.ts';
import { type LayoutOptions, layoutCircuit, type PictureLayout } from './picture-layout.ts';
import { strokePicture } from './picture-strokes.ts';

export const WIRES_MAX = 60;
export const OPERATIONS_MAX = 2000;

export type PictureOptions = LayoutOptions &
  DocumentOptions & {
    /** Names of the original qubits, for the flags; `q[0]`, `q[1]` ... by default. */
    qubitNames?: readonly string[];
    /** Short name of the picture. */
    title?: string;
  };

/** Space between columns, and above and below the wires. */
const GAP = 12;
const MARGIN = 14;

export function circuitPicture(circuit: Circuit, options: PictureOptions = {}): string {
  if (isSimplified(circuit)) return strokePicture(circuit, options);
  const layout = layoutCircuit(circuit, options);
  const nameOf = (qubit: number): string => options.qubitNames?.[qubit] ?? `q[${qubit}]`;
  const glyphs = layout.placed.map((placed) => operationGlyph(circuit, layout, placed, nameOf));
  const labelOf = (row: number): string => rowLabel(circuit, layout, row);
  const labels = Array.from({ length: layout.rows }, (_, row) => labelOf(row));
  const left = MARGIN + Math.max(16, ...labels.map((label) => textWidth(label, 13))) + 10;
  const { middles, right } = columnPlaces(layout, glyphs, left + GAP);
  const hasBrackets = layout.brackets.length > 0;
  const top = MARGIN + ROW / 2 + (hasBrackets ? 22 : 0);
  const height = top + Math.max(layout.rows - 1, 0) * ROW + ROW / 2 + MARGIN;
  const width = right + GAP + MARGIN;
  const edges = { left, right: right + GAP, middles, glyphs };
  const body = [
    `<g transform="translate(0 ${top})">`,
    ...lifeBands(layout, edges),
    ...wireLines(circuit, layout, edges),
    ...labels.map(
      (label, row) =>
        `<text class="label" x="${left - 8}" y="${row * ROW + 4.5}" data-wire="${row < layout.wires ? row : ''}">${escapeXml(label)}</text>`,
    ),
    ...layout.placed.map((placed, k) => {
      const words = escapeXml(operationText(circuit, circuit.operations[placed.index]!));
      const line = placed.line === undefined ? '' : ` data-line="${placed.line}"`;
      return `<g class="op" data-op="${placed.index}"${line} data-wires="${placed.wires.join(' ')}" transform="translate(${round(middles[placed.column]!)} 0)"><title>${words}</title>${glyphs[k]!.svg}</g>`;
    }),
    ...bracketLines(layout, edges),
    '</g>',
  ];
  return svgDocument(width, height, pictureWords(circuit, layout, options, nameOf), options, body);
}

/** True when a circuit is drawn as strokes, without symbols and links. */
export function isSimplified({ wires, operations }: Circuit): boolean {
  return wires > WIRES_MAX || operations.length > OPERATIONS_MAX;
}

type Edges = { left: number; right: number; middles: Float64Array; glyphs: readonly Glyph[] };

function rowLabel(circuit: Circuit, layout: PictureLayout, row: number): string {
  if (row < layout.wires) return wireName(circuit, row);
  if (layout.classical !== 'lines') return 'bits';
  return circuit.bitRegisters[row - layout.wires]?.name ?? 'bits';
}

function columnPlaces(
  layout: PictureLayout,
  glyphs: readonly Glyph[],
  start: number,
): { middles: Float64Array; right: number } {
  const half = new Float64Array(layout.columns).fill(10);
  layout.placed.forEach(({ column }, k) => {
    half[column] = Math.max(half[column]!, glyphs[k]!.halfWidth);
  });
  const middles = new Float64Array(layout.columns);
  let x = start;
  for (let column = 0; column < layout.columns; column++) {
    middles[column] = x + half[column]!;
    x += 2 * half[column]! + GAP;
  }
  return { middles, right: Math.max(x - GAP, start + 40) };
}

function lifeBands(layout: PictureLayout, { middles }: Edges): string[] {
  const seen = new Int32Array(layout.wires);
  return layout.lifespans.map(({ wire, from, to, enters, leaves }) => {
    const odd = seen[wire]!++ % 2 === 1 ? ' odd' : '';
    const x = middles[from]! - 12;
    const width = Math.max(24, middles[to]! + 12 - x);
    return `<rect class="life${odd}" data-enters="${enters}" data-leaves="${leaves}" x="${round(x)}" y="${wire * ROW - 19}" width="${round(width)}" height="38" rx="5"/>`;
  });
}

/** One line a wire, doubled where it is only the record of a measured bit: from a measurement to a reset. */
function wireLines(
  circuit: Circuit,
  layout: PictureLayout,
  { left, right, middles }: Edges,
): string[] {
  const start: number[] = new Array(layout.wires).fill(left);
  const out: string[] = [];
  const draw = (wire: number, from: number, to: number): void => {
    if (to > from) out.push(`<path class="wire" d="M${round(from)} ${wire * ROW}H${round(to)}"/>`);
  };
  const isOver: boolean[] = new Array(layout.wires).fill(false);
  for (const { index, column, wires, enters, leaves } of layout.placed) {
    const { kind } = circuit.operations[index]!;
    const wire = wires[0]!;
    if (kind === 'reset' && enters !== undefined) {
      // nothing is on the wire between one qubit's leaving and the next one's entering
      const isFirst = start[wire] === left && !isOver[wire];
      if (!isOver[wire] && !isFirst) draw(wire, start[wire]!, middles[column]!);
      start[wire] = middles[column]!;
      isOver[wire] = false;
    } else if (kind === 'measure' && leaves !== undefined) {
      draw(wire, start[wire]!, middles[column]!);
      isOver[wire] = true;
    }
  }
  for (let wire = 0; wire < layout.wires; wire++)
    if (!isOver[wire]) draw(wire, start[wire]!, right);
  for (let row = layout.wires; row < layout.rows; row++) {
    out.push(
      `<path class="bits" d="M${left} ${row * ROW - 1.5}H${round(right)}M${left} ${row * ROW + 1.5}H${round(right)}"/>`,
    );
  }
  return out;
}

function bracketLines(layout: PictureLayout, { middles, glyphs }: Edges): string[] {
  const half = new Float64Array(layout.columns).fill(10);
  layout.placed.forEach(({ column }, k) => {
    half[column] = Math.max(half[column]!, glyphs[k]!.halfWidth);
  });
  return layout.brackets.map(({ label, from, to }) => {
    const x = round(middles[from]! - half[from]! - 2);
    const end = round(middles[to]! + half[to]! + 2);
    const y = -ROW / 2 - 2;
    return `<path class="bracket" d="M${x} ${y + 6}V${y}H${end}V${y + 6}"/><text class="note" x="${(x + end) / 2}" y="${y - 6}">${label}</text>`;
  });
}

/** Title and description, for whoever cannot see the picture. */
function pictureWords(
  circuit: Circuit,
  layout: PictureLayout,
  options: PictureOptions,
  nameOf: (qubit: number) => string,
): { title: string; description: string } {
  const { oneQubit, twoQubit, depth, measurements } = countCircuit(circuit);
  const parts = [
    `${circuit.wires} ${circuit.wires === 1 ? 'wire' : 'wires'}, ${oneQubit + twoQubit} gates (${twoQubit} on two wires or more), ${measurements} measurements, depth ${depth}.`,
  ];
  for (const { wire, enters, leaves } of layout.lifespans) {
    if (enters < 0) continue;
    const end = leaves < 0 ? 'stays' : `leaves as ${nameOf(leaves)}`;
    parts.push(`On wire ${wireName(circuit, wire)}, ${nameOf(enters)} enters and ${end}.`);
  }
  return { title: options.title ?? `Circuit ${circuit.name}`, description: parts.join(' ') };
}

function round(x: number): number {
  return Math.round(x * 10) / 10;
}
