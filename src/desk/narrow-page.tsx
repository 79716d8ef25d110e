/** The main page: a circuit, what it needs and why, and the same on fewer wires. */
import type { Counts } from '../circuit/counts.ts';
import type { FitRow, NarrowReport, SurveyReport } from '../reports.ts';
import { frontierPicture, type TradeMark } from '../write/frontier-picture.ts';
import { Convergence } from './convergence.tsx';
import { DrawingView } from './drawing.tsx';
import { Editor } from './editor.tsx';
import { examples, exampleText } from './example-texts.ts';
import { ContractFields, DeviceField, Options, TextField } from './fields.tsx';
import { InfluenceTable } from './influence.tsx';
import type { NarrowModel } from './models.ts';
import { Failure, Numbers, RunBar, SaveBar, SaveButton } from './parts.tsx';
import { saveText } from './save.ts';
import { set } from './settings.ts';
import {
  bracketSentence,
  CONTRACT_WORDS,
  checkSentence,
  count,
  distanceRows,
  figure,
  narrowTitle,
  sentence,
  surveySentence,
} from './words.ts';

export function NarrowPage({ model }: { model: NarrowModel }) {
  const report = model.surveyReport;
  return (
    <>
      <section aria-labelledby="narrow-circuit">
        <h2 id="narrow-circuit">The circuit</h2>
        <ExampleChoice model={model} />
        <div class="pair">
          <Editor sheet={model.sheet} label="Circuit as text" />
          <div>
            <DrawingView
              sheet={model.sheet}
              caption="The circuit as written"
              empty="Nothing here yet. Write a circuit in OpenQASM, open a file, or choose an example."
            />
            <Warnings model={model} />
          </div>
        </div>
      </section>
      <section aria-labelledby="narrow-needs" aria-busy={model.survey.isRunning}>
        <h2 id="narrow-needs">What it needs</h2>
        <Failure task={model.survey} />
        {report ? <Needs model={model} report={report} /> : <SurveyWait model={model} />}
      </section>
      <section aria-labelledby="narrow-run">
        <h2 id="narrow-run">On fewer wires</h2>
        <Options summary="Options">
          <ContractFields />
          <TextField name="wires" label="Wires" advice="Empty: the fewest." width="6" />
          <TextField name="native" label="Native gates" advice="As cx,rz,sx or cz,rx,rz." />
          <TextField name="tolerance" label="Tolerance on D" width="8" />
          <TextField name="seed" label="Seed" advice="Same seed, same circuit." width="6" />
          <DeviceField />
        </Options>
        <RunBar
          task={model.narrowing}
          start="Narrow it"
          again="Start again"
          isReady={report !== null}
          onStart={() => void model.narrow()}
        />
        <Failure task={model.narrowing} />
        <Convergence data={model.convergence} />
        <NarrowAnswer model={model} />
      </section>
    </>
  );
}

function ExampleChoice({ model }: { model: NarrowModel }) {
  const text = model.sheet.text.value;
  const shown = examples.find(({ file }) => exampleText(file) === text);
  return (
    <div class="examples">
      <label for="example">Example</label>
      <select
        id="example"
        value={shown?.file ?? ''}
        onChange={(event) => {
          const { value } = event.currentTarget;
          if (value) model.sheet.text.value = exampleText(value);
        }}
      >
        <option value="">a circuit of your own</option>
        {examples.map(({ file }) => (
          <option key={file} value={file}>
            {file.replace(/\.qasm$/, '').replaceAll('-', ' ')}
          </option>
        ))}
      </select>
      <p>{shown?.sentence ?? ''}</p>
    </div>
  );
}

function Warnings({ model }: { model: NarrowModel }) {
  const warnings = model.sheet.shown.value?.warnings ?? [];
  if (warnings.length === 0) return null;
  return (
    <ul class="notes">
      {warnings.map(({ message, line }) => (
        <li key={`${line}${message}`}>
          {line === undefined ? '' : `Line ${line}: `}
          {message}
        </li>
      ))}
    </ul>
  );
}

function SurveyWait({ model }: { model: NarrowModel }) {
  const { kind } = model.survey.state.value;
  if (kind === 'running') {
    return (
      <p class="empty" role="status">
        <span class="busy" aria-hidden="true" /> {sentence(model.survey.stage.value)}
      </p>
    );
  }
  if (kind === 'problems' || kind === 'fault') return null;
  return (
    <p class="empty">
      {model.sheet.problems.value.length > 0
        ? 'As soon as the text has no mistakes, this says how many wires it needs.'
        : 'As soon as there is a circuit, this says how many wires it needs.'}
    </p>
  );
}

function Needs({ model, report }: { model: NarrowModel; report: SurveyReport }) {
  return (
    <>
      <p class="lead" role="status">
        {surveySentence(report)}
      </p>
      <div class="pair">
        <div>
          <h3>Who influences whom</h3>
          <InfluenceTable model={model} report={report} />
        </div>
        <div>
          <h3>Fewest wires, by what must stay the same</h3>
          <WidthTable report={report} />
          <h3>The trade</h3>
          <TradeView model={model} />
        </div>
      </div>
      {report.notes.length > 0 && (
        <ul class="notes">
          {report.notes.map((note) => (
            <li key={note}>{sentence(note)}</li>
          ))}
        </ul>
      )}
      <div class="save">
        <span>Save</span>
        <SaveButton
          label="survey.json"
          onSave={() => saveText('survey.json', jsonOf(report, model.survey.state.value), 'application/json')} // biome-ignore format: one call
        />
        <SaveButton
          label="circuit.svg"
          onSave={() =>
            void model.sheet.picture().then((svg) => {
              if (svg) saveText('circuit.svg', svg, 'image/svg+xml');
            })
          }
        />
      </div>
    </>
  );
}

function WidthTable({ report }: { report: SurveyReport }) {
  const sure = { exact: '', upper: 'at most ', lower: 'at least ' } as const;
  return (
    <table class="widths">
      <tbody>
        {report.widths.map(({ contract, width, how, why }) => (
          <tr key={contract}>
            <th scope="row">{CONTRACT_WORDS[contract]}</th>
            <td>
              <strong>
                {sure[how]}
                {width}
              </strong>
              <span class="why">{sentence(why)}</span>
            </td>
          </tr>
        ))}
        {report.approximate?.map(({ wires, infidelityAtLeast }) => (
          <tr key={`at-${wires}`}>
            <th scope="row">on {count(wires, 'wire')}, approximately</th>
            <td>
              <span class="why">
                Wrong by at least {figure(infidelityAtLeast)} in process infidelity.
              </span>
            </td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

function TradeView({ model }: { model: NarrowModel }) {
  const state = model.trade.state.value;
  if (state.kind === 'running' || state.kind === 'idle') {
    return <p class="empty">Weighing wires against depth …</p>;
  }
  if (state.kind !== 'answer') return <Failure task={model.trade} />;
  const { points, written } = state.value;
  const marks: TradeMark[] = [{ ...written, label: 'as written' }];
  const narrowed = model.narrowReport;
  if (narrowed?.after) {
    const { wires, depth } = narrowed.after;
    marks.push({ wires, depth, success: narrowed.estimate?.after ?? null, label: 'narrowed' });
  }
  const svg = frontierPicture(points, marks, { standalone: false, idPrefix: 'trade' });
  const hasSuccess = points.some(({ success }) => success !== null);
  return (
    <div class="trade">
      <div
        class="scroll-x"
        tabIndex={0}
        role="region"
        aria-label="Trade of wires against depth"
        dangerouslySetInnerHTML={{ __html: svg }}
      />
      <table class="numbers">
        <caption>By order and early measurement alone, with the gates as written</caption>
        <thead>
          <tr>
            <th scope="col">wires</th>
            <th scope="col">depth</th>
            {hasSuccess && <th scope="col">success</th>}
            <th scope="col">
              <span class="unseen">take it</span>
            </th>
          </tr>
        </thead>
        <tbody>
          {points.slice(0, 12).map(({ wires, depth, success }) => (
            <tr key={wires}>
              <td>{wires}</td>
              <td>{depth}</td>
              {hasSuccess && <td>{success === null ? '' : `${(100 * success).toFixed(1)} %`}</td>}
              <td>
                <button
                  type="button"
                  class="plain"
                  onClick={() => {
                    set('wires', `${wires}`);
                    void model.narrow();
                  }}
                >
                  narrow to {wires}
                </button>
              </td>
            </tr>
          ))}
        </tbody>
      </table>
      <div class="save">
        <span>Save</span>
        <SaveButton
          label="trade.svg"
          onSave={() => saveText('trade.svg', frontierPicture(points, marks), 'image/svg+xml')}
        />
      </div>
    </div>
  );
}

function NarrowAnswer({ model }: { model: NarrowModel }) {
  const report = model.narrowReport;
  const state = model.narrowing.state.value;
  if (!report || state.kind !== 'answer') return null;
  const bracket = bracketSentence(report);
  const check = checkSentence(report);
  const opening = model.opening.value;
  return (
    <div class={`answer ${report.verdict}`}>
      <p class="lead" role="status">
        {narrowTitle(report)}
      </p>
      <p>{sentence(report.reason)}</p>
      {bracket && <p>{bracket}</p>}
      {opening && report.verdict === 'narrowed' && <p>{openingSentence(model, report)}</p>}
      {report.verdict === 'undecided' && (
        <p>
          Another seed may decide it, or a wider tolerance, or one wire more. What is shown is the
          best so far.
        </p>
      )}
      {report.after && (
        <>
          <div class="stack">
            <DrawingView
              sheet={model.sheet}
              caption={`Before: ${count(report.before.wires, 'wire')}`}
              empty=""
            />{' '}
            {/* biome-ignore format: one element */}
            <DrawingView sheet={model.after} caption={`After: ${count(report.after.wires, 'wire')}`} empty="Drawing …" />{' '}
            {/* biome-ignore format: one element */}
          </div>
          <p class="legend">
            A filled flag: a qubit enters. An outlined flag: it leaves. The shaded stretch between
            them is its time on the wire.
          </p>
          <div class="pair">
            <BeforeAfter before={report.before} after={report.after} report={report} />
            <div>
              {check && <p>{check}</p>}
              {report.distance && (
                <Numbers caption="How far the two are apart" rows={distanceRows(report.distance)} />
              )}
            </div>
          </div>
          <Reuse model={model} report={report} />
          <Fits fits={report.fits} />
          <details class="text">
            <summary>The narrowed circuit as text</summary>
            <pre>{state.value.text}</pre>
          </details>
          <pre class="print-only">{state.value.text}</pre>
        </>
      )}
      {report.notes.length > 0 && (
        <ul class="notes">
          {report.notes.map((note) => (
            <li key={note}>{sentence(note)}</li>
          ))}
        </ul>
      )}
      <SaveBar>
        {state.value.text !== null && (
          <>
            <SaveButton
              label="narrowed.qasm"
              onSave={() => saveText('narrowed.qasm', state.value.text ?? '', 'text/plain')}
            />{' '}
            {/* biome-ignore format: one element */}
            <SaveButton
              label="narrowed.svg"
              onSave={() =>
                void model.after.picture().then((svg) => {
                  if (svg) saveText('narrowed.svg', svg, 'image/svg+xml');
                })
              }
            />
          </>
        )}
        <SaveButton
          label="narrow.json"
          onSave={() => saveText('narrow.json', jsonOf(report, state), 'application/json')}
        />{' '}
        {/* biome-ignore format: one element */}
      </SaveBar>
    </div>
  );
}

function openingSentence(model: NarrowModel, report: NarrowReport): string {
  const names = model.sheet.shown.value?.wireNames ?? [];
  const opening = model.opening.value!; // the caller looked
  const { leaves, enters } = opening;
  const isTaken = report.reuse.some((pair) => pair.leaves === leaves && pair.enters === enters);
  const [out, into] = [names[leaves] ?? `#${leaves}`, names[enters] ?? `#${enters}`];
  return isTaken
    ? `The opening you chose is used: ${into} enters on the wire that ${out} leaves.`
    : `In the plan with the fewest wires, ${out} leaves before ${into} enters, but another qubit takes its wire.`;
}

function BeforeAfter({
  before,
  after,
  report,
}: {
  before: Counts;
  after: Counts;
  report: NarrowReport;
}) {
  const rows: [string, number | string, number | string][] = [
    ['wires', before.wires, after.wires],
    ['one-qubit gates', before.oneQubit, after.oneQubit],
    ['entanglers', before.twoQubit, after.twoQubit],
    ['depth', before.depth, after.depth],
    ['entangler depth', before.twoQubitDepth, after.twoQubitDepth],
    ['measurements', before.measurements, after.measurements],
    ['resets', before.resets, after.resets],
  ];
  if (report.estimate) {
    const percent = (x: number): string => `${(100 * x).toFixed(1)} %`;
    rows.push(['success, estimated', percent(report.estimate.before), percent(report.estimate.after)]); // biome-ignore format: one row
  }
  return (
    <table class="numbers">
      <caption>What it costs</caption>
      <thead>
        <tr>
          <td />
          <th scope="col">before</th>
          <th scope="col">after</th>
        </tr>
      </thead>
      <tbody>
        {rows.map(([name, a, b]) => (
          <tr key={name}>
            <th scope="row">{name}</th>
            <td>{a}</td>
            <td>{b}</td>
          </tr>
        ))}
      </tbody>
    </table>
  );
}

function Reuse({ model, report }: { model: NarrowModel; report: NarrowReport }) {
  const names = model.sheet.shown.value?.wireNames ?? [];
  const nameOf = (k: number): string => names[k] ?? `#${k}`;
  if (report.reuse.length === 0) return null;
  return (
    <details class="text">
      <summary>{count(report.reuse.length, 'reuse')}</summary>
      <ul class="notes">
        {report.reuse.map(({ wire, leaves, enters }) => (
          <li key={`${leaves}-${enters}`}>
            On wire {wire}, {nameOf(leaves)} leaves and {nameOf(enters)} enters.
          </li>
        ))}
      </ul>
    </details>
  );
}

export function Fits({ fits }: { fits: readonly FitRow[] }) {
  if (fits.length === 0) return null;
  return (
    <details class="text">
      <summary>{count(fits.length, 'fit')}</summary>
      <div class="scroll-x" tabIndex={0} role="region" aria-label="Fits">
        <table class="numbers">
          <thead>
            <tr>
              <th scope="col">block</th>
              <th scope="col">wires</th>
              <th scope="col">entanglers</th>
              <th scope="col">iterations</th>
              <th scope="col">D</th>
              <th scope="col">ended</th>
            </tr>
          </thead>
          <tbody>
            {fits.map((fit, k) => (
              <tr key={k}>
                <td>{fit.block + 1}</td>
                <td>{fit.wires.join(', ')}</td>
                <td>{fit.entanglers}</td>
                <td>{fit.iterations}</td>
                <td>{figure(fit.distance)}</td>
                <td>{fit.status}</td>
              </tr>
            ))}
          </tbody>
        </table>
      </div>
    </details>
  );
}

/** The report as it is saved, with the time it took. */
export function jsonOf(report: object, state: { kind: string; seconds?: number }): string {
  return `${JSON.stringify({ ...report, seconds: state.seconds ?? 0 }, null, 2)}\n`;
}
