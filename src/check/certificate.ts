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
  const { schema, original, rewritten, asked, answer } = (data ?? {}) as Partial<Certificate>;
  const isWhole =
    schema === 'wiregauge/certificate@1' &&
    typeof original?.sha256 === 'string' &&
    typeof rewritten?.sha256 === 'string' &&
    typeof asked?.seed === 'number' &&
    typeof answer?.verdict === 'string';
  if (!isWhole) {
    throw new InputError({
      code: 'bad-certificate',
      message: `expected a certificate of schema wiregauge/certificate@1, got ${JSON.stringify(schema ?? null)}`,
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

/** What of the certificate does not hold any more; empty when everything does. */
export function disagreements({ answer }: Certificate, report: CompareReport): string[] {
  const out: string[] = [];
  if (answer.verdict !== report.verdict) {
    out.push(`the verdict was ${answer.verdict} and is ${report.verdict}`);
  }
  if (answer.proof && !report.proof) out.push('it was a proof and is none');
  const [before, now] = [answer.distance?.hilbertSchmidt, report.distance?.hilbertSchmidt];
  if (before !== undefined && now !== undefined) {
    const slack = 1e-9 * Math.max(before, now) + 10 * (report.distance?.errorBar ?? 1e-24);
    if (Math.abs(before - now) > slack) out.push(`the distance was ${before} and is ${now}`);
  }
  return out;
}
