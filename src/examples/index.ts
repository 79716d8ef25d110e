/**
 * The examples, one sentence each: a network of river gauges whose stations send parity checks along the valley. The
 * files stand beside this list, so that the command line, the page and the tests use the same ones.
 */
export type Example = { file: string; sentence: string };

export const examples: readonly Example[] = [
  {
    file: 'structural-pair.qasm',
    sentence:
      'Five stations send their parity to one gauge: each can be read as soon as it has spoken.',
  },
  {
    file: 'opening.qasm',
    sentence:
      'No order of these gates frees a wire, but the matrix allows station 0 to leave before station 3 enters.',
  },
  {
    file: 'no-opening.qasm',
    sentence:
      'News goes round a ring until everyone knows of everyone: a proof that no wire can be saved.',
  },
  {
    file: 'fourier-measured.qasm',
    sentence:
      'A measured Fourier transform of four stations, which fits on one wire with conditions.',
  },
  { file: 'relay.qasm', sentence: 'A relay of three stations, as first written.' },
  { file: 'relay-rewritten.qasm', sentence: 'The same relay rewritten by hand, and equal.' },
  {
    file: 'relay-off.qasm',
    sentence: 'The same relay once more, with one angle off by a thousandth.',
  },
  { file: 'forty-stations.qasm', sentence: 'Forty stations pass a parity check down the valley.' },
];
