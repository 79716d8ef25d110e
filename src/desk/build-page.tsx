/** A unitary: native gates for it, with few entanglers, and what fewer would cost. */
import type { BuildReport } from '../reports.ts';
import { Convergence } from './convergence.tsx';
import { DrawingView } from './drawing.tsx';
import { Editor } from './editor.tsx';
import { EXAMPLE_TARGETS } from './example-texts.ts';
import { ChoiceField, Options, TextField } from './fields.tsx';
import type { BuildModel } from './models.ts';
import { Fits, jsonOf } from './narrow-page.tsx';
import { Failure, Numbers, RunBar, SaveBar, SaveButton } from './parts.tsx';
import { saveText } from './save.ts';
import { count, distanceRows, figure, sentence } from './words.ts';

export function BuildPage({ model }: { model: BuildModel }) {
  const isReady = model.target.shown.value !== null && model.target.problems.value.length === 0;
  return (
    <>
      <section aria-labelledby="build-target">
        <h2 id="build-target">The target</h2>
        <p class="examples">
          <span>Example</span>
          {EXAMPLE_TARGETS.map(({ label, text }) => (
            <button
              key={label}
              type="button"
              class="plain"
              onClick={() => {
                model.target.text.value = text;
              }}
            >
              {label}
            </button>
          ))}
        </p>
        <p>
          An expression such as <code>kron(h, id) * cx</code>, a matrix in Matrix Market form, or a
          circuit.
        </p>
        <div class="pair">
          <Editor sheet={model.target} label="Target as text" rows={8} />
          <DrawingView
            sheet={model.target}
            caption="The target"
            empty="Nothing to build yet. Write an expression or choose an example."
          />
        </div>
      </section>
      <section aria-labelledby="build-run">
        <h2 id="build-run">In native gates</h2>
        <Options summary="Options">
          <TextField name="native" label="Native gates" advice="As cx,rz,sx or cz,rx,rz." />
          <TextField name="links" label="Links" advice="As 0-1, 1-2. Empty: all." />
          <TextField
            name="entanglers"
            label="Entanglers, at most"
            advice="Empty: as many as it takes."
            width="6"
          />
          <ChoiceField
            name="optimiser"
            label="Fit by"
            choices={[
              ['lm', 'Levenberg–Marquardt'],
              ['bfgs', 'BFGS'],
              ['nelder-mead', 'Nelder–Mead'],
            ]}
          />
          <TextField name="tolerance" label="Tolerance on D" width="8" />
          <TextField name="seed" label="Seed" width="6" />
        </Options>
        <RunBar
          task={model.building}
          start="Build it"
          again="Build again"
          isReady={isReady}
          onStart={() => void model.build()}
        />
        <Failure task={model.building} />
        <Convergence data={model.convergence} />
        <BuildAnswer model={model} />
      </section>
    </>
  );
}

function verdictSentence({ verdict, entanglers, distance }: BuildReport): string {
  const made = count(entanglers.used, 'entangler');
  if (verdict === 'built') return `Built with ${made}.`;
  if (verdict === 'approximate') {
    return `Not exactly: with ${made} the nearest is at D = ${figure(distance.hilbertSchmidt)}.`;
  }
  return `Undecided: the best so far uses ${made}.`;
}

function boundSentence({ entanglers: { used, bound, boundKind } }: BuildReport): string {
  if (boundKind === 'proven') return `No circuit needs fewer than ${bound}; this is a theorem.`;
  if (boundKind === 'exhausted below') return `Every smaller arrangement was tried and failed; a theorem gives at least ${bound}.`; // biome-ignore format: one sentence
  return used > bound
    ? `A theorem gives at least ${bound}; between ${bound} and ${used} nothing is proved.`
    : `It meets the theorem’s bound of ${bound}.`;
}

function BuildAnswer({ model }: { model: BuildModel }) {
  const state = model.building.state.value;
  if (state.kind !== 'answer') return null;
  const report = state.value.report as BuildReport; // a build was asked for
  const { text } = state.value;
  const { counts } = report;
  return (
    <div class={`answer ${report.verdict}`}>
      <p class="lead" role="status">
        {verdictSentence(report)}
      </p>
      <p>{boundSentence(report)}</p>
      <div class="stack">
        <DrawingView sheet={model.after} caption={`In ${report.native}`} empty="Drawing …" />
      </div>
      <div class="pair">
        <div>
          <Numbers
            caption="What it costs"
            rows={[
              ['wires', `${counts.wires}`],
              ['one-qubit gates', `${counts.oneQubit}`],
              ['entanglers', `${counts.twoQubit}`],
              ['depth', `${counts.depth}`],
            ]}
          />
          <Numbers caption="How far it is from the target" rows={distanceRows(report.distance)} />
        </div>
        {report.frontier.length > 0 && (
          <Numbers
            caption="What fewer entanglers would cost: entanglers and the least D found"
            rows={report.frontier.map(({ entanglers, distance }) => [`${entanglers}`, figure(distance)])} // biome-ignore format: one mapping
          />
        )}
      </div>
      <Fits fits={report.fits} />
      {report.notes.length > 0 && (
        <ul class="notes">
          {report.notes.map((note) => (
            <li key={note}>{sentence(note)}</li>
          ))}
        </ul>
      )}
      <pre class="print-only">{text}</pre>
      <SaveBar>
        <SaveButton
          label="built.qasm"
          onSave={() => saveText('built.qasm', text ?? '', 'text/plain')}
        />{' '}
        {/* biome-ignore format: one element */}
        <SaveButton
          label="built.svg"
          onSave={() =>
            void model.after.picture().then((svg) => {
              if (svg) saveText('built.svg', svg, 'image/svg+xml');
            })
          }
        />
        <SaveButton
          label="build.json"
          onSave={() => saveText('build.json', jsonOf(report, state), 'application/json')}
        />{' '}
        {/* biome-ignore format: one element */}
      </SaveBar>
    </div>
  );
}
