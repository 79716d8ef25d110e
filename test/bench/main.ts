/**
 * Side by side in one run: our fits against the same fits in NumPy and SciPy with analytic gradients, from the same
 * starts, in seconds of processor time, which other work on the machine disturbs least; the kernels against their plain
 * twins and against NumPy. `--quick` takes fewer targets.
 */
import { spawnSync } from 'node:child_process';
import { cpus } from 'node:os';
import { fileURLToPath } from 'node:url';
import Table from 'cli-table3';
import { canonical } from '../../src/native/canonical.ts';
import { simdKernels } from '../../src/numeric/kernels/kernels.ts';
import { type Kernels, plainKernels } from '../../src/numeric/kernels/plain.ts';
import { random } from '../../src/numeric/random.ts';
import { haarUnitary } from '../../src/numeric/svd.ts';
import { type FitJob, fitBlock } from '../../src/reshape/fit-block.ts';
import { angleCount, entanglerTemplate } from '../../src/reshape/template.ts';

const isQuick = process.argv.includes('--quick');
const GOAL = 1e-12;

function pythonJson(input: unknown): unknown {
  const script = fileURLToPath(new URL('./reference.py', import.meta.url));
  const { status, stdout, stderr } = spawnSync('python3', [script], {
    input: JSON.stringify(input),
    encoding: 'utf8',
    maxBuffer: 1 << 28,
    env: { ...process.env, OMP_NUM_THREADS: '1', OPENBLAS_NUM_THREADS: '1' },
  });
  if (status !== 0) throw new Error(stderr);
  return JSON.parse(stdout);
}

/** Seconds a call takes: the least mean of several rounds. */
function secondsOf(run: () => void, repeats = 20): number {
  for (let k = 0; k < 10 * repeats; k++) run();
  let best = Number.POSITIVE_INFINITY;
  const until = performance.now() + 1000;
  for (let round = 0; round < 5 || performance.now() < until; round++) {
    const begin = performance.now();
    for (let k = 0; k < repeats; k++) run();
    best = Math.min(best, (performance.now() - begin) / (1000 * repeats));
  }
  return best;
}

function benchKernels(): void {
  const simd = simdKernels();
  if (!simd) throw new Error('this engine runs no WebAssembly SIMD');
  const draw = random(1, 'bench');
  const some = (size: number): Float64Array => Float64Array.from({ length: size }, () => draw());
  const [a, j, half] = [some(2 * 32 * 32), some(256 * 256), some(2 * 16 * 32)];
  const spd = new Float64Array(256 * 256);
  plainKernels.gramInto(spd, j, 256, 256);
  const shift = new Float64Array(256).fill(1);
  const [small, large] = [new Float64Array(2 * 32 * 32), new Float64Array(256 * 256)];
  // flops that each one really needs: triangles only, where only triangles are computed
  const work: [keyof Times, string, number, (k: Kernels) => void][] = [
    [
      'multiply',
      'complex product 32 x 32',
      8 * 32 ** 3,
      (k) => k.multiplyInto(small, a, a, 32, 32, 32),
    ],
    ['gram', 'normal matrix 256 x 256', 256 ** 3, (k) => k.gramInto(large, j, 256, 256)],
    [
      'square',
      'projector square 32 x 32',
      4 * 16 * 32 ** 2,
      (k) => k.squareInto(small, half, 16, 32),
    ],
    ['cholesky', 'Cholesky 256', 256 ** 3 / 3, (k) => k.choleskyInto(large, spd, shift, 256)],
  ];
  const theirs = pythonJson({ kind: 'kernels' }) as Theirs;
  // NumPy computes all of b^dag b; for j j^T it calls the symmetric routine and computes a triangle
  const theirFlops = { multiply: 1, gram: 1, square: 2, cholesky: 1 };
  const table = new Table({
    style: { head: [], border: [] },
    head: ['kernel', 'SIMD Gflop/s', 'plain', 'NumPy', 'SIMD / plain', 'SIMD / NumPy'],
  });
  for (const [name, title, flops, run] of work) {
    const rate = flops / secondsOf(() => run(simd)) / 1e9;
    const plain = flops / secondsOf(() => run(plainKernels)) / 1e9;
    const numpy = (flops * theirFlops[name]) / theirs.times[name] / 1e9;
    const figures = [rate, plain, numpy, rate / plain, rate / numpy];
    table.push([title, ...figures.map((figure) => figure.toFixed(2))]);
  }
  console.log(`NumPy ${theirs.numpy}, SciPy ${theirs.scipy}, one thread`);
  console.log(table.toString());
}

function benchCanonical(): void {
  const gates = Array.from({ length: 2000 }, (_, k) => haarUnitary(4, random(14, k)));
  const seconds = secondsOf(() => {
    for (const gate of gates) canonical(gate);
  }, 2);
  console.log(`canonical decomposition: ${Math.round(gates.length / seconds)} a second`);
}

type Times = { multiply: number; gram: number; square: number; cholesky: number };
type Theirs = { times: Times; numpy: string; scipy: string };
type Outcome = { seconds: number; solved: number; iterations: number; starts: number };

/** All pairs of wires again and again. */
function pairsOf(wires: number, count: number): [number, number][] {
  const all: [number, number][] = [];
  for (let a = 0; a < wires; a++) for (let b = a + 1; b < wires; b++) all.push([a, b]);
  return Array.from({ length: count }, (_, k) => all[k % all.length]!);
}

async function ours(
  base: Omit<FitJob, 'start' | 'id' | 'optimiser'>,
  starts: readonly Float64Array[],
  optimiser: FitJob['optimiser'],
): Promise<Outcome> {
  const begin = process.cpuUsage();
  let [iterations, used, solved] = [0, 0, 0];
  for (const start of starts) {
    const found = await fitBlock({ ...base, id: `bench ${used}`, start, optimiser });
    iterations += found.iterations;
    used++;
    if (found.distance <= GOAL) {
      solved = 1;
      break;
    }
  }
  const { user, system } = process.cpuUsage(begin);
  return { seconds: (user + system) / 1e6, solved, iterations, starts: used };
}

async function benchFits(
  wires: number,
  entanglers: number,
  targets: number,
  shared: number,
  startsMax: number,
  optimisers: readonly FitJob['optimiser'][],
  methods: readonly string[],
): Promise<void> {
  const template = entanglerTemplate(wires, pairsOf(wires, entanglers));
  const d = 2 ** wires;
  const outcomes = new Map<string, Outcome[]>();
  const note = (name: string, outcome: Outcome): void => {
    outcomes.set(name, [...(outcomes.get(name) ?? []), outcome]);
  };
  const fits: unknown[] = [];
  const warmUp = haarUnitary(d, random(13));
  const seed = 1;
  // often enough for the engine to have compiled what the fits run
  const until = performance.now() + 3000;
  for (let round = 0; round === 0 || performance.now() < until; round++) {
    for (const optimiser of ['lm', ...optimisers] as const) {
      await fitBlock({
        kind: 'fit',
        id: `warm ${round}`,
        seed,
        template,
        target: { kind: 'unitary', matrix: warmUp },
        goal: GOAL,
        iterationsMax: wires > 4 ? 3 : 50,
        optimiser,
      });
    }
  }
  for (let t = 0; t < targets; t++) {
    const matrix = haarUnitary(d, random(11, 'target', t));
    const starts = Array.from({ length: startsMax }, (_, k) => {
      const draw = random(12, t, k);
      return Float64Array.from({ length: angleCount(template) }, () => Math.PI * (2 * draw() - 1));
    });
    const base = {
      kind: 'fit',
      seed,
      template,
      target: { kind: 'unitary', matrix },
      goal: GOAL,
      iterationsMax: 3000,
    } as const;
    note('ours, lm', await ours(base, starts, 'lm'));
    if (t >= shared) continue;
    for (const optimiser of optimisers) {
      note(`ours, ${optimiser}`, await ours(base, starts, optimiser));
    }
    fits.push({
      wires,
      steps: template.steps,
      target: [...matrix],
      starts: starts.map((s) => [...s]),
      goal: GOAL,
      methods,
    });
  }
  for (const found of pythonJson({ kind: 'fits', fits }) as { [method: string]: Outcome }[]) {
    for (const method of methods) note(`SciPy ${method}`, found[method]!);
  }
  const table = new Table({
    style: { head: [], border: [] },
    head: [
      `${wires} wires, ${entanglers} CX`,
      'targets',
      'solved',
      'starts, most',
      'iterations',
      'CPU s a target',
      'ratio',
    ],
  });
  const mean = (list: readonly Outcome[]): number =>
    list.reduce((sum, o) => sum + o.seconds, 0) / list.length;
  const all = outcomes.get('ours, lm')!;
  for (const [name, list] of outcomes) {
    const most = Math.max(...list.map(({ starts }) => starts));
    const iterations = list.reduce((sum, o) => sum + o.iterations, 0) / list.length;
    const solved = list.filter((o) => o.solved === 1).length;
    // the ratio compares the same targets
    const ratio = mean(list) / mean(all.slice(0, list.length));
    table.push([
      name,
      list.length,
      solved,
      most,
      iterations.toFixed(0),
      mean(list).toPrecision(3),
      ratio.toFixed(1),
    ]);
  }
  console.log(table.toString());
}

console.log(
  `${cpus()[0]?.model ?? 'unknown processor'} x ${cpus().length}, Node ${process.version}`,
);
benchKernels();
benchCanonical();
const threeWires = isQuick ? 20 : 200;
await benchFits(
  3,
  14,
  threeWires,
  isQuick ? 3 : 10,
  3,
  ['bfgs', 'lbfgs'],
  ['least_squares', 'BFGS', 'L-BFGS-B'],
);
await benchFits(4, 61, isQuick ? 4 : 20, isQuick ? 1 : 2, 4, [], ['least_squares']);
if (!isQuick) await benchFits(5, 256, 2, 0, 2, [], []);
