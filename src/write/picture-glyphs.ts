/**
 * Draws one operation as SVG text, centred on x = 0 of its column: dots for controls, a circled cross for a
 * target, crosses for a swap, boxes for everything else, a dial for a measurement, a ket for a reset.
 *
 * Classes only, no styles: the picture or the page brings them. Rows are `ROW` apart, row 0 at y = 0.
 */
import { bitName, bitsRead, type Circuit, type GateOperation } from '../circuit/circuit.ts';
import {
  conditionText,
  type DrawnGate,
  drawnGate,
  type Symbol as GateSymbol,
  gateSymbol,
  operationText,
} from './picture-labels.ts';
import type { PictureLayout, PlacedOperation } from './picture-layout.ts';

/** Distance of two rows, and height of a box, in pixels. */
export const ROW = 46;
export const BOX = 30;

/** One operation drawn, and how far it reaches to the left and right of its column's middle. */
export type Glyph = { svg: string; halfWidth: number };

export function escapeXml(text: string): string {
  return text
    .replaceAll('&', '&amp;')
    .replaceAll('<', '&lt;')
    .replaceAll('>', '&gt;')
    .replaceAll('"', '&quot;');
}

/** Width of text set at a size, in pixels: an average, so boxes get a little room. */
export function textWidth(text: string, size: number): number {
  let ems = 0;
  for (const letter of text) ems += /[il.,'’()/[\] ]/.test(letter) ? 0.36 : /[A-ZmwπΩ√−]/.test(letter) ? 0.72 : 0.56; // biome-ignore format: one rule of thumb
  return ems * size;
}

const line = (y1: number, y2: number, kind = 'link'): string =>
  `<path class="${kind}" d="M0 ${y1}V${y2}"/>`;
const dot = (y: number, on = true): string =>
  `<circle class="${on ? 'dot' : 'ring'}" cy="${y}" r="${on ? 4.5 : 4.2}"/>`;

function target(y: number): string {
  return `<circle class="plus" cy="${y}" r="11"/><path class="stroke" d="M-11 ${y}H11M0 ${y - 11}V${y + 11}"/>`;
}

function cross(y: number): string {
  return `<path class="stroke" d="M-6 ${y - 6}L6 ${y + 6}M-6 ${y + 6}L6 ${y - 6}"/>`;
}

/** A box over rows, with its symbol; the angle stands below the symbol in small letters. */
function box(symbol: GateSymbol, top: number, bottom: number): Glyph {
  const small = symbol.angle ?? '';
  const name = `${symbol.base}${symbol.lower ?? ''}${symbol.upper ?? ''}`;
  const half = Math.max(BOX / 2, textWidth(name, 14) / 2 + 7, textWidth(small, 10) / 2 + 6);
  const y = (top + bottom) / 2;
  const shift = small ? -1.5 : 5;
  const rect = `<rect class="box" x="${-half}" y="${top - BOX / 2}" width="${2 * half}" height="${bottom - top + BOX}" rx="2"/>`;
  const lower = symbol.lower ? `<tspan class="tiny" dy="3">${escapeXml(symbol.lower)}</tspan>` : '';
  const rise = symbol.lower ? -9 : -6;
  const upper = symbol.upper
    ? `<tspan class="tiny" dy="${rise}">${escapeXml(symbol.upper)}</tspan>`
    : '';
  const text = `<text class="name" y="${y + shift}">${escapeXml(symbol.base)}${lower}${upper}</text>`;
  const angle = small ? `<text class="angle" y="${y + 10.5}">${escapeXml(small)}</text>` : '';
  return { svg: rect + text + angle, halfWidth: half };
}

function gateGlyph(gate: GateOperation): Glyph {
  const drawn = drawnGate(gate);
  const own = gate.controls.length;
  const controls = own + drawn.controls;
  const rowOf = (wire: number): number => wire * ROW;
  const controlled = gate.wires.slice(controls);
  const rows = gate.wires.map(rowOf);
  const [top, bottom] = [Math.min(...rows), Math.max(...rows)];
  const dots = gate.wires
    .slice(0, controls)
    .map((wire, k) => dot(rowOf(wire), k >= own || gate.controls[k] === true))
    .join('');
  const link = gate.wires.length > 1 ? line(top, bottom) : '';
  const plain = gate.power === 1;
  if (plain && drawn.name === 'x' && controls > 0) {
    return { svg: link + dots + target(rowOf(controlled[0]!)), halfWidth: 12 };
  }
  if (plain && drawn.name === 'swap') {
    return { svg: link + dots + controlled.map((w) => cross(rowOf(w))).join(''), halfWidth: 9 };
  }
  if (plain && drawn.name === 'z' && controls > 0) {
    return { svg: link + dots + dot(rowOf(controlled[0]!)), halfWidth: 8 };
  }
  if (plain && drawn.name === 'p' && controls > 0) {
    return phaseGlyph(link + dots + dot(rowOf(controlled[0]!)), gate, drawn, bottom);
  }
  return boxed(gate, drawn, controlled, link + dots);
}

/** A controlled phase: dots only, with its angle beside the last one. */
function phaseGlyph(svg: string, gate: GateOperation, drawn: DrawnGate, bottom: number): Glyph {
  const angle = gateSymbol(gate, drawn).angle ?? '';
  const text = `<text class="angle start" x="7" y="${bottom - 7}">${escapeXml(angle)}</text>`;
  return { svg: svg + text, halfWidth: 9 + textWidth(angle, 10) };
}

function boxed(
  gate: GateOperation,
  drawn: DrawnGate,
  wires: readonly number[],
  before: string,
): Glyph {
  const [top, bottom] = [Math.min(...wires) * ROW, Math.max(...wires) * ROW];
  const glyph = box(gateSymbol(gate, drawn), top, bottom);
  if (wires.length === 1) return { svg: before + glyph.svg, halfWidth: glyph.halfWidth };
  // operands carry their number where they are not simply in order; wires that only pass are drawn through
  const isSorted = wires.every((wire, k) => k === 0 || wires[k - 1]! + 1 === wire);
  const half = glyph.halfWidth + (isSorted ? 0 : 8);
  const wider = glyph.svg.replace(
    /x="[^"]*"( y="[^"]*") width="[^"]*"/,
    `x="${-half}"$1 width="${2 * half}"`,
  );
  const marks = isSorted
    ? ''
    : wires
        .map((w, k) => `<text class="operand" x="${5 - half}" y="${w * ROW + 3.5}">${k}</text>`)
        .join('');
  let passing = '';
  for (let wire = Math.min(...wires) + 1; wire < Math.max(...wires); wire++) {
    if (!wires.includes(wire))
      passing += `<path class="pass" d="M${-half} ${wire * ROW}H${half}"/>`;
  }
  return { svg: before + wider + passing + marks, halfWidth: half };
}

function measureGlyph(wire: number): string {
  const y = wire * ROW;
  return (
    `<rect class="box" x="-15" y="${y - 15}" width="30" height="30" rx="2"/>` +
    `<path class="stroke thin" d="M-9 ${y + 6}A9.5 9.5 0 0 1 9 ${y + 6}M0 ${y + 6}L7 ${y - 7}"/>`
  );
}

/** A double line down to the row of a bit register. */
function bitLine(from: number, to: number): string {
  return `<path class="bits" d="M-1.5 ${from}V${to}M1.5 ${from}V${to}"/>`;
}

/** Draws an operation of a layout. `qubitName` names a qubit of the original circuit. */
export function operationGlyph(
  circuit: Circuit,
  layout: PictureLayout,
  placed: PlacedOperation,
  qubitName: (qubit: number) => string,
): Glyph {
  const operation = circuit.operations[placed.index]!;
  const isLines = layout.classical === 'lines';
  const rowOfBit = (bit: number): number =>
    (layout.wires +
      circuit.bitRegisters.findIndex(({ first, size }) => bit >= first && bit < first + size)) *
    ROW;
  const tag = (text: string, y: number): string =>
    `<text class="angle" y="${y}">${escapeXml(text)}</text>`;
  let glyph: Glyph;
  switch (operation.kind) {
    case 'gate':
      glyph = gateGlyph(operation);
      break;
    case 'barrier':
      glyph = {
        svg: `<path class="barrier" d="M0 ${placed.top * ROW - 20}V${placed.bottom * ROW + 20}"/>`,
        halfWidth: 6,
      };
      break;
    case 'reset':
      glyph = resetGlyph(placed, qubitName);
      break;
    case 'measure': {
      const y = operation.wire * ROW;
      const text = operation.bit < 0 ? '' : bitName(circuit, operation.bit);
      const { bit } = operation;
      const down = isLines && bit >= 0 ? bitLine(y + 15, rowOfBit(bit)) + bitMark(text, rowOfBit(bit)) : ''; // biome-ignore format: one choice
      const beside = isLines || bit < 0 ? '' : tag(text, y + 24);
      glyph = {
        svg: down + measureGlyph(operation.wire) + beside,
        halfWidth: Math.max(16, isLines ? 8 + textWidth(text, 10) : textWidth(text, 10) / 2 + 2),
      };
      if (placed.leaves !== undefined) glyph = leaving(glyph, y, qubitName(placed.leaves));
      break;
    }
    case 'assign': {
      const text = operationText(circuit, operation);
      const row = isLines ? rowOfBit(operation.bit) : layout.wires * ROW;
      const half = textWidth(text, 10) / 2 + 6;
      const rect = `<rect class="box" x="${-half}" y="${row - 10}" width="${2 * half}" height="20" rx="2"/>`;
      return { svg: rect + tag(text, row + 3.5), halfWidth: half };
    }
  }
  return operation.condition ? conditioned(circuit, placed, glyph, isLines, rowOfBit) : glyph;
}

function bitMark(text: string, y: number): string {
  return `<path class="dot" d="M-4.5 ${y - 7}H4.5L0 ${y}Z"/><text class="angle start" x="7" y="${y - 4}">${escapeXml(text)}</text>`;
}

/** The end of a wire's stretch: a flag to the right of the dial with the qubit's name. */
function leaving(glyph: Glyph, y: number, name: string): Glyph {
  const width = textWidth(name, 12) + 10;
  const flag =
    `<path class="flag leaves" d="M17 ${y - 9}h${width}l7 9l-7 9h${-width}z"/>` +
    `<text class="flagname" x="${17 + width / 2 + 2}" y="${y + 4}">${escapeXml(name)}</text>`;
  return { svg: glyph.svg + flag, halfWidth: Math.max(glyph.halfWidth, 17 + width + 9) };
}

function resetGlyph(placed: PlacedOperation, qubitName: (qubit: number) => string): Glyph {
  const y = placed.wires[0]! * ROW;
  if (placed.enters === undefined) {
    const cut = `<path class="gap" d="M-16 ${y}H16"/><path class="stroke thin" d="M-16 ${y - 7}V${y + 7}"/>`;
    return { svg: `${cut}<text class="name" y="${y + 5}">|0⟩</text>`, halfWidth: 17 };
  }
  const name = qubitName(placed.enters);
  const width = textWidth(name, 12) + 14;
  const half = width / 2 + 6;
  const flag =
    `<path class="gap" d="M${-half - 3} ${y}H${half}"/>` +
    `<path class="flag enters" d="M${-half} ${y - 9}h${width + 3}l7 9l-7 9h${-width - 3}l7 -9z"/>` +
    `<text class="flagname" x="2" y="${y + 4}">${escapeXml(name)}</text>`;
  return { svg: flag, halfWidth: half + 3 };
}

function conditioned(
  circuit: Circuit,
  placed: PlacedOperation,
  glyph: Glyph,
  isLines: boolean,
  rowOfBit: (bit: number) => number,
): Glyph {
  const operation = circuit.operations[placed.index]!;
  const text = operation.condition ? conditionText(circuit, operation.condition) : '';
  const { wires } = placed;
  const from = wires.length > 0 ? Math.max(...wires) * ROW : 0;
  if (!isLines) {
    const y = (wires.length > 0 ? Math.min(...wires) * ROW : 0) - BOX / 2 - 4;
    const words = `<text class="angle when" y="${y}">if ${escapeXml(text)}</text>`;
    const half = textWidth(`if ${text}`, 10) / 2 + 2;
    return { svg: glyph.svg + words, halfWidth: Math.max(glyph.halfWidth, half) };
  }
  const rows = bitsRead(operation).map(rowOfBit);
  const last = Math.max(from, ...rows);
  const marks = [...new Set(rows)].map((y) => dot(y)).join('');
  const words = `<text class="angle start when" x="7" y="${last - 5}">${escapeXml(text)}</text>`;
  return {
    svg: bitLine(from, last) + glyph.svg + marks + words,
    halfWidth: Math.max(glyph.halfWidth, 9 + textWidth(text, 10)),
  };
}
