/**
 * Reads the JSON description of a device (device/device.schema.json says the same as a JSON Schema). All
 * mistakes are reported, each with the path of the value: `links[3].error must be in [0, 1], got 2`.
 */
import type { Device, DeviceLink, DeviceWire } from '../device/device.ts';
import { InputError, type InputProblem, nearestWord } from '../input-error.ts';

export const DEVICE_WIRES_MAX = 10_000;

type Json = null | boolean | number | string | readonly Json[] | { readonly [key: string]: Json };

const WIRE_KEYS = ['t1Us', 't2Us', 'readoutError', 'gateError', 'gateDurationNs'] as const;
const LINK_KEYS = ['error', 'durationNs'] as const;
const TOP_KEYS = [
  '$schema',
  'name',
  'note',
  'wireCount',
  'allWires',
  'allLinks',
  'wires',
  'links',
  'measureDurationNs',
  'resetDurationNs',
  'resetError',
];

export function readDevice(text: string, name: string): Device {
  const data = parseJson(text, name);
  const reader = new DeviceReader(name);
  const device = reader.device(data);
  if (reader.problems.length > 0) throw new InputError(reader.problems);
  return device;
}

function parseJson(text: string, file: string): Json {
  try {
    return JSON.parse(text) as Json; // JSON.parse gives exactly this type
  } catch (error) {
    const reason = error instanceof Error ? error.message : String(error);
    throw new InputError({
      code: 'bad-json',
      message: `expected a device as JSON, got text that is not JSON: ${inOurWords(reason)}`,
      file,
      ...placeOfJsonMistake(text, reason),
    });
  }
}

/** The engine's reason without its place, which is told as line and column. */
function inOurWords(reason: string): string {
  const short = reason
    .replace(/(?: in JSON)? at (?:position|line) .*$/s, '')
    .replace(/, ".*$/s, '');
  return short.charAt(0).toLowerCase() + short.slice(1, 120);
}

/** Where JSON.parse stopped: engines name a position, or a line and a column, or (at the end) nothing. */
function placeOfJsonMistake(text: string, reason: string): { line: number; column: number } {
  const lineAndColumn = /line (\d+) column (\d+)/.exec(reason);
  if (lineAndColumn) return { line: Number(lineAndColumn[1]), column: Number(lineAndColumn[2]) };
  const position = /position (\d+)/.exec(reason);
  const before = text.slice(0, position ? Number(position[1]) : text.length);
  const lines = before.split('\n');
  return { line: lines.length, column: (lines[lines.length - 1]?.length ?? 0) + 1 };
}

/** Collects problems while it walks the data; never throws. */
class DeviceReader {
  readonly problems: InputProblem[] = [];
  private readonly file: string;

  constructor(file: string) {
    this.file = file;
  }

  private problem(code: string, message: string, hint?: string): void {
    this.problems.push({ code, message, file: this.file, ...(hint ? { hint } : {}) });
  }

  device(data: Json): Device {
    const top = this.object(data, 'the device', TOP_KEYS);
    if (!('links' in top)) {
      this.problem('missing-links', 'missing links', 'a device needs at least "links": [[0, 1]]');
    }
    for (const key of ['name', 'note', '$schema']) {
      const value = top[key];
      if (value !== undefined && typeof value !== 'string') {
        this.problem('bad-text', `expected a text for ${key}, got ${shown(value)}`);
      }
    }
    const allWires = this.figures(given(top.allWires, {}), 'allWires', WIRE_KEYS) as DeviceWire;
    const allLinks = this.figures(given(top.allLinks, {}), 'allLinks', LINK_KEYS);
    const links = this.list(given(top.links, []), 'links').map((item, k) =>
      this.link(item, `links[${k}]`, allLinks),
    );
    const listed = this.list(given(top.wires, []), 'wires').map((item, k) => ({
      ...allWires,
      ...(this.figures(item, `wires[${k}]`, WIRE_KEYS) as DeviceWire),
    }));
    listed.forEach((wire, k) => {
      if (wire.t1Us !== undefined && wire.t2Us !== undefined && wire.t2Us > 2 * wire.t1Us) {
        this.problem(
          'impossible-t2',
          `wires[${k}].t2Us must be at most twice t1Us (${2 * wire.t1Us}), got ${wire.t2Us}`,
        );
      }
    });
    let mentioned = listed.length;
    for (const { between } of links)
      mentioned = Math.max(mentioned, between[0] + 1, between[1] + 1);
    const count = this.wireCount(top.wireCount, mentioned);
    const wires = Array.from({ length: count }, (_, k) => listed[k] ?? { ...allWires });
    return {
      name: typeof top.name === 'string' ? top.name : this.file,
      wires,
      links,
      ...this.figures(
        pick(top, ['measureDurationNs', 'resetDurationNs', 'resetError']),
        'the device',
        ['measureDurationNs', 'resetDurationNs', 'resetError'],
      ),
    };
  }

  private wireCount(wanted: Json | undefined, mentioned: number): number {
    const count = wanted === undefined ? Math.max(1, mentioned) : wanted;
    if (
      typeof count !== 'number' ||
      !Number.isInteger(count) ||
      count < mentioned ||
      count > DEVICE_WIRES_MAX
    ) {
      this.problem(
        'bad-wire-count',
        `wireCount must be in [${Math.max(1, mentioned)}, ${DEVICE_WIRES_MAX}], got ${shown(count)}`,
      );
      return Math.min(mentioned, DEVICE_WIRES_MAX);
    }
    return count;
  }

  private link(item: Json, path: string, all: { [key: string]: number }): DeviceLink {
    if (Array.isArray(item)) return { between: this.pair(item, path), ...all };
    const { between = [], ...figures } = this.object(item, path, ['between', ...LINK_KEYS]);
    return {
      between: this.pair(between, `${path}.between`),
      ...all,
      ...this.figures(figures, path, LINK_KEYS),
    };
  }

  private pair(item: Json, path: string): [number, number] {
    if (Array.isArray(item) && item.length === 2) {
      const [a, b] = item;
      const isWire = (x: unknown): x is number =>
        typeof x === 'number' && Number.isInteger(x) && x >= 0 && x < DEVICE_WIRES_MAX;
      if (isWire(a) && isWire(b) && a !== b) return [a, b];
    }
    this.problem('bad-link', `expected two different wire numbers in ${path}, got ${shown(item)}`);
    return [0, 0];
  }

  private list(item: Json, path: string): readonly Json[] {
    if (Array.isArray(item)) return item;
    this.problem('bad-list', `expected a list for ${path}, got ${shown(item)}`);
    return [];
  }

  private object(item: Json, path: string, keys: readonly string[]): { [key: string]: Json } {
    if (item === null || typeof item !== 'object' || Array.isArray(item)) {
      this.problem('bad-object', `expected an object for ${path}, got ${shown(item)}`);
      return {};
    }
    for (const key of Object.keys(item)) {
      if (keys.includes(key)) continue;
      const near = key.length > 60 ? undefined : nearestWord(key, keys);
      this.problem(
        'unknown-key',
        `unknown key in ${path}: ${key.slice(0, 60)}`,
        near ? `did you mean ${near}?` : `known: ${keys.join(', ')}`,
      );
    }
    return item as { [key: string]: Json };
  }

  private figures(item: Json, path: string, keys: readonly string[]): { [key: string]: number } {
    const out: { [key: string]: number } = {};
    const figures = this.object(item, path, keys);
    for (const key of keys) {
      const value = figures[key];
      if (value === undefined) continue;
      const range = key.endsWith('rror') ? '[0, 1]' : key.endsWith('Us') ? '(0, inf)' : '[0, inf)';
      const isInside =
        typeof value === 'number' &&
        Number.isFinite(value) &&
        (range === '(0, inf)' ? value > 0 : value >= 0) &&
        (range !== '[0, 1]' || value <= 1);
      if (isInside) out[key] = value;
      else this.problem('out-of-range', `${path}.${key} must be in ${range}, got ${shown(value)}`);
    }
    return out;
  }
}

/** The value of a key, or what stands for a key that is left out; null is a value, and a wrong one. */
function given(value: Json | undefined, instead: Json): Json {
  return value === undefined ? instead : value;
}

/** A value as it stands in the file, short enough for a message. */
function shown(value: Json): string {
  if (Array.isArray(value)) {
    const isFlat = value.length <= 4 && value.every((x) => x === null || typeof x !== 'object');
    return isFlat ? JSON.stringify(value) : 'a list';
  }
  if (value !== null && typeof value === 'object') return 'an object';
  const text = JSON.stringify(value);
  return text.length > 60 ? `${text.slice(0, 57)}...` : text;
}

function pick(from: { [key: string]: Json }, keys: readonly string[]): { [key: string]: Json } {
  return Object.fromEntries(Object.entries(from).filter(([key]) => keys.includes(key)));
}
