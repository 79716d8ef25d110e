/**
 * Writes the trade between wires and depth as SVG: a falling staircase, because a plan for fewer wires is
 * one for more wires too, with the estimated success beside each step where a device is known, and single
 * points for circuits that are not on it (as written; after reshaping).
 */
import { type DocumentOptions, svgDocument } from './picture-document.ts';
import { escapeXml, textWidth } from './picture-glyphs.ts';

export type TradePoint = {
  wires: number;
  depth: number;
  /** Estimated probability that a run succeeds on the device; null without one. */
  success: number | null;
};

/** A circuit to show beside the staircase. */
export type TradeMark = TradePoint & { label: string };

export type FrontierOptions = DocumentOptions & { title?: string; width?: number };

const LEFT = 56;
const RIGHT = 24;
const TOP = 30;
const HEIGHT = 190;
const FOOT = 46;

export function frontierPicture(
  points: readonly TradePoint[],
  marks: readonly TradeMark[],
  options: FrontierOptions = {},
): string {
  const { width = 460 } = options;
  const all = [...points, ...marks];
  const title = options.title ?? 'Wires against depth';
  if (all.length === 0) {
    const description = 'There is nothing to trade.';
    return svgDocument(width, 60, { title, description }, options, [
      `<text class="note start" x="14" y="34">${description}</text>`,
    ]);
  }
  const wires = all.map((point) => point.wires);
  const [least, most] = [Math.min(...wires), Math.max(...wires)];
  const deepest = niceCeiling(Math.max(...all.map(({ depth }) => depth), 1));
  const span = width - LEFT - RIGHT;
  const x = (w: number): number =>
    Math.round((LEFT + 20 + ((span - 40) * (w - least)) / Math.max(1, most - least)) * 10) / 10;
  const y = (depth: number): number => Math.round((TOP + HEIGHT * (1 - depth / deepest)) * 10) / 10;
  const body = [
    ...axes(least, most, deepest, width, x, y),
    staircase(points, x, y),
    ...points.map((point) => pointMark(point, x(point.wires), y(point.depth))),
    ...marks.map((mark) => labelledMark(mark, x(mark.wires), y(mark.depth), width)),
  ];
  const description = all
    .map((point) => {
      const name = 'label' in point ? `${(point as TradeMark).label}: ` : '';
      return `${name}${point.wires} wires, depth ${point.depth}${successWords(point)}`;
    })
    .join('; ');
  return svgDocument(
    width,
    TOP + HEIGHT + FOOT,
    { title, description: `${description}.` },
    options,
    body,
  );
}

/** 1, 2 or 5 times a power of ten, at least x. */
function niceCeiling(x: number): number {
  const power = 10 ** Math.floor(Math.log10(x));
  for (const step of [1, 2, 5, 10]) if (step * power >= x) return step * power;
  return 10 * power;
}

function axes(
  least: number,
  most: number,
  deepest: number,
  width: number,
  x: (wires: number) => number,
  y: (depth: number) => number,
): string[] {
  const out: string[] = [];
  for (const share of [0, 0.5, 1]) {
    const depth = Math.round(deepest * share * 100) / 100;
    out.push(`<path class="grid" d="M${LEFT} ${y(depth)}H${width - RIGHT}"/>`);
    out.push(`<text class="angle end" x="${LEFT - 8}" y="${y(depth) + 3.5}">${depth}</text>`);
  }
  const step = Math.max(1, Math.ceil((most - least) / 10));
  for (let wires = least; wires <= most; wires += step) {
    out.push(`<text class="angle" x="${x(wires)}" y="${TOP + HEIGHT + 18}">${wires}</text>`);
  }
  out.push(
    `<text class="note" x="${(LEFT + width - RIGHT) / 2}" y="${TOP + HEIGHT + 38}">wires</text>`,
  );
  out.push(`<text class="note start" x="${LEFT - 40}" y="14">depth</text>`);
  return out;
}

function staircase(
  points: readonly TradePoint[],
  x: (wires: number) => number,
  y: (depth: number) => number,
): string {
  const [first] = points;
  if (!first) return '';
  let path = `M${x(first.wires)} ${y(first.depth)}`;
  for (const { wires, depth } of points.slice(1)) path += `H${x(wires)}V${y(depth)}`;
  return `<path class="step" d="${path}"/>`;
}

function successWords({ success }: TradePoint): string {
  return success === null ? '' : `, success ${percent(success)}`;
}

function percent(share: number): string {
  const value = 100 * share;
  return `${value >= 10 ? value.toFixed(0) : value.toPrecision(2)} %`;
}

function pointMark(point: TradePoint, x: number, y: number): string {
  const words = `${point.wires} wires, depth ${point.depth}${successWords(point)}`;
  const beside =
    point.success === null
      ? ''
      : `<text class="angle start" x="${x + 5}" y="${y + 16}">${percent(point.success)}</text>`;
  return `<g data-trade="${point.wires}"><title>${words}</title><circle class="point" cx="${x}" cy="${y}" r="4.5"/>${beside}</g>`;
}

function labelledMark(mark: TradeMark, x: number, y: number, width: number): string {
  const text = `${mark.label}${mark.success === null ? '' : `, ${percent(mark.success)}`}`;
  const isLeft = x + 12 + textWidth(text, 11) > width;
  const anchor = isLeft ? 'end' : 'start';
  const words = `${mark.label}: ${mark.wires} wires, depth ${mark.depth}${successWords(mark)}`;
  return (
    `<g><title>${escapeXml(words)}</title><rect class="point hollow" x="${x - 4.5}" y="${y - 4.5}" width="9" height="9" transform="rotate(45 ${x} ${y})"/>` +
    `<text class="note ${anchor}" x="${isLeft ? x - 10 : x + 10}" y="${y + (isLeft ? -9 : 4)}">${escapeXml(text)}</text></g>`
  );
}
