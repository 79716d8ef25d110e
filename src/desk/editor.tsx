/** A text to edit: a plain field at once, the editor with marks as soon as it is loaded. */
import { useSignal, useSignalEffect } from '@preact/signals';
import { useEffect, useRef } from 'preact/hooks';
import type { CodeEditor } from './code-editor.ts';
import type { Sheet } from './models.ts';
import { readFile } from './save.ts';
import { problemSentence } from './words.ts';

type Props = { sheet: Sheet; label: string; rows?: number };

export function Editor({ sheet, label, rows = 14 }: Props) {
  const host = useRef<HTMLDivElement>(null);
  const field = useRef<HTMLTextAreaElement>(null);
  const editor = useRef<CodeEditor | null>(null);
  const isLoaded = useSignal(false);
  const refusal = useSignal('');

  useEffect(() => {
    let isGone = false;
    void import('./code-editor.ts').then(({ createEditor }) => {
      if (isGone || !host.current || editor.current) return;
      const hadFocus = document.activeElement === field.current;
      editor.current = createEditor(host.current, sheet.text.peek(), {
        label,
        onText: (text) => {
          sheet.text.value = text;
        },
        onLine: (line) => {
          sheet.line.value = line;
        },
      });
      editor.current.setProblems(sheet.problems.peek());
      isLoaded.value = true;
      if (hadFocus) requestAnimationFrame(() => editor.current?.focus());
    });
    return () => {
      isGone = true;
    };
  }, []);

  // each value is read first: an effect that runs before the editor is there must still listen to it
  useSignalEffect(() => {
    const text = sheet.text.value;
    editor.current?.setText(text);
  });
  useSignalEffect(() => {
    const problems = sheet.problems.value;
    editor.current?.setProblems(problems);
  });
  useSignalEffect(() => {
    const line = sheet.line.value;
    editor.current?.setLinkedLine(line);
  });

  const goTo = (line: number, column: number): void => {
    if (editor.current) return editor.current.goTo(line, column);
    const lines = sheet.text.peek().split('\n');
    const start = lines.slice(0, line - 1).reduce((sum, text) => sum + text.length + 1, 0);
    field.current?.focus();
    field.current?.setSelectionRange(start + column - 1, start + column);
  };

  const take = async (file: File | undefined): Promise<void> => {
    if (!file) return;
    const found = await readFile(file);
    if ('refusal' in found) refusal.value = found.refusal;
    else {
      refusal.value = '';
      sheet.text.value = found.text;
    }
  };

  const problems = sheet.problems.value;
  return (
    <div
      class="editor"
      onDragOver={(event) => event.preventDefault()}
      onDrop={(event) => {
        event.preventDefault();
        void take(event.dataTransfer?.files[0]);
      }}
    >
      <div class="sheet">
        <textarea
          ref={field}
          hidden={isLoaded.value}
          aria-label={label}
          spellcheck={false}
          rows={rows}
          value={sheet.text.value}
          onInput={(event) => {
            sheet.text.value = event.currentTarget.value;
          }}
        />
        <div ref={host} hidden={!isLoaded.value} class="code-host" />
      </div>
      <pre class="print-only">{sheet.text.value}</pre>
      <label class="file-choice">
        <span>Open a file</span>
        <input
          type="file"
          accept=".qasm,.mtx,.txt,.inc"
          onChange={(event) => {
            void take(event.currentTarget.files?.[0]);
            event.currentTarget.value = '';
          }}
        />
      </label>
      <div role="alert">
        {refusal.value !== '' && <p class="wrong">{refusal.value}</p>}
        {problems.length > 0 && (
          <div class="problems">
            <p>
              {problems.length === 1
                ? 'One mistake in this text:'
                : `${problems.length} mistakes in this text:`}
            </p>
            <ul>
              {problems.slice(0, 12).map((problem) => (
                <li key={`${problem.line}:${problem.column}:${problem.message}`}>
                  <button
                    type="button"
                    class="plain"
                    onClick={() => goTo(problem.line ?? 1, problem.column ?? 1)}
                  >
                    {problemSentence(problem)}
                  </button>
                </li>
              ))}
            </ul>
            {problems.length > 12 && <p>and {problems.length - 12} more</p>}
          </div>
        )}
      </div>
    </div>
  );
}
