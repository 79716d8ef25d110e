/**
 * The rules of the house that a machine can check: who may import whom, no cycles, no file that nobody uses, no calls that
 * belong to the shells, and the guides in step with the folders. Plain text scanning; its own cases are at the end.
 */
import { existsSync, readdirSync, readFileSync, statSync } from 'node:fs';
import { dirname, join, relative, resolve } from 'node:path';
import { describe, expect, test } from 'vitest';

const root = resolve(import.meta.dirname, '..');

function filesBelow(folder: string, ending: RegExp): string[] {
  return readdirSync(join(root, folder)).flatMap((name) => {
    const path = `${folder}/${name}`;
    if (statSync(join(root, path)).isDirectory()) return filesBelow(path, ending);
    return ending.test(name) ? [path] : [];
  });
}

type Import = { to: string; isTypeOnly: boolean };

function importsOf(text: string): { specifier: string; isTypeOnly: boolean }[] {
  const found: { specifier: string; isTypeOnly: boolean }[] = [];
  const pattern =
    /(?:^|\n)\s*(?:import|export)\s+(type\s)?(?:[^'";]*?\sfrom\s+)?['"]([^'"]+)['"]|import\(\s*['"]([^'"]+)['"]|new URL\(\s*['"](\.[^'"]+)['"]/g;
  for (const [, typeOnly, specifier, dynamic, url] of text.matchAll(pattern)) {
    found.push({ specifier: (specifier ?? dynamic ?? url)!, isTypeOnly: typeOnly !== undefined });
  }
  return found;
}

const sources = [...filesBelow('src', /\.tsx?$/), ...filesBelow('workers', /\.ts$/)].filter(
  (file) => !file.includes('/assembly/'),
);
const graph = new Map<string, Import[]>(
  sources.map((file) => {
    const imports = importsOf(readFileSync(join(root, file), 'utf8')).flatMap(
      ({ specifier, isTypeOnly }): Import[] => {
        if (!specifier.startsWith('.')) return [];
        const to = relative(root, resolve(root, dirname(file), specifier.replace(/\?.*$/, '')));
        return [{ to, isTypeOnly }];
      },
    );
    return [file, imports];
  }),
);

/** Which rooms a room may import; leaves directly in src are open to all. */
const ROOMS: { readonly [room: string]: readonly string[] } = {
  numeric: [],
  optimise: ['numeric'],
  circuit: ['numeric'],
  device: ['circuit', 'numeric', 'plan'],
  read: ['circuit', 'numeric', 'device/device.ts'],
  survey: ['circuit', 'numeric'],
  plan: ['survey', 'circuit', 'numeric', 'device'],
  reshape: ['plan', 'survey', 'circuit', 'optimise', 'numeric'],
  native: ['reshape', 'circuit', 'optimise', 'numeric'],
  check: ['read', 'circuit', 'numeric'],
  write: ['circuit', 'numeric', 'device', 'plan'],
  examples: [],
};
const LEAVES = ['assert', 'input-error', 'control', 'contract', 'jobs', 'reports'];
/** Files that may import everything. */
const TOP = /^(src\/(cli|desk)\/|src\/(narrow|build|commands|draw|job-table|index)\.ts$|workers\/)/;
const ENTRIES = ['src/cli/bin.ts', 'src/index.ts', 'workers/worker.ts', 'src/desk/main.tsx', 'src/desk/vite.config.ts', 'src/examples/index.ts']; // biome-ignore format: one list

function mayImport(from: string, to: string): boolean {
  if (TOP.test(from)) return true;
  const target = to.replace(/^src\//, '');
  if (LEAVES.some((leaf) => target === `${leaf}.ts`)) return true;
  const room = /^src\/(\w+)\//.exec(from)?.[1];
  // a leaf may use leaves and the types of reports it names
  if (room === undefined) return from === 'src/reports.ts' && target.startsWith('circuit/');
  if (target.startsWith(`${room}/`)) return true;
  return (ROOMS[room] ?? []).some(
    (allowed) => target === allowed || target.startsWith(`${allowed}/`),
  );
}

/** The shells: the only places for files, processes, clocks, pages and threads. */
const SHELL = /^(src\/(cli|desk)\/|workers\/)/;
const BANNED: readonly [RegExp, string][] = [
  [/\bMath\.random\b/, 'random(seed)'],
  [/\bDate\.now\b|\bnew Date\b/, 'a clock of the shell'],
  [/\bperformance\.now\b/, 'a clock of the shell'],
  [/\bprocess\.(?!env\.CI)/, 'an argument from the shell'],
  [/\bconsole\./, 'a report or a note'],
  [/\bsetTimeout\b|\bsetInterval\b/, 'Control.pause'],
  [/from 'node:/, 'the shells'],
];
const BANNED_EVERYWHERE: readonly [RegExp, string][] = [
  [/\bas any\b|:\s*any\s*[;,)=>|[\]]/, 'unknown or the type itself'],
  [/^\s*(export\s+)?(const\s+)?enum\b/m, 'a union of strings'],
  [/\bexport default\b/, 'a named export'],
  [/\b(FIXME|TODO)\b/, 'the thing itself'],
  [/\.only\(/, 'the whole suite'],
  [/new Complex\b/, 'planar arrays'],
];

function withoutComments(text: string): string {
  return text.replace(/\/\*[\s\S]*?\*\//g, '').replace(/(^|[^:'"])\/\/[^\n]*/g, '$1');
}

function offences(file: string, text: string): string[] {
  const rules = SHELL.test(file) ? BANNED_EVERYWHERE : [...BANNED, ...BANNED_EVERYWHERE];
  const code = withoutComments(text);
  return rules.flatMap(([pattern, instead]) => {
    const match = pattern.exec(code);
    return match ? [`${file}: ${match[0].trim()} is banned, use ${instead}`] : [];
  });
}

function cycles(imports: ReadonlyMap<string, readonly Import[]>): string[][] {
  const state = new Map<string, 'open' | 'done'>();
  const path: string[] = [];
  const found: string[][] = [];
  const visit = (file: string): void => {
    if (state.get(file) === 'done') return;
    if (state.get(file) === 'open') {
      found.push([...path.slice(path.indexOf(file)), file]);
      return;
    }
    state.set(file, 'open');
    path.push(file);
    for (const { to, isTypeOnly } of imports.get(file) ?? []) if (!isTypeOnly) visit(to);
    path.pop();
    state.set(file, 'done');
  };
  for (const file of imports.keys()) visit(file);
  return found;
}

describe('imports', () => {
  test('go down the layers only', () => {
    const wrong = [...graph].flatMap(([from, imports]) =>
      imports
        .filter(({ to }) => /\.tsx?$/.test(to) && !mayImport(from, to))
        .map(({ to }) => `${from} imports ${to}`),
    );
    expect(wrong).toEqual([]);
  });

  test('have no cycles', () => {
    expect(cycles(graph)).toEqual([]);
  });

  test('reach every file', () => {
    const used = new Set([...graph.values()].flat().map(({ to }) => to));
    const lonely = sources.filter(
      (file) => !used.has(file) && !ENTRIES.includes(file) && !file.endsWith('.d.ts'),
    );
    expect(lonely).toEqual([]);
  });

  test('exist', () => {
    const missing = [...graph].flatMap(([from, imports]) =>
      imports
        .filter(({ to }) => /\.(tsx?|json|css|svg|qasm)$/.test(to) && !existsSync(join(root, to)))
        .map(({ to }) => `${from}: ${to}`),
    );
    expect(missing).toEqual([]);
  });
});

test('nothing that is banned is used', () => {
  const tests = filesBelow('test', /\.ts$/).filter((file) => file !== 'test/tidy.test.ts');
  const found = [
    ...sources.flatMap((file) => offences(file, readFileSync(join(root, file), 'utf8'))),
    ...tests.flatMap((file) => offences('workers/', readFileSync(join(root, file), 'utf8')).map((text) => text.replace('workers/', file))), // biome-ignore format: tests are held to the common rules
  ].filter((text) => !/config\.ts: export default/.test(text));
  expect(found).toEqual([]);
});

describe('guides', () => {
  const developers = readFileSync(join(root, 'DEVELOPERS.md'), 'utf8');
  const folders = readdirSync(join(root, 'src')).filter((name) =>
    statSync(join(root, 'src', name)).isDirectory(),
  );

  test.each(folders)('DEVELOPERS.md names src/%s', (folder) => {
    expect(developers).toContain(`src/${folder}`);
  });

  test.each(['README.md', 'DEVELOPERS.md', 'CHANGELOG.md'])('%s has one title', (file) => {
    const text = readFileSync(join(root, file), 'utf8').replace(/```[\s\S]*?```/g, '');
    expect(text.match(/^# /gm)).toHaveLength(1);
  });
});

describe('the rules themselves', () => {
  test('an import against the layers is seen', () => {
    expect(mayImport('src/check/dense.ts', 'src/reshape/chain.ts')).toBe(false);
    expect(mayImport('src/numeric/svd.ts', 'src/circuit/gates.ts')).toBe(false);
    expect(mayImport('src/read/device.ts', 'src/device/estimate.ts')).toBe(false);
    expect(mayImport('src/read/device.ts', 'src/device/device.ts')).toBe(true);
    expect(mayImport('src/reshape/chain.ts', 'src/numeric/svd.ts')).toBe(true);
    expect(mayImport('src/cli/main.ts', 'src/commands.ts')).toBe(true);
  });

  test('a cycle is seen, one of types only is not', () => {
    const value = (to: string): Import => ({ to, isTypeOnly: false });
    expect(
      cycles(
        new Map([
          ['a', [value('b')]],
          ['b', [value('a')]],
        ]),
      ),
    ).toEqual([['a', 'b', 'a']]);
    expect(
      cycles(
        new Map([
          ['a', [value('b')]],
          ['b', [{ to: 'a', isTypeOnly: true }]],
        ]),
      ),
    ).toEqual([]);
  });

  test('banned calls are seen in code and not in comments', () => {
    expect(offences('src/plan/x.ts', 'const x = Math.random();')).toEqual([
      'src/plan/x.ts: Math.random is banned, use random(seed)',
    ]);
    expect(offences('src/plan/x.ts', '// Math.random is banned\nconst x = 1;')).toEqual([]);
    expect(offences('src/cli/x.ts', 'performance.now()')).toEqual([]);
    expect(offences('src/cli/x.ts', 'const x = y as any;')).toHaveLength(1);
  });

  test('imports are read in all their forms', () => {
    const text =
      "import { a } from './a.ts';\nimport type { B } from './b.ts';\nexport { c } from './c.ts';\nconst d = await import('./d.ts');";
    expect(importsOf(text)).toEqual([
      { specifier: './a.ts', isTypeOnly: false },
      { specifier: './b.ts', isTypeOnly: true },
      { specifier: './c.ts', isTypeOnly: false },
      { specifier: './d.ts', isTypeOnly: false },
    ]);
  });
});
