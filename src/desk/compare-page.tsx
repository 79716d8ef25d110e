/** Two circuits: the same or not, how far apart, and an input that shows it. */
import type { CompareReport } from '../reports.ts';
import { DrawingView } from './drawing.tsx';
import { Editor } from './editor.tsx';
import { EXAMPLE_PAIRS, exampleText } from './example-texts.ts';
import { ChoiceField, ContractFields, Options, TextField } from './fields.tsx';
import type { CompareModel } from './models.ts';
import { jsonOf } from './narrow-page.tsx';
import { Failure, Numbers, RunBar, SaveBar, SaveButton } from './parts.tsx';
import { saveText } from './save.ts';
import { distanceRows, figure, probability, sentence } from './words.ts';

export function ComparePage({ model }: { model: CompareModel }) {
  const isReady =
    model.original.shown.value !== null &&
    model.rewritten.shown.value !== null &&
    model.original.problems.value.length + model.rewritten.problems.value.length === 0;
  return (
    <>
      <section aria-labelledby="compare-circuits">
        <h2 id="compare-circuits">Two circuits</h2>
        <p class="examples">
          <span>Example</span>
          {EXAMPLE_PAIRS.map(({ label, original, rewritten }) => (
            <button
              key={label}
              type="button"
              class="plain"
              onClick={() => {
                model.original.text.value = exampleText(original);
                model.rewritten.text.value = exampleText(rewritten);
              }}
            >
              {label}
            </button>
          ))}
        </p>
        <div class="pair even">
          <div>
            <h3>Original</h3>
            <Editor sheet={model.original} label="Original circuit as text" />
            <DrawingView
              sheet={model.original}
              caption="Original"
              empty="The circuit that is right."
            />
          </div>
          <div>
            <h3>Rewritten</h3>
            <Editor sheet={model.rewritten} label="Rewritten circuit as text" />
            <DrawingView
              sheet={model.rewritten}
              caption="Rewritten"
              empty="The circuit that should do the same. Annotations of a narrowed circuit are understood."
            />
          </div>
        </div>
      </section>
      <section aria-labelledby="compare-run">
        <h2 id="compare-run">Are they the same?</h2>
        <Options summary="Options">
          <ContractFields />
          <ChoiceField
            name="relabel"
            label="Outputs may change places"
            choices={[
              ['', 'no'],
              ['yes', 'yes'],
            ]}
          />
          <TextField name="tolerance" label="Tolerance on D" width="8" />
          <TextField name="seed" label="Seed" width="6" />
        </Options>
        <RunBar
          task={model.comparing}
          start="Compare them"
          again="Compare again"
          isReady={isReady}
          onStart={() => void model.compare()}
        />
        <Failure task={model.comparing} />
        <CompareAnswer model={model} />
      </section>
    </>
  );
}

function verdictSentence({ verdict, proof }: CompareReport): string {
  if (verdict === 'same') return proof ? 'They are the same, and this is proved.' : 'No difference was found.'; // biome-ignore format: one choice
  if (verdict === 'different') return 'They are different.';
  return 'Undecided within the limits.';
}

function CompareAnswer({ model }: { model: CompareModel }) {
  const state = model.comparing.state.value;
  if (state.kind !== 'answer') return null;
  const report = state.value.report as CompareReport; // a comparison was asked for
  const { distance, witness, phase, relabelling } = report;
  return (
    <div class={`answer ${report.verdict}`}>
      <p class="lead" role="status">
        {verdictSentence(report)}
      </p>
      <p>
        {sentence(`compared by ${report.method}`)}
        {phase === null ? '' : ` The global phase between them is ${figure(phase)}.`}
      </p>
      {witness && (
        <p>
          For the input {witness.input}, the output {witness.output} has probability{' '}
          {probability(witness.probabilityOriginal, witness.probabilityRewritten)} in the original
          and {probability(witness.probabilityRewritten, witness.probabilityOriginal)} in the
          rewritten circuit.
        </p>
      )}
      {relabelling && (
        <p>Output k of the original is output {relabelling.join(', ')} of the rewritten circuit.</p>
      )}
      {distance && <Numbers caption="How far they are apart" rows={distanceRows(distance)} />}
      {report.notes.length > 0 && (
        <ul class="notes">
          {report.notes.map((note) => (
            <li key={note}>{sentence(note)}</li>
          ))}
        </ul>
      )}
      <SaveBar>
        <SaveButton
          label="compare.json"
          onSave={() => saveText('compare.json', jsonOf(report, state), 'application/json')}
        />{' '}
        {/* biome-ignore format: one element */}
      </SaveBar>
    </div>
  );
}
