/**
 * The four commands as one function from plain data to plain data: what the command line, a worker and a page call.
 *
 * A request carries the texts it needs; reading, the work itself and writing happen here, without any platform. The
 * result holds the report, the text to save if there is one, and the exit code that the answer stands for.
 */
import { buildTarget } from './build.ts';
import { type CompareOptions, compareCircuits } from './check/compare.ts';
import { type Circuit, circuitOfUnitary } from './circuit/circuit.ts';
import type { ContractOptions } from './contract.ts';
import type { Control } from './control.ts';
import type { Device } from './device/device.ts';
import { InputError, type InputProblem } from './input-error.ts';
import type { RunJobs } from './jobs.ts';
import { narrow } from './narrow.ts';
import { readDevice } from './read/device.ts';
import { readExpression } from './read/expression.ts';
import { isMatrixMarket, readMatrixMarket } from './read/matrix-market.ts';
import { readCircuit } from './read/openqasm.ts';
import { checkUnitary } from './read/unitary.ts';
import type { BuildReport, CompareReport, NarrowReport, SurveyReport } from './reports.ts';
import { surveyCircuit } from './survey/survey.ts';
import { writeCircuit } from './write/openqasm.ts';

/** A circuit or a unitary: the text of a file with its name, or an expression. */
export type Source = { name: string; text: string; isExpression?: boolean };

export type CommonOptions = ContractOptions & {
  native?: string;
  /** Entanglers of the caller's own, as unitaries on two wires; their names may stand in `native`. */
  entanglers?: readonly Source[];
  device?: Source;
  links?: readonly (readonly [number, number])[];
  tolerance?: number;
  seed?: number;
  /** Take the unitary nearest to a matrix that is not one. */
  nearest?: boolean;
};

export type CommandRequest =
  | { command: 'survey'; circuit: Source; options: CommonOptions }
  | { command: 'narrow'; circuit: Source; options: CommonOptions & { wires?: number } }
  | {
      command: 'compare';
      original: Source;
      rewritten: Source;
      options: CommonOptions & { relabel?: boolean; map?: string };
    }
  | {
      command: 'build';
      target: Source;
      options: CommonOptions & {
        entanglersMax?: number;
        optimiser?: 'lm' | 'bfgs' | 'nelder-mead';
      };
    };

export type CommandResult = {
  report: SurveyReport | NarrowReport | CompareReport | BuildReport;
  /** OpenQASM to save; null when the answer is no, or there is nothing to save. */
  text: string | null;
  /** 0 yes, 1 no, 3 undecided. */
  exitCode: 0 | 1 | 3;
  /** Things in the input that are allowed but worth a word. */
  warnings: InputProblem[];
};

export type CommandTools = { runJobs: RunJobs; control: Control };

export async function runCommand(
  request: CommandRequest,
  tools: CommandTools,
): Promise<CommandResult> {
  const warnings: InputProblem[] = [];
  const notes: string[] = [];
  const read = (source: Source): Promise<Circuit> =>
    readSource(source, request.options.nearest === true, warnings, notes);
  const result = await perform(request, tools, read);
  result.report.notes.unshift(...notes);
  return { ...result, warnings };
}

async function perform(
  request: CommandRequest,
  { runJobs, control }: CommandTools,
  read: (source: Source) => Promise<Circuit>,
): Promise<Omit<CommandResult, 'warnings'>> {
  const { options } = request;
  const common = { ...contractPart(options), seed: options.seed ?? 1, control };
  switch (request.command) {
    case 'survey': {
      const circuit = withRules(await read(request.circuit), options);
      const report = surveyCircuit(circuit, common);
      return { report, text: null, exitCode: 0 };
    }
    case 'narrow': {
      const circuit = withRules(await read(request.circuit), options);
      const { report, text } = await narrow(circuit, {
        ...common,
        ...(await nativePart(options, read)),
        ...defined({ wires: request.options.wires, tolerance: options.tolerance }),
        ...(options.device ? { device: deviceOf(options.device) } : {}),
        runJobs,
      });
      const exitCode = report.verdict === 'narrowed' ? 0 : report.verdict === 'impossible' ? 1 : 3;
      return { report, text, exitCode };
    }
    case 'compare': {
      const settings: CompareOptions = {
        contract: contractPart(options),
        seed: common.seed,
        ...defined({
          tolerance: options.tolerance,
          relabel: request.options.relabel,
          map: request.options.map,
        }),
      };
      const [original, rewritten] = [
        withRules(await read(request.original), options),
        await read(request.rewritten),
      ];
      const report = compareCircuits(original, rewritten, settings);
      const exitCode = report.verdict === 'same' ? 0 : report.verdict === 'different' ? 1 : 3;
      return { report, text: null, exitCode };
    }
    case 'build': {
      const target = withRules(await read(request.target), options);
      const { optimiser, entanglersMax } = request.options;
      const device = options.device ? deviceOf(options.device) : undefined;
      const links = options.links ?? device?.links.map(({ between }) => between);
      const { report, circuit } = await buildTarget(target, {
        ...common,
        ...(await nativePart(options, read)),
        ...defined({ tolerance: options.tolerance, optimiser, links }),
        ...defined({ entanglers: entanglersMax }),
        runJobs,
      });
      const exitCode = report.verdict === 'built' ? 0 : report.verdict === 'approximate' ? 1 : 3;
      return { report, text: writeCircuit(circuit), exitCode };
    }
  }
}

/** The circuit, if it has all the wires for which a rule was asked. */
function withRules(circuit: Circuit, { inputOf, outputOf }: CommonOptions): Circuit {
  for (const [what, rules] of [
    ['input', inputOf],
    ['output', outputOf],
  ] as const) {
    for (const wire of rules?.keys() ?? []) {
      if (wire < circuit.wires) continue;
      throw new InputError({
        code: 'no-such-wire',
        message: `the wire of an ${what} rule must be in [0, ${circuit.wires - 1}], got ${wire}`,
        file: circuit.name,
      });
    }
  }
  return circuit;
}

/** Only the entries that are there: options that are not given must not be passed as undefined. */
function defined<T extends object>(values: T): { [K in keyof T]?: Exclude<T[K], undefined> } {
  const entries = Object.entries(values).filter(([, value]) => value !== undefined);
  return Object.fromEntries(entries) as { [K in keyof T]?: Exclude<T[K], undefined> };
}

function contractPart({ inputs, outputs, inputOf, outputOf }: CommonOptions): ContractOptions {
  return defined({ inputs, outputs, inputOf, outputOf }) as ContractOptions;
}

async function nativePart(
  { native, entanglers = [] }: CommonOptions,
  read: (source: Source) => Promise<Circuit>,
): Promise<{
  native?: string;
  nativeAsked?: boolean;
  custom?: { name: string; matrix: Float64Array }[];
}> {
  const custom: { name: string; matrix: Float64Array }[] = [];
  for (const source of entanglers) {
    const circuit = await read(source);
    const [gate] = circuit.operations;
    const isPair = gate?.kind === 'gate' && gate.name === 'unitary' && circuit.wires === 2;
    if (!isPair || !gate.matrix) {
      throw new InputError({
        code: 'native-set',
        message: `expected a 4x4 unitary as entangler, got ${circuit.wires} wires`,
        file: source.name,
      });
    }
    const name = source.name.replace(/^.*[\\/]/, '').replace(/\.mtx$/, '');
    custom.push({ name: name.replace(/[^A-Za-z0-9_]/g, '_'), matrix: gate.matrix });
  }
  if (native === undefined && custom.length === 0) return {};
  return { ...(native === undefined ? {} : { native, nativeAsked: true }), custom };
}

function deviceOf({ text, name }: Source): Device {
  return readDevice(text, name);
}

/** Reads a circuit, or a unitary as a circuit of one gate; adds to `warnings` and `notes`. */
export async function readSource(
  { name, text, isExpression }: Source,
  nearest: boolean,
  warnings: InputProblem[],
  notes: string[],
): Promise<Circuit> {
  if (isExpression || isMatrixMarket(text)) {
    const read = isExpression ? await readExpression(text) : readMatrixMarket(text, name);
    const unitary = checkUnitary(read, name, { nearest });
    notes.push(...unitary.notes);
    return circuitOfUnitary(unitary.matrix, unitary.wires, name);
  }
  const { circuit, warnings: found } = readCircuit(text, name);
  warnings.push(...found);
  return circuit;
}
