/** Turns the words of the command line into options, with one clear message for each wrong value. */
import { availableParallelism } from 'node:os';
import { InvalidArgumentError } from 'commander';
import type { CommonOptions, Source } from '../commands.ts';
import type { InputRule, OutputRule } from '../contract.ts';
import { readText, sourceOf } from './files.ts';

/** What commander hands over for every command. */
export type Words = {
  inputs?: InputRule;
  outputs?: 'kept' | 'measured';
  inputOf?: Map<number, InputRule>;
  outputOf?: Map<number, OutputRule>;
  native?: string;
  device?: string;
  links?: [number, number][];
  tolerance?: number;
  seed: number;
  workers: number;
  timeLimit?: number;
  out?: string;
  report?: string;
  picture?: string;
  certificate?: string;
  recheck?: string;
  json?: boolean;
  quiet?: boolean;
  force?: boolean;
  nearest?: boolean;
  wires?: number;
  relabel?: boolean;
  map?: string;
  entanglers?: number;
  optimiser?: 'lm' | 'bfgs' | 'nelder-mead';
};

export const WORKERS_MAX = 64;

export function defaultWorkers(): number {
  return Math.min(WORKERS_MAX, availableParallelism());
}

function numberFrom(text: string, what: string, isFine: (x: number) => boolean): number {
  const x = Number(text);
  if (text.trim() === '' || !isFine(x)) throw new InvalidArgumentError(`${what}, got ${text}`);
  return x;
}

export const wholeFrom =
  (least: number, most: number) =>
  (text: string): number =>
    numberFrom(
      text,
      `expected a whole number in [${least}, ${most}]`,
      (x) => Number.isInteger(x) && x >= least && x <= most,
    );

export const toleranceFrom = (text: string): number =>
  numberFrom(text, 'expected a number in (0, 1)', (x) => x > 0 && x < 1);

export const secondsFrom = (text: string): number =>
  numberFrom(text, 'expected a number of seconds above 0', (x) => x > 0 && x < 1e7);

/** `0-1,1-2`. */
export function linksFrom(text: string): [number, number][] {
  return text.split(',').map((part) => {
    const match = /^\s*(\d+)-(\d+)\s*$/.exec(part);
    if (!match || match[1] === match[2]) {
      throw new InvalidArgumentError(`expected links such as 0-1,1-2, got ${part}`);
    }
    return [Number(match[1]), Number(match[2])];
  });
}

/** Collects `3=zero`, several times. */
export const ruleFrom =
  <Rule extends string>(rules: readonly Rule[]) =>
  (text: string, before: Map<number, Rule> = new Map()): Map<number, Rule> => {
    const match = /^(\d+)=(\w+)$/.exec(text);
    const rule = rules.find((known) => known === match?.[2]);
    if (!match || !rule) {
      throw new InvalidArgumentError(`expected WIRE=${rules.join('|')}, got ${text}`);
    }
    return new Map(before).set(Number(match[1]), rule);
  };

/** The options that all commands share, with the files they name read. */
export function commonOptions(words: Words): CommonOptions {
  const { inputs, outputs, inputOf, outputOf, links, tolerance, seed, nearest } = words;
  const entanglers: Source[] = [];
  const native = words.native
    ?.split(',')
    .map((part) => {
      if (!/\.mtx$/.test(part.trim())) return part;
      const source = sourceOf(part.trim());
      entanglers.push(source);
      return source.name
        .replace(/^.*[\\/]/, '')
        .replace(/\.mtx$/, '')
        .replace(/[^A-Za-z0-9_]/g, '_');
    })
    .join(',');
  return {
    seed,
    ...(inputs ? { inputs } : {}),
    ...(outputs ? { outputs } : {}),
    ...(inputOf ? { inputOf } : {}),
    ...(outputOf ? { outputOf } : {}),
    ...(native === undefined ? {} : { native }),
    ...(entanglers.length > 0 ? { entanglers } : {}),
    ...(links ? { links } : {}),
    ...(tolerance === undefined ? {} : { tolerance }),
    ...(nearest ? { nearest } : {}),
    ...(words.device ? { device: { name: words.device, text: readText(words.device) } } : {}),
  };
}
