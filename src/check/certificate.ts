/**
 * A certificate: what was compared, how, and what came out, so that anybody can repeat it.
 *
 * It holds the hashes of both texts, the contract and all options, the road, the numbers, the version and the seed. There is
 * none without an answer: `undecided` gets no certificate.
 */
import type { ContractOptions } from '../contract.ts';
import { InputError } from '../input-error.ts';
import type { CompareReport } from '../reports.ts';
import { sha256 } from './sha256.ts';

export type Certificate = {
  schema: 'wiregauge/certificate@1';
  version: string;
  original: { name: string; sha256: string };
  rewritten: { name: string; sha256: string };
  asked: {
    inputs?: ContractOptions['inputs'];
    outputs?: ContractOptions['outputs'];
    inputOf?: [number, string][];
    outputOf?: [number, string][];
    relabel: boolean;
    map?: string;
    tolerance: number;
    seed: number;
  };
  answer: Pick<
    CompareReport,
    'verdict' | 'contract' | 'method' | 'proof' | 'distance' | 'phase' | 'witness' | 'relabelling'
  >;
};

const SCHEMA = 'wiregauge/certificate@1';

/** A text with the name it goes by. */
export type NamedText = { name: string; text: string };

export function certificateOf(
  report: CompareReport,
  texts: { original: NamedText; rewritten: NamedText },
  asked: ContractOptions & { relabel?: boolean; map?: string; tolerance: number },
  version: string,
): Certificate {
  if (report.verdict === 'undecided') {
    throw new InputError({
      code: 'no-answer',
      message: 'expected a completed check for a certificate, got an undecided one',
    });
  }
  const { verdict, contract, method, proof, distance, phase, witness, relabelling, seed } = report;
  const { inputs, outputs, inputOf, outputOf, relabel = false, map, tolerance } = asked;
  return {
    schema: 'wiregauge/certificate@1',
    version,
    original: { name: texts.original.name, sha256: sha256(texts.original.text) },
    rewritten: { name: texts.rewritten.name, sha256: sha256(texts.rewritten.text) },
    asked: {
      ...(inputs ? { inputs } : {}),
      ...(outputs ? { outputs } : {}),
      ...(inputOf ? { inputOf: [...inputOf] } : {}),
      ...(outputOf ? { outputOf: [...outputOf] } : {}),
      relabel,
      ...(map === undefined ? {} : { map }),
      tolerance,
      seed,
    },
    answer: { verdict, contract, method, proof, distance, phase, witness, relabelling },
  };
}

export function readCertificate(text: string, file: string): Certificate {
  let data: unknown;
  try {
    data = JSON.parse(text);
  } catch {
    // the engine's words about the place say nothing about certificates
    throw new InputError({ code: 'bad-certificate', message: 'expected a certificate as JSON, got other text', file }); // biome-ignore format: one message
  }
  const wrong = firstWrong(data);
  if (wrong !== null) {
    const { schema } = (data ?? {}) as Partial<Certificate>; // null or anything else that JSON gives
    const isOther = schema !== SCHEMA;
    throw new InputError({
      code: 'bad-certificate',
      message: isOther
        ? `expected a certificate of schema ${SCHEMA}, got ${JSON.stringify(schema ?? null).slice(0, 60)}`
        : `expected a whole certificate, got one with a wrong or missing ${wrong}`,
      file,
    });
  }
  return data as Certificate; // checked above
}

/** Fails when a text is not the one that was certified. */
export function checkHashes(
  certificate: Certificate,
  texts: { original: NamedText; rewritten: NamedText },
): void {
  for (const side of ['original', 'rewritten'] as const) {
    const found = sha256(texts[side].text);
    if (found === certificate[side].sha256) continue;
    throw new InputError({
      code: 'other-text',
      message: `expected the ${side} text with hash ${certificate[side].sha256.slice(0, 16)}..., got ${found.slice(0, 16)}...`,
      file: texts[side].name,
    });
  }
}

type Field = { readonly [key: string]: unknown };
type Test = (value: unknown) => boolean;

const isField = (value: unknown): value is Field =>
  typeof value === 'object' && value !== null && !Array.isArray(value);
const isText: Test = (value) => typeof value === 'string';
const isNumber: Test = (value) => typeof value === 'number' && Number.isFinite(value);
const isPlace: Test = (value) => Number.isSafeInteger(value) && Number(value) >= 0;
const isFlag: Test = (value) => typeof value === 'boolean';
const oneOf = (...words: readonly unknown[]): Test => (value) => words.includes(value); // biome-ignore format: one rule
const orNull = (test: Test): Test => (value) => value === null || test(value); // biome-ignore format: one rule
const orNone = (test: Test): Test => (value) => value === undefined || test(value); // biome-ignore format: one rule
const listOf = (test: Test): Test => (value) => Array.isArray(value) && value.every(test); // biome-ignore format: one rule
const withFields = (fields: { readonly [key: string]: Test }): Test => (value) =>
  isField(value) && Object.entries(fields).every(([key, test]) => test(value[key])); // biome-ignore format: one rule
const rulesOf = (...rules: readonly string[]): Test => orNone(listOf((pair) =>
  Array.isArray(pair) && pair.length === 2 && isPlace(pair[0]) && rules.includes(pair[1]))); // biome-ignore format: one rule

/** Every part that a recheck reads, in the order of the file. */
const PARTS: readonly (readonly [path: string, test: Test])[] = [
  ['schema', oneOf(SCHEMA)],
  ['version', isText],
  ['original.name', isText],
  ['original.sha256', isText],
  ['rewritten.name', isText],
  ['rewritten.sha256', isText],
  ['asked.inputs', orNone(oneOf('any', 'zero'))],
  ['asked.outputs', orNone(oneOf('kept', 'measured'))],
  ['asked.inputOf', rulesOf('any', 'zero')],
  ['asked.outputOf', rulesOf('kept', 'measured', 'dropped')],
  ['asked.relabel', isFlag],
  ['asked.map', orNone(isText)],
  ['asked.tolerance', (value) => isNumber(value) && Number(value) > 0 && Number(value) < 1],
  ['asked.seed', isPlace],
  ['answer.verdict', oneOf('same', 'different')],
  ['answer.contract', isText],
  ['answer.method', isText],
  ['answer.proof', isFlag],
  ['answer.distance', orNull(withFields({
    hilbertSchmidt: isNumber, processInfidelity: isNumber, worstCase: orNull(isNumber), angle: isNumber,
  }))], // biome-ignore format: one part a line
  ['answer.phase', orNull(isNumber)],
  ['answer.witness', orNull(withFields({
    input: isText, output: isText, probabilityOriginal: isNumber, probabilityRewritten: isNumber,
  }))], // biome-ignore format: one part a line
  ['answer.relabelling', orNull(listOf(isPlace))],
];

/** The first part that is missing or wrong, or null. */
function firstWrong(data: unknown): string | null {
  for (const [path, test] of PARTS) {
    const value = path
      .split('.')
      .reduce<unknown>(
        (part, key) => (isField(part) && Object.hasOwn(part, key) ? part[key] : undefined),
        data,
      );
    if (!test(value)) return path;
  }
  return null;
}

/** Numbers of two runs agree up to rounding: the square of it for distances, itself for angles and probabilities. */
const DISTANCE_SLACK = 1e-24;
const NUMBER_SLACK = 1e-9;

/**
 * What of the certificate does not hold any more; empty when everything does. The road, and what only that road tells, are
 * held to it when the version is the same.
 */
export function disagreements(
  { answer, version }: Certificate,
  report: CompareReport,
  versionNow = version,
): string[] {
  const out: string[] = [];
  const tell = (what: string, before: unknown, now: unknown): void => {
    out.push(`${what} was ${before ?? 'none'} and is ${now ?? 'none'}`);
  };
  if (answer.verdict !== report.verdict) tell('the verdict', answer.verdict, report.verdict);
  if (answer.contract !== report.contract) tell('the contract', answer.contract, report.contract);
  if (answer.proof && !report.proof) out.push('it was a proof and is none');
  const isSameRoad = answer.method === report.method;
  if (!isSameRoad && version === versionNow) tell('the road', answer.method, report.method);
  const [d, e] = [answer.distance, report.distance];
  if ((d === null) !== (e === null)) {
    if (version === versionNow) tell('the distance', d?.hilbertSchmidt, e?.hilbertSchmidt);
  } else if (d && e) {
    const bar = 10 * (e.errorBar ?? DISTANCE_SLACK);
    const near = (x: number, y: number): boolean =>
      Math.abs(x - y) <= NUMBER_SLACK * Math.max(Math.abs(x), Math.abs(y)) + bar;
    if (!near(d.hilbertSchmidt, e.hilbertSchmidt)) tell('the distance', d.hilbertSchmidt, e.hilbertSchmidt); // biome-ignore format: one line each
    if (!near(d.processInfidelity, e.processInfidelity)) tell('the process infidelity', d.processInfidelity, e.processInfidelity); // biome-ignore format: one line each
    if (!isClose(d.angle, e.angle)) tell('the angle', d.angle, e.angle);
    if (isSameRoad && !isClose(d.worstCase, e.worstCase)) tell('the worst case', d.worstCase, e.worstCase); // biome-ignore format: one line each
  }
  if (!isSameRoad) return out;
  if (!isSamePhase(answer.phase, report.phase)) tell('the phase', answer.phase, report.phase);
  const [w, v] = [answer.witness, report.witness];
  const texts = [w, v].map((one) => one && `${one.input}: ${one.output}`);
  if (texts[0] !== texts[1]) tell('the witness', texts[0], texts[1]);
  else if (w && v) {
    const areClose = isClose(w.probabilityOriginal, v.probabilityOriginal) && isClose(w.probabilityRewritten, v.probabilityRewritten); // biome-ignore format: one condition
    if (!areClose) tell('the probabilities of the witness', `${w.probabilityOriginal} and ${w.probabilityRewritten}`, `${v.probabilityOriginal} and ${v.probabilityRewritten}`); // biome-ignore format: one line each
  }
  const orders = [answer.relabelling, report.relabelling].map((one) => one?.join(' '));
  if (orders[0] !== orders[1]) tell('the relabelling', orders[0], orders[1]);
  return out;
}

function isClose(before: number | null, now: number | null): boolean {
  if (before === null || now === null) return before === now;
  return Math.abs(before - now) <= 10 * NUMBER_SLACK;
}

/** Phases go round. */
function isSamePhase(before: number | null, now: number | null): boolean {
  if (before === null || now === null) return before === now;
  return Math.abs(Math.sin((before - now) / 2)) <= 10 * NUMBER_SLACK;
}
