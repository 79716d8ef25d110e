/** The examples with their texts, as the build puts them into the page. */

import { examples } from '../examples/index.ts';
import demoDevice from '../examples/valley-device.json?raw';

const files = import.meta.glob<string>('../examples/*.qasm', {
  query: '?raw',
  import: 'default',
  eager: true,
});

export function exampleText(file: string): string {
  return files[`../examples/${file}`] ?? '';
}

export const FIRST_EXAMPLE = 'opening.qasm';

export const demoDeviceText: string = demoDevice;

/** Pairs for the compare page: the same relay, and one that is off. */
export const EXAMPLE_PAIRS: readonly { label: string; original: string; rewritten: string }[] = [
  {
    label: 'A relay rewritten by hand',
    original: 'relay.qasm',
    rewritten: 'relay-rewritten.qasm',
  },
  {
    label: 'The same, one angle off',
    original: 'relay.qasm',
    rewritten: 'relay-off.qasm',
  },
];

/** Targets for the build page. */
export const EXAMPLE_TARGETS: readonly { label: string; text: string }[] = [
  {
    label: 'A gauge that mixes two stations',
    text: 'expm(-i * (0.4 * kron(x, x) + 0.3 * kron(y, y) + 0.2 * kron(z, z)))',
  },
  { label: 'The relay of three stations', text: exampleText('relay.qasm') },
];

export { examples };
