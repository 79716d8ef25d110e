/** Writes reports for people: plain sentences and tables, coloured on a terminal only. */
import Table from 'cli-table3';
import type { Counts } from '../circuit/counts.ts';
import type {
  BuildReport,
  CompareReport,
  DistanceReport,
  FitRow,
  NarrowReport,
  Stretch,
  SurveyReport,
  WindowRow,
} from '../reports.ts';
import { outputColours as pc } from './colours.ts';

type Report = SurveyReport | NarrowReport | CompareReport | BuildReport;

/** Tables of influence are shown up to this many wires; the JSON report has them all. */
const TABLE_WIRES_MAX = 12;

export function showReport(report: Report): string {
  switch (report.schema) {
    case 'wiregauge/survey@1':
      return showSurvey(report);
    case 'wiregauge/narrow@1':
      return showNarrow(report);
    case 'wiregauge/compare@1':
      return showCompare(report);
    case 'wiregauge/build@1':
      return showBuild(report);
  }
}

function table(head: readonly string[], rows: readonly (readonly (string | number)[])[]): string {
  const drawn = new Table({
    head: head.map((text) => pc.dim(text)),
    style: { head: [], border: [], compact: true, 'padding-left': 0, 'padding-right': 2 },
    chars: {
      top: '', 'top-mid': '', 'top-left': '', 'top-right': '',
      bottom: '', 'bottom-mid': '', 'bottom-left': '', 'bottom-right': '',
      left: '', 'left-mid': '', mid: '', 'mid-mid': '', right: '', 'right-mid': '', middle: '',
    }, // biome-ignore format: no lines anywhere
  });
  drawn.push(...rows.map((row) => row.map(String)));
  return drawn
    .toString()
    .split('\n')
    .map((line) => `  ${line.trimEnd()}`)
    .join('\n');
}

function small(x: number): string {
  if (x === 0) return '0';
  return Math.abs(x) >= 0.001 && Math.abs(x) < 1e4
    ? Number(x.toPrecision(4)).toString()
    : x.toExponential(2);
}

function place(stretch: Stretch): string {
  if (!stretch) return 'no gate';
  const { from, to } = stretch;
  return from === to ? `line ${from}` : `lines ${from} to ${to}`;
}

function wires(count: number): string {
  return `${count} ${count === 1 ? 'wire' : 'wires'}`;
}

function contractLine(report: Report): string {
  const who = report.contractFromFile ? 'decided by the file' : 'as asked';
  return `contract ${report.contract} (${who})`;
}

function countRows(named: readonly (readonly [string, Counts | null])[]): string {
  const rows = named.flatMap(([name, counts]) =>
    counts
      ? [
          [
            name,
            counts.wires,
            counts.oneQubit,
            counts.twoQubit,
            counts.depth,
            counts.twoQubitDepth,
            counts.measurements,
            counts.resets,
          ],
        ]
      : [],
  );
  const head = [
    '',
    'wires',
    'one-qubit',
    'two-qubit',
    'depth',
    'two-qubit depth',
    'measured',
    'resets',
  ];
  return table(head, rows);
}

function noteLines(notes: readonly string[]): string[] {
  return notes.map((note) => pc.dim(`note: ${note}`));
}

function showSurvey(report: SurveyReport): string {
  const { structure, causal, early, influence, openings, widths, approximate } = report;
  const lines = [`${pc.bold(report.circuit)}: ${contractLine(report)}`, ''];
  lines.push(countRows([['circuit', report.counts]]), '');
  lines.push(`structure needs ${wires(structure.width)} (${structure.method})`);
  if (early) lines.push(`with early measurement ${wires(early.width)} (${early.method})`);
  if (causal) lines.push(`any equal circuit needs ${wires(causal.width)} (${causal.method})`);
  lines.push('', table(['contract', 'wires', '', 'why'], widths.map((row) => [row.contract, row.width, row.how, row.why]))); // biome-ignore format: one table
  if (influence && influence.table.length <= TABLE_WIRES_MAX) {
    lines.push('', ...influenceTable(report));
  }
  if (openings.length > 0) {
    const shown = openings.slice(0, 12).map(({ leaves, enters }) => `${leaves} before ${enters}`);
    const more = openings.length > 12 ? `, and ${openings.length - 12} more` : '';
    lines.push('', `openings (structure forbids, influence allows): ${shown.join(', ')}${more}`);
  }
  if (approximate && approximate.length > 0) {
    const priced = approximate.map(
      ({ wires: count, infidelityAtLeast }) =>
        `${wires(count)} at a process infidelity of at least ${small(infidelityAtLeast)}`,
    );
    lines.push('', `fewer wires, at a price: ${priced.join('; ')}`);
  }
  return [...lines, ...noteLines(report.notes), ''].join('\n');
}

/** Rows outputs, columns inputs: `.` free by structure, `open` free by influence only, else the bound. */
function influenceTable({ influence, structure }: SurveyReport): string[] {
  if (!influence) return [];
  const n = influence.table.length;
  const cell = (i: number, j: number): string => {
    const strength = influence.table[i]![j]!;
    if (strength > 1e-15) return small(strength);
    return structure.reach[i]?.[j] ? pc.bold('open') : '.';
  };
  const rows = Array.from({ length: n }, (_, i) => [
    `out ${i}`,
    ...Array.from({ length: n }, (__, j) => cell(i, j)),
  ]);
  const what =
    influence.kind === 'kept'
      ? 'least process infidelity of a circuit that lets the output leave before the input enters'
      : "least error of the output's probability when it leaves before the input enters";
  const head = ['', ...Array.from({ length: n }, (_, j) => `in ${j}`)];
  return [`influence (${influence.method}; ${what})`, table(head, rows)];
}

function showNarrow(report: NarrowReport): string {
  const { verdict, reason, before, after, reuse, check, bracket, fits, estimate } = report;
  const colour = verdict === 'narrowed' ? pc.green : verdict === 'impossible' ? pc.red : pc.yellow;
  const lines = [
    `${pc.bold(report.circuit)}: ${colour(verdict)}`,
    reason,
    contractLine(report),
    '',
  ];
  lines.push(countRows([['before', before], ['after', after]])); // biome-ignore format: two rows
  if (reuse.length > 0) {
    const rows = reuse.map(
      ({ wire, leaves, enters }) => `wire ${wire}: ${leaves} leaves, ${enters} enters`,
    );
    lines.push('', `reuse: ${rows.slice(0, 12).join('; ')}${rows.length > 12 ? `; and ${rows.length - 12} more` : ''}`); // biome-ignore format: one line
  }
  if (bracket) {
    const reached =
      bracket.reached === null ? 'nothing reached' : `reached ${small(bracket.reached)}`;
    lines.push(`bracket: D is at least ${small(bracket.lower)}, ${reached}`);
  }
  lines.push(...windowLines(report.windows), ...fitLines(fits));
  if (check) {
    const proof = check.proof ? 'a proof' : 'no proof';
    lines.push(`check: ${check.method} (${proof}), ${wires(check.unfoldedWires)} unfolded, D = ${small(check.distance)}`); // biome-ignore format: one line
  }
  if (estimate) {
    lines.push(`estimated success on the device: ${small(estimate.before)} before, ${small(estimate.after)} after`); // biome-ignore format: one line
  }
  return [...lines, ...noteLines(report.notes), ''].join('\n');
}

function windowLines(windows: readonly WindowRow[]): string[] {
  if (windows.length === 0) return [];
  const rows = windows.map(({ wires: on, gates, entanglers }, k) => [k, on.join(' '), gates.before, gates.after, entanglers.before, entanglers.after]); // biome-ignore format: one row
  return ['', table(['window', 'on wires', 'gates before', 'after', 'entanglers before', 'after'], rows)]; // biome-ignore format: one table
}

function fitLines(fits: readonly FitRow[]): string[] {
  if (fits.length === 0) return [];
  const rows = fits.map((row) => [
    row.block,
    row.wires.join(' '),
    row.entanglers,
    row.iterations,
    small(row.distance),
    row.status,
  ]);
  return ['', table(['fit', 'on wires', 'entanglers', 'iterations', 'D', ''], rows)];
}

function distanceLines(distance: DistanceReport | null): string[] {
  if (!distance) return [];
  const bar = distance.errorBar ? ` +- ${small(distance.errorBar)}` : '';
  const worst = distance.worstCase === null ? 'not computed' : small(distance.worstCase);
  return [
    `distance: D = ${small(distance.hilbertSchmidt)}${bar}, process infidelity ${small(distance.processInfidelity)}, worst case ${worst}, angle ${small(distance.angle)}`,
  ];
}

function showCompare(report: CompareReport): string {
  const { verdict, witness, relabelling, method, proof, phase } = report;
  const colour = verdict === 'same' ? pc.green : verdict === 'different' ? pc.red : pc.yellow;
  const lines = [`${colour(pc.bold(verdict))}: ${report.original} and ${report.rewritten}`];
  lines.push(`${contractLine(report)}; ${method} (${proof ? 'a proof' : 'no proof'})`);
  lines.push(...distanceLines(report.distance));
  if (phase !== null) lines.push(`global phase: ${small(phase)}`);
  if (witness) {
    lines.push(`witness: input ${witness.input}`);
    lines.push(
      `  probability of ${witness.output}: ${witness.probabilityOriginal.toPrecision(12)} in the original, ${witness.probabilityRewritten.toPrecision(12)} in the rewritten circuit`,
    );
  }
  if (report.where?.original || report.where?.rewritten) {
    const { original, rewritten } = report.where;
    lines.push(
      `they part at ${place(original)} of the original and ${place(rewritten)} of the rewritten circuit`,
    );
  }
  if (relabelling) lines.push(`outputs relabelled: ${relabelling.join(' ')}`);
  return [...lines, ...noteLines(report.notes), ''].join('\n');
}

function classLines({ coordinates, makhlin }: NonNullable<BuildReport['canonical']>): string[] {
  const digits = (x: number): string => String(Number(x.toFixed(9)));
  const [re, im, g2] = makhlin;
  const g1 =
    im === 0 ? digits(re) : `${digits(re)}${im < 0 ? ' - ' : ' + '}${digits(Math.abs(im))}i`;
  return [
    `class (${coordinates.map(digits).join(', ')}) in units of pi/4; invariants G1 = ${g1}, G2 = ${digits(g2)}`,
  ];
}

function showBuild(report: BuildReport): string {
  const { verdict, entanglers, counts, frontier } = report;
  const lines = [`${pc.bold(report.target)}: ${verdict} in ${report.native}`];
  lines.push(
    `${entanglers.used} entanglers (${entanglers.boundKind}${entanglers.bound > 0 ? `; at least ${entanglers.bound} are needed` : ''})`,
  );
  if (report.canonical) lines.push(...classLines(report.canonical));
  lines.push(...distanceLines(report.distance), '', countRows([['circuit', counts]]));
  if (frontier.length > 1) {
    const rows = frontier.map(({ entanglers: count, distance }) => [count, small(distance)]);
    lines.push('', table(['entanglers', 'D'], rows));
  }
  lines.push(...fitLines(report.fits));
  return [...lines, ...noteLines(report.notes), ''].join('\n');
}
