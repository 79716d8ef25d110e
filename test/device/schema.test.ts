/**
 * The published JSON Schema and the reader say the same: whatever the one accepts, the other does, but for the
 * two rules that a schema cannot state (T2 at most 2 T1; wireCount at least what is mentioned).
 */
import fc from 'fast-check';
import { expect, test } from 'vitest';
import schema from '../../src/device/device.schema.json' with { type: 'json' };
import { InputError } from '../../src/input-error.ts';
import { readDevice } from '../../src/read/device.ts';

type Schema = {
  type?: string;
  required?: string[];
  additionalProperties?: boolean;
  properties?: { [key: string]: Schema };
  items?: Schema;
  oneOf?: Schema[];
  $ref?: string;
  minimum?: number;
  maximum?: number;
  exclusiveMinimum?: number;
  minItems?: number;
  maxItems?: number;
  uniqueItems?: boolean;
};
/** Words of the schema language that the check below understands, or that only describe. */
const KNOWN = new Set(
  '$schema $id $defs title description type required additionalProperties properties items oneOf $ref minimum maximum exclusiveMinimum minItems maxItems uniqueItems'.split(
    ' ',
  ),
);
const definitions = schema.$defs as { [name: string]: Schema };

function accepts(s: Schema, value: unknown): boolean {
  for (const word of Object.keys(s)) expect(KNOWN).toContain(word);
  if (s.$ref && !accepts(definitions[s.$ref.replace('#/$defs/', '')]!, value)) return false;
  if (s.oneOf && s.oneOf.filter((part) => accepts(part, value)).length !== 1) return false;
  if (s.type && typeOf(value, s.type) !== s.type) return false;
  if (typeof value === 'number') {
    if (s.minimum !== undefined && value < s.minimum) return false;
    if (s.maximum !== undefined && value > s.maximum) return false;
    if (s.exclusiveMinimum !== undefined && value <= s.exclusiveMinimum) return false;
  }
  if (Array.isArray(value)) {
    if (value.length < (s.minItems ?? 0) || value.length > (s.maxItems ?? Infinity)) return false;
    if (s.uniqueItems && new Set(value).size < value.length) return false;
    return value.every((item) => !s.items || accepts(s.items, item));
  }
  if (typeof value !== 'object' || value === null) return true;
  if (s.required?.some((key) => !(key in value))) return false;
  return Object.entries(value).every(([key, item]) => {
    const property = s.properties?.[key];
    return property ? accepts(property, item) : s.additionalProperties !== false;
  });
}

function typeOf(value: unknown, wanted: string): string {
  if (Array.isArray(value)) return 'array';
  if (typeof value === 'number' && wanted === 'integer' && Number.isInteger(value))
    return 'integer';
  return value === null ? 'null' : typeof value;
}

/** Codes of the mistakes that the reader finds, without those that a schema cannot find. */
function mistakesOf(value: unknown): string[] {
  try {
    readDevice(JSON.stringify(value), 'd.json');
    return [];
  } catch (error) {
    if (!(error instanceof InputError)) throw error;
    return error.problems.map(({ code }) => code);
  }
}

const rarely = <T>(good: fc.Arbitrary<T>): fc.Arbitrary<unknown> =>
  fc.oneof(
    { weight: 100, arbitrary: good as fc.Arbitrary<unknown> },
    {
      weight: 1,
      arbitrary: fc.constantFrom<unknown>(null, true, 'x', -1, 2, 0, 1e9, 0.5, [], [0, 0], {}),
    },
  );
const error = rarely(fc.double({ min: 0, max: 1, noNaN: true }));
const time = rarely(fc.double({ min: 0, max: 1e4, noNaN: true }));
// undefined is gone once the device is text
const odd = {
  x: fc.oneof(
    { weight: 100, arbitrary: fc.constant<unknown>(undefined) },
    { weight: 1, arbitrary: fc.constant<unknown>(1) },
  ),
};
const optional = <T extends { [key: string]: fc.Arbitrary<unknown> }>(
  shape: T,
): fc.Arbitrary<unknown> => fc.record({ ...shape, ...odd }, { requiredKeys: [] });
const wire = rarely(
  optional({ t1Us: time, readoutError: error, gateError: error, gateDurationNs: time }),
);
const pair = rarely(fc.uniqueArray(fc.nat(5), { minLength: 2, maxLength: 2 }));
const link = rarely(
  fc.oneof(
    pair,
    fc.record({ between: pair, error, durationNs: time }, { requiredKeys: ['between'] }),
  ),
);
const device = rarely(
  fc.record(
    {
      links: rarely(fc.array(link, { maxLength: 4 })),
      wires: rarely(fc.array(wire, { maxLength: 3 })),
      name: rarely(fc.constant('valley')),
      wireCount: rarely(fc.integer({ min: 6, max: 9 })),
      allWires: wire,
      allLinks: rarely(optional({ error, durationNs: time })),
      resetError: error,
      measureDurationNs: time,
    },
    { requiredKeys: ['links'] },
  ),
);

test('the schema and the reader accept the same devices (fast-check, seed 81)', () => {
  let [good, bad] = [0, 0];
  fc.assert(
    fc.property(device, (value) => {
      const plain: unknown = JSON.parse(JSON.stringify(value));
      const isFine = accepts(schema as Schema, plain);
      const codes = mistakesOf(plain);
      if (isFine) good++;
      else bad++;
      const beyondSchema = codes.filter(
        (code) => code === 'bad-wire-count' || code === 'impossible-t2',
      );
      expect(isFine ? codes.length - beyondSchema.length : codes.length > 0).toBe(
        isFine ? 0 : true,
      );
    }),
    { seed: 81, numRuns: 1000 },
  );
  // the generator makes enough of either kind for the comparison to mean something
  expect(Math.min(good, bad)).toBeGreaterThan(150);
});
