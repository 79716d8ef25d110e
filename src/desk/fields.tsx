/** Fields of the options, each with its label, its advice and, when needed, its complaint. */
import type { ComponentChildren } from 'preact';
import { useId } from 'preact/hooks';
import { demoDeviceText } from './example-texts.ts';
import { complaint, type Settings, set, settings } from './settings.ts';

type TextProps = { name: keyof Settings; label: string; advice?: string; width?: string };

export function TextField({ name, label, advice, width = '12' }: TextProps) {
  const id = useId();
  const value = settings.value[name];
  const wrong = complaint(name, value);
  const described = [advice ? `${id}-advice` : '', wrong ? `${id}-wrong` : ''].filter(Boolean).join(' '); // biome-ignore format: one list
  return (
    <div class="field">
      <label for={id}>{label}</label>
      <input
        id={id}
        class={`width-${width}`}
        value={value}
        spellcheck={false}
        autocomplete="off"
        aria-invalid={wrong !== undefined}
        {...(described ? { 'aria-describedby': described } : {})}
        onInput={(event) => set(name, event.currentTarget.value)}
      />
      {advice && (
        <p class="advice" id={`${id}-advice`}>
          {advice}
        </p>
      )}
      {wrong && (
        <p class="wrong" id={`${id}-wrong`}>
          {wrong}
        </p>
      )}
    </div>
  );
}

type ChoiceProps = {
  name: keyof Settings;
  label: string;
  choices: readonly (readonly [string, string])[];
};

export function ChoiceField({ name, label, choices }: ChoiceProps) {
  const id = useId();
  return (
    <div class="field">
      <label for={id}>{label}</label>
      <select
        id={id}
        value={settings.value[name]}
        onChange={(event) => set(name, event.currentTarget.value)}
      >
        {choices.map(([value, words]) => (
          <option key={value} value={value}>
            {words}
          </option>
        ))}
      </select>
    </div>
  );
}

export function ContractFields() {
  return (
    <>
      <ChoiceField
        name="inputs"
        label="Inputs"
        choices={[
          ['file', 'as the file says'],
          ['any', 'any state'],
          ['zero', 'all |0⟩'],
        ]}
      />
      <ChoiceField
        name="outputs"
        label="Outputs"
        choices={[
          ['file', 'as the file says'],
          ['kept', 'kept'],
          ['measured', 'measured'],
        ]}
      />
    </>
  );
}

export function DeviceField() {
  const id = useId();
  const { device } = settings.value;
  return (
    <div class="field wide">
      <label for={id}>Device (JSON), for estimates of success</label>
      <textarea
        id={id}
        rows={device ? 8 : 2}
        spellcheck={false}
        value={device}
        onInput={(event) => set('device', event.currentTarget.value)}
      />
      <p class="advice">
        <button type="button" class="plain" onClick={() => set('device', demoDeviceText)}>
          Take the demonstration device
        </button>{' '}
        <button type="button" class="plain" onClick={() => set('device', '')} disabled={!device}>
          Take none
        </button>
      </p>
      {device && (
        <p class="advice">
          Estimates leave out crosstalk, leakage and drift; your maker’s calibration data and a run
          on the device decide.
        </p>
      )}
    </div>
  );
}

export function Options({ summary, children }: { summary: string; children: ComponentChildren }) {
  return (
    <details class="options">
      <summary>{summary}</summary>
      <div class="fields">{children}</div>
    </details>
  );
}
