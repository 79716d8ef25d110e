/** What each page holds: its texts, what is being computed of them, and what must be forgotten on an edit. */
import { effect, type Signal, signal, untracked } from '@preact/signals';
import type { CommandRequest, CommandResult } from '../commands.ts';
import type { Drawing, DrawJob, Trade, TradeJob } from '../draw.ts';
import type { InputProblem } from '../input-error.ts';
import type { NarrowReport, Pair, SurveyReport } from '../reports.ts';
import { ConvergenceData } from './convergence-data.ts';
import { Lane, workersUsable } from './engine.ts';
import { commonOptions, contractOptions, settings } from './settings.ts';
import { sourceOfText } from './source.ts';
import { Task } from './task.ts';

/** So long after the last key a text is read again. */
const TYPING_MS = 160;

const work = new Lane(workersUsable());

/** A text, its drawing and its mistakes. */
export class Sheet {
  readonly text: Signal<string>;
  readonly name: string;
  private readonly title: string;
  /** Names of the original's qubits, for the flags on a narrowed circuit. */
  qubitNames: readonly string[] | undefined;
  readonly drawing = new Task<Drawing>();
  /** The last drawing that could be made, shown while a newer text has mistakes. */
  readonly shown = signal<Drawing | null>(null);
  readonly problems = signal<readonly InputProblem[]>([]);
  /** Line under the pointer or the cursor, and wires, for linking drawing, text and table. */
  readonly line = signal(0);
  readonly wires = signal<readonly number[]>([]);
  private readonly lane = new Lane(1);

  constructor(name: string, title: string) {
    this.name = name;
    this.title = title;
    this.text = signal('');
  }

  private names(): { qubitNames?: readonly string[] } {
    return this.qubitNames ? { qubitNames: this.qubitNames } : {};
  }

  async draw(): Promise<Drawing | null> {
    const text = this.text.peek();
    if (text.trim() === '') {
      this.drawing.clear();
      this.shown.value = null;
      this.problems.value = [];
      return null;
    }
    const job: DrawJob = {
      kind: 'draw',
      id: 'draw',
      seed: 1,
      source: sourceOfText(text, this.name),
      options: contractOptions(settings.peek()),
      picture: {
        standalone: false,
        idPrefix: this.name.replace(/\W/g, '-'),
        title: this.title,
        ...this.names(),
      },
    };
    const outcome = await this.drawing.follow(this.lane.job<Drawing>(job));
    if (outcome.kind === 'answer') {
      this.shown.value = outcome.value;
      this.problems.value = [];
      return outcome.value;
    }
    if (outcome.kind === 'problems') this.problems.value = outcome.problems;
    if (outcome.kind === 'fault')
      this.problems.value = [{ code: 'fault', message: outcome.message }];
    return null;
  }

  /** The picture as a file of its own. */
  async picture(): Promise<string | null> {
    const job: DrawJob = {
      kind: 'draw',
      id: 'picture',
      seed: 1,
      source: sourceOfText(this.text.peek(), this.name),
      options: {},
      picture: { title: this.title, ...this.names() },
    };
    const outcome = await this.lane.job<Drawing>(job).outcome;
    return outcome.kind === 'answer' ? outcome.value.svg : null;
  }
}

/** Calls `run` some time after the last change of what `watch` reads. Returns how to end it. */
function afterTyping(watch: () => void, onChange: () => void, run: () => void): () => void {
  let timer: ReturnType<typeof setTimeout> | undefined;
  let isFirst = true;
  return effect(() => {
    watch();
    clearTimeout(timer);
    untracked(onChange);
    timer = setTimeout(run, isFirst ? 0 : TYPING_MS);
    isFirst = false;
  });
}

export class NarrowModel {
  readonly sheet = new Sheet('circuit.qasm', 'The circuit as written');
  readonly survey = new Task<CommandResult>();
  readonly narrowing = new Task<CommandResult>();
  readonly trade = new Task<Trade>();
  readonly convergence = new ConvergenceData();
  /** The circuit that came out, as a sheet of its own. */
  readonly after = new Sheet('narrowed.qasm', 'The narrowed circuit');
  /** The pair of the influence table that is looked at. */
  readonly cell = signal<Pair | null>(null);
  /** The opening that the running or finished narrowing was started from. */
  readonly opening = signal<Pair | null>(null);
  private readonly surveys = new Lane(1);
  private readonly trades = new Lane(1);

  constructor() {
    afterTyping(
      () => [this.sheet.text.value, settings.value.inputs, settings.value.outputs],
      () => this.forget(),
      () => void this.look(),
    );
    afterTyping(
      () => settings.value.device,
      () => this.trade.clear(),
      () => void this.weigh(),
    );
  }

  get surveyReport(): SurveyReport | null {
    const state = this.survey.state.value;
    return state.kind === 'answer' ? (state.value.report as SurveyReport) : null; // a survey was asked for
  }

  get narrowReport(): NarrowReport | null {
    const state = this.narrowing.state.value;
    return state.kind === 'answer' ? (state.value.report as NarrowReport) : null; // a narrowing was asked for
  }

  /** What was computed of another text is stale: it is ended and taken away. */
  private forget(): void {
    const wasRunning = this.narrowing.isRunning;
    this.survey.clear();
    this.trade.clear();
    this.cell.value = null;
    this.opening.value = null;
    this.after.shown.value = null;
    this.narrowing.clear(
      wasRunning ? 'The circuit was changed, so the narrowing was stopped. Start it again when you are ready.' : undefined, // biome-ignore format: one sentence
    );
  }

  private async look(): Promise<void> {
    const drawing = await this.sheet.draw();
    if (!drawing) return;
    await this.survey.follow(
      this.surveys.command(
        {
          command: 'survey',
          circuit: sourceOfText(this.sheet.text.peek(), this.sheet.name),
          options: contractOptions(settings.peek()),
        },
        this.survey.onProgress,
      ),
    );
    await this.weigh();
  }

  private async weigh(): Promise<void> {
    if (this.survey.state.peek().kind !== 'answer') return;
    const { device } = settings.peek();
    const options = { ...contractOptions(settings.peek()), ...deviceOption(device) };
    const source = sourceOfText(this.sheet.text.peek(), this.sheet.name);
    const job: TradeJob = { kind: 'trade', id: 'trade', seed: 1, source, options };
    await this.trade.follow(this.trades.job<Trade>(job));
  }

  async narrow(opening: Pair | null = null): Promise<void> {
    const { wires } = settings.peek();
    this.opening.value = opening;
    this.after.shown.value = null;
    this.convergence.clear();
    const request: CommandRequest = {
      command: 'narrow',
      circuit: sourceOfText(this.sheet.text.peek(), this.sheet.name),
      options: {
        ...commonOptions(settings.peek()),
        ...(wires.trim() === '' ? {} : { wires: Number(wires) }),
      },
    };
    const outcome = await this.narrowing.follow(
      work.command(request, (progress) => {
        this.narrowing.onProgress(progress);
        this.convergence.add(progress);
      }),
    );
    if (outcome.kind === 'answer' && outcome.value.text !== null) {
      this.after.text.value = outcome.value.text;
      this.after.qubitNames = this.sheet.shown.peek()?.wireNames;
      await this.after.draw();
    }
  }
}

function deviceOption(device: string): { device?: { name: string; text: string } } {
  return device.trim() === '' ? {} : { device: { name: 'device', text: device } };
}

export class CompareModel {
  readonly original = new Sheet('original.qasm', 'The original circuit');
  readonly rewritten = new Sheet('rewritten.qasm', 'The rewritten circuit');
  readonly comparing = new Task<CommandResult>();
  /** Nothing is read before somebody looks at the page. */
  readonly isAwake = signal(false);

  constructor() {
    for (const sheet of [this.original, this.rewritten]) {
      afterTyping(
        () => [this.isAwake.value, sheet.text.value, settings.value.inputs, settings.value.outputs],
        () => this.comparing.clear(),
        () => void (this.isAwake.peek() && sheet.draw()),
      );
    }
  }

  async compare(): Promise<void> {
    const request: CommandRequest = {
      command: 'compare',
      original: sourceOfText(this.original.text.peek(), this.original.name),
      rewritten: sourceOfText(this.rewritten.text.peek(), this.rewritten.name),
      options: {
        ...commonOptions(settings.peek()),
        ...(settings.peek().relabel === 'yes' ? { relabel: true } : {}),
      },
    };
    await this.comparing.follow(work.command(request, this.comparing.onProgress));
  }
}

export class BuildModel {
  readonly target = new Sheet('target', 'The target');
  readonly building = new Task<CommandResult>();
  readonly convergence = new ConvergenceData();
  readonly after = new Sheet('built.qasm', 'The circuit built for the target');
  readonly isAwake = signal(false);

  constructor() {
    afterTyping(
      () => [this.isAwake.value, this.target.text.value],
      () => {
        this.building.clear();
        this.after.shown.value = null;
      },
      () => void (this.isAwake.peek() && this.target.draw()),
    );
  }

  async build(): Promise<void> {
    const { entanglers, optimiser } = settings.peek();
    this.after.shown.value = null;
    this.convergence.clear();
    const request: CommandRequest = {
      command: 'build',
      target: sourceOfText(this.target.text.peek(), this.target.name),
      options: {
        ...commonOptions(settings.peek()),
        ...(entanglers.trim() === '' ? {} : { entanglersMax: Number(entanglers) }),
        ...(isOptimiser(optimiser) ? { optimiser } : {}),
      },
    };
    const outcome = await this.building.follow(
      work.command(request, (progress) => {
        this.building.onProgress(progress);
        this.convergence.add(progress);
      }),
    );
    if (outcome.kind === 'answer' && outcome.value.text !== null) {
      this.after.text.value = outcome.value.text;
      await this.after.draw();
    }
  }
}

function isOptimiser(word: string): word is 'lm' | 'bfgs' | 'nelder-mead' {
  return word === 'lm' || word === 'bfgs' || word === 'nelder-mead';
}
