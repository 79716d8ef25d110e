/** The options of the page as its fields hold them (strings), and as the commands want them. */
import { signal } from '@preact/signals';
import type { CommonOptions } from '../commands.ts';

export type Settings = {
  inputs: string;
  outputs: string;
  native: string;
  links: string;
  tolerance: string;
  seed: string;
  wires: string;
  entanglers: string;
  optimiser: string;
  relabel: string;
  device: string;
};

export const DEFAULT_SETTINGS: Readonly<Settings> = Object.freeze({
  inputs: 'file',
  outputs: 'file',
  native: 'cx,rz,sx',
  links: '',
  tolerance: '1e-10',
  seed: '1',
  wires: '',
  entanglers: '',
  optimiser: 'lm',
  relabel: '',
  device: '',
});

export const settings = signal<Settings>({ ...DEFAULT_SETTINGS });

export function set(name: keyof Settings, value: string): void {
  if (settings.value[name] !== value) settings.value = { ...settings.value, [name]: value };
}

/** What is wrong with a field, in a sentence; undefined when nothing is. */
export function complaint(name: keyof Settings, value: string): string | undefined {
  const text = value.trim();
  const isWhole = /^\d{1,9}$/.test(text);
  switch (name) {
    case 'tolerance': {
      const x = Number(text);
      return text !== '' && x > 0 && x < 1 ? undefined : 'A number between 0 and 1, as 1e-10.';
    }
    case 'seed':
      return isWhole ? undefined : 'A whole number from 0 on.';
    case 'wires':
      return text === '' || (isWhole && Number(text) >= 1)
        ? undefined
        : 'A whole number from 1 on, or nothing for the fewest.';
    case 'entanglers':
      return text === '' || isWhole
        ? undefined
        : 'A whole number, or nothing for as many as it takes.';
    case 'links':
      return text === '' || /^\d+-\d+(\s*,\s*\d+-\d+)*$/.test(text)
        ? undefined
        : 'Pairs of wires, as 0-1, 1-2.';
    default:
      return undefined;
  }
}

export function hasComplaint(): boolean {
  const names = Object.keys(settings.value) as (keyof Settings)[]; // the keys of Settings
  return names.some((name) => complaint(name, settings.value[name]) !== undefined);
}

/** The contract part only: what a drawing and a survey depend on. */
export function contractOptions({ inputs, outputs }: Settings): CommonOptions {
  return {
    ...(inputs === 'any' || inputs === 'zero' ? { inputs } : {}),
    ...(outputs === 'kept' || outputs === 'measured' ? { outputs } : {}),
  };
}

/** All common options; fields with a complaint must be asked about before. */
export function commonOptions(from: Settings): CommonOptions {
  const { native, links, tolerance, seed, device } = from;
  const isDefaultNative = native.trim() === '' || native.trim() === DEFAULT_SETTINGS.native;
  return {
    ...contractOptions(from),
    seed: Number(seed),
    tolerance: Number(tolerance),
    // the default set is not asked for by name, so that gates may stay as they were written
    ...(isDefaultNative ? {} : { native: native.trim() }),
    ...(links.trim() === '' ? {} : { links: pairs(links) }),
    ...(device.trim() === '' ? {} : { device: { name: 'device', text: device } }),
  };
}

function pairs(links: string): [number, number][] {
  return links.split(',').map((part) => {
    const [a = '', b = ''] = part.trim().split('-');
    return [Number(a), Number(b)];
  });
}
