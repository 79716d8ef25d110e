/**
 * The command line: reads words, runs one command, writes its answer.
 *
 * Exit codes: 0 yes, 1 no, 2 bad input or usage, 3 undecided within the limits, 70 a fault of ours, 130 stopped by Ctrl-C.
 */
import { fileURLToPath } from 'node:url';
import { Command, CommanderError, Option } from 'commander';
import {
  type Certificate,
  certificateOf,
  checkHashes,
  disagreements,
  readCertificate,
} from '../check/certificate.ts';
import { COMPARE_TOLERANCE } from '../check/compare.ts';
import type { CommandRequest, CommandResult, CommonOptions, Source } from '../commands.ts';
import type { InputRule, OutputRule } from '../contract.ts';
import { formatProblem, InputError, nearestWord, shortened } from '../input-error.ts';
import { type Captioned, pictureSheet } from '../write/picture-sheet.ts';
import { reportHtml } from '../write/report-html.ts';
import { errorColours } from './colours.ts';
import { checkWritable, readText, sourceOf, writeWhole } from './files.ts';
import {
  commonOptions,
  defaultWorkers,
  linksFrom,
  ruleFrom,
  secondsFrom,
  toleranceFrom,
  WORKERS_MAX,
  type Words,
  wholeFrom,
} from './options.ts';
import { picturesOf } from './pictures.ts';
import { progressView } from './progress.ts';
import { runToEnd } from './run.ts';
import { showReport } from './show.ts';

const VERSION = '0.1.0';

function shared(command: Command): Command {
  return command
    .addOption(new Option('--inputs <rule>', 'what the circuit must accept').choices(['any', 'zero']))
    .addOption(new Option('--outputs <rule>', 'what becomes of the outputs').choices(['kept', 'measured'])) // biome-ignore format: one option a line
    .option('--input-of <wire=rule>', 'the rule of one input (any, zero); repeatable', ruleFrom(['any', 'zero'])) // biome-ignore format: one option a line
    .option('--output-of <wire=rule>', 'the rule of one output (kept, measured, dropped); repeatable', ruleFrom(['kept', 'measured', 'dropped'])) // biome-ignore format: one option a line
    .option('--native <list>', 'native gates, or a .mtx file as entangler (default: cx,rz,sx)')
    .option('--device <file>', 'device description (JSON)')
    .option('--links <list>', 'pairs of wires that may interact, as 0-1,1-2', linksFrom)
    .option('--tolerance <D>', 'Hilbert-Schmidt distance that counts as equal (default: 1e-10)', toleranceFrom) // biome-ignore format: one option a line
    .option('--nearest', 'take the unitary nearest to a matrix that is not one')
    .option('--seed <n>', 'same seed, same bytes', wholeFrom(0, 2 ** 31 - 1), 1)
    .option('--workers <n>', 'threads for the fits; 0: none', wholeFrom(0, WORKERS_MAX), defaultWorkers()) // biome-ignore format: one option a line
    .option('--time-limit <seconds>', 'stop after this long, keep the best so far', secondsFrom)
    .option('--report <file>', 'write the report (.json or .html)')
    .option('--json', 'the report on standard output, and nothing else there')
    .option('--quiet', 'no progress on standard error')
    .option('--force', 'replace existing files');
}

function program(finish: (code: number) => void): Command {
  const root = new Command('wiregauge')
    .description(
      'Measures how many wires a quantum circuit really needs, rewrites it to need fewer, and proves that nothing else changed.',
    )
    .version(VERSION)
    .showSuggestionAfterError(true)
    .exitOverride()
    .configureOutput({ outputError: () => {} })
    .addHelpText(
      'after',
      '\nA CIRCUIT is an OpenQASM file (2.0 or 3), a unitary in a .mtx file, or an expression such as "kron(h, id) * cx".\nExit codes: 0 yes, 1 no, 2 bad input, 3 undecided within the limits, 70 a fault of ours, 130 stopped.',
    );
  shared(root.command('survey').argument('<circuit>', 'circuit or unitary'))
    .description('counts, reusable pairs, influence, and the width under each contract')
    .option('--picture <file>', 'draw the circuit and the trade of wires against depth (.svg)')
    .addHelpText('after', '\nExample: wiregauge survey parity.qasm')
    .action(async (circuit: string, words: Words) => {
      finish(await perform(words, () => ({ command: 'survey', circuit: sourceOf(circuit), options: commonOptions(words) }))); // biome-ignore format: one request
    });
  shared(root.command('narrow').argument('<circuit>', 'circuit or unitary'))
    .description('the main job: fewer wires, native gates, checked')
    .option('--wires <n>', 'this many wires (default: the fewest)', wholeFrom(1, 10_000))
    .option('--out <file>', 'write the narrower circuit (OpenQASM 3)')
    .option('--picture <file>', 'draw the circuit before and after (.svg)')
    .addHelpText('after', '\nExample: wiregauge narrow block.qasm --out narrow.qasm')
    .action(async (circuit: string, words: Words) => {
      const { wires } = words;
      finish(
        await perform(words, () => ({
          command: 'narrow',
          circuit: sourceOf(circuit),
          options: { ...commonOptions(words), ...(wires === undefined ? {} : { wires }) },
        })),
      );
    });
  shared(
    root
      .command('compare')
      .argument('[original]', 'circuit or unitary')
      .argument('[rewritten]', 'circuit or unitary'),
  )
    .description('same or not, how far apart, and an input that shows it')
    .option('--relabel', 'allow a permutation of the outputs')
    .option('--map <pairs>', 'which register is which: a[0]=q[2],b=r (original=rewritten)')
    .option('--certificate <file>', 'write what was compared and found (.json)')
    .option('--recheck <certificate>', 'repeat a comparison and hold it to its certificate')
    .addHelpText('after', '\nExample: wiregauge compare before.qasm after.qasm')
    .action(async (original: string | undefined, rewritten: string | undefined, words: Words) => {
      finish(await compareFiles(original, rewritten, words));
    });
  shared(root.command('build').argument('<target>', 'unitary (.mtx or expression) or circuit'))
    .description('native gates for a unitary, with few entanglers')
    .option('--entanglers <n>', 'at most this many; the best fit', wholeFrom(0, 100_000))
    .addOption(new Option('--optimiser <name>', 'how to fit').choices(['lm', 'bfgs', 'nelder-mead'])) // biome-ignore format: one option a line
    .option('--out <file>', 'write the circuit (OpenQASM 3)')
    .addHelpText('after', '\nExample: wiregauge build "kron(h, id) * cx" --native cz,rz,sx')
    .action(async (target: string, words: Words) => {
      const { entanglers, optimiser } = words;
      finish(
        await perform(words, () => ({
          command: 'build',
          target: sourceOf(target),
          options: {
            ...commonOptions(words),
            ...(entanglers === undefined ? {} : { entanglersMax: entanglers }),
            ...(optimiser ? { optimiser } : {}),
          },
        })),
      );
    });
  root
    .command('desk')
    .description('the same in a local web page; nothing leaves this machine')
    .option(
      '--port <n>',
      'port on the loopback address; 0: any that is free',
      wholeFrom(0, 65_535),
      0,
    )
    .addHelpText('after', '\nExample: wiregauge desk --port 8080')
    .action(async (words: { port: number }) => {
      finish(await openDesk(words.port));
    });
  for (const command of root.commands) {
    command.exitOverride().configureOutput({ outputError: () => {} });
    command.showSuggestionAfterError(true);
  }
  return root;
}

/** Serves the page until Ctrl-C. */
async function openDesk(port: number): Promise<number> {
  const { startDesk } = await import('./desk-server.ts');
  const directory = fileURLToPath(new URL('./desk', import.meta.url));
  const { url, close } = await startDesk({ port, directory });
  process.stdout.write(`the desk is at ${url} (Ctrl-C ends it)\n`);
  await new Promise<void>((resolve) => {
    process.once('SIGINT', resolve);
    process.once('SIGTERM', resolve);
  });
  await close();
  return 0;
}

async function compareFiles(
  original: string | undefined,
  rewritten: string | undefined,
  words: Words,
): Promise<number> {
  const known = words.recheck ? readCertificate(readText(words.recheck), words.recheck) : undefined;
  const first = original ?? known?.original.name;
  const second = rewritten ?? known?.rewritten.name;
  if (first === undefined || second === undefined) {
    throw new InputError({
      code: 'missing-argument',
      message: 'missing argument: two circuits to compare, or --recheck with a certificate',
    });
  }
  const texts = { original: sourceOf(first), rewritten: sourceOf(second) };
  if (known) checkHashes(known, texts);
  const asked = known
    ? askedBy(known)
    : { ...commonOptions(words), relabel: words.relabel === true, ...(words.map ? { map: words.map } : {}) }; // biome-ignore format: one choice
  return perform(
    words,
    () => ({ command: 'compare', ...texts, options: asked }),
    ({ report }) => {
      if (report.schema !== 'wiregauge/compare@1') return null;
      if (words.certificate) {
        const tolerance = asked.tolerance ?? COMPARE_TOLERANCE;
        const made = certificateOf(
          report,
          { original: named(texts.original), rewritten: named(texts.rewritten) },
          { ...asked, tolerance },
          VERSION,
        );
        writeWhole(words.certificate, `${JSON.stringify(made, null, 2)}\n`);
      }
      if (!known) return null;
      const wrong = disagreements(known, report, VERSION);
      const held = wrong.length === 0 ? 'the certificate holds' : `the certificate does not hold: ${wrong.join('; ')}`; // biome-ignore format: one sentence
      report.notes.push(held);
      return wrong.length === 0 ? 0 : 1;
    },
  );
}

/** An expression goes by its text, so that a recheck finds it again. */
function named({ name, text, isExpression }: Source): { name: string; text: string } {
  return { name: isExpression ? text : name, text };
}

function askedBy({ asked }: Certificate): CommonOptions & { relabel?: boolean; map?: string } {
  const { inputs, outputs, inputOf, outputOf, relabel, map, tolerance, seed } = asked;
  return {
    relabel,
    tolerance,
    seed,
    ...(map === undefined ? {} : { map }),
    ...(inputs ? { inputs } : {}),
    ...(outputs ? { outputs } : {}),
    // the rules were checked when the certificate was read
    ...(inputOf ? { inputOf: new Map(inputOf as [number, InputRule][]) } : {}),
    ...(outputOf ? { outputOf: new Map(outputOf as [number, OutputRule][]) } : {}),
  };
}

async function perform(
  words: Words,
  request: () => CommandRequest,
  /** Looks at the result before it is shown; may decide the exit code. */
  inspect: (result: CommandResult) => number | null = () => null,
): Promise<number> {
  const started = performance.now();
  for (const file of [words.out, words.report, words.picture, words.certificate])
    if (file) checkWritable(file, words.force === true);
  if (words.report && !/\.(json|html)$/.test(words.report)) {
    throw new InputError({ code: 'bad-report', message: `expected a .json or .html file for --report, got ${words.report}` }); // biome-ignore format: one message
  }
  if (words.picture && !words.picture.endsWith('.svg')) {
    throw new InputError({ code: 'bad-picture', message: `expected a .svg file for --picture, got ${words.picture}` }); // biome-ignore format: one message
  }
  const asked = request();
  const view = progressView(words.quiet === true);
  const { result, isInterrupted, isTimedOut } = await runToEnd(asked, {
    workers: words.workers,
    ...(words.timeLimit === undefined ? {} : { timeLimitSeconds: words.timeLimit }),
    onProgress: (progress) => view.show(progress),
  }).finally(() => view.end());
  if (!result) {
    const why = isTimedOut ? 'stopped at the time limit' : 'stopped';
    process.stderr.write(`wiregauge: ${why} before there was a result to keep\n`);
    return isInterrupted ? 130 : 3;
  }
  result.report.seconds = Math.round(performance.now() - started) / 1000;
  const decided = inspect(result);
  const isDrawn = words.picture !== undefined || words.report?.endsWith('.html') === true;
  const pictures = isDrawn ? await picturesOf(asked, result) : [];
  if (words.picture)
    writeWhole(words.picture, pictureSheet(pictures, `wiregauge ${asked.command}`));
  deliver(result, words, asked.command, pictures);
  if (isInterrupted) return 130;
  if (decided !== null) return decided;
  return isTimedOut && result.exitCode !== 0 ? 3 : result.exitCode;
}

function deliver(
  { report, text, warnings }: CommandResult,
  words: Words,
  command: string,
  pictures: readonly Captioned[],
): void {
  for (const warning of warnings) {
    process.stderr.write(`${errorColours.yellow('warning')}: ${formatProblem(warning)}\n`);
  }
  if (words.out && text !== null) {
    writeWhole(words.out, text);
    if ('files' in report) report.files.push(words.out);
  }
  const json = `${JSON.stringify(report, null, 2)}\n`;
  if (words.report) {
    const isHtml = words.report.endsWith('.html');
    const summary = 'reason' in report ? report.reason : 'verdict' in report ? report.verdict : 'survey'; // biome-ignore format: one choice
    writeWhole(words.report, isHtml ? reportHtml(report, { title: `wiregauge ${command}`, summary, pictures }) : json); // biome-ignore format: one call
  }
  if (words.json) {
    process.stdout.write(json);
    return;
  }
  process.stdout.write(showReport(report));
  if (words.out && text !== null) process.stdout.write(`written: ${words.out}\n`);
  else if (text !== null && command !== 'survey') process.stdout.write(`\n${text}`);
}

/** One message on standard error, and the exit code that goes with it. */
function explain(error: unknown): number {
  if (error instanceof CommanderError) {
    if (error.exitCode === 0) return 0;
    // commander prints help itself when no command is given
    if (error.code === 'commander.help') return 2;
    process.stderr.write(`wiregauge: ${shortened(error.message.replace(/^error: /, ''))}\n`);
    return 2;
  }
  if (error instanceof InputError) {
    for (const problem of error.problems) {
      process.stderr.write(`${errorColours.red('error')}: ${formatProblem(problem)}\n`);
    }
    return 2;
  }
  const message = error instanceof Error ? error.message : String(error);
  process.stderr.write(`wiregauge: a fault of ours: ${message}\n`);
  if (process.env.WIREGAUGE_TRACE && error instanceof Error)
    process.stderr.write(`${error.stack}\n`);
  return 70;
}

export async function main(argv: readonly string[]): Promise<number> {
  let code = 0;
  const root = program((found) => {
    code = found;
  });
  try {
    const [first] = argv;
    const names = root.commands.map((command) => command.name());
    if (
      first !== undefined &&
      !first.startsWith('-') &&
      first !== 'help' &&
      !names.includes(first)
    ) {
      const near = nearestWord(first, names);
      throw new InputError({
        code: 'unknown-command',
        message: `unknown command: ${first}`,
        hint: near ? `did you mean ${near}?` : `known: ${names.join(', ')}`,
      });
    }
    await root.parseAsync([...argv], { from: 'user' });
    return code;
  } catch (error) {
    // the edge: every error becomes one message and a code
    return explain(error);
  }
}
